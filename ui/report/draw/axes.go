package draw

import (
	"math"
	"strconv"
)

// Axis is a range of values with its label.
type Axis struct {
	Low, High float64
	Log       bool
	Label     string
}

// huge is beyond what is drawn: differences must not overflow.
const huge = 1e300

// Around is an axis with some air around all finite values; false where there are
// none. An axis of no extent gets some.
func Around(label string, lists ...[]float64) (Axis, bool) {
	a := Axis{Low: math.Inf(1), High: math.Inf(-1), Label: label}
	for _, l := range lists {
		for _, v := range l {
			if math.Abs(v) <= huge {
				a.Low, a.High = min(a.Low, v), max(a.High, v)
			}
		}
	}
	if a.Low > a.High {
		return Axis{Low: 0, High: 1, Label: label}, false
	}
	air := 0.06 * (a.High - a.Low)
	if !(air > 1e-12*math.Max(math.Abs(a.Low), math.Abs(a.High))) {
		air = math.Max(math.Abs(a.High)*0.1, 1e-12)
	}
	a.Low, a.High = a.Low-air, a.High+air
	return a, true
}

// AroundLog is Around for values above 0 on a logarithmic axis.
func AroundLog(label string, lists ...[]float64) (Axis, bool) {
	a := Axis{Low: math.Inf(1), High: 0, Log: true, Label: label}
	for _, l := range lists {
		for _, v := range l {
			if v >= 1/huge && v <= huge {
				a.Low, a.High = min(a.Low, v), max(a.High, v)
			}
		}
	}
	if a.Low > a.High {
		return Axis{Low: 1, High: 10, Log: true, Label: label}, false
	}
	air := math.Max(math.Pow(a.High/a.Low, 0.06), 1.1)
	a.Low, a.High = a.Low/air, a.High*air
	return a, true
}

// Ticks are round values within the axis, about as many as asked for.
func (a Axis) Ticks(about int) []float64 {
	if a.Log {
		return a.logTicks()
	}
	step := Step((a.High - a.Low) / float64(about))
	var out []float64
	for k := math.Ceil(a.Low / step); k*step <= a.High*(1+1e-12) && len(out) < 50; k++ {
		if v := k * step; v >= a.Low {
			out = append(out, v+0)
		}
	}
	return out
}

func (a Axis) logTicks() []float64 {
	factors := []float64{1, 2, 5}
	if a.High/a.Low > 100 {
		factors = factors[:1]
	}
	if a.High/a.Low < 2.5 {
		b := a
		b.Log = false
		return b.Ticks(4)
	}
	var out []float64
	for e := math.Floor(math.Log10(a.Low)); e <= math.Ceil(math.Log10(a.High)); e++ {
		for _, f := range factors {
			if v := f * math.Pow(10, e); v >= a.Low && v <= a.High {
				out = append(out, v)
			}
		}
	}
	return out
}

// Step is the least of 1, 2, 5, 10 ... that is not below v.
func Step(v float64) float64 {
	if !(v > 0) || math.IsInf(v, 0) {
		return 1
	}
	p := math.Pow(10, math.Floor(math.Log10(v)))
	for _, f := range []float64{1, 2, 5} {
		if f*p >= v*(1-1e-9) {
			return f * p
		}
	}
	return 10 * p
}

// label prints a tick without the digits that its step does not have.
func label(v, step float64) string {
	if math.Abs(v) < step*1e-6 {
		return "0"
	}
	size := math.Max(math.Abs(v), step)
	if size >= 1e5 || step < 1e-4 {
		return strconv.FormatFloat(v, 'g', 3, 64)
	}
	decimals := max(0, -int(math.Floor(math.Log10(step)+1e-9)))
	return strconv.FormatFloat(v, 'f', decimals, 64)
}

// share is where v is on the axis, 0 at its low end.
func (a Axis) share(v float64) float64 {
	if a.Log {
		return math.Log(v/a.Low) / math.Log(a.High/a.Low)
	}
	return (v - a.Low) / (a.High - a.Low)
}

// Plot is a part of a canvas with two axes.
type Plot struct {
	C          *Canvas
	X, Y       Axis
	Left, Top  float64
	Wide, High float64
}

// At maps values to places.
func (p *Plot) At(x, y float64) (float64, float64) {
	return p.Left + p.X.share(x)*p.Wide, p.Top + (1-p.Y.share(y))*p.High
}

// Map maps lists of values.
func (p *Plot) Map(x, y []float64) (px, py []float64) {
	px, py = make([]float64, len(x)), make([]float64, len(x))
	for i := range x {
		px[i], py[i] = p.At(x[i], y[i])
	}
	return px, py
}

// Inside tells whether a value is within both axes.
func (p *Plot) Inside(x, y float64) bool {
	return x >= p.X.Low && x <= p.X.High && y >= p.Y.Low && y <= p.Y.High
}

// Axes draws both axes with ticks and labels, at the left and at the bottom.
func (p *Plot) Axes(xTicks, yTicks int) {
	c, pen := p.C, Pen{Ink: Grey, Width: 0.7}
	bottom := p.Top + p.High
	c.Line(p.Left, bottom, p.Left+p.Wide, bottom, pen)
	c.Line(p.Left, p.Top, p.Left, bottom, pen)
	xs, ys := p.X.Ticks(xTicks), p.Y.Ticks(yTicks)
	for _, v := range xs {
		x, _ := p.At(v, p.Y.Low)
		c.Line(x, bottom, x, bottom+3, pen)
		c.Text(x, bottom+12, Middle, Grey, label(v, stepOf(xs, v)))
	}
	for _, v := range ys {
		_, y := p.At(p.X.Low, v)
		c.Line(p.Left-3, y, p.Left, y, pen)
		c.Text(p.Left-5, y+3, End, Grey, label(v, stepOf(ys, v)))
	}
	if p.X.Label != "" {
		c.Text(p.Left+p.Wide, bottom+23, End, Dark, p.X.Label)
	}
	if p.Y.Label != "" {
		c.Text(p.Left-5, p.Top-6, Start, Dark, p.Y.Label)
	}
}

// stepOf is the distance between ticks, of uneven ones the tick itself.
func stepOf(ticks []float64, v float64) float64 {
	if len(ticks) < 2 {
		return math.Abs(v)
	}
	step := ticks[1] - ticks[0]
	if last := ticks[len(ticks)-1] - ticks[len(ticks)-2]; math.Abs(last-step) > 1e-6*step {
		return math.Pow(10, math.Floor(math.Log10(math.Abs(v))))
	}
	return step
}
