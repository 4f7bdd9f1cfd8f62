// Package theme holds the look of the screen: a handful of inks and the glyphs
// of marks and lines. It is built once and handed down; nothing else in the
// screen makes a style.
package theme

import (
	"io"
	"strconv"
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
	// Grid is Faint for lines that only guide the eye; on a shade it stays behind
	// the labels.
	Grid
	inks
)

// Shades are the steps of grey behind cells, from none to the deepest.
const Shades = 5

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
	ASCII  bool // a character of someone's text that is not 7-bit is shown as ?
	// Backed tells that shades are colours behind the cells; elsewhere marks of
	// growing density, Glyphs.Grain, stand for them.
	Backed bool
	open   [inks]string // escape sequence that starts an ink and ends every other
	onOpen [inks]string // the same for cells on a shade
	shade  [Shades]string
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
	t.open[Grid] = t.open[Faint]
	if o.Depth == NoColour { // weight is no colour
		t.open[Title], t.open[Hold] = "\x1b[0;1m", "\x1b[0;1m"
	}
	t.shades(o)
	return t
}

// greys of the 256-colour palette behind cells and, for labels and lines on them,
// before them. A label keeps a contrast of 4.5 on the deepest shade.
var greys = map[bool]struct {
	behind      [Shades]int
	label, line int
}{
	true:  {[Shades]int{0, 236, 238, 240, 241}, 254, 247},
	false: {[Shades]int{0, 255, 253, 251, 249}, 238, 244},
}

// shades fills in what cells on a shade need.
func (t *Theme) shades(o Options) {
	t.Backed = o.Depth >= Many
	t.onOpen = t.open
	if !t.Backed {
		return
	}
	g := greys[o.Dark]
	t.shade[0] = "\x1b[49m"
	for i := 1; i < Shades; i++ {
		t.shade[i] = "\x1b[48;5;" + strconv.Itoa(g.behind[i]) + "m"
	}
	t.onOpen[Faint] = "\x1b[0;38;5;" + strconv.Itoa(g.label) + "m"
	t.onOpen[Grid] = "\x1b[0;38;5;" + strconv.Itoa(g.line) + "m"
}

// Shade returns the escape sequence that puts a shade behind the cells that
// follow and leaves their ink; empty where shades are no colours.
func (t *Theme) Shade(level uint8) string { return t.shade[min(level, Shades-1)] }

// OpenOn returns the escape sequence that starts an ink where it will stand on a
// shade. It ends every shade: that of the cell is to follow.
func (t *Theme) OpenOn(i Ink) string { return t.onOpen[i] }

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
