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

// Compare shows designs side by side, the one under the cursor among them. The
// best value of each row has weight.
func Compare(w int, b *desk.Bench, an *estimator.Analysis, plane targets.Plane, list []Column, cursor int, t *theme.Theme) []string {
	p := page{w: w}
	if len(list) == 0 {
		p.title("candidates")
		p.prose(2, "None yet. Press a on the screen to keep the design in hand under the next letter.", theme.Faint)
		return p.lines(t)
	}
	fit := max((w-compareLabel)/compareWidth, 1)
	from := max(cursor-fit+1, 0)
	c := comparison{page: &p, bench: b, shown: list[from:min(from+fit, len(list))], g: &t.Glyphs}
	c.names(from, cursor, len(list))
	p.blank()
	c.poles(plane)
	p.blank()
	c.speed()
	p.blank()
	c.noise(an)
	if b.Model.K != nil {
		p.blank()
		c.margins()
	}
	p.blank()
	c.line("limits met", met)
	return p.lines(t)
}

const (
	compareLabel = 20
	compareWidth = 19
)

// comparison writes the rows of a comparison.
type comparison struct {
	*page
	bench *desk.Bench
	shown []Column
	g     *theme.Glyphs
}

// line writes one row.
func (c *comparison) line(label string, of func(c Column) string) {
	spans := []span{{x: 2, text: canvas.Cut(label, compareLabel-3, c.g.Ellipsis), ink: theme.Faint}}
	for k, column := range c.shown {
		spans = append(spans, span{x: compareLabel + (k+1)*compareWidth - 2, right: true,
			text: canvas.Cut(of(column), compareWidth-1, c.g.Ellipsis)})
	}
	c.row(spans...)
}

// figures writes one row of a figure of the designs.
func (c *comparison) figures(label string, of func(d *estimator.Design) string) {
	c.line(label, func(column Column) string {
		if column.Design == nil {
			return c.g.Undefined
		}
		return of(column.Design)
	})
}

// values writes one row of numbers and gives weight to the best: the least, or
// with most the largest.
func (c *comparison) values(label string, most bool, of func(d *estimator.Design) float64, print func(v float64) string) {
	c.figures(label, func(d *estimator.Design) string { return print(of(d)) })
	c.best(most, of)
}

func (c *comparison) best(most bool, of func(d *estimator.Design) float64) {
	row, best, found := c.rows[len(c.rows)-1], -1, math.Inf(1)
	for k, column := range c.shown {
		if column.Design == nil {
			continue
		}
		v := of(column.Design)
		if most {
			v = -v
		}
		if v < found {
			best, found = k, v
		}
	}
	if best >= 0 && len(c.shown) > 1 {
		row[best+1].ink = theme.Title
	}
}

// fixed prints with so many decimals; like with those that suit the first design.
func (c *comparison) fixed(decimals int) func(v float64) string {
	return func(v float64) string { return readings.Fixed(v, decimals, c.g) }
}

func (c *comparison) like(of func(d *estimator.Design) float64) func(v float64) string {
	ref := math.NaN()
	if d := c.shown[0].Design; d != nil {
		ref = of(d)
	}
	return func(v float64) string { return readings.Figure(v, ref, c.g) }
}

// names heads the columns, those from the given one on of all; where not all are
// in sight it says so.
func (c *comparison) names(from, cursor, all int) {
	c.line("candidates", func(column Column) string { return column.Name })
	row := c.rows[len(c.rows)-1]
	row[0].x, row[0].ink = 0, theme.Title
	to := from + len(c.shown)
	if to-from < all {
		row[0].text = fmt.Sprintf("%d to %d of %d", from+1, to, all)
		if from > 0 {
			row[0].text = string(c.g.Left) + " " + row[0].text
		}
		if to < all {
			row[0].text += " " + string(c.g.Right)
		}
	}
	for k := range c.shown {
		row[k+1].ink = theme.Title
		if k == cursor-from {
			row[k+1].ink, row[k+1].text = theme.Hold, string(c.g.Right)+" "+row[k+1].text
		}
	}
}

func (c *comparison) poles(plane targets.Plane) {
	rows := 0
	for _, column := range c.shown {
		rows = max(rows, len(column.Poles.List))
	}
	for i := range rows {
		label := ""
		if i == 0 {
			label = "poles, " + string(byte(plane)) + "-plane"
		}
		c.line(label, func(column Column) string { return c.place(column, i, plane) })
	}
	if c.bench.Model.Discrete() {
		c.line("form", func(column Column) string { return measures.FormName(column.Form) })
	}
}

func (c *comparison) place(column Column, i int, plane targets.Plane) string {
	if i >= len(column.Poles.List) {
		return ""
	}
	target := column.Poles.List[i]
	at, ok := targets.Shown(target.At, plane, column.Poles.Period)
	if !ok {
		return "z = 0"
	}
	ref := math.Hypot(real(at), imag(at)) * 3
	return readings.Place(at, target.Pair, max(ref, 0.1), c.g)
}

func (c *comparison) speed() {
	settle := func(d *estimator.Design) float64 { return d.Transient.Settle }
	norm := func(d *estimator.Design) float64 { return d.GainNorm }
	c.values("settle, s", false, settle, c.like(settle))
	c.values("peak, x", false, func(d *estimator.Design) float64 { return d.Transient.Peak }, c.fixed(2))
	c.values("gain norm", false, norm, c.like(norm))
	c.values("conditioning", false, func(d *estimator.Design) float64 { return d.EigenvectorCondition }, c.fixed(1))
}

func (c *comparison) noise(an *estimator.Analysis) {
	over := func(d *estimator.Design) float64 {
		if d.Noise.Std == nil {
			return math.NaN()
		}
		return d.Noise.OverFloorRMS
	}
	c.values("noise, x floor", false, over, c.fixed(2))
	states, _, _ := c.bench.Model.Dims()
	for i := range states {
		label := readings.StateName(c.bench, i)
		if u := readings.StateUnit(c.bench, i); u != "" {
			label += ", " + u
		}
		ref := math.NaN()
		if an != nil && an.Floor != nil {
			ref = an.Floor.Std[i]
		}
		c.figures(label, func(d *estimator.Design) string { return c.stateNoise(d, i, ref) })
		c.best(false, func(d *estimator.Design) float64 { return entry(d.Noise.Std, i) })
	}
}

func (c *comparison) stateNoise(d *estimator.Design, i int, ref float64) string {
	std, over := entry(d.Noise.Std, i), entry(d.Noise.OverFloor, i)
	if !(ref > 0) {
		ref = std
	}
	text := readings.Figure(std, ref, c.g)
	if !math.IsNaN(over) {
		text += fmt.Sprintf(" %6s", readings.Fixed(over, 2, c.g))
	}
	return text
}

// entry is entry i of a list, NaN where there is none.
func entry(list []float64, i int) float64 {
	if i >= len(list) {
		return math.NaN()
	}
	return list[i]
}

func (c *comparison) margins() {
	margin := func(label string, decimals int, most bool, of func(l *estimator.Loop) float64) {
		c.values(label, most, func(d *estimator.Design) float64 {
			if d.Loop == nil {
				return math.NaN()
			}
			return of(d.Loop)
		}, c.fixed(decimals))
	}
	margin("phase margin, deg", 1, true, func(l *estimator.Loop) float64 { return l.PhaseMargin })
	margin("delay margin, ms", 2, true, func(l *estimator.Loop) float64 { return 1000 * l.DelayMargin })
	margin("sensitivity", 2, false, func(l *estimator.Loop) float64 { return l.SensitivityPeak })
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
