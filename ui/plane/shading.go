package plane

import (
	"math"
	"strconv"
	"unicode"

	"polewright/ui/canvas"
	"polewright/ui/theme"
)

// Tone is how a cell is shaded.
type Tone struct {
	Level   uint8 // shade of the theme, 0 for none
	Hatched bool  // something breaks there
}

// levels are the noises over the floor up to which each shade but the deepest goes.
var levels = [theme.Shades - 1]float64{1.1, 1.5, 2, 3}

// Level is the shade of a noise over the floor; NaN, where there is none, has the
// deepest.
func Level(overFloor float64) uint8 {
	for i, top := range levels {
		if overFloor <= top {
			return uint8(i)
		}
	}
	return theme.Shades - 1
}

// Levels are the noises over the floor where one shade ends and the next begins.
func Levels() []float64 { return levels[:] }

// Lattice returns the places where moves by whole cells bring the held pole: one
// for every cell of the rows from the top to the real axis, in the plane shown. In
// the row of the axis a pair has the imaginary part 0, where a step from above
// stops, unless it can stand in that row just above.
// For a real pole only the row of the axis is returned.
func (w Window) Lattice(held complex128, pair bool) (cells []complex128, width, height int) {
	x := offset(real(held)-w.X0, w.DX)
	top := w.H / 2
	if !pair {
		top = 0
	}
	y := offset(imag(held)+w.DY/2, w.DY) - w.DY/2
	for row := top; row >= 0; row-- {
		im := float64(row)*w.DY + y
		if !pair {
			im = imag(held)
		}
		if pair && im <= 1e-9*w.DY {
			im = 0
		}
		for col := range w.W {
			cells = append(cells, complex(w.X0+float64(col)*w.DX+x, im))
		}
	}
	return cells, w.W, top + 1
}

// offset is v less the multiples of d below it.
func offset(v, d float64) float64 { return v - math.Floor(v/d+edge)*d }

// Shade lays tones under what is drawn: row by row those of the upper half and of
// the axis, mirrored below, or of the axis alone, which then get the rows beside
// it. Where shades are no colours it draws their marks on what is left blank, with
// some room around letters and digits. A nil tone is none.
func Shade(c *canvas.Canvas, x, y int, w Window, tones []Tone, t *theme.Theme) {
	rows := len(tones) / max(w.W, 1)
	if rows == 0 {
		return
	}
	mid := w.H / 2
	for row := range w.H {
		from := min(row, 2*mid-row)
		if rows == 1 { // a real pole
			if row < mid-1 || row > mid+1 {
				continue
			}
			from = 0
		}
		if from < 0 || from >= rows {
			continue
		}
		shadeRow(c, x, y+row, tones[from*w.W:(from+1)*w.W], t)
	}
}

func shadeRow(c *canvas.Canvas, x, y int, tones []Tone, t *theme.Theme) {
	said := func(r rune) bool { return unicode.IsLetter(r) || unicode.IsDigit(r) }
	before := c.At(x-1, y)
	for col, tone := range tones {
		r := c.At(x+col, y)
		if t.Backed {
			c.Shade(x+col, y, tone.Level)
		}
		if r == ' ' && !said(before) && !said(c.At(x+col+1, y)) {
			switch {
			case tone.Hatched && (col+y)%hatching == 0:
				c.Set(x+col, y, t.Glyphs.Hatch, theme.Grid)
			case !t.Backed:
				c.Set(x+col, y, t.Glyphs.Grain[min(tone.Level, theme.Shades-1)][y%2][col%4], theme.Grid)
			}
		}
		before = r
	}
}

// hatching is how many cells apart the strokes are.
const hatching = 6

// Legend explains the shades in one line that ends before column right, within
// room cells; where that is too little it draws nothing.
func Legend(c *canvas.Canvas, right, y, room int, t *theme.Theme) {
	g := &t.Glyphs
	type part struct {
		text  string
		level uint8
		glyph [4]rune
	}
	var parts []part
	n := 0
	wide := 4
	if t.Backed {
		wide = 2
	}
	add := func(text string, level uint8, glyph [4]rune) {
		parts = append(parts, part{text, level, glyph})
		n += wide + 1 + canvas.TextWidth(text) + 2
	}
	for i, top := range levels {
		add(g.AtMost+number(top), uint8(i), g.Grain[i][0])
	}
	add("more", theme.Shades-1, g.Grain[theme.Shades-1][0])
	add("limit", 0, [4]rune{g.Hatch, g.Hatch, g.Hatch, g.Hatch})
	title := "noise x floor "
	n += len(title) - 2
	if n > room {
		n -= len(title)
		title = ""
	}
	if n > room {
		return
	}
	x := c.Text(right-n, y, title, theme.Faint)
	for i, p := range parts {
		for k := range wide {
			c.Set(x+k, y, ' ', theme.Text)
			if t.Backed {
				c.Shade(x+k, y, p.level)
			}
			if !t.Backed || i == len(parts)-1 {
				c.Set(x+k, y, p.glyph[k], theme.Grid)
			}
		}
		x = c.Text(x+wide+1, y, p.text, theme.Faint) + 2
	}
}

func number(v float64) string { return strconv.FormatFloat(v, 'g', -1, 64) }
