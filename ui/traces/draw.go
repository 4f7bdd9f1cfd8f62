package traces

import (
	"math"
	"strconv"
	"strings"
	"unicode/utf8"

	"github.com/guptarohit/asciigraph"

	"polewright/ui/canvas"
	"polewright/ui/theme"
)

// Panel is one plot.
type Panel struct {
	Title, Unit string
	Curves      [][]float64
	Mode        Mode
	Axis        Axis
	End         float64 // s, time at the right end
	Band        float64 // two standard deviations, predicted; NaN or 0 for none
	Around      bool    // show the band around the estimate too
	Events      []Event
	Cursor      *float64 // s; nil for none
	Note        string   // trouble: the run diverged
	Late        bool     // older than asked for
	Run         []string // what the run is, from long to short; empty for one that needs no words
	Beside      string   // what the estimate is drawn beside; empty is the truth
}

const gutter = 9 // labels of the value axis, in cells

// Draw draws the panel into w by h cells at (x, y): a title, the plot, the time.
func Draw(c *canvas.Canvas, x, y, w, h int, p Panel, t *theme.Theme) {
	g := &t.Glyphs
	heading(c, x, y, w, p, g)
	rows, width := h-2, w-gutter-1
	if rows < 2 || width < 8 {
		return
	}
	top := y + 1
	axisLabels(c, x, top, rows, p.Axis)
	if p.Curves == nil {
		c.Text(x+gutter+2, top+rows/2, "nothing yet", theme.Faint)
	} else {
		plot(c, x+gutter, top, width, rows, p, g)
		band(c, x+gutter, top, width, rows, p, t)
		cursor(c, x+gutter, top, width, rows, p, g)
	}
	bottom := top + rows
	c.Text(x+gutter+1, bottom, "0", theme.Faint)
	c.Right(x+w, bottom, number(p.End)+" s", theme.Faint)
	if width > 40 {
		mid := number(p.End / 2)
		c.Text(x+gutter+1+width/2-len(mid)/2, bottom, mid, theme.Faint)
	}
	events(c, x+gutter+1, bottom, width, p, g)
	said(c, x, w, y, bottom, p)
}

// said writes what the run is, in the longest words that find room at the end of
// the title or behind the zero of the time axis.
func said(c *canvas.Canvas, x, w, title, bottom int, p Panel) {
	free := func(from, to, y int) bool {
		for ; from < to; from++ {
			if c.At(from, y) != ' ' {
				return false
			}
		}
		return true
	}
	for _, text := range p.Run {
		n := canvas.TextWidth(text)
		from := x + gutter + 4
		switch {
		case n+2 <= w && free(x+w-n-2, x+w, title):
			c.Right(x+w, title, text, theme.Faint)
		case from+n+2 <= x+w && free(from-1, from+n+2, bottom):
			c.Text(from, bottom, text, theme.Faint)
		default:
			continue
		}
		return
	}
}

func heading(c *canvas.Canvas, x, y, w int, p Panel, g *theme.Glyphs) {
	title := p.Title
	if p.Unit != "" {
		title += ", " + p.Unit
	}
	at := c.Text(x, y, canvas.Cut(title, w/2, g.Ellipsis), theme.Title) + 2
	ink := theme.Text
	if p.Late {
		ink = theme.Faint
	}
	switch {
	case p.Note != "":
		c.Text(at, y, canvas.Cut(p.Note, x+w-at, g.Ellipsis), theme.Trouble)
	case p.Cursor != nil && p.Curves != nil:
		values(c, at, y, x+w-at, p, ink, g)
	case p.Mode == Both:
		beside := "truth"
		if p.Beside != "" {
			beside = p.Beside
		}
		at = c.Text(at, y, g.Truth.Sample+" "+beside, theme.Faint) + 2
		if x+w-at >= 12 {
			at = c.Text(at, y, g.Estimate.Sample+" estimate", ink) + 2
		}
		if text := g.PlusMinus + "2 " + g.Sigma + " " + number(p.Band); p.Around && p.Band > 0 && x+w-at >= canvas.TextWidth(text) {
			c.Text(at, y, text, theme.Faint)
		}
	case p.Mode == Error:
		at = c.Text(at, y, g.Estimate.Sample+" error", ink) + 2
		if p.Band > 0 && x+w-at >= 14 {
			c.Text(at, y, strings.Repeat(string(g.Band), 3)+" 2 "+g.Sigma+" due", theme.Faint)
		}
	default:
		at = c.Text(at, y, g.Estimate.Sample+" innovation", ink) + 2
		if text := strings.Repeat(string(g.Band), 3) + " 2 " + g.Sigma + " due"; p.Band > 0 && x+w-at >= canvas.TextWidth(text) {
			c.Text(at, y, text, theme.Faint)
		}
	}
}

