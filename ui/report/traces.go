package report

import (
	"fmt"
	"math"

	"polewright/ui/report/draw"
)

const (
	// maxTraces is how many states are drawn.
	maxTraces = 12
	// columns is how many parts a long run is thinned to: of each, the least and
	// the largest value are drawn.
	columns = 300
	rowHigh = 96.0
)

// traces draws the scenario's run: truth and estimate of each state of the plant,
// and their difference with the predicted noise.
func (m *maker) traces(s *shown) {
	run := s.run
	n := min(len(m.bench.Plant.States), len(run.Estimate), maxTraces)
	if len(run.T) < 2 || n == 0 {
		m.text(Plain, "The scenario's run ended before there was anything to draw.")
		return
	}
	m.heading(2, "The scenario's run: "+m.bench.Scenario.Name)
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
	run, name := s.run, withUnit(m.bench.Plant.States[i].Name, m.units[i])
	truth, estimate := run.True[i], run.Estimate[i]
	diff := make([]float64, len(truth))
	for k := range diff {
		diff[k] = truth[k] - estimate[k]
	}
	x := draw.Axis{Low: run.T[0], High: run.T[len(run.T)-1]}
	if last {
		x.Label = "time, s"
	}
	left := &draw.Plot{C: c, X: x, Left: 46, Top: top + 16, Wide: 192, High: rowHigh - 36}
	left.Y, _ = draw.Around(name, truth, estimate)
	left.Axes(4, 3)
	curve(left, run.T, truth, draw.Pen{Ink: draw.Grey, Width: 1.4})
	curve(left, run.T, estimate, draw.Pen{Ink: draw.Accent, Width: 1, Dash: "4 2"})

	right := &draw.Plot{C: c, X: x, Left: 298, Top: top + 16, Wide: 192, High: rowHigh - 36}
	var band []float64
	if i < len(s.design.Noise.Std) {
		band = []float64{-2 * s.design.Noise.Std[i], 2 * s.design.Noise.Std[i]}
	}
	right.Y, _ = draw.Around("error", diff, band)
	right.Axes(4, 3)
	for _, v := range band {
		x1, y := right.At(x.Low, v)
		x2, _ := right.At(x.High, v)
		c.Line(x1, y, x2, y, draw.Pen{Ink: draw.Dark, Width: 0.7, Dash: "1 2"})
	}
	curve(right, run.T, diff, draw.Pen{Ink: draw.Accent, Width: 0.9})
}

// curve draws a series, a long one by the least and the largest value of each part
// in the order in which they come.
func curve(p *draw.Plot, t, v []float64, pen draw.Pen) {
	x, y := thin(t, v)
	px, py := p.Map(x, y)
	p.C.Curve(px, py, pen)
}

func thin(t, v []float64) (x, y []float64) {
	if len(v) <= 2*columns {
		return t[:len(v)], v
	}
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
			x, y = append(x, t[i]), append(y, v[i])
		}
	}
	return x, y
}
