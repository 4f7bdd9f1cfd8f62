package views

import (
	"fmt"
	"math"
	"strings"

	"polewright/estimator"
	"polewright/estimator/sweep"
	"polewright/ui/canvas"
	"polewright/ui/readings"
	"polewright/ui/theme"
)

// Curve is one of the curves of the trade-off.
type Curve uint8

const (
	// Speeds scales all poles of the design in hand.
	Speeds Curve = iota
	// Floors is the family of the best linear estimators.
	Floors
)

// Kept is a candidate on the trade-off.
type Kept struct {
	Letter string
	Design *estimator.Design
}

// Tradeoff is what the trade-off shows: noise over the floor against settle time.
type Tradeoff struct {
	Scaling, Family []sweep.Point
	Running         bool
	Trouble         string // why there is no floor or no curve; empty where all is well
	Kept            []Kept
	Design          *estimator.Design // in hand; nil before the first answer
	Settle, Over    *float64          // limits; nil without
	Curve           Curve             // that is walked along
	At              int               // its point under the cursor
}

// Points are those of the curve that is walked along.
func (f *Tradeoff) Points() []sweep.Point {
	if f.Curve == Floors {
		return f.Family
	}
	return f.Scaling
}

// Point is the one under the cursor; false where there is none.
func (f *Tradeoff) Point() (sweep.Point, bool) {
	list := f.Points()
	if f.At < 0 || f.At >= len(list) || !shows(list[f.At]) {
		return sweep.Point{}, false
	}
	return list[f.At], true
}

// shows tells whether a point has a place on the trade-off.
func shows(p sweep.Point) bool {
	return p.Settle() > 0 && p.OverFloor() > 0 && !math.IsInf(p.Settle(), 0) && !math.IsInf(p.OverFloor(), 0)
}

// Unchanged is the index of the point with the factor nearest to 1 that has a
// place, −1 where none has.
func Unchanged(list []sweep.Point) int {
	best, least := -1, math.Inf(1)
	for i, p := range list {
		if d := math.Abs(math.Log(p.Factor)); shows(p) && d < least {
			best, least = i, d
		}
	}
	return best
}

// Along goes from point at to the next one that has a place, up or down the
// factors by step; at the end it stays.
func Along(list []sweep.Point, at, step int) int {
	for i := at + step; i >= 0 && i < len(list); i += step {
		if shows(list[i]) {
			return i
		}
	}
	return at
}

// tradeBelow are the rows below the plot: ticks, the point, how it compares.
const tradeBelow = 4

// Lines draws the trade-off into w by h cells.
func (f *Tradeoff) Lines(w, h int, t *theme.Theme) []string {
	var c canvas.Canvas
	c.Reset(w, h)
	p := tradePlot{f: f, c: &c, g: &t.Glyphs, x: tradeGutter, y: 1, w: w - tradeGutter - 1, h: h - 1 - tradeBelow}
	p.heading(w)
	switch ok := p.axes(); {
	case f.Trouble != "" && !ok:
		for i, l := range canvas.Wrap(f.Trouble, w-4) {
			c.Text(2, 2+i, l, theme.Text)
		}
	case !ok:
		c.Text(2, 2, "the curves are on their way", theme.Faint)
	default:
		p.draw()
		p.words(w, h)
	}
	return c.Lines(t, true)
}

const tradeGutter = 8

// tradePlot draws the plot; its area is w by h cells at (x, y).
type tradePlot struct {
	f          *Tradeoff
	c          *canvas.Canvas
	g          *theme.Glyphs
	x, y, w, h int
	ax, ay     logAxis
}

func (p *tradePlot) heading(w int) {
	x := p.c.Text(0, 0, "noise, x floor", theme.Title) + 3
	scaling, family := theme.Faint, theme.Faint
	if p.f.Curve == Floors {
		family = theme.Hold
	} else {
		scaling = theme.Hold
	}
	long := w >= 76
	word := func(short, full string) string {
		if long {
			return full
		}
		return short
	}
	x = p.c.Text(x, 0, strings.Repeat(p.g.Estimate.Horizontal, 3)+" "+word("speeds", "all speeds together"), scaling) + 3
	x = p.c.Text(x, 0, strings.Repeat(string(p.g.Dot), 3)+" "+word("best", "best estimators"), family) + 3
	if p.f.Running {
		p.c.Text(x, 0, "computing", theme.Text)
		return
	}
	p.c.Set(x, 0, p.g.Selected, theme.Hold)
	p.c.Text(x+2, 0, "in hand", theme.Faint)
}

