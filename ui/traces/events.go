package traces

import (
	"math"

	"polewright/scenarios"
	"polewright/ui/canvas"
	"polewright/ui/theme"
)

// Event is something on the time axis that the estimator was not told of.
type Event struct {
	At, Until float64 // s; Until is +Inf where it lasts
	Text      string
}

// Events are the surprises and faults of a scenario.
func Events(s *scenarios.Scenario) []Event {
	var out []Event
	for _, d := range s.Surprises {
		out = append(out, Event{d.At, d.Until, d.Input + " " + string(d.Shape)})
	}
	for _, f := range s.Faults {
		out = append(out, Event{f.From, f.Until, f.Sensor + " " + string(f.Kind)})
	}
	return out
}

// events marks the time axis in row y, width columns from x on: where each begins,
// how long it lasts, and what it is, as far as blanks are left.
func events(c *canvas.Canvas, x, y, width int, p Panel, g *theme.Glyphs) {
	if !(p.End > 0) {
		return
	}
	column := func(t float64) int { return int(math.Round(min(t/p.End, 1) * float64(width-1))) }
	for _, e := range p.Events {
		if e.At < 0 || e.At > p.End {
			continue
		}
		from, to := column(e.At), column(e.Until)
		at := from
		if c.At(x+at, y) != ' ' { // a label of the axis: just behind it
			for at <= from+6 && c.At(x+at, y) != ' ' {
				at++
			}
			if at > from+6 || at >= width {
				continue
			}
		}
		c.Set(x+at, y, g.Event, theme.Text)
		if !math.IsInf(e.Until, 1) {
			for k := at + 1; k <= to && c.At(x+k, y) == ' '; k++ {
				c.Set(x+k, y, g.Band, theme.Grid)
			}
		}
		n := canvas.TextWidth(e.Text)
		free := true
		for k := range n + 1 {
			r := c.At(x+at+1+k, y)
			free = free && (r == ' ' || r == g.Band) && at+1+k < width
		}
		if free {
			c.Text(x+at+1, y, e.Text, theme.Faint)
		}
	}
}

// cursor draws the line of the time cursor on what is blank.
func cursor(c *canvas.Canvas, x, top, width, rows int, p Panel, g *theme.Glyphs) {
	if p.Cursor == nil || !(p.End > 0) {
		return
	}
	col := x + 1 + int(math.Round(*p.Cursor/p.End*float64(width-1)))
	for r := range rows {
		if c.At(col, top+r) == ' ' {
			c.Set(col, top+r, g.Vertical, theme.Hold)
		}
	}
}

// At is the value of a series at a time before end; NaN where it has none.
func At(series []float64, t, end float64) float64 {
	k := math.Round(t / end * float64(len(series)-1))
	if !(k >= 0) || int(k) >= len(series) {
		return math.NaN()
	}
	return series[int(k)]
}

// band lays the predicted band of two standard deviations under the estimate: it
// does not cover the curves.
func band(c *canvas.Canvas, x, top, width, rows int, p Panel, t *theme.Theme) {
	last := len(p.Curves) - 1
	if p.Mode != Both || !p.Around || !(p.Band > 0) || last < 0 {
		return
	}
	scale := float64(rows-1) / (p.Axis.High - p.Axis.Low)
	for j := range width {
		v := At(p.Curves[last], float64(j), float64(width))
		if math.IsNaN(v) {
			continue
		}
		low, high := (v-p.Band-p.Axis.Low)*scale, (v+p.Band-p.Axis.Low)*scale
		if high < -0.5 || low > float64(rows)-0.5 {
			continue
		}
		from := rows - 1 - int(math.Round(min(high, float64(rows-1))))
		to := rows - 1 - int(math.Round(max(low, 0)))
		for r := from; r <= to; r++ {
			if t.Backed {
				c.Shade(x+1+j, top+r, 1)
			} else if c.At(x+1+j, top+r) == ' ' {
				c.Set(x+1+j, top+r, t.Glyphs.Grain[3][0][0], theme.Grid)
			}
		}
	}
}
