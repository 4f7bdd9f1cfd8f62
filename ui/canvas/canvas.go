// Package canvas is a grid of cells that a region of the screen draws on. It
// becomes text by runs of equal ink, never cell by cell.
package canvas

import (
	"fmt"
	"strings"
	"unicode/utf8"

	"github.com/mattn/go-runewidth"

	"polewright/ui/theme"
)

// cell is one character, its ink, and the shade behind it. The right half of a
// wide character holds the rune 0.
type cell struct {
	r     rune
	ink   theme.Ink
	shade uint8
}

// Canvas is a grid of cells; its zero value has none. Drawing outside is
// ignored. It belongs to one region, which reuses it from frame to frame.
type Canvas struct {
	W, H  int
	cells []cell
	buf   []byte
}

// Reset makes it w by h blanks, reusing what it has.
func (c *Canvas) Reset(w, h int) {
	c.W, c.H = max(w, 0), max(h, 0)
	n := c.W * c.H
	if cap(c.cells) < n {
		c.cells = make([]cell, n)
	}
	c.cells = c.cells[:n]
	for i := range c.cells {
		c.cells[i] = cell{r: ' '}
	}
}

// Set draws one character of one cell.
func (c *Canvas) Set(x, y int, r rune, ink theme.Ink) {
	if x < 0 || y < 0 || x >= c.W || y >= c.H {
		return
	}
	at := &c.cells[y*c.W+x]
	if at.r == 0 && x > 0 { // the right half of a wide character goes with its left half
		c.cells[y*c.W+x-1].r = ' '
	}
	if x+1 < c.W && c.cells[y*c.W+x+1].r == 0 {
		c.cells[y*c.W+x+1].r = ' '
	}
	at.r, at.ink = r, ink
}

// Shade puts a shade of the theme behind a cell.
func (c *Canvas) Shade(x, y int, level uint8) {
	if x >= 0 && y >= 0 && x < c.W && y < c.H {
		c.cells[y*c.W+x].shade = level
	}
}

// At returns what is drawn at a cell.
func (c *Canvas) At(x, y int) rune {
	if x < 0 || y < 0 || x >= c.W || y >= c.H {
		return ' '
	}
	return c.cells[y*c.W+x].r
}

// Text writes s from (x, y) to the right and returns the column behind it. What
// does not fit is cut; control characters are dropped.
func (c *Canvas) Text(x, y int, s string, ink theme.Ink) int {
	for _, r := range s {
		switch w := Width(r); w {
		case 0:
		case 1:
			c.Set(x, y, r, ink)
			x++
		default:
			if x >= 0 && y >= 0 && y < c.H && x+1 < c.W {
				c.Set(x, y, r, ink)
				c.Set(x+1, y, ' ', ink)
				c.cells[y*c.W+x+1].r = 0
			}
			x += 2
		}
	}
	return x
}

// Right writes s so that it ends before column x.
func (c *Canvas) Right(x, y int, s string, ink theme.Ink) {
	c.Text(x-TextWidth(s), y, s, ink)
}

// Repeat draws n times the same character.
func (c *Canvas) Repeat(x, y, n int, r rune, ink theme.Ink) {
	for i := range n {
		c.Set(x+i, y, r, ink)
	}
}

// Fade draws everything in one ink.
func (c *Canvas) Fade(ink theme.Ink) {
	for i := range c.cells {
		c.cells[i].ink = ink
	}
}

// Lines returns the rows as text with escape sequences. Each stands alone. With
// trim the blanks at the end are left out, else every row is W cells wide.
func (c *Canvas) Lines(t *theme.Theme, trim bool) []string {
	out := make([]string, c.H)
	for y := range out {
		out[y] = c.line(t, c.cells[y*c.W:(y+1)*c.W], trim)
	}
	return out
}

func (c *Canvas) line(t *theme.Theme, row []cell, trim bool) string {
	if trim {
		for len(row) > 0 && row[len(row)-1].r == ' ' && (row[len(row)-1].shade == 0 || !t.Backed) {
			row = row[:len(row)-1]
		}
	}
	c.buf = c.buf[:0]
	plain := t.Open(theme.Text)
	front, shade := plain, uint8(0)
	for _, cell := range row {
		if t.ASCII && (cell.r == 0 || cell.r > '~') {
			cell.r = '?'
		}
		if cell.r == 0 {
			continue
		}
		if cell.r != ' ' { // a blank has no ink: the run goes on
			open := t.Open(cell.ink)
			if cell.shade > 0 {
				open = t.OpenOn(cell.ink)
			}
			if open != front {
				c.buf = append(c.buf, open...)
				front, shade = open, 0
			}
		}
		if cell.shade != shade && t.Backed {
			c.buf = append(c.buf, t.Shade(cell.shade)...)
			shade = cell.shade
		}
		c.buf = utf8.AppendRune(c.buf, cell.r)
	}
	if front != plain || shade != 0 {
		c.buf = append(c.buf, plain...)
	}
	return string(c.buf)
}

// widths counts ambiguous characters as one cell, whatever the locale: those
// whose terminals disagree use the ASCII glyphs.
var widths = func() *runewidth.Condition {
	w := runewidth.NewCondition()
	w.EastAsianWidth = false
	return w
}()

// Width returns the cells of a character; 0 for control and combining ones.
func Width(r rune) int {
	if r >= ' ' && r < 0x7f {
		return 1
	}
	if r < ' ' || r < 0xa0 {
		return 0
	}
	return widths.RuneWidth(r)
}

// TextWidth returns the cells of a text.
func TextWidth(s string) int {
	n := 0
	for _, r := range s {
		n += Width(r)
	}
	return n
}

// Cut shortens a text to w cells, the last of them the ellipsis where it was cut.
func Cut(s string, w int, ellipsis rune) string {
	if TextWidth(s) <= w {
		return s
	}
	if w <= 0 {
		return ""
	}
	n := 0
	for i, r := range s {
		if n+Width(r) > w-1 {
			return s[:i] + string(ellipsis)
		}
		n += Width(r)
	}
	return s
}

// CutList shortens a list to w cells: whole entries and the number of those left
// out, as far as there is room for that.
func CutList(list []string, w int, ellipsis rune) string {
	all := strings.Join(list, ", ")
	if TextWidth(all) <= w {
		return all
	}
	for n := len(list) - 1; n > 0; n-- {
		if s := fmt.Sprintf("%s, %d more", strings.Join(list[:n], ", "), len(list)-n); TextWidth(s) <= w {
			return s
		}
	}
	return Cut(all, w, ellipsis)
}

// Wrap breaks a text into lines of at most w cells, at blanks where there are any.
func Wrap(s string, w int) []string {
	if w < 1 {
		return nil
	}
	var lines []string
	line, n := "", 0
	for _, word := range strings.Fields(s) {
		for TextWidth(word) > w { // a word wider than the line is broken
			head := Cut(word, w+1, 0)
			head = strings.TrimRight(head, "\x00")
			if line != "" {
				lines = append(lines, line)
				line, n = "", 0
			}
			lines = append(lines, head)
			word = word[len(head):]
		}
		k := TextWidth(word)
		switch {
		case line == "":
			line, n = word, k
		case n+1+k <= w:
			line, n = line+" "+word, n+1+k
		default:
			lines = append(lines, line)
			line, n = word, k
		}
	}
	if line != "" {
		lines = append(lines, line)
	}
	return lines
}
