package plane

import (
	"math"
	"math/cmplx"
	"strconv"

	"polewright/ui/canvas"
	"polewright/ui/plane/targets"
	"polewright/ui/theme"
)

// Kind of a mark, in the order in which one covers another.
type Kind uint8

const (
	// Plant poles are the model's own.
	Plant Kind = iota
	// Controller poles are those of the loop.
	Controller
	// Floor poles are those of the best linear estimator.
	Floor
	// Fixed poles cannot be moved by any gain.
	Fixed
	// Target poles are wanted.
	Target
	// Selected is the target in the hand.
	Selected
	// SelectedFixed is a fixed pole in the hand.
	SelectedFixed
)

// Mark is one pole, in the plane shown. Place is false where it has none there.
type Mark struct {
	At    complex128
	Place bool
	Kind  Kind
}

// Glyph is the shape of a mark.
func Glyph(k Kind, g *theme.Glyphs) rune {
	return [...]rune{g.Plant, g.Controller, g.Floor, g.Fixed, g.Target, g.Selected, g.Fixed}[k]
}

// Ink is the ink of a mark.
func Ink(k Kind) theme.Ink {
	return [...]theme.Ink{theme.Faint, theme.Faint, theme.Text, theme.Text, theme.Title, theme.Hold, theme.Hold}[k]
}

// Draw draws the window with the marks on it, at (x, y) of the canvas. Marks of
// higher kind cover others.
func Draw(c *canvas.Canvas, x, y int, w Window, marks []Mark, t *theme.Theme) {
	p := pen{c: c, x: x, y: y, w: w, g: &t.Glyphs}
	p.occupy(marks)
	if w.Plane == targets.Z {
		p.circle()
	} else {
		p.rings()
		p.rays()
		p.limit()
	}
	p.axes()
	for k := Plant; k <= SelectedFixed; k++ {
		for _, m := range marks {
			if m.Kind == k {
				p.mark(m)
			}
		}
	}
	p.counts(marks)
}

// pen draws in the coordinates of a window.
type pen struct {
	c    *canvas.Canvas
	x, y int
	w    Window
	g    *theme.Glyphs
	// Cells of marks: those that stay while a pole is moved, and all. Labels make
	// room for the former; one that a moving mark meets is left out.
	still, marked []cell
	aside         int // poles that have no place in this plane
}

// cell is a place in the window.
type cell struct{ col, row int }

func (p *pen) cellOf(m Mark) (cell, bool) {
	at := cell{p.w.Column(real(m.At)), p.w.Row(imag(m.At))}
	return at, m.Place && p.w.Inside(m.At)
}

// occupy notes where the marks will be.
func (p *pen) occupy(marks []Mark) {
	for _, m := range marks {
		if at, ok := p.cellOf(m); ok {
			p.marked = append(p.marked, at)
			if m.Kind < Target {
				p.still = append(p.still, at)
			}
		} else if !m.Place && m.Kind >= Fixed {
			p.aside++
		}
	}
}

// clear tells whether n cells hold none of the marks.
func clear(marks []cell, col, row, n int) bool {
	for _, m := range marks {
		if m.row == row && m.col >= col && m.col < col+n {
			return false
		}
	}
	return true
}

// counts writes the number of wanted and fixed poles beside a mark that stands
// for several.
func (p *pen) counts(marks []Mark) {
	number := map[cell]int{}
	ink := map[cell]theme.Ink{}
	for _, m := range marks {
		if at, ok := p.cellOf(m); ok && m.Kind >= Fixed {
			number[at]++
			if ink[at] != theme.Hold {
				ink[at] = Ink(m.Kind)
			}
		}
	}
	for at, n := range number {
		if n < 2 {
			continue
		}
		text := strconv.Itoa(n)
		for _, col := range []int{at.col + 1, at.col - len(text)} {
			if col >= 0 && col+len(text) <= p.w.W && clear(p.marked, col, at.row, len(text)) {
				p.c.Text(p.x+col, p.y+at.row, text, ink[at])
				break
			}
		}
	}
}

