// Package report makes one self-contained document of a session: the plant, what
// its sensors see, every candidate with its figures, and where all of it comes
// from. It needs no network, and the same session gives the same bytes.
//
// The figures are those of the measures document, as `design --json` prints it:
// every cell that shows one knows its place there.
package report

import (
	"fmt"
	"math"
	"strconv"

	"polewright/ui/measures"
)

// Document is the report before it is written out as HTML or Markdown.
type Document struct {
	Title    string
	Subtitle string
	Blocks   []Block
}

// Block is a *Heading, *Text, *Table or *Figure.
type Block interface{ block() }

// Heading starts a part. Parts of level 1 begin on a new page in print where Page
// says so.
type Heading struct {
	Level int // 1, 2
	Text  string
	Page  bool
}

// Kind of a text.
type Kind uint8

// The kinds of texts.
const (
	Plain Kind = iota
	Caution
	Warning
	Faint
)

// Text is one paragraph.
type Text struct {
	Kind Kind
	Text string
}

// Table has as many cells in every row as in Head.
type Table struct {
	Caption string
	Head    []string
	Rows    [][]Cell
	// Words tells per column that it holds words, not figures.
	Words []bool
}

// Cell is one entry of a table.
type Cell struct {
	Text   string
	Key    string // of the figure in the candidate's measures: "noise.std.0"
	Strong bool   // what must not be overlooked
}

// Figure is a picture.
type Figure struct {
	Caption string
	SVG     string // the whole element, without empty lines
}

func (*Heading) block() {}
func (*Text) block()    {}
func (*Table) block()   {}
func (*Figure) block()  {}

func (d *Document) heading(level int, text string) {
	d.Blocks = append(d.Blocks, &Heading{Level: level, Text: text})
}

func (d *Document) page(text string) {
	d.Blocks = append(d.Blocks, &Heading{Level: 1, Text: text, Page: true})
}

func (d *Document) text(k Kind, format string, args ...any) {
	d.Blocks = append(d.Blocks, &Text{Kind: k, Text: fmt.Sprintf(format, args...)})
}

// table adds a table that has rows.
func (d *Document) table(t *Table) {
	if len(t.Rows) > 0 {
		d.Blocks = append(d.Blocks, t)
	}
}

func (d *Document) figure(caption, svg string) {
	d.Blocks = append(d.Blocks, &Figure{caption, svg})
}

// words is a cell of text.
func words(s string) Cell { return Cell{Text: s} }

// Digits prints a number in five digits, or a dash where it is not defined: as
// `design` prints it.
func Digits(v float64) string {
	switch {
	case math.IsNaN(v):
		return "–"
	case math.IsInf(v, 0):
		return "unlimited"
	}
	return strconv.FormatFloat(v+0, 'g', 5, 64)
}

// Exact prints a number so that it reads back exactly.
func Exact(v float64) string {
	if math.IsNaN(v) || math.IsInf(v, 0) {
		return Digits(v)
	}
	return strconv.FormatFloat(v+0, 'g', -1, 64)
}

// figure is a cell with a figure of the measures; key parts are joined by points.
func number(v measures.Number, key ...any) Cell {
	return Cell{Text: Digits(float64(v)), Key: path(key)}
}

// exact is a figure in all its digits.
func exact(v measures.Number, key ...any) Cell {
	return Cell{Text: Exact(float64(v)), Key: path(key)}
}

func path(parts []any) string {
	s := ""
	for i, p := range parts {
		if i > 0 {
			s += "."
		}
		s += fmt.Sprint(p)
	}
	return s
}

// pole prints a place of the complex plane.
func pole(z *measures.Complex, key ...any) Cell {
	c := Cell{Key: path(key)}
	switch {
	case z == nil:
		c.Text = "–"
	case z[1] == 0:
		c.Text = place(z[0])
	case z[1] < 0:
		c.Text = place(z[0]) + " - " + place(-z[1]) + "i"
	default:
		c.Text = place(z[0]) + " + " + place(z[1]) + "i"
	}
	return c
}

func place(v float64) string { return strconv.FormatFloat(v+0, 'g', 6, 64) }

// withUnit is a name with its unit.
func withUnit(name, unit string) string {
	if unit == "" {
		return name
	}
	return name + ", " + unit
}

func blank(s string) string {
	if s == "" {
		return "–"
	}
	return s
}