// axes fits the axes to what matters: the design in hand, the candidates, the
// limits, and as much of the curves as leaves these apart.
func (p *tradePlot) axes() bool {
	var settle, over []float64 // what must be in sight
	see := func(d *estimator.Design) {
		if d != nil && d.Noise.Std != nil {
			settle, over = append(settle, d.Transient.Settle), append(over, d.Noise.OverFloorRMS)
		}
	}
	see(p.f.Design)
	for _, k := range p.f.Kept {
		see(k.Design)
	}
	const beyond = 6 // times what must be in sight, for the curves
	slow, fast, loud := beyond*most(settle), least(settle)/beyond, max(beyond*most(over), 10)
	any := false
	for _, list := range [][]sweep.Point{p.f.Scaling, p.f.Family} {
		for _, q := range list {
			any = any || shows(q)
			if s, v := q.Settle(), q.OverFloor(); len(settle) == 0 || s <= slow && s >= fast && v <= loud {
				settle, over = append(settle, s), append(over, v)
			}
		}
	}
	if p.f.Settle != nil {
		settle = append(settle, *p.f.Settle)
	}
	if p.f.Over != nil {
		over = append(over, *p.f.Over)
	}
	over = append(over, 1)
	var okX, okY bool
	p.ax, okX = newLogAxis(settle, p.w)
	p.ay, okY = newLogAxis(over, p.h)
	return any && okX && okY
}

func most(list []float64) float64 {
	out := 0.0
	for _, v := range list {
		if !math.IsInf(v, 0) && v > out {
			out = v
		}
	}
	return out
}

func least(list []float64) float64 {
	out := math.Inf(1)
	for _, v := range list {
		if v > 0 && v < out {
			out = v
		}
	}
	return out
}

// cell is where a point is; false where it has no place or is out of sight.
func (p *tradePlot) cell(settle, over float64) (x, y int, ok bool) {
	fx, ok1 := p.ax.cell(settle)
	fy, ok2 := p.ay.cell(over)
	x, y = p.x+int(math.Round(fx)), p.y+p.h-1-int(math.Round(fy))
	return x, y, ok1 && ok2 && p.inside(x, y)
}

func (p *tradePlot) inside(x, y int) bool {
	return x >= p.x && x < p.x+p.w && y >= p.y && y < p.y+p.h
}

func (p *tradePlot) draw() {
	p.ticks()
	p.limits()
	scaling, _ := firstRune(p.g.Estimate.Horizontal)
	if p.f.Curve == Floors {
		p.curve(p.f.Scaling, scaling, theme.Faint)
		p.curve(p.f.Family, p.g.Dot, theme.Text)
	} else {
		p.curve(p.f.Family, p.g.Dot, theme.Faint)
		p.curve(p.f.Scaling, scaling, theme.Text)
	}
	for _, k := range p.f.Kept {
		p.mark(k.Design, []rune(k.Letter + "?")[0], theme.Title)
	}
	p.mark(p.f.Design, p.g.Selected, theme.Hold)
	if point, ok := p.f.Point(); ok {
		p.cursor(point)
	}
}

func firstRune(s string) (rune, bool) {
	for _, r := range s {
		return r, true
	}
	return ' ', false
}

func (p *tradePlot) ticks() {
	for y := range p.h {
		p.c.Set(p.x-1, p.y+y, p.g.Vertical, theme.Faint)
	}
	bottom := p.y + p.h
	p.c.Repeat(p.x-1, bottom, p.w+1, p.g.Rule, theme.Faint)
	for _, v := range p.ay.ticks(2) {
		f, _ := p.ay.cell(v)
		p.c.Right(p.x-2, bottom-1-int(math.Round(f)), tick(v), theme.Faint)
	}
	const unit = "settle, s"
	p.c.Right(p.x+p.w, bottom+1, unit, theme.Title)
	for _, v := range p.ax.ticks(8) {
		f, _ := p.ax.cell(v)
		label := tick(v)
		if at := p.x + int(math.Round(f)) - len(label)/2; at >= p.x-1 && at+len(label) < p.x+p.w-len(unit)-1 {
			p.c.Text(at, bottom+1, label, theme.Faint)
		}
	}
}

func (p *tradePlot) limits() {
	if v := p.f.Over; v != nil {
		if f, ok := p.ay.cell(*v); ok {
			y := p.y + p.h - 1 - int(math.Round(f))
			p.c.Repeat(p.x, y, p.w, p.g.Limit, theme.Faint)
			p.c.Right(p.x+p.w, y, " "+p.g.AtMost+" "+tick(*v), theme.Faint)
		}
	}
	if v := p.f.Settle; v != nil {
		if f, ok := p.ax.cell(*v); ok {
			x := p.x + int(math.Round(f))
			for y := range p.h {
				p.c.Set(x, p.y+y, p.g.Vertical, theme.Faint)
			}
			p.c.Right(x, p.y, p.g.AtMost+" "+tick(*v)+" s", theme.Faint)
		}
	}
}

// curve draws straight steps between neighbouring points that have a place.
func (p *tradePlot) curve(list []sweep.Point, glyph rune, ink theme.Ink) {
	var fx, fy float64
	before := false
	for _, q := range list {
		if !shows(q) {
			before = false
			continue
		}
		gx, _ := p.ax.cell(q.Settle())
		gy, _ := p.ay.cell(q.OverFloor())
		n := 1
		if before {
			n = min(max(int(math.Ceil(max(math.Abs(gx-fx), math.Abs(gy-fy)))), 1), 2000)
		} else {
			fx, fy = gx, gy
		}
		for i := 1; i <= n; i++ {
			k := float64(i) / float64(n)
			x := p.x + int(math.Round(fx+(gx-fx)*k))
			y := p.y + p.h - 1 - int(math.Round(fy+(gy-fy)*k))
			if p.inside(x, y) {
				p.c.Set(x, y, glyph, ink)
			}
		}
		fx, fy, before = gx, gy, true
	}
}

