package views

import (
	"fmt"
	"strconv"

	"gonum.org/v1/gonum/mat"

	"polewright/ui/canvas"
	"polewright/ui/readings"
	"polewright/ui/theme"
)

// Readings shows every figure of the design in hand, the gain, where the noise
// of each state comes from, and the warnings.
func Readings(w int, f readings.Facts, t *theme.Theme) []string {
	g := &t.Glyphs
	p := page{w: w}
	if f.Design != nil && len(f.Design.Warnings) > 0 {
		p.title("warnings")
		for _, s := range f.Design.Warnings {
			p.prose(2, s, theme.Trouble)
		}
	}
	name := min(30, w/2-4)
	for _, s := range readings.Sections(f, g) {
		p.title(s.Title)
		if s.Note != "" {
			last := len(p.rows) - 1
			p.rows[last] = append(p.rows[last], span{x: name, text: s.Note, ink: theme.Faint})
		}
		for _, r := range s.Rows {
			p.row(span{x: 2, text: canvas.Cut(r.Label, name-3, g.Ellipsis), ink: theme.Faint},
				span{x: name + 14, text: r.Value, right: true}, span{x: name + 15, text: r.Unit, ink: theme.Faint},
				span{x: min(name+36, w), text: r.Tail, ink: r.Ink, right: true})
		}
	}
	if f.Design == nil {
		return p.lines(t)
	}
	if f.Analysis != nil && f.Analysis.Floor == nil {
		p.title("why there is no floor")
		p.prose(2, f.Analysis.FloorReason, theme.Text)
	}
	p.matrix("gain L, prediction form, one column per sensor", f, f.Design.Gain, g)
	p.matrix("gain Lf, current form", f, f.Design.GainCurrent, g)
	p.matrix("noise of each state per unit of noise on one sensor, prediction form", f, f.Design.Noise.SensorToState, g)
	p.lost(f)
	return p.lines(t)
}

// matrix prints n rows, one per state, in full precision.
func (p *page) matrix(title string, f readings.Facts, m *mat.Dense, g *theme.Glyphs) {
	if m == nil {
		return
	}
	p.title(title)
	rows, cols := m.Dims()
	const width = 25
	name := min(22, p.w/3)
	fit := max((p.w-name)/width, 1)
	for from := 0; from < cols; from += fit {
		to := min(from+fit, cols)
		head := []span{}
		for j := from; j < to; j++ {
			head = append(head, span{x: name + (j-from+1)*width, text: canvas.Cut(sensorName(f, j), width-1, g.Ellipsis), ink: theme.Faint, right: true})
		}
		p.row(head...)
		for i := range rows {
			line := []span{{x: 2, text: canvas.Cut(readings.StateName(f.Bench, i), name-3, g.Ellipsis), ink: theme.Faint}}
			for j := from; j < to; j++ {
				line = append(line, span{x: name + (j-from+1)*width, text: strconv.FormatFloat(m.At(i, j), 'g', -1, 64), right: true})
			}
			p.row(line...)
		}
	}
}

func sensorName(f readings.Facts, j int) string {
	if j < len(f.Bench.Model.SensorNames) {
		return f.Bench.Model.SensorNames[j]
	}
	return fmt.Sprintf("y%d", j+1)
}

// lost says what is left when sensors fail.
func (p *page) lost(f readings.Facts) {
	if len(f.Design.SensorSets) == 0 {
		return
	}
	p.title("with sensors lost, their columns of L at zero")
	for _, s := range f.Design.SensorSets {
		names := ""
		for k, j := range s.Lost {
			if k > 0 {
				names += ", "
			}
			names += sensorName(f, j)
		}
		word, ink := "stable", theme.Text
		if !s.Stable {
			word, ink = "UNSTABLE", theme.Trouble
		}
		p.row(span{x: 2, text: canvas.Cut(names, p.w-14, '.'), ink: theme.Faint}, span{x: p.w - 2, text: word, ink: ink, right: true})
	}
}
