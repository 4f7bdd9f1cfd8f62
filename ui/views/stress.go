package views

import (
	"fmt"
	"math"
	"strings"

	"polewright/scenarios/tolerance"
	"polewright/ui/canvas"
	"polewright/ui/readings"
	"polewright/ui/theme"
)

// Stress is what the view of the worst case shows.
type Stress struct {
	Envelope   *tolerance.Envelope // nil until the study is done
	Tried, All int                 // cases so far; All is 0 where it is not known
	Trouble    string              // why there is no study; empty where all is well
	Older      bool                // the study is of a design that is not in hand any more
	Controlled bool                // the plant has a controller
	Truth      string              // the case that is the scenario's real plant now; empty for its own
}

// Lines draws it w cells wide.
func (f *Stress) Lines(w int, t *theme.Theme) []string {
	g := &t.Glyphs
	p := page{w: w}
	p.title("worst of the cases tried within the tolerances")
	p.state(f, g)
	e := f.Envelope
	if e == nil {
		return p.lines(t)
	}
	p.stability(f, g)
	p.envelope(e, g)
	p.blank()
	for _, n := range e.Notes {
		p.prose(2, n, theme.Faint)
	}
	for _, x := range e.Failures {
		p.prose(2, CaseText(x.Case)+" could not be judged: "+x.Err.Error(), theme.Trouble)
	}
	p.prose(2, tolerance.Caution, theme.Text)
	return p.lines(t)
}

// state says what was studied, or how far that has come, and on which real plant
// the traces run.
func (p *page) state(f *Stress, g *theme.Glyphs) {
	e := f.Envelope
	switch {
	case f.Trouble != "":
		p.prose(2, f.Trouble, theme.Trouble)
	case e == nil && f.All > 0:
		const cells = 24
		done := min(f.Tried*cells/f.All, cells)
		p.row(span{x: 2, text: strings.Repeat(g.Estimate.Horizontal, done) + strings.Repeat(string(g.Dot), cells-done), ink: theme.Faint},
			span{x: cells + 4, text: fmt.Sprintf("%d of %d plants tried", f.Tried, f.All)})
	case e == nil:
		p.row(span{x: 2, text: "trying the corners", ink: theme.Faint})
	default:
		var names []string
		for _, q := range e.Parameters {
			names = append(names, fmt.Sprintf("%s %s%.3g%%", q.Name, g.PlusMinus, q.Tolerance*100))
		}
		p.prose(2, fmt.Sprintf("one design, %d plants: %s", e.Cases, strings.Join(names, ", ")), theme.Faint)
	}
	if f.Older && f.Trouble == "" {
		p.row(span{x: 2, text: "of the design before; another run is on its way", ink: theme.Faint})
	}
	if e != nil {
		if worst, ok := e.Stress(); ok {
			p.said("hardest case", CaseText(worst), theme.Title)
		}
	}
	if f.Truth != "" {
		p.said("traces run on", plainMinus(f.Truth), theme.Hold)
	}
}

// said writes a label and a text that may need several rows.
func (p *page) said(label, text string, ink theme.Ink) {
	for _, l := range canvas.Wrap(text, p.w-16) {
		p.row(span{x: 2, text: label, ink: theme.Faint}, span{x: 16, text: l, ink: ink})
		label = ""
	}
}

func (p *page) stability(f *Stress, g *theme.Glyphs) {
	e := f.Envelope
	if e.NominalUnstable && !f.Controlled {
		p.blank()
		p.prose(2, "The plant does not settle by itself and has no controller here: a parameter that is off makes the estimate drift off with the plant.", theme.Text)
	}
	if e.Unstable == 0 {
		return
	}
	p.blank()
	p.row(span{x: 2, text: fmt.Sprintf("UNSTABLE in %d of %d cases", e.Unstable, e.Cases), ink: theme.Trouble},
		span{x: 36, text: canvas.Cut("left out of the rows below", p.w-36, g.Ellipsis), ink: theme.Faint})
	const few = 4
	for i, c := range e.UnstableCases {
		if i == few {
			break
		}
		p.row(span{x: 4, text: canvas.CutList(strings.Split(CaseText(c), ", "), p.w-4, g.Ellipsis), ink: theme.Faint})
	}
}

// Widths of the table's columns: the figure's name takes what they leave of a
// third of the page.
const stressNumber = 12

func (p *page) envelope(e *tolerance.Envelope, g *theme.Glyphs) {
	name := min(max(p.w/3, 22), 48)
	nominal, worst := name+stressNumber, name+2*stressNumber
	at := worst + 8
	below := p.w-at < 16 // the case goes into a row of its own
	p.blank()
	p.row(span{x: 2, text: "figure", ink: theme.Faint}, span{x: nominal, text: "nominal", ink: theme.Faint, right: true},
		span{x: worst, text: "worst", ink: theme.Faint, right: true}, span{x: at, text: "at", ink: theme.Faint})
	before, unbiased, biased := "", 0, false
	for _, m := range e.Measures {
		if m.Figure == tolerance.Bias && m.Nominal == 0 && m.Worst == 0 {
			unbiased++
			continue
		}
		biased = biased || m.Figure == tolerance.Bias
		ref := m.Nominal
		if !(math.Abs(ref) > 0) || math.IsInf(ref, 0) {
			ref = m.Worst
		}
		ink := theme.Text
		if m.Figure == tolerance.Stability && e.Unstable > 0 {
			ink = theme.Trouble
		}
		room := p.w - at
		if below {
			room = p.w - 4
		}
		lines := canvas.Wrap(CaseText(m.Case), room)
		text := strings.Join(lines, " ")
		if text == before && len(m.Case.Truth()) > 0 {
			lines = []string{"the same"}
		}
		before = text
		label := canvas.Wrap(plainMinus(m.Name), name-3)
		var under []string
		if below {
			lines, under = nil, lines
		}
		for i := range max(len(lines), len(label)) {
			var row []span
			if i < len(label) {
				row = append(row, span{x: 2, text: label[i], ink: theme.Faint})
			}
			if i == 0 {
				row = append(row, span{x: nominal, text: readings.Figure(m.Nominal, ref, g), right: true},
					span{x: worst, text: readings.Figure(m.Worst, ref, g), ink: ink, right: true},
					span{x: worst + 1, text: canvas.Cut(m.Unit, 6, g.Ellipsis), ink: theme.Faint})
			}
			if i < len(lines) {
				row = append(row, span{x: at, text: lines[i], ink: theme.Faint})
			}
			p.row(row...)
		}
		for _, l := range under {
			p.row(span{x: 4, text: l, ink: theme.Faint})
		}
	}
	if unbiased > 0 {
		label := "bias"
		if biased {
			label = "other bias"
		}
		p.row(span{x: 2, text: label, ink: theme.Faint}, span{x: nominal, text: "none", right: true}, span{x: worst, text: "none", right: true})
	}
}

// CaseText names a case in the characters of the screen.
func CaseText(c tolerance.Case) string {
	return plainMinus(c.String())
}

// plainMinus writes a minus sign as every other figure has it, and keeps a number
// and its percent sign on one line.
func plainMinus(s string) string { return strings.NewReplacer("−", "-", " %", "%").Replace(s) }