func (p *tradePlot) mark(d *estimator.Design, glyph rune, ink theme.Ink) {
	if d == nil || d.Noise.Std == nil {
		return
	}
	if x, y, ok := p.cell(d.Transient.Settle, d.Noise.OverFloorRMS); ok {
		p.c.Set(x, y, glyph, ink)
	}
}

// cursor marks a point where it is, unless something stands there, and on both
// axes. One that is out of sight is marked at the edge.
func (p *tradePlot) cursor(point sweep.Point) {
	x, y, ok := p.cell(point.Settle(), point.OverFloor())
	mark := p.g.Cross
	if !ok {
		fx, _ := p.ax.cell(point.Settle())
		fy, _ := p.ay.cell(point.OverFloor())
		switch {
		case fx < 0:
			mark = p.g.Left
		case fx > float64(p.w-1):
			mark = p.g.Right
		default:
			mark = p.g.Up
		}
		x = p.x + int(math.Round(min(max(fx, 0), float64(p.w-1))))
		y = p.y + p.h - 1 - int(math.Round(min(max(fy, 0), float64(p.h-1))))
	}
	if r := p.c.At(x, y); r != p.g.Selected && (r < 'A' || r > 'Z') {
		p.c.Set(x, y, mark, theme.Hold)
	}
	p.c.Set(p.x-1, y, p.g.Right, theme.Hold)
	p.c.Set(x, p.y+p.h, p.g.Up, theme.Hold)
}

// words spell the point under the cursor out.
func (p *tradePlot) words(w, h int) {
	point, ok := p.f.Point()
	if !ok {
		text := "no point of this curve has a place here"
		if p.f.Running {
			text = "this curve is on its way"
		}
		p.c.Text(0, h-2, text, theme.Faint)
		return
	}
	what := "all speeds x "
	if p.f.Curve == Floors {
		what = "best for process noise x "
	}
	x := p.c.Text(0, h-2, fmt.Sprintf("%s%-7s", what, tick(point.Factor)), theme.Hold) + 2
	x = p.c.Text(x, h-2, "settles in", theme.Faint) + 1
	x = p.c.Text(x, h-2, fmt.Sprintf("%6s", readings.Figure(point.Settle(), p.ax.low*3, p.g)), theme.Text) + 1
	x = p.c.Text(x, h-2, "s", theme.Faint) + 3
	x = p.c.Text(x, h-2, "noise", theme.Faint) + 1
	x = p.c.Text(x, h-2, fmt.Sprintf("%5s", readings.Fixed(point.OverFloor(), 2, p.g)), theme.Text) + 1
	x = p.c.Text(x, h-2, "x floor", theme.Faint) + 3
	if w-x >= 14 {
		x = p.c.Text(x, h-2, "peak", theme.Faint) + 1
		x = p.c.Text(x, h-2, readings.Fixed(point.Design.Transient.Peak, 2, p.g), theme.Text) + 1
		p.c.Text(x, h-2, "x", theme.Faint)
	}
	x = 0
	if d := p.f.Design; d != nil && d.Noise.Std != nil {
		said := "against the design in hand: " + compared(point.Settle(), d.Transient.Settle, "slower", "faster", "as fast") + ", " +
			compared(point.OverFloor(), d.Noise.OverFloorRMS, "noisier", "quieter", "as quiet")
		x = p.c.Text(0, h-1, canvas.Cut(said, w, p.g.Ellipsis), theme.Faint) + 3
	}
	if broken := p.broken(point); broken != "" {
		p.c.Text(x, h-1, canvas.Cut(broken, w-x, p.g.Ellipsis), theme.Trouble)
	}
}

// compared says by how much a is more or less than b.
func compared(a, b float64, more, less, even string) string {
	change := (a/b - 1) * 100
	switch {
	case math.IsNaN(change) || math.IsInf(change, 0):
		return "not to be compared"
	case math.Abs(change) < 0.5:
		return even
	case change > 300:
		return fmt.Sprintf("%.3g times %s", a/b, more)
	case change < 0:
		more = less
	}
	return fmt.Sprintf("%.0f %% %s", math.Abs(change), more)
}

// broken names the limits of the plot that a point does not keep.
func (p *tradePlot) broken(point sweep.Point) string {
	var names []string
	if v := p.f.Settle; v != nil && !(point.Settle() <= *v*(1+1e-9)) {
		names = append(names, "settle")
	}
	if v := p.f.Over; v != nil && !(point.OverFloor() <= *v*(1+1e-9)) {
		names = append(names, "noise")
	}
	if names == nil {
		return ""
	}
	return strings.Join(names, " and ") + " over the limit"
}