func (p *pen) set(col, row int, r rune, ink theme.Ink) {
	if col >= 0 && row >= 0 && col < p.w.W && row < p.w.H {
		p.c.Set(p.x+col, p.y+row, r, ink)
	}
}

// text writes a label if it lies wholly inside and covers nothing but blanks and dots.
func (p *pen) text(col, row int, s string) bool {
	n := canvas.TextWidth(s)
	if col < 0 || row < 0 || col+n > p.w.W || row >= p.w.H {
		return false
	}
	for i := range n {
		if r := p.c.At(p.x+col+i, p.y+row); r != ' ' && r != p.g.Dot {
			return false
		}
	}
	if !clear(p.still, col, row, n) {
		return false
	}
	if clear(p.marked, col, row, n) {
		p.c.Text(p.x+col, p.y+row, s, theme.Faint)
	}
	return true
}

// dot is part of a curve.
func (p *pen) dot(v complex128) {
	p.set(p.w.Column(real(v)), p.w.Row(imag(v)), p.g.Dot, theme.Grid)
}

// ticks are the distances of labels along the axes.
func (p *pen) ticks() (dx, dy float64) {
	return tick(11 * p.w.DX), tick(3 * p.w.DY)
}

// rings are arcs of equal natural frequency in the left half plane, at every
// labelled place of the real axis.
func (p *pen) rings() {
	d, _ := p.ticks()
	if p.w.W < 60 || p.w.H < 16 {
		d *= 2
	}
	far := math.Hypot(max(-p.w.X0, 0), p.w.Half())
	for k := 1; k <= 40 && float64(k)*d < far; k++ {
		r := float64(k) * d
		n := min(max(int(math.Pi/2*r/p.w.DX/5), 2), 1000) // a dot in about three cells of the way around
		for i := range n {
			v := cmplx.Rect(r, math.Pi/2*(1+(float64(i)+0.5)/float64(n)))
			p.dot(v)
			p.dot(cmplx.Conj(v))
		}
	}
}

// dampings are the ratios that have a line.
var dampings = []float64{0.3, 0.7}

// rays are lines of equal damping ratio, with the ratio where they leave.
func (p *pen) rays() {
	for _, zeta := range dampings {
		slope := zeta / math.Sqrt(1-zeta*zeta)
		top := 0
		for row := range p.w.H / 2 {
			im := float64(p.w.H/2-row) * p.w.DY
			col := p.w.Column(-slope * im)
			if col < 0 {
				top = row + 1
				continue
			}
			p.set(col, row, p.g.Dot, theme.Grid)
			p.set(col, p.w.H-1-row+(p.w.H+1)%2, p.g.Dot, theme.Grid)
		}
		if im := float64(p.w.H/2-top) * p.w.DY; im > 0 {
			label := strconv.FormatFloat(zeta, 'g', 2, 64)
			if p.w.W >= 70 {
				label = "damping " + label
			}
			col := p.w.Column(-slope * im)
			p.text(max(col-len(label)+2, 0), top, label)
		}
	}
}

// limit draws the sampling limit ±π/period of the s-plane.
func (p *pen) limit() {
	if p.w.Period == 0 {
		return
	}
	im := math.Pi / p.w.Period
	for _, sign := range []float64{1, -1} {
		row := p.w.Row(sign * im)
		if row < 0 || row >= p.w.H {
			continue
		}
		for col := range p.w.W {
			p.set(col, row, p.g.Limit, theme.Grid)
		}
		if sign > 0 {
			p.limitLabel(row)
		}
	}
}

// limitLabel names the sampling limit on its line, where no mark stands.
func (p *pen) limitLabel(row int) {
	const text = " sampling limit "
	for col := 2; col+len(text) <= p.w.W; col += 4 {
		if clear(p.still, col, row, len(text)) {
			if clear(p.marked, col, row, len(text)) {
				p.c.Text(p.x+col, p.y+row, text, theme.Faint)
			}
			return
		}
	}
}

