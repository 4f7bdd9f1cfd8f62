package views

import (
	"strconv"
	"strings"

	"polewright/ui/canvas"
	"polewright/ui/keys"
	"polewright/ui/measures"
	"polewright/ui/plane"
	"polewright/ui/theme"
)

// advice goes with the caution that every figure carries.
const advice = "Feed the estimator the input that is actually applied, after saturation and rate limits; reject NaN and out-of-range samples; " +
	"start from the first measurement, or wait out the settle time before closing the loop; know what losing each sensor does."

// Marks are the kinds of marks with their words, as help and legend show them.
var Marks = []struct {
	Kind  plane.Kind
	Short string
	Words string
}{
	{plane.Selected, "held", "the pole or pair in your hand"},
	{plane.Target, "wanted", "the estimator's other wanted poles"},
	{plane.Fixed, "fixed", "poles that no gain can move: the sensors do not see them"},
	{plane.Plant, "plant", "the plant's own poles"},
	{plane.Floor, "floor", "poles of the floor, the best linear estimator if the noise figures are true"},
	{plane.Controller, "control", "poles of plant and controller together, as the state feedback alone places them"},
}

// Help lists every key, the marks, and the cautions.
func Help(w int, k keys.Map, t *theme.Theme) []string {
	p := page{w: w}
	const column = 16
	for _, group := range k.Groups() {
		p.title(group.Title)
		for _, b := range group.Bindings {
			if !b.Enabled() {
				continue
			}
			h := b.Help()
			for i, l := range canvas.Wrap(h.Desc, w-column-2) {
				name := span{x: 2, text: h.Key}
				if i > 0 {
					name.text = ""
				}
				p.row(name, span{x: column + 2, text: l, ink: theme.Faint})
			}
		}
	}
	p.title("Marks")
	for _, m := range Marks {
		for i, l := range canvas.Wrap(m.Words, w-column-2) {
			if i > 0 {
				p.row(span{x: column + 2, text: l, ink: theme.Faint})
				continue
			}
			p.row(span{x: 2, text: string(plane.Glyph(m.Kind, &t.Glyphs)), ink: plane.Ink(m.Kind)}, span{x: 4, text: m.Short}, span{x: column + 2, text: l, ink: theme.Faint})
		}
	}
	g := &t.Glyphs
	p.row(span{x: 2, text: string([]rune{g.Left, ' ', g.Right, ' ', g.Up, ' ', g.Down})},
		span{x: column + 2, text: canvas.Cut("at the edge: a wanted or fixed pole lies further out that way", w-column-2, g.Ellipsis), ink: theme.Faint})
	p.shades(t, column)
	p.title("Before it moves a machine")
	p.prose(2, measures.Caution, theme.Text)
	p.prose(2, advice, theme.Text)
	return p.lines(t)
}

// shades explains what lies under the marks and on the time axis.
func (p *page) shades(t *theme.Theme, column int) {
	g := &t.Glyphs
	p.title("Shades of the plane: noise over the floor if the held pole went there")
	step := func(level uint8, words string) {
		text := string(g.Grain[level][0][:])
		if t.Backed {
			text = "    "
		}
		p.row(span{x: 2, text: text, ink: theme.Grid, shade: level}, span{x: column + 2, text: words, ink: theme.Faint})
	}
	levels := plane.Levels()
	for i, top := range levels {
		step(uint8(i), "up to "+strconv.FormatFloat(top, 'g', -1, 64)+" times the floor")
	}
	step(theme.Shades-1, "more")
	row := func(sign, words string) {
		for i, l := range canvas.Wrap(words, p.w-column-2) {
			if i > 0 {
				sign = ""
			}
			p.row(span{x: 2, text: sign, ink: theme.Grid}, span{x: column + 2, text: l, ink: theme.Faint})
		}
	}
	hatch := strings.Repeat(" ", 3) + string(g.Hatch)
	row(string(g.Hatch)+hatch, "a limit breaks there; the line under the traces names it for the cell of the held pole")
	row(string(g.Target)+"2", "so many poles in one cell; Tab takes one after the other")
	row(string(g.Event), "on the time axis: a fault, or a surprise that the estimator is not told of")
}
