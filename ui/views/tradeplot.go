package views

import (
	"math"
	"strings"

	"polewright/estimator"
	"polewright/estimator/sweep"
	"polewright/ui/canvas"
	"polewright/ui/theme"
)

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
	scaling := []rune(p.g.Estimate.Horizontal)[0]
	if p.f.Curve == Floors {
		p.curve(p.f.Scaling, scaling, theme.Faint)
		p.curve(p.f.Family, p.g.Dot, theme.Text)
	} else {
		p.curve(p.f.Family, p.g.Dot, theme.Faint)
		p.curve(p.f.Scaling, scaling, theme.Text)
	}
	p.limitNames()
	p.mark(p.f.Design, p.g.Selected, theme.Hold)
	for _, k := range p.f.Kept {
		p.mark(k.Design, []rune(k.Letter + "?")[0], theme.Title)
	}
	if point, ok := p.f.Point(); ok {
		p.cursor(point)
	}
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

// limits draws the limits as lines; limitNames names them where the curves have
// been drawn.
func (p *tradePlot) limits() {
	if y, ok := p.limitRow(); ok {
		p.c.Repeat(p.x, y, p.w, p.g.Limit, theme.Faint)
	}
	if x, ok := p.limitColumn(); ok {
		for y := range p.h {
			p.c.Set(x, p.y+y, p.g.Vertical, theme.Faint)
		}
	}
}

func (p *tradePlot) limitNames() {
	if y, ok := p.limitRow(); ok {
		p.c.Right(p.x+p.w, y, " "+p.g.AtMost+" "+tick(*p.f.Over), theme.Faint)
	}
	if x, ok := p.limitColumn(); ok {
		p.c.Right(x, p.y, p.g.AtMost+" "+tick(*p.f.Settle)+" s", theme.Faint)
	}
}

func (p *tradePlot) limitRow() (y int, ok bool) {
	if p.f.Over == nil {
		return 0, false
	}
	f, ok := p.ay.cell(*p.f.Over)
	return p.y + p.h - 1 - int(math.Round(f)), ok
}

func (p *tradePlot) limitColumn() (x int, ok bool) {
	if p.f.Settle == nil {
		return 0, false
	}
	f, ok := p.ax.cell(*p.f.Settle)
	return p.x + int(math.Round(f)), ok
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
	x, y, ok := p.cell(d.Transient.Settle, d.Noise.OverFloorRMS)
	if !ok {
		return
	}
	for p.marked(x, y) && x < p.x+p.w-1 { // beside what stands there
		x++
	}
	p.c.Set(x, y, glyph, ink)
}

// marked tells whether a cell has the design in hand or a candidate.
func (p *tradePlot) marked(x, y int) bool {
	r := p.c.At(x, y)
	return r == p.g.Selected || r >= 'A' && r <= 'Z'
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
	if !p.marked(x, y) {
		p.c.Set(x, y, mark, theme.Hold)
	}
	p.c.Set(p.x-1, y, p.g.Right, theme.Hold)
	p.c.Set(x, p.y+p.h, p.g.Up, theme.Hold)
}
