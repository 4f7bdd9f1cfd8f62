package logs

import (
	"math"
	"slices"
)

const (
	// paceRows is how many intervals settle what the period of a log is.
	paceRows = 1024
	// maxGap bounds the sample periods between two rows.
	maxGap = 1000000
)

// pace measures the period of a log from the times of its rows. The median of the
// first intervals tells missing rows from jitter, the mean over all sample
// periods is the measure.
type pace struct {
	first      []interval
	median     float64
	periods    float64 // sample periods passed, missing rows included
	missing    int64
	begin, end float64
	low, high  float64 // least and largest interval less its whole periods
	longest    interval
	started    bool
}

type interval struct {
	span float64
	line int
}

func (p *pace) add(t float64, line int) {
	if !p.started {
		p.started = true
		p.begin, p.end = t, t
		p.low, p.high = math.Inf(1), math.Inf(-1)
		return
	}
	d := interval{t - p.end, line}
	p.end = t
	if p.median > 0 {
		p.count(d)
		return
	}
	p.first = append(p.first, d)
	if len(p.first) == paceRows {
		p.settle()
	}
}

// settle takes the median, the lower of two, and counts what came before.
func (p *pace) settle() {
	if p.median > 0 || len(p.first) == 0 {
		return
	}
	spans := make([]float64, len(p.first))
	for i, d := range p.first {
		spans[i] = d.span
	}
	slices.Sort(spans)
	p.median = spans[(len(spans)-1)/2]
	for _, d := range p.first {
		p.count(d)
	}
	p.first = nil
}

func (p *pace) count(d interval) {
	if d.span > p.longest.span {
		p.longest = d
	}
	k := periodsIn(d.span, p.median)
	p.periods += k
	p.missing += int64(k) - 1
	rest := d.span - k*p.median
	p.low, p.high = math.Min(p.low, rest), math.Max(p.high, rest)
}

// periodsIn is the whole number of sample periods that an interval stands for, at
// most maxGap.
func periodsIn(span, period float64) float64 {
	if k := math.Round(span / period); k < maxGap {
		return math.Max(1, k)
	}
	return maxGap
}

// period is the mean over all sample periods.
func (p *pace) period() float64 { return (p.end - p.begin) / p.periods }

// jitter is the largest deviation of an interval over the period.
func (p *pace) jitter() float64 {
	t := p.period()
	shift := p.median - t
	return math.Max(math.Abs(p.low+shift), math.Abs(p.high+shift)) / t
}
