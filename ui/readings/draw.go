package readings

import (
	"fmt"

	"polewright/ui/canvas"
	"polewright/ui/theme"
)

// Draw draws the readings into w by h cells at (x, y). Where they do not fit,
// first the blank lines go, then what stands last; the bottom line says so.
func Draw(c *canvas.Canvas, x, y, w, h int, f Facts, t *theme.Theme) {
	g := &t.Glyphs
	sections := Sections(f, g)
	rows := 0
	for _, s := range sections {
		rows += 1 + len(s.Rows)
	}
	gap := 0
	if rows+len(sections)-1 <= h {
		gap = 1
	}
	at, end := y, y+h
	if rows > h {
		end--
	}
	hidden := false
	for k, s := range sections {
		if at >= end || at == end-1 && len(s.Rows) > 0 {
			hidden = true
			break
		}
		title(c, x, at, w, s, f.Late, g)
		at++
		for _, r := range s.Rows {
			if at >= end {
				hidden = true
				break
			}
			Draw1(c, x, at, w, r, rowInk(s, f.Late, k == 0 && r.Label == string(byte(f.Plane))), s.Figures && f.Late, g)
			at++
		}
		at += gap
	}
	if hidden {
		text, ink := "r shows the rest", theme.Faint
		if f.Design != nil && len(f.Design.Warnings) > 0 {
			n := len(f.Design.Warnings)
			text, ink = fmt.Sprintf("%d warning%s, r shows the rest", n, plural(n)), theme.Trouble
		}
		c.Right(x+w, y+h-1, text, ink)
	}
}

func rowInk(s Section, late, hold bool) theme.Ink {
	switch {
	case s.Figures && late:
		return theme.Faint
	case hold:
		return theme.Hold
	}
	return theme.Text
}

func title(c *canvas.Canvas, x, y, w int, s Section, late bool, g *theme.Glyphs) {
	end := c.Text(x, y, s.Title, theme.Title)
	if s.Note == "" {
		return
	}
	ink := theme.Faint
	if s.Title == "limits" && s.Note != "all met" && !late || s.Note == "unstable" || s.Note == "undefined: unstable" {
		ink = theme.Trouble
	}
	note := canvas.Cut(s.Note, w-(end-x)-1, g.Ellipsis)
	c.Right(x+w, y, note, ink)
}

// Draw1 draws one row in w cells: label, value before its unit, and at the right
// edge the tail.
func Draw1(c *canvas.Canvas, x, y, w int, r Row, ink theme.Ink, late bool, g *theme.Glyphs) {
	valueEnd := w - 11
	label := theme.Faint
	if ink == theme.Text && r.Value == "" {
		label = theme.Text
	}
	tail := r.Ink
	if late {
		tail = theme.Faint
	}
	unitEnd := w
	if r.Tail != "" {
		unitEnd = w - canvas.TextWidth(r.Tail) - 1
		c.Right(x+w, y, r.Tail, tail)
	}
	labelEnd := valueEnd - canvas.TextWidth(r.Value) - 1
	if r.Value == "" {
		labelEnd = unitEnd
	}
	c.Text(x, y, canvas.Cut(r.Label, labelEnd, g.Ellipsis), label)
	c.Right(x+valueEnd, y, r.Value, ink)
	if canvas.TextWidth(r.Unit) <= unitEnd-valueEnd-1 {
		c.Text(x+valueEnd+1, y, r.Unit, theme.Faint)
	}
}
