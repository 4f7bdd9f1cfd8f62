package views

import (
	"math"

	"polewright/scenarios/logs"
	"polewright/ui/canvas"
	"polewright/ui/replays"
	"polewright/ui/theme"
	"polewright/ui/traces"
)

// logPlot draws one sensor of a replay: the innovations over time, and beside them
// their autocorrelation. It takes rows lines from y on.
type logPlot struct {
	c       *canvas.Canvas
	y, rows int
	t       *theme.Theme
	late    bool
	skipped float64 // part of the trace that does not matter for its axis
}

// lagGutter is the room of the labels left of the autocorrelation.
const lagGutter = 6

func (l *logPlot) draw(o *replays.Outcome, i int) {
	v := &o.Result.Innovations[i]
	lags, step := len(v.Autocorrelation), 1
	if l.c.W >= 100 {
		step = 2
	}
	right := lagGutter + lags*step + 3
	left := l.c.W - right - 2
	curves := [][]float64{o.Traces[i]}
	panel := traces.Panel{Title: v.Name, Unit: v.Unit, Mode: traces.Innovation, Curves: curves, Axis: evenAxis(o.Traces[i], l.skipped), End: o.Span, Late: l.late}
	if std := float64(v.StdExpected); std > 0 && !math.IsInf(std, 0) {
		panel.Band = 2 * std
		if panel.Axis.High < panel.Band {
			panel.Axis = traces.Axes([][]float64{{-panel.Band, panel.Band}})
		}
	}
	traces.Draw(l.c, 0, l.y, left, l.rows, panel, l.t)
	l.lags(v, left+2, step)
}

// evenAxis has zero in its middle and holds what comes behind the skipped part of a
// trace: a start from a wrong state would leave no room for the rest.
func evenAxis(trace []float64, skipped float64) traces.Axis {
	a, ok := traces.Span([][]float64{trace[int(skipped*float64(len(trace))):]})
	if !ok {
		if a, ok = traces.Span([][]float64{trace}); !ok {
			return traces.Axis{Low: -1, High: 1}
		}
	}
	size := math.Max(math.Abs(a.Low), math.Abs(a.High))
	return traces.Axes([][]float64{{-size, size}})
}

// lags draws the autocorrelation at x: measured, expected, and the band around it.
func (l *logPlot) lags(v *logs.Innovation, x, step int) {
	c, g := l.c, &l.t.Glyphs
	at := c.Text(x, l.y, "autocorrelation", theme.Title) + 2
	if c.W-at >= 12 {
		l.key(at, g)
	}
	top, rows := l.y+1, l.rows-2
	axis := lagAxis(v)
	row := func(value logs.Number) (int, bool) {
		r := math.Round((axis.High - float64(value)) / (axis.High - axis.Low) * float64(rows-1))
		return top + int(r), r >= 0 && r < float64(rows)
	}
	x0 := x + lagGutter
	for r := range rows {
		c.Set(x0-1, top+r, g.Vertical, theme.Faint)
	}
	c.Right(x0-1, top, tick(axis.High), theme.Faint)
	c.Right(x0-1, top+rows-1, tick(axis.Low), theme.Faint)
	width := len(v.Autocorrelation) * step
	if r, ok := row(0); ok {
		c.Repeat(x0, r, width, g.Rule, theme.Faint)
	}
	ink := theme.Text
	if l.late {
		ink = theme.Faint
	}
	for j, have := range v.Autocorrelation {
		col := x0 + j*step
		put := func(value logs.Number, glyph rune, ink theme.Ink) {
			if r, ok := row(value); ok && !math.IsNaN(float64(value)) {
				c.Set(col, r, glyph, ink)
			}
		}
		put(v.AutocorrelationLow[j], g.Band, theme.Faint)
		put(v.AutocorrelationHigh[j], g.Band, theme.Faint)
		put(v.AutocorrelationExpected[j], g.Cross, theme.Faint)
		if have < v.AutocorrelationLow[j] || have > v.AutocorrelationHigh[j] {
			put(have, g.Selected, theme.Trouble)
			continue
		}
		put(have, g.Target, ink)
	}
	bottom := top + rows
	c.Text(x0, bottom, "1", theme.Faint)
	if n := len(v.Autocorrelation); n >= 20 {
		c.Right(x0+9*step+2, bottom, "10", theme.Faint)
		c.Right(x0+19*step+2, bottom, "20", theme.Faint)
	}
}

// key tells the marks apart, as far as there is room.
func (l *logPlot) key(x int, g *theme.Glyphs) {
	for _, k := range []struct {
		mark rune
		does string
		ink  theme.Ink
	}{{g.Cross, "due", theme.Faint}, {g.Band, "95 %", theme.Faint}, {g.Selected, "outside", theme.Trouble}} {
		if x+2+len(k.does) > l.c.W {
			return
		}
		l.c.Set(x, l.y, k.mark, k.ink)
		x = l.c.Text(x+2, l.y, k.does, theme.Faint) + 2
	}
}

// lagAxis holds what is measured and expected, zero in its middle. Its few steps
// keep it still while poles move.
func lagAxis(v *logs.Innovation) traces.Axis {
	size := 0.0
	for _, list := range [][]logs.Number{v.Autocorrelation, v.AutocorrelationExpected, v.AutocorrelationLow, v.AutocorrelationHigh} {
		for _, x := range list {
			if f := float64(x); !math.IsNaN(f) {
				size = math.Max(size, math.Abs(f))
			}
		}
	}
	for _, step := range []float64{0.1, 0.25, 0.5} {
		if size <= step {
			return traces.Axis{Low: -step, High: step}
		}
	}
	return traces.Axis{Low: -1, High: 1}
}