// values writes what the curves are at the time cursor.
func values(c *canvas.Canvas, x, y, room int, p Panel, ink theme.Ink, g *theme.Glyphs) {
	end := x + room
	put := func(text string, ink theme.Ink) {
		if x+canvas.TextWidth(text) <= end {
			x = c.Text(x, y, text, ink) + 2
		}
	}
	put(strconv.FormatFloat(*p.Cursor, 'f', max(3-int(math.Floor(math.Log10(max(p.End, 1e-9)))), 0), 64)+" s", theme.Hold)
	d := (p.Axis.High - p.Axis.Low) / 1000
	for i, series := range p.Curves {
		v := At(series, *p.Cursor, p.End)
		sample, in := g.Estimate.Sample, ink
		if i < len(p.Curves)-1 {
			sample, in = g.Truth.Sample, theme.Faint
		}
		text := g.Undefined
		if !math.IsNaN(v) {
			text = value(v, d)
		}
		put(sample+" "+text, in)
	}
}

func axisLabels(c *canvas.Canvas, x, top, rows int, a Axis) {
	marks := []int{0, rows - 1}
	if rows >= 9 && rows%2 == 1 {
		marks = append(marks, rows/2)
	}
	d := (a.High - a.Low) / 4
	for _, row := range marks {
		v := a.High - (a.High-a.Low)*float64(row)/float64(rows-1)
		c.Right(x+gutter-1, top+row, value(v, d), theme.Faint)
	}
}

// value prints v with the decimals that a step of d needs.
func value(v, d float64) string {
	decimals := 0
	if d > 0 {
		decimals = max(1-int(math.Floor(math.Log10(d)+1e-9)), 0)
	}
	if math.Abs(v) < d*1e-6 {
		v = 0
	}
	s := strconv.FormatFloat(v, 'f', min(decimals, 9), 64)
	if len(s) > gutter-1 || decimals > 6 {
		s = strconv.FormatFloat(v, 'e', 1, 64)
	}
	return s
}

func number(v float64) string { return strconv.FormatFloat(v, 'g', 4, 64) }

// plot draws the curves over their axis line. Where truth and estimate share a
// cell, every second column shows the estimate, so that both are seen.
func plot(c *canvas.Canvas, x, top, width, rows int, p Panel, g *theme.Glyphs) {
	for r := range rows {
		c.Set(x, top+r, g.Vertical, theme.Faint)
	}
	if p.Mode != Both {
		level := func(v float64, glyph rune) {
			r := rows - 1 - int(math.Round((v-p.Axis.Low)/(p.Axis.High-p.Axis.Low)*float64(rows-1)))
			if r >= 0 && r < rows {
				c.Repeat(x+1, top+r, width, glyph, theme.Faint)
			}
		}
		level(0, g.Rule)
		if p.Band > 0 {
			level(p.Band, g.Band)
			level(-p.Band, g.Band)
		}
	}
	ink := theme.Text
	if p.Late {
		ink = theme.Faint
	}
	last := len(p.Curves) - 1
	for i, series := range p.Curves {
		glyphs, in := &g.Estimate, ink
		if i < last {
			glyphs, in = &g.Truth, theme.Faint
		}
		for r, line := range curve(column(series, width, rows, p.Axis, p.Mode != Both), rows, glyphs) {
			col := 0
			for _, ch := range line {
				if ch != ' ' {
					at, row := x+1+col, top+r
					if under := c.At(at, row); i == last && p.Mode == Both && under != ' ' && col%2 == 1 {
						ch = under // shared: both show, in one ink
					}
					c.Set(at, row, ch, in)
				}
				col++
			}
		}
	}
}

// curve lets asciigraph draw one series whose values are rows above the bottom
// and returns its rows without their axis.
func curve(series []float64, rows int, g *theme.Line) []string {
	text := asciigraph.Plot(series,
		asciigraph.Offset(1), asciigraph.Height(rows-1),
		asciigraph.LowerBound(0), asciigraph.UpperBound(float64(rows-1)),
		asciigraph.SeriesChars(asciigraph.CharSet{
			Horizontal: g.Horizontal, VerticalLine: g.Vertical,
			ArcDownRight: g.DownRight, ArcDownLeft: g.DownLeft, ArcUpRight: g.UpRight, ArcUpLeft: g.UpLeft,
			StartCap: g.Start, EndCap: g.End,
		}))
	lines := strings.Split(text, "\n")
	for i, l := range lines {
		_, axis := utf8.DecodeRuneInString(l)
		lines[i] = l[axis:]
	}
	return lines
}
