// Package traces draws the scenario's run: the true state and its estimate, their
// difference, the innovations.
package traces

import (
	"math"

	"polewright/scenarios"
)

// Mode is what a trace shows.
type Mode uint8

const (
	// Both shows truth and estimate.
	Both Mode = iota
	// Error shows truth minus estimate.
	Error
	// Innovation shows what a sensor says beyond the prediction.
	Innovation
	modes
)

// Next is the mode after m.
func (m Mode) Next() Mode { return (m + 1) % modes }

// Axis is the range of values that a trace shows.
type Axis struct{ Low, High float64 }

// Curves returns what a mode shows for one state (for innovations: one sensor):
// one or two series over the run's time, nil where the run has none.
func Curves(run *scenarios.Run, m Mode, i int) [][]float64 {
	if run == nil {
		return nil
	}
	pick := func(list [][]float64) []float64 {
		if i < 0 || i >= len(list) {
			return nil
		}
		return list[i]
	}
	truth, estimate := pick(run.True), pick(run.Estimate)
	switch m {
	case Innovation:
		if v := pick(run.Innovations); v != nil {
			return [][]float64{v}
		}
		return nil
	case Error:
		if truth == nil || estimate == nil {
			return nil
		}
		e := make([]float64, min(len(truth), len(estimate)))
		for k := range e {
			e[k] = truth[k] - estimate[k]
		}
		return [][]float64{e}
	}
	if estimate == nil {
		return nil
	}
	return [][]float64{truth, estimate} // a state that the real plant lacks has no truth
}

// Span is the least and the largest finite value; false where there is none.
func Span(curves [][]float64) (Axis, bool) {
	a := Axis{math.Inf(1), math.Inf(-1)}
	for _, c := range curves {
		for _, v := range c {
			if !math.IsNaN(v) && !math.IsInf(v, 0) {
				a.Low, a.High = min(a.Low, v), max(a.High, v)
			}
		}
	}
	return a, a.Low <= a.High
}

// Axes returns an axis with round ends that holds all values.
func Axes(curves [][]float64) Axis {
	a, ok := Span(curves)
	if !ok {
		return Axis{-1, 1}
	}
	width := a.High - a.Low
	if size := max(math.Abs(a.Low), math.Abs(a.High)); width <= 1e-9*size || width == 0 {
		width = max(size, 1e-12) * 0.2 // a constant
		a.Low, a.High = a.Low-width/2, a.High+width/2
	}
	if math.IsInf(width, 0) {
		return Axis{a.Low, a.High}
	}
	d := round(width / 8)
	low, high := math.Floor(a.Low/d)*d, math.Ceil(a.High/d)*d
	return Axis{low + 0, high + 0}
}

// round returns the first of 1, 2, 5 times a power of ten that is not below v.
func round(v float64) float64 {
	p := math.Pow(10, math.Floor(math.Log10(v)))
	for _, m := range []float64{1, 2, 5} {
		if m*p >= v*(1-1e-12) {
			return m * p
		}
	}
	return 10 * p
}

// Serves tells whether an axis still serves the values: all are on it and they
// fill a third of it.
func (a Axis) Serves(curves [][]float64) bool {
	s, ok := Span(curves)
	if !ok {
		return true
	}
	return s.Low >= a.Low && s.High <= a.High && s.High-s.Low >= (a.High-a.Low)/4
}

// column samples a series at n+1 equal steps of time, in units of rows above the
// low end; what is off the axis or not finite is NaN, which leaves a gap. With
// peaks each column takes the largest value around its time, so that no spike is
// lost between columns.
func column(series []float64, n, rows int, a Axis, peaks bool) []float64 {
	out := make([]float64, n+1)
	for j := range out {
		out[j] = math.NaN()
		if len(series) == 0 {
			continue
		}
		k := int(math.Round(float64(j) / float64(n) * float64(len(series)-1)))
		v := series[k]
		if peaks {
			half := len(series) / (2 * n)
			for i := max(k-half, 0); i <= min(k+half, len(series)-1); i++ {
				if math.Abs(series[i]) > math.Abs(v) {
					v = series[i]
				}
			}
		}
		if y := (v - a.Low) / (a.High - a.Low) * float64(rows-1); y > -0.5 && y < float64(rows)-0.5 {
			out[j] = min(max(y, 0), float64(rows-1))
		}
	}
	return out
}
