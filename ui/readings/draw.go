package readings

import (
	"fmt"

	"polewright/ui/canvas"
	"polewright/ui/theme"
)

// Draw draws the readings into w by h cells at (x, y). Where they do not fit,
// first the blank lines go, then what stands last; the last row says so.
func Draw(c *canvas.Canvas, x, y, w, h int, f Facts, t *theme.Theme) {
	g := &t.Glyphs
	sections := Sections(f, g)
	rows := 1 // the last one is kept for what is not in sight
	for _, s := range sections {
		rows += 1 + len(s.Rows)
	}
	gap := 0
	if rows+len(sections) <= h {
		gap = 1
	}
	at, end := y, y+h-1
	hidden, unseen := false, false // unseen: limits
	for k, s := range sections {
		if at >= end-1 {
			hidden = true
			unseen = unseen || s.Title == limitsTitle
			continue
		}
		title(c, x, at, w, s, f.Late, g)
		at++
		for _, r := range s.Rows {
			if at >= end {
				hidden, unseen = true, unseen || s.Title == limitsTitle
				break
			}
			drawRow(c, x, at, w, r, rowInk(s, f.Late, k == 0 && r.Label == string(byte(f.Plane))), s.Figures && f.Late, g)
			at++
		}
		at += gap
	}
	more(c, x+w, y+h-1, f, hidden, unseen)
}

// more says on the last row what the view of all readings has.
func more(c *canvas.Canvas, right, y int, f Facts, hidden, unseenLimits bool) {
	if f.Design == nil {
		return
	}
	broken := 0
	for _, l := range f.Limits {
		if !l.Met {
			broken++
		}
	}
	switch n := len(f.Design.Warnings); {
	case unseenLimits && broken > 0:
		c.Right(right, y, fmt.Sprintf("r shows %d of %d limits broken", broken, len(f.Limits)), theme.Trouble)
	case n > 0:
		c.Right(right, y, fmt.Sprintf("%d warning%s, r shows all", n, plural(n)), theme.Trouble)
	case hidden:
		c.Right(right, y, "r shows the rest", theme.Faint)
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
	if s.Title == limitsTitle && s.Note != "all met" && !late || s.Note == "unstable" || s.Note == "undefined: unstable" {
		ink = theme.Trouble
	}
	note := canvas.Cut(s.Note, w-(end-x)-1, g.Ellipsis)
	c.Right(x+w, y, note, ink)
}

// drawRow draws one row in w cells: label, value before its unit, and at the right
// edge the tail.
func drawRow(c *canvas.Canvas, x, y, w int, r Row, ink theme.Ink, late bool, g *theme.Glyphs) {
	valueEnd := w - 11 - max(min(w-34, 8), 0)
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
	text := r.Label
	unitFits := canvas.TextWidth(r.Unit) <= unitEnd-valueEnd-1
	if r.Named != "" && !unitFits && canvas.TextWidth(r.Named) <= labelEnd {
		text = r.Named
	}
	if r.Short != "" && canvas.TextWidth(text) > labelEnd {
		text = r.Short
	}
	c.Text(x, y, canvas.Cut(text, labelEnd, g.Ellipsis), label)
	c.Right(x+valueEnd, y, r.Value, ink)
	if unitFits {
		c.Text(x+valueEnd+1, y, r.Unit, theme.Faint)
	}
}
