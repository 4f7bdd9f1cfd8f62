package views

import (
	"fmt"
	"math"

	"polewright/estimator"
	"polewright/scenarios"
	"polewright/ui/canvas"
	"polewright/ui/desk"
	"polewright/ui/measures"
	"polewright/ui/plane/targets"
	"polewright/ui/readings"
	"polewright/ui/theme"
)

// Column is one design of a comparison.
type Column struct {
	Name   string
	Poles  targets.Set
	Form   estimator.Form
	Design *estimator.Design
	Limits []scenarios.LimitResult
}

const (
	compareLabel = 20
	compareWidth = 19
)

// Compare shows designs side by side, the one under the cursor among them.
func Compare(w int, b *desk.Bench, an *estimator.Analysis, plane targets.Plane, list []Column, cursor int, t *theme.Theme) []string {
	g := &t.Glyphs
	p := page{w: w}
	if len(list) == 0 {
		p.title("candidates")
		p.prose(2, "None yet. Press a on the screen to keep the design in hand under the next letter.", theme.Faint)
		return p.lines(t)
	}
	fit := max((w-compareLabel)/compareWidth, 1)
	from := 0
	if cursor >= fit {
		from = cursor - fit + 1
	}
	shown := list[from:min(from+fit, len(list))]
	line := func(label string, of func(c Column) string) {
		spans := []span{{x: 2, text: canvas.Cut(label, compareLabel-3, g.Ellipsis), ink: theme.Faint}}
		for k, c := range shown {
			spans = append(spans, span{x: compareLabel + (k+1)*compareWidth - 2, text: canvas.Cut(of(c), compareWidth-1, g.Ellipsis), right: true})
		}
		p.row(spans...)
	}
	line("candidates", func(c Column) string { return c.Name })
	for k := range shown {
		p.rows[0][k+1].ink = theme.Title
		if from+k == cursor {
			p.rows[0][k+1].ink = theme.Hold
			p.rows[0][k+1].text = string(g.Right) + " " + p.rows[0][k+1].text
		}
	}
	p.rows[0][0].ink, p.rows[0][0].x = theme.Title, 0
	rows := 0
	for _, c := range shown {
		rows = max(rows, len(c.Poles.List))
	}
	p.blank()
	for i := range rows {
		label := ""
		if i == 0 {
			label = "poles, " + string(byte(plane)) + "-plane"
		}
		line(label, func(c Column) string { return polePlace(c, i, plane, g) })
	}
	if b.Model.Discrete() {
		line("form", func(c Column) string { return measures.FormName(c.Form) })
	}
	p.blank()
	figure := func(label string, of func(d *estimator.Design) string) {
		line(label, func(c Column) string {
			if c.Design == nil {
				return g.Undefined
			}
			return of(c.Design)
		})
	}
	first := shown[0].Design
	ref := func(of func(d *estimator.Design) float64) float64 {
		if first == nil {
			return math.NaN()
		}
		return of(first)
	}
	settle := func(d *estimator.Design) float64 { return d.Transient.Settle }
	norm := func(d *estimator.Design) float64 { return d.GainNorm }
	settleRef, normRef := ref(settle), ref(norm)
	figure("settle, s", func(d *estimator.Design) string { return readings.Figure(settle(d), settleRef, g) })
	figure("peak, x", func(d *estimator.Design) string { return readings.Fixed(d.Transient.Peak, 2, g) })
	figure("gain norm", func(d *estimator.Design) string { return readings.Figure(norm(d), normRef, g) })
	figure("conditioning", func(d *estimator.Design) string { return readings.Fixed(d.EigenvectorCondition, 1, g) })
	p.blank()
	figure("noise, x floor", func(d *estimator.Design) string { return over(d, g) })
	states, _, _ := b.Model.Dims()
	for i := range states {
		label := readings.StateName(b, i)
		if u := readings.StateUnit(b, i); u != "" {
			label += ", " + u
		}
		stdRef := math.NaN()
		if an != nil && an.Floor != nil {
			stdRef = an.Floor.Std[i]
		}
		figure(label, func(d *estimator.Design) string { return stateNoise(d, i, stdRef, g) })
	}
	if b.Model.K != nil {
		p.blank()
		loop := func(label string, of func(l *estimator.Loop) string) {
			figure(label, func(d *estimator.Design) string {
				if d.Loop == nil {
					return g.Undefined
				}
				return of(d.Loop)
			})
		}
		loop("phase margin, deg", func(l *estimator.Loop) string { return readings.Fixed(l.PhaseMargin, 1, g) })
		loop("delay margin, ms", func(l *estimator.Loop) string { return readings.Fixed(1000*l.DelayMargin, 2, g) })
		loop("sensitivity", func(l *estimator.Loop) string { return readings.Fixed(l.SensitivityPeak, 2, g) })
	}
	p.blank()
	line("limits met", met)
	return p.lines(t)
}

func polePlace(c Column, i int, plane targets.Plane, g *theme.Glyphs) string {
	if i >= len(c.Poles.List) {
		return ""
	}
	target := c.Poles.List[i]
	at, ok := targets.Shown(target.At, plane, c.Poles.Period)
	if !ok {
		return "z = 0"
	}
	ref := math.Hypot(real(at), imag(at)) * 3
	return readings.Place(at, target.Pair, max(ref, 0.1), g)
}

func over(d *estimator.Design, g *theme.Glyphs) string {
	if d.Noise.Std == nil {
		return g.Undefined
	}
	return readings.Fixed(d.Noise.OverFloorRMS, 2, g)
}

func stateNoise(d *estimator.Design, i int, ref float64, g *theme.Glyphs) string {
	if i >= len(d.Noise.Std) {
		return g.Undefined
	}
	if !(ref > 0) {
		ref = d.Noise.Std[i]
	}
	s := readings.Figure(d.Noise.Std[i], ref, g)
	if i < len(d.Noise.OverFloor) && !math.IsNaN(d.Noise.OverFloor[i]) {
		s += fmt.Sprintf(" %6s", readings.Fixed(d.Noise.OverFloor[i], 2, g))
	}
	return s
}

func met(c Column) string {
	if len(c.Limits) == 0 {
		return "none set"
	}
	n := 0
	for _, l := range c.Limits {
		if l.Met {
			n++
		}
	}
	return fmt.Sprintf("%d of %d", n, len(c.Limits))
}