// circle draws the unit circle and a line of equal damping inside it.
func (p *pen) circle() {
	n := max(int(2*math.Pi/p.w.DX/2), 8)
	for i := range min(n, 4000) {
		v := cmplx.Rect(1, math.Pi*(float64(i)+0.5)/float64(min(n, 4000)))
		p.dot(v)
		p.dot(cmplx.Conj(v))
	}
	for _, zeta := range dampings {
		angle := math.Sqrt(1 - zeta*zeta)
		for a := 0.0; a < math.Pi; {
			radius := math.Exp(-zeta / angle * a)
			v := cmplx.Rect(radius, a)
			p.dot(v)
			p.dot(cmplx.Conj(v))
			a += min(max(6*p.w.DX/radius, 0.001), 0.5)
		}
	}
}

// axes draws both axes with their labels.
func (p *pen) axes() {
	mid, axis := p.w.H/2, p.w.Column(0)
	for col := range p.w.W {
		p.set(col, mid, p.g.Rule, theme.Grid)
	}
	for row := range p.w.H {
		p.set(axis, row, p.g.Vertical, theme.Grid)
	}
	p.set(axis, mid, p.g.Cross, theme.Grid)
	dx, dy := p.ticks()
	for _, im := range values(-p.w.Half(), p.w.Half(), dy) {
		if row := p.w.Row(im); row != mid && row != mid+1 {
			at := axis + 2
			if axis < -1 || axis > p.w.W-4 { // the axis is out of sight
				at = 1
			}
			for k := 0; k < 4 && !p.text(at+k, row, label(im, dy)); k++ {
			}
		}
	}
	for _, re := range values(p.w.X0, p.w.X0+float64(p.w.W)*p.w.DX, dx) {
		if re == 0 {
			continue
		}
		col, s := p.w.Column(re), label(re, dx)
		p.set(col, mid, p.g.Cross, theme.Grid)
		for _, k := range []int{0, -1, 1, -2, 2, -3, 3} { // around still marks
			if p.text(col-len(s)/2+k, mid+1, s) {
				break
			}
		}
	}
}

// values are the multiples of d from low to high.
func values(low, high, d float64) []float64 {
	var out []float64
	for k := math.Ceil(low / d); k*d <= high && len(out) < 200; k++ {
		out = append(out, k*d)
	}
	return out
}

// label prints a multiple of d with the decimals that d has.
func label(v, d float64) string {
	decimals := max(-int(math.Floor(math.Log10(d)+1e-9)), 0)
	if decimals > 4 || math.Abs(v) >= 1e5 {
		return strconv.FormatFloat(v, 'e', 0, 64)
	}
	return strconv.FormatFloat(v, 'f', decimals, 64)
}

// mark draws one pole. A target beyond the picture becomes an arrow at its edge.
func (p *pen) mark(m Mark) {
	ink, r := Ink(m.Kind), Glyph(m.Kind, p.g)
	if !m.Place { // z = 0 lies infinitely far to the left in the s-plane
		if m.Kind >= Fixed {
			p.set(0, p.w.H/2, p.g.Left, ink)
			text := " z = 0 "
			if p.aside > 1 {
				text += "x" + strconv.Itoa(p.aside) + " "
			}
			p.c.Text(p.x+1, p.y+p.w.H/2, text, ink)
		}
		return
	}
	col, row := p.w.Column(real(m.At)), p.w.Row(imag(m.At))
	if p.w.Inside(m.At) {
		p.set(col, row, r, ink)
		return
	}
	if m.Kind < Fixed {
		return
	}
	switch {
	case row < 0:
		r = p.g.Up
	case row >= p.w.H:
		r = p.g.Down
	case col < 0:
		r = p.g.Left
	default:
		r = p.g.Right
	}
	p.set(min(max(col, 0), p.w.W-1), min(max(row, 0), p.w.H-1), r, ink)
}
