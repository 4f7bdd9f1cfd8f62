// Package views draws what opens on top of the screen: help, all readings, the
// candidates side by side, the trade-off, sensors and modes, the worst case, a real
// log.
package views

import (
	"polewright/ui/canvas"
	"polewright/ui/theme"
)

// span is a text at a column, or one that ends before it.
type span struct {
	x     int
	text  string
	ink   theme.Ink
	right bool
	shade uint8 // behind it
}

// page collects rows; it becomes lines of text at the end.
type page struct {
	w     int
	rows  [][]span
	plots []plot
}

// plot draws itself from row y on.
type plot struct {
	y    int
	draw func(c *canvas.Canvas, y int)
}

func (p *page) row(spans ...span) { p.rows = append(p.rows, spans) }
func (p *page) blank()            { p.rows = append(p.rows, nil) }

// title starts a part, with a blank row before all but the first.
func (p *page) title(text string) {
	if len(p.rows) > 0 {
		p.blank()
	}
	p.row(span{text: text, ink: theme.Title})
}

// prose writes a wrapped text from column x on.
func (p *page) prose(x int, text string, ink theme.Ink) {
	for _, l := range canvas.Wrap(text, p.w-x) {
		p.row(span{x: x, text: l, ink: ink})
	}
}

// plot leaves so many rows to a drawing.
func (p *page) plot(rows int, draw func(c *canvas.Canvas, y int)) {
	p.plots = append(p.plots, plot{len(p.rows), draw})
	p.rows = append(p.rows, make([][]span, rows)...)
}

func (p *page) lines(t *theme.Theme) []string {
	var c canvas.Canvas
	c.Reset(p.w, len(p.rows))
	for y, row := range p.rows {
		for _, s := range row {
			if s.right {
				c.Right(s.x, y, s.text, s.ink)
			} else {
				for x, end := s.x, c.Text(s.x, y, s.text, s.ink); x < end && s.shade > 0; x++ {
					c.Shade(x, y, s.shade)
				}
			}
		}
	}
	for _, d := range p.plots {
		d.draw(&c, d.y)
	}
	return c.Lines(t, true)
}
