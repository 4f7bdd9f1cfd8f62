package logs

import (
	"math"
	"slices"
)

// paceRows is how many intervals settle what the period of a log is.
const paceRows = 1024

// pace measures the period of a log from the times of its rows. The median of the
// first intervals tells missing rows from jitter, the mean of all intervals
// without missing rows is the measure.
type pace struct {
	times      []float64 // of the first rows, until the median is known
	median     float64
	slots      slots
	placed     float64 // time of the last row that has its place
	rows       int64   // that have their place
	gaps       float64 // time of intervals with missing rows
	intervals  int64   // without missing rows
	missing    int64
	begin, end float64
	low, high  float64 // least and largest interval less its whole periods
	longest    interval
}

type interval struct {
	span float64
	line int
}

func (p *pace) add(t float64, line int) {
	if p.median == 0 && len(p.times) == 0 {
		p.begin, p.low, p.high = t, math.Inf(1), math.Inf(-1)
	} else if d := t - p.end; d > p.longest.span {
		p.longest = interval{d, line}
	}
	p.end = t
	if p.median > 0 {
		p.place(t)
		return
	}
	p.times = append(p.times, t)
	if len(p.times) > paceRows {
		p.settle()
	}
}

// settle takes the median, the lower of two, and places what came before.
func (p *pace) settle() {
	if p.median > 0 || len(p.times) < 2 {
		return
	}
	spans := make([]float64, len(p.times)-1)
	for i := range spans {
		spans[i] = p.times[i+1] - p.times[i]
	}
	slices.Sort(spans)
	p.median = spans[(len(spans)-1)/2]
	p.slots.period = p.median
	for _, t := range p.times {
		p.place(t)
	}
	p.times = nil
}

// finish places the last rows.
func (p *pace) finish() {
	p.settle()
	p.drain(true)
}

func (p *pace) place(t float64) {
	p.slots.add(t)
	p.drain(false)
}

func (p *pace) drain(end bool) {
	for {
		t := p.slots.pending[0]
		k, ok := p.slots.next(end)
		if !ok {
			return
		}
		if p.rows++; p.rows > 1 {
			p.count(t-p.placed, k)
		}
		p.placed = t
	}
}

func (p *pace) count(span float64, k int) {
	if k > 1 {
		p.gaps += span
		p.missing += int64(k - 1)
	} else {
		p.intervals++
	}
	rest := span - float64(k)*p.median
	p.low, p.high = math.Min(p.low, rest), math.Max(p.high, rest)
}

// period is the mean of the intervals without missing rows; their median where gaps
// are so long that no digits of the others are left beside them.
func (p *pace) period() float64 {
	rest := p.end - p.begin - p.gaps
	if p.intervals == 0 || !(rest > 1e-9*p.gaps) {
		return p.median
	}
	return rest / float64(p.intervals)
}

// jitter is the largest deviation of an interval over the period.
func (p *pace) jitter() float64 {
	t := p.period()
	shift := p.median - t
	return math.Max(math.Abs(p.low+shift), math.Abs(p.high+shift)) / t
}
