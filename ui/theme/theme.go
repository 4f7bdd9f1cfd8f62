// Package theme holds the look of the screen: a handful of inks and the glyphs
// of marks and lines. It is built once and handed down; nothing else in the
// screen makes a style.
package theme

import (
	"io"
	"strings"

	"github.com/charmbracelet/lipgloss"
	"github.com/muesli/termenv"
)

// Ink is the role in which a cell is drawn.
type Ink uint8

const (
	// Text is what is read: the terminal's own foreground, without any code.
	Text Ink = iota
	// Faint is the second grey: rules, axes, units, what is older than asked.
	Faint
	// Title is Text with weight.
	Title
	// Hold is the one accent: what the hand holds.
	Hold
	// Trouble is the other one: a limit broken, a refusal.
	Trouble
	inks
)

// Depth is how many colours the terminal shows.
type Depth uint8

const (
	// NoColour uses weight only.
	NoColour Depth = iota
	// Sixteen uses the terminal's palette.
	Sixteen
	// Many uses the 256-colour palette.
	Many
	// True uses exact colours.
	True
)

// Options of a theme. The zero value has no colour, for a light background,
// with line-drawing characters.
type Options struct {
	Depth Depth
	Dark  bool // background
	ASCII bool // 7-bit characters only
}

// Theme is immutable.
type Theme struct {
	Glyphs Glyphs
	ASCII  bool         // a character of someone's text that is not 7-bit is shown as ?
	open   [inks]string // escape sequence that starts an ink and ends every other
}

// New builds a theme. It asks the terminal nothing.
func New(o Options) *Theme {
	r := lipgloss.NewRenderer(io.Discard)
	r.SetHasDarkBackground(o.Dark)
	r.SetColorProfile([]termenv.Profile{termenv.Ascii, termenv.ANSI, termenv.ANSI256, termenv.TrueColor}[min(o.Depth, True)])
	// Blue and orange stay apart in every common kind of colour blindness. The
	// greys, #767676 and #808080, keep a contrast of 4.5 against white and against
	// black (by the rule of WCAG 2.1); as numbers of the fixed palette they take
	// fewer bytes, and there are many of them.
	faint := lipgloss.CompleteColor{TrueColor: "243", ANSI256: "243", ANSI: "8"}
	hold := lipgloss.CompleteColor{TrueColor: "#00598f", ANSI256: "25", ANSI: "4"}
	trouble := lipgloss.CompleteColor{TrueColor: "#a34700", ANSI256: "130", ANSI: "1"}
	if o.Dark {
		faint.TrueColor, faint.ANSI256 = "244", "244"
		hold = lipgloss.CompleteColor{TrueColor: "#62b8f0", ANSI256: "75", ANSI: "14"}
		trouble = lipgloss.CompleteColor{TrueColor: "#f0a030", ANSI256: "214", ANSI: "11"}
	}
	t := &Theme{Glyphs: unicode, ASCII: o.ASCII}
	if o.ASCII {
		t.Glyphs = ascii
	}
	plain := r.NewStyle()
	t.open[Text] = "\x1b[m"
	t.open[Title] = opening(plain.Bold(true))
	t.open[Hold] = opening(plain.Bold(true).Foreground(hold))
	t.open[Trouble] = opening(plain.Foreground(trouble))
	t.open[Faint] = opening(plain.Foreground(faint))
	if o.Depth == NoColour { // weight is no colour
		t.open[Title], t.open[Hold] = "\x1b[0;1m", "\x1b[0;1m"
	}
	return t
}

// opening returns the escape sequence with which a style starts, with a reset in
// front so that inks follow each other without one.
func opening(s lipgloss.Style) string {
	before, _, _ := strings.Cut(s.Render("x"), "x")
	if before == "" {
		return "\x1b[m"
	}
	return "\x1b[0;" + strings.TrimPrefix(before, "\x1b[")
}

// Open returns the escape sequence that starts an ink. Inks of equal look have
// equal sequences.
func (t *Theme) Open(i Ink) string { return t.open[i] }
