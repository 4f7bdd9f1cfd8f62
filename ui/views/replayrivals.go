package views

import (
	"fmt"

	"polewright/scenarios/logs"
	"polewright/ui/canvas"
	"polewright/ui/measures"
	"polewright/ui/readings"
	"polewright/ui/replays"
	"polewright/ui/theme"
)

// rivalColumn is one figure of the designs on a log.
type rivalColumn struct {
	name, what string
	of         func(r *logs.Result) (v, low, high logs.Number)
	ref        float64
}

func rivalColumns(r *logs.Result) []rivalColumn {
	list := []rivalColumn{{"all sensors", "NIS mean", func(r *logs.Result) (v, low, high logs.Number) { return r.NISMean, r.NISLow, r.NISHigh }, float64(len(r.Innovations))}}
	for i, v := range r.Innovations {
		list = append(list, rivalColumn{v.Name, "std" + comma(v.Unit), func(r *logs.Result) (x, low, high logs.Number) {
			return r.Innovations[i].Std, r.Innovations[i].StdLow, r.Innovations[i].StdHigh
		}, float64(v.Std)})
	}
	for i, c := range r.References {
		list = append(list, rivalColumn{c.Name, "rms" + comma(c.Unit), func(r *logs.Result) (x, low, high logs.Number) {
			x = r.References[i].RMS
			return x, x, x
		}, float64(c.RMS)})
	}
	return list
}

func comma(unit string) string {
	if unit == "" {
		return ""
	}
	return ", " + unit
}

// rivals shows the kept designs on the same log, a row for each.
func (p *page) rivals(f *Replay, g *theme.Glyphs) {
	p.title("candidates on this log")
	if len(f.Rivals) == 0 && !f.Running {
		p.prose(2, "None is kept: a on the screen keeps the design in hand under the next letter.", theme.Faint)
		return
	}
	const name, wide = 10, 16
	columns := rivalColumns(f.Outcome.Result)
	fit := min(len(columns), max((p.w-name)/wide, 1))
	head, what := []span{}, []span{}
	for k, c := range columns[:fit] {
		head = append(head, span{x: name + (k+1)*wide - 2, text: canvas.Cut(c.name, wide-3, g.Ellipsis), ink: theme.Faint, right: true})
		what = append(what, span{x: name + (k+1)*wide - 2, text: canvas.Cut(c.what, wide-3, g.Ellipsis), ink: theme.Faint, right: true})
	}
	p.row(head...)
	p.row(what...)
	p.rival(replays.Rival{Name: "in hand", Result: f.Outcome.Result}, columns[:fit], name, wide, g)
	for _, r := range f.Rivals {
		p.rival(r, columns[:fit], name, wide, g)
	}
	p.row(span{x: 2, text: canvas.Cut(string(g.Up)+" above, "+string(g.Down)+" below what 95 of 100 true logs give that gain", p.w-2, g.Ellipsis), ink: theme.Faint})
	if more := len(columns) - fit; more > 0 {
		p.row(span{x: 2, text: fmt.Sprintf("on a wider screen, more columns: %d", more), ink: theme.Faint})
	}
}

// rival is one row: its figures, and a mark behind those outside their own band.
func (p *page) rival(r replays.Rival, columns []rivalColumn, name, wide int, g *theme.Glyphs) {
	row := []span{{x: 2, text: canvas.Cut(r.Name, name-2, g.Ellipsis), ink: theme.Title}}
	if r.Result == nil {
		why := "no replay"
		if r.Err != nil {
			why = r.Err.Error()
		}
		p.row(append(row, span{x: name, text: canvas.Cut(why, p.w-name, g.Ellipsis), ink: theme.Trouble})...)
		return
	}
	for k, c := range columns {
		v, low, high := c.of(r.Result)
		end := name + (k+1)*wide - 2
		row = append(row, span{x: end, text: readings.Figure(float64(v), c.ref, g), right: true})
		switch measures.Place(v, low, high) {
		case "ABOVE":
			row = append(row, span{x: end + 1, text: string(g.Up), ink: theme.Trouble})
		case "BELOW":
			row = append(row, span{x: end + 1, text: string(g.Down), ink: theme.Trouble})
		}
	}
	p.row(row...)
}
