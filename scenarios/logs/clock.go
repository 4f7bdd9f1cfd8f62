package logs

import "math"

// clock knows which samples are late enough for the statistics.
type clock struct {
	index int64
	first int64   // samples before it stay out
	from  float64 // and so do times before this one
}

func newClock(v *Survey, skip *float64) clock {
	if skip != nil {
		return clock{from: v.Start + *skip}
	}
	return clock{first: v.Samples / 10, from: math.Inf(-1)}
}

// late takes the next sample.
func (c *clock) late(s *Sample) bool {
	c.index++
	return c.index > c.first && s.T >= c.from
}

// settleSamples is a settle time in samples; NaN is none.
func settleSamples(settle, period float64) int {
	if !(settle > 0) {
		return 0
	}
	return int(math.Min(math.Ceil(settle/period-1e-9), math.MaxInt32))
}

func wraps(l *Layout) []float64 {
	list := make([]float64, len(l.Sensors))
	for i, s := range l.Sensors {
		list[i] = s.Wrap
	}
	return list
}
