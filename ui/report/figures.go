package report

import (
	"fmt"
	"math"
	"math/cmplx"

	"gonum.org/v1/gonum/mat"

	"polewright/estimator/poles"
	"polewright/ui/report/draw"
)

// marks are the poles of a plane by what they stand for.
type marks struct {
	name  string
	shape draw.Shape
	ink   draw.Ink
	list  []complex128
}

// polePlanes draws the s-plane, and for a sampled estimator the z-plane as well.
func (m *maker) polePlanes(s *shown) {
	b := m.bench
	fixed := s.designer.Analysis().Observability.Fixed
	sets := []marks{
		{"plant", draw.Saltire, draw.Grey, eigenvalues(b.Model.A)},
		{"wanted", draw.Ring, draw.Accent, s.design.Wanted},
		{"reached", draw.Disc, draw.Accent, s.design.Reached},
		{"no gain moves it", draw.Square, draw.Dark, fixed},
	}
	if f := s.designer.Analysis().Floor; f != nil {
		sets = append(sets, marks{"floor", draw.Diamond, draw.Dark, f.Poles})
	}
	period := b.Model.Period
	c := draw.New(500, 268)
	wide := 480.0
	if period > 0 {
		wide = 262
		zPlane(c, 306, 22, 186, sets)
	}
	out, limited := sPlane(c, wide, sets, period)
	legend(c, sets)
	caption := "Poles in the s-plane, rad/s, with lines of equal damping ratio"
	if limited {
		caption += " and, dashed, the sampling limit"
	}
	if period > 0 {
		caption += "; right: the z-plane with the unit circle and lines of equal damping ratio"
	}
	caption += "."
	if out > 0 {
		caption += fmt.Sprintf(" Of the places, %d beyond the edge of the s-plane or without a place in it are left out there.", out)
	}
	m.figure(caption, c.SVG("poles of candidate "+s.name))
}

// eigenvalues of a matrix; nil where the iteration gives up.
func eigenvalues(a *mat.Dense) []complex128 {
	var e mat.Eigen
	if !e.Factorize(a, mat.EigenNone) {
		return nil
	}
	return e.Values(nil)
}

// legend names the shapes that occur.
func legend(c *draw.Canvas, sets []marks) {
	x := 12.0
	for _, s := range sets {
		if len(s.list) == 0 {
			continue
		}
		c.Mark(x, 259, s.shape, s.ink)
		c.Text(x+9, 262, draw.Start, draw.Dark, s.name)
		x += 24 + 5*float64(len(s.name))
	}
}

// sPlane draws to the left of the canvas and returns how many places are left out.
func sPlane(c *draw.Canvas, wide float64, sets []marks, period float64) (out int, limited bool) {
	places := make([][]complex128, len(sets))
	reach := 0.0
	for i, s := range sets {
		for _, v := range s.list {
			if period > 0 {
				var ok bool
				if v, ok = poles.ToS(v, period); !ok || math.Log10(1/period)+8 < math.Log10(cmplx.Abs(v)+1e-300) {
					out++
					continue
				}
			}
			places[i] = append(places[i], v)
			if s.name == "reached" || s.name == "wanted" {
				reach = max(reach, math.Abs(real(v)), 1.45*math.Abs(imag(v)))
			}
		}
	}
	if reach == 0 {
		reach = 1
	}
	reach *= 1.25
	if period > 0 { // the place of a register's pole far to the left would hide the rest
		reach = min(reach, 6*math.Pi/period)
	}
	high := 205.0
	p := &draw.Plot{C: c, Left: 46, Top: 20, Wide: wide - 56, High: high,
		X: draw.Axis{Low: -reach, High: 0.25 * reach, Label: "real, rad/s"}}
	if square := p.Wide / high; square > 1 { // room for what is above and below
		p.X.Low, p.X.High = p.X.Low*square, p.X.High*square
	}
	half := (p.X.High - p.X.Low) / p.Wide * high / 2 // a circle looks round
	p.Y = draw.Axis{Low: -half, High: half, Label: "imaginary, rad/s"}
	damping(p, half)
	if limit := math.Pi / period; period > 0 && limit < half {
		limited = true
		for _, v := range []float64{-limit, limit} {
			x1, y := p.At(p.X.Low, v)
			x2, _ := p.At(p.X.High, v)
			c.Line(x1, y, x2, y, draw.Pen{Ink: draw.Grey, Dash: "6 3", Width: 0.8})
		}
	}
	p.Axes(4, 5)
	for i, s := range sets {
		for _, v := range places[i] {
			if !p.Inside(real(v), imag(v)) {
				out++
				continue
			}
			x, y := p.At(real(v), imag(v))
			c.Mark(x, y, s.shape, s.ink)
		}
	}
	return out, limited
}

// damping draws the lines of equal damping ratio and the axes through zero.
func damping(p *draw.Plot, half float64) {
	c := p.C
	x0, y0 := p.At(0, 0)
	for _, ratio := range []float64{0.2, 0.4, 0.6, 0.8} {
		slope := math.Sqrt(1-ratio*ratio) / ratio
		re := math.Min(-p.X.Low, half/slope)
		for _, sign := range []float64{1, -1} {
			x, y := p.At(-re, sign*re*slope)
			c.Line(x0, y0, x, y, draw.Pen{Ink: draw.Faint, Width: 0.6})
			if sign > 0 {
				c.Text(x+2, y+8, draw.Start, draw.Grey, fmt.Sprintf("%.1f", ratio))
			}
		}
	}
	x1, _ := p.At(p.X.Low, 0)
	x2, _ := p.At(p.X.High, 0)
	c.Line(x1, y0, x2, y0, draw.Pen{Ink: draw.Grey, Width: 0.6})
	_, y1 := p.At(0, p.Y.Low)
	_, y2 := p.At(0, p.Y.High)
	c.Line(x0, y1, x0, y2, draw.Pen{Ink: draw.Grey, Width: 0.6})
}

// zPlane draws the unit circle with the poles in and near it.
func zPlane(c *draw.Canvas, left, top, size float64, sets []marks) {
	p := &draw.Plot{C: c, Left: left, Top: top, Wide: size, High: size,
		X: draw.Axis{Low: -1.15, High: 1.15, Label: "real"}, Y: draw.Axis{Low: -1.15, High: 1.15, Label: "imaginary"}}
	x0, y0 := p.At(0, 0)
	x1, _ := p.At(1, 0)
	for _, ratio := range []float64{0.2, 0.4, 0.6, 0.8} {
		for _, sign := range []float64{1, -1} {
			var xs, ys []float64
			for k := range 41 {
				angle := math.Pi * float64(k) / 40
				r := math.Exp(-angle * ratio / math.Sqrt(1-ratio*ratio))
				x, y := p.At(r*math.Cos(angle), sign*r*math.Sin(angle))
				xs, ys = append(xs, x), append(ys, y)
			}
			c.Curve(xs, ys, draw.Pen{Ink: draw.Faint, Width: 0.6})
		}
	}
	c.Circle(x0, y0, x1-x0, draw.Pen{Ink: draw.Grey, Width: 0.8})
	c.Line(x0-size/2, y0, x0+size/2, y0, draw.Pen{Ink: draw.Grey, Width: 0.5})
	c.Line(x0, y0-size/2, x0, y0+size/2, draw.Pen{Ink: draw.Grey, Width: 0.5})
	p.Axes(4, 4)
	for _, s := range sets {
		for _, v := range s.list {
			if p.Inside(real(v), imag(v)) {
				x, y := p.At(real(v), imag(v))
				c.Mark(x, y, s.shape, s.ink)
			}
		}
	}
}
