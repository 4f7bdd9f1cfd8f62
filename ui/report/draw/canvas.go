// Package draw writes small SVG figures: axes, curves, marks that differ in shape,
// texts. It is deterministic to the byte and needs no fonts: texts are placed by
// anchors, so that whatever face a reader has fits.
//
// gonum.org/v1/plot would draw as well, but carries its faces with it: the program
// would grow from 10 to 18 MB.
package draw

import (
	"html"
	"math"
	"strconv"
	"strings"
)

// Ink is a colour of the figures. Nothing is told by ink alone.
type Ink string

// The inks: dark for what counts, Accent for the design, two greys for the rest.
const (
	Dark   Ink = "#1b1b1b"
	Accent Ink = "#1f4e79"
	Grey   Ink = "#6b6b6b"
	Faint  Ink = "#c9c9c9"
	None   Ink = "none"
)

// Pen draws lines. The zero value is a dark line of width 1.
type Pen struct {
	Ink   Ink
	Width float64
	Dash  string // lengths of dashes and gaps, empty for none
}

// Canvas takes the elements of one figure, in points, y downwards.
type Canvas struct {
	w, h float64
	b    strings.Builder
}

// shown is how much larger than in its own units a figure is shown.
const shown = 1.3

// New starts a figure of that size.
func New(w, h float64) *Canvas { return &Canvas{w: w, h: h} }

// SVG is the whole element. title is what is read out in its place.
func (c *Canvas) SVG(title string) string {
	return `<svg xmlns="http://www.w3.org/2000/svg" viewBox="0 0 ` + num(c.w) + ` ` + num(c.h) +
		`" width="` + num(shown*c.w) + `" height="` + num(shown*c.h) +
		`" role="img" aria-label="` + Escape(title) + `" font-family="Helvetica, Arial, sans-serif" font-size="9">` + "\n" + c.b.String() + "</svg>"
}

// Escape makes a text of any origin harmless in elements and attributes of SVG and
// HTML. Characters that XML forbids, and those that turn the writing direction, are
// written out as their codes.
func Escape(s string) string { return html.EscapeString(Visible(s)) }

// num prints a coordinate to a hundredth.
func num(v float64) string {
	if math.IsNaN(v) || math.IsInf(v, 0) {
		return "0"
	}
	return strconv.FormatFloat(math.Round(v*100)/100+0, 'f', -1, 64)
}

func (c *Canvas) put(parts ...string) {
	for _, p := range parts {
		c.b.WriteString(p)
	}
	c.b.WriteByte('\n')
}

func (p Pen) attributes() string {
	ink, width := p.Ink, p.Width
	if ink == "" {
		ink = Dark
	}
	if width == 0 {
		width = 1
	}
	s := `fill="none" stroke="` + string(ink) + `" stroke-width="` + num(width) + `"`
	if p.Dash != "" {
		s += ` stroke-dasharray="` + p.Dash + `"`
	}
	return s
}

// Line draws from a to b.
func (c *Canvas) Line(x1, y1, x2, y2 float64, p Pen) {
	c.put(`<line x1="`, num(x1), `" y1="`, num(y1), `" x2="`, num(x2), `" y2="`, num(y2), `" `, p.attributes(), `/>`)
}

// Circle draws a circle, clipped by nothing.
func (c *Canvas) Circle(x, y, r float64, p Pen) {
	c.put(`<circle cx="`, num(x), `" cy="`, num(y), `" r="`, num(r), `" `, p.attributes(), `/>`)
}

// Curve draws through points; a NaN parts it.
func (c *Canvas) Curve(x, y []float64, p Pen) {
	var d strings.Builder
	pen, any := false, false
	for i := range x {
		if math.IsNaN(x[i]) || math.IsNaN(y[i]) {
			pen = false
			continue
		}
		if pen {
			d.WriteByte('L')
		} else {
			d.WriteByte('M')
		}
		d.WriteString(num(x[i]) + " " + num(y[i]))
		pen, any = true, true
	}
	if any {
		c.put(`<path d="`, d.String(), `" `, p.attributes(), ` stroke-linejoin="round"/>`)
	}
}

// Band fills between two curves over the same x.
func (c *Canvas) Band(x, low, high []float64, ink Ink) {
	if len(x) == 0 {
		return
	}
	var d strings.Builder
	for i := range x {
		d.WriteString(num(x[i]) + "," + num(high[i]) + " ")
	}
	for i := len(x) - 1; i >= 0; i-- {
		d.WriteString(num(x[i]) + "," + num(low[i]) + " ")
	}
	c.put(`<polygon points="`, strings.TrimSpace(d.String()), `" fill="`, string(ink), `" fill-opacity="0.35" stroke="none"/>`)
}

// Anchor says which end of a text stands at its place.
type Anchor string

// The anchors of a text.
const (
	Start  Anchor = "start"
	Middle Anchor = "middle"
	End    Anchor = "end"
)

// Text writes at a place, on the baseline.
func (c *Canvas) Text(x, y float64, a Anchor, ink Ink, s string) {
	c.put(`<text x="`, num(x), `" y="`, num(y), `" text-anchor="`, string(a), `" fill="`, string(ink), `">`, Escape(s), `</text>`)
}

// Upright writes along a vertical axis, upwards.
func (c *Canvas) Upright(x, y float64, ink Ink, s string) {
	c.put(`<text transform="translate(`, num(x), ` `, num(y), `) rotate(-90)" text-anchor="middle" fill="`, string(ink), `">`, Escape(s), `</text>`)
}

// Shape is that of a mark.
type Shape uint8

// The shapes, as on the screen: reached poles are filled circles, wanted ones open.
const (
	Disc Shape = iota
	Ring
	Square
	Saltire
	Triangle
	Diamond
)

// Mark draws one mark.
func (c *Canvas) Mark(x, y float64, s Shape, ink Ink) {
	const r = 3.5
	line := `" fill="none" stroke="` + string(ink) + `" stroke-width="1.2"/>`
	full := `" fill="` + string(ink) + `" stroke="none"/>`
	at := func(dx, dy float64) string { return num(x+dx) + " " + num(y+dy) }
	switch s {
	case Disc:
		c.put(`<circle cx="`, num(x), `" cy="`, num(y), `" r="2.4`, full)
	case Ring:
		c.put(`<circle cx="`, num(x), `" cy="`, num(y), `" r="4.6`, line)
	case Square:
		c.put(`<path d="M`, at(-r, -r), "L", at(r, -r), "L", at(r, r), "L", at(-r, r), "Z", full)
	case Saltire:
		c.put(`<path d="M`, at(-r, -r), "L", at(r, r), "M", at(-r, r), "L", at(r, -r), line)
	case Triangle:
		c.put(`<path d="M`, at(0, -r-0.5), "L", at(r, r-0.5), "L", at(-r, r-0.5), "Z", line)
	case Diamond:
		c.put(`<path d="M`, at(0, -r-1), "L", at(r+1, 0), "L", at(0, r+1), "L", at(-r-1, 0), "Z", line)
	}
}
