package report

import (
	"fmt"
	"math"

	"polewright/scenarios"
	"polewright/ui/report/draw"
)

const (
	// maxTraces is how many states are drawn.
	maxTraces = 12
	// columns is how many parts a long run is thinned to: of each, the least and
	// the largest value are drawn.
	columns = 220
	rowHigh = 104.0
)

// series is what is drawn of a signal.
type series struct{ t, v []float64 }

// trace is what is drawn of one state.
type trace struct{ truth, estimate, diff series }

// thinned takes over what is drawn of a run, so that the run need not be kept.
func thinned(run *scenarios.Run, states int) (list []trace, last float64) {
	if len(run.T) < 2 {
		return nil, 0
	}
	for i := range min(states, len(run.Estimate), len(run.True), maxTraces) {
		diff := make([]float64, len(run.T))
		for k := range diff {
			diff[k] = run.True[i][k] - run.Estimate[i][k]
		}
		list = append(list, trace{thin(run.T, run.True[i]), thin(run.T, run.Estimate[i]), thin(run.T, diff)})
	}
	return list, run.T[len(run.T)-1]
}

// thin copies a series; of a long one the least and the largest value of each part,
// in the order in which they come.
func thin(t, v []float64) series {
	if len(v) <= 2*columns {
		return series{append([]float64(nil), t[:len(v)]...), append([]float64(nil), v...)}
	}
	var s series
	for k := range columns {
		from, to := k*len(v)/columns, (k+1)*len(v)/columns
		low, high := from, from
		for i := from; i < to; i++ {
			if v[i] < v[low] || math.IsNaN(v[low]) {
				low = i
			}
			if v[i] > v[high] || math.IsNaN(v[high]) {
				high = i
			}
		}
		for _, i := range []int{min(low, high), max(low, high)} {
			s.t, s.v = append(s.t, t[i]), append(s.v, v[i])
		}
	}
	return s
}

// traces draws the scenario's run: truth and estimate of each state of the plant,
// and their difference with the predicted noise.
func (m *maker) traces(s *shown) {
	m.heading(2, "The scenario's run: "+m.bench.Scenario.Name)
	n := len(s.traces)
	if n == 0 {
		m.text(Plain, "The run ended before there was anything to draw.")
		return
	}
	for from := 0; from < n; from += 4 {
		to := min(from+4, n)
		c := draw.New(500, rowHigh*float64(to-from)+18)
		for i := from; i < to; i++ {
			m.trace(c, s, i, float64(i-from)*rowHigh, i == to-1)
		}
		m.figure(fmt.Sprintf("Candidate %s, %s. Left: truth (solid grey) and estimate (dashed). Right: truth minus estimate; dotted: twice the predicted standard deviation.", s.name, m.bench.Scenario.Name),
			c.SVG("truth and estimate over time"))
	}
	if more := len(m.bench.Plant.States) - n; more > 0 {
		m.text(Faint, "%s more not drawn.", count(more, "state"))
	}
}

func (m *maker) trace(c *draw.Canvas, s *shown, i int, top float64, last bool) {
	tr, name := &s.traces[i], withUnit(m.bench.Plant.States[i].Name, m.units[i])
	x := draw.Axis{Low: 0, High: s.last}
	if last {
		x.Label = "time, s"
	}
	left := &draw.Plot{C: c, X: x, Left: 46, Top: top + 16, Wide: 192, High: rowHigh - 38}
	left.Y, _ = draw.Around(name, tr.truth.v, tr.estimate.v)
	left.Axes(4, 4)
	curve(left, tr.truth, draw.Pen{Ink: draw.Grey, Width: 1.4})
	curve(left, tr.estimate, draw.Pen{Ink: draw.Accent, Width: 1, Dash: "4 2"})

	right := &draw.Plot{C: c, X: x, Left: 298, Top: top + 16, Wide: 192, High: rowHigh - 38}
	var band []float64
	if i < len(s.design.Noise.Std) {
		band = []float64{-2 * s.design.Noise.Std[i], 2 * s.design.Noise.Std[i]}
	}
	right.Y, _ = draw.Around("error", tr.diff.v, band)
	right.Axes(4, 4)
	for _, v := range band {
		x1, y := right.At(x.Low, v)
		x2, _ := right.At(x.High, v)
		c.Line(x1, y, x2, y, draw.Pen{Ink: draw.Dark, Width: 0.7, Dash: "1 2"})
	}
	curve(right, tr.diff, draw.Pen{Ink: draw.Accent, Width: 0.9})
}

func curve(p *draw.Plot, s series, pen draw.Pen) {
	x, y := p.Map(s.t, s.v)
	p.C.Curve(x, y, pen)
}
