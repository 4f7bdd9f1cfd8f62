package views

import (
	"fmt"
	"math"

	"polewright/scenarios/logs"
	"polewright/ui/canvas"
	"polewright/ui/measures"
	"polewright/ui/readings"
	"polewright/ui/replays"
	"polewright/ui/theme"
	"polewright/ui/traces"
)

// Replay is what the view of a real log shows.
type Replay struct {
	Log     *replays.Log
	Outcome *replays.Outcome // nil until the first replay is done
	Rivals  []replays.Rival  // kept designs on the same log, those so far
	Running bool             // rivals, or the replay of a newer design, are on their way
	Older   bool             // Outcome is of a design that is not in hand any more
	Trouble string           // why there is no replay; empty where all is well
}

// Lines draws it w cells wide; h is the room in sight.
func (f *Replay) Lines(w, h int, t *theme.Theme) []string {
	g := &t.Glyphs
	p := page{w: w}
	f.heading(&p, g)
	o := f.Outcome
	if o == nil {
		return p.lines(t)
	}
	for i := range o.Result.Innovations {
		p.sensor(f, i, min(max(h/3, 7), 13), t)
	}
	p.together(f, g)
	p.references(f, min(max(h/4, 6), 10), t)
	p.rivals(f, g)
	p.noiseFigures(o, g)
	p.blank()
	for _, text := range o.Result.Warnings {
		p.prose(2, text, theme.Text)
	}
	p.prose(2, measures.Caution, theme.Text)
	return p.lines(t)
}

// heading says what log this is, which part of it, and how far the replay has come.
func (f *Replay) heading(p *page, g *theme.Glyphs) {
	v := f.Log.Record.Survey()
	state := ""
	switch {
	case f.Trouble != "":
	case f.Outcome == nil || f.Older:
		state = "computing"
	case f.Running:
		state = "computing candidates"
	}
	room := p.w - canvas.TextWidth(state) - 2
	p.row(span{text: canvas.Cut("log "+f.Log.File, room, g.Ellipsis), ink: theme.Title}, span{x: p.w, text: state, ink: theme.Faint, right: true})
	text := fmt.Sprintf("%d samples from %s to %s s", v.Samples, tick6(v.Start), tick6(v.End))
	if f.Log.Whole > v.Samples {
		text = fmt.Sprintf("a window: %d of %d samples, from %s to %s s; start with --from SECONDS for another", v.Samples, f.Log.Whole, tick6(v.Start), tick6(v.End))
	}
	if f.Outcome != nil {
		text += fmt.Sprintf("; %d in the statistics", f.Outcome.Result.Counted)
	}
	p.prose(2, text, theme.Faint)
	lost := int64(0)
	for _, n := range v.Lost {
		lost += n
	}
	if lost+v.Missing+v.Held > 0 {
		p.prose(2, fmt.Sprintf("lost readings %d, missing rows %d, rows without an input %d: predicted through", lost, v.Missing, v.Held), theme.Faint)
	}
	if f.Trouble != "" {
		p.prose(2, f.Trouble, theme.Trouble)
	}
}

// Columns of the figures below a plot.
const (
	logFigure   = 26
	logExpected = logFigure + 13
	logBand     = logExpected + 2
)

// sensor shows one sensor's innovations: over time, their autocorrelation, figures.
func (p *page) sensor(f *Replay, i, rows int, t *theme.Theme) {
	g, o := &t.Glyphs, f.Outcome
	v := &o.Result.Innovations[i]
	p.blank()
	p.plot(rows, func(c *canvas.Canvas, y int) {
		plot := logPlot{c: c, y: y, rows: rows, t: t, late: f.Older, skipped: f.skipped()}
		plot.draw(o, i)
	})
	p.row(span{x: logFigure, text: "innovation", ink: theme.Faint, right: true}, span{x: logExpected, text: "expected", ink: theme.Faint, right: true},
		span{x: logBand, text: "95 of 100 true logs", ink: theme.Faint})
	unit := float64(v.StdExpected)
	p.judged("mean", v.Mean, 0, v.MeanLow, v.MeanHigh, unit, g)
	p.judged("std", v.Std, v.StdExpected, v.StdLow, v.StdHigh, unit, g)
	if out, all := measures.OutsideLags(v); all > 0 {
		p.row(span{x: 2, text: "lags outside", ink: theme.Faint}, span{x: logFigure, text: fmt.Sprintf("%d of %d", out, all), right: true},
			span{x: logBand, text: canvas.Cut("of this gain's band; neighbours go together", p.w-logBand, g.Ellipsis), ink: theme.Faint})
	}
	if i < len(o.Result.Whiteness) {
		w := &o.Result.Whiteness[i]
		p.row(span{x: 2, text: "white at floor", ink: theme.Faint}, span{x: logFigure, text: chance(float64(w.P), g), right: true},
			span{x: logExpected, text: "effect " + readings.Fixed(float64(w.EffectSize), 3, g), right: true},
			span{x: logBand, text: canvas.Cut(measures.WhiteWords(w), p.w-logBand, g.Ellipsis), ink: theme.Faint})
	}
}

// skipped is the part of the span that is not in the statistics.
func (f *Replay) skipped() float64 {
	switch {
	case f.Log.Skip == nil:
		return 0.1
	case f.Outcome.Span > 0:
		return math.Min(*f.Log.Skip/f.Outcome.Span, 1)
	}
	return 0
}

// judged writes a figure beside what is expected and where it lies.
func (p *page) judged(label string, v, expected, low, high logs.Number, ref float64, g *theme.Glyphs) {
	place, ink := measures.Place(v, low, high), theme.Faint
	if place == "BELOW" || place == "ABOVE" {
		ink = theme.Trouble
	}
	figure := func(x logs.Number) string { return readings.Figure(float64(x), ref, g) }
	band := g.Undefined
	if !math.IsNaN(float64(low)) && !math.IsNaN(float64(high)) {
		band = figure(low) + " to " + figure(high)
	}
	end := logBand + max(canvas.TextWidth(band)+2, 24)
	p.row(span{x: 2, text: label, ink: theme.Faint}, span{x: logFigure, text: figure(v), right: true}, span{x: logExpected, text: figure(expected), right: true},
		span{x: logBand, text: band, ink: theme.Faint}, span{x: end, text: place, ink: ink})
}

// together judges all sensors at once.
func (p *page) together(f *Replay, g *theme.Glyphs) {
	r := f.Outcome.Result
	p.title("all sensors together")
	p.judged("NIS mean", r.NISMean, logs.Number(len(r.Innovations)), r.NISLow, r.NISHigh, float64(len(r.Innovations)), g)
	if len(r.Whiteness) > 0 {
		p.prose(2, "Only the floor gain's innovations are white, and only if model and noise figures are right; effect is their largest |autocorrelation|.", theme.Faint)
	}
}

// references holds the estimate against what the log knows of the truth.
func (p *page) references(f *Replay, rows int, t *theme.Theme) {
	o, g := f.Outcome, &t.Glyphs
	if len(o.Result.References) == 0 {
		return
	}
	p.title("estimate against the log's own column")
	p.row(span{x: logFigure + 12, text: "rms", ink: theme.Faint, right: true}, span{x: logExpected + 12, text: "bias", ink: theme.Faint, right: true})
	for _, c := range o.Result.References {
		rms := float64(c.RMS)
		p.row(span{x: 2, text: canvas.Cut(withUnit(c.Name, c.Unit), logFigure-2, g.Ellipsis), ink: theme.Faint},
			span{x: logFigure + 12, text: readings.Figure(rms, rms, g), right: true},
			span{x: logExpected + 12, text: readings.Figure(float64(c.Bias), rms, g), right: true},
			span{x: logExpected + 15, text: canvas.Cut(fmt.Sprintf("%d samples", c.Count), p.w-logExpected-15, g.Ellipsis), ink: theme.Faint})
	}
	for i, c := range o.Result.References {
		if i >= len(o.Followed) {
			break
		}
		curves := [][]float64{o.Followed[i][0], o.Followed[i][1]}
		p.blank()
		p.plot(rows, func(cv *canvas.Canvas, y int) {
			traces.Draw(cv, 0, y, cv.W-2, rows, traces.Panel{Title: c.Name, Unit: c.Unit, Curves: curves, Axis: traces.Axes(curves),
				End: o.Span, Late: f.Older, Beside: "the log"}, t)
		})
	}
}

// noiseFigures shows what the log suggests beside what the plant file says.
func (p *page) noiseFigures(o *replays.Outcome, g *theme.Glyphs) {
	p.title("noise figures that this log suggests")
	n := o.Noise
	if n == nil {
		why := "they cannot be told"
		if o.NoNoise != nil {
			why = o.NoNoise.Error()
		}
		p.prose(2, "none: "+why, theme.Text)
		return
	}
	const name, wide = 22, 12
	p.row(span{x: name + wide, text: "suggested", ink: theme.Faint, right: true}, span{x: name + 2*wide, text: "plant file", ink: theme.Faint, right: true},
		span{x: name + 2*wide + 3, text: "95 % confidence", ink: theme.Faint})
	row := func(label string, v, own, low, high, ref float64, note string) {
		band := g.Undefined
		if !math.IsNaN(low) && !math.IsNaN(high) {
			band = readings.Figure(low, ref, g) + " to " + readings.Figure(high, ref, g)
		}
		p.row(span{x: 2, text: canvas.Cut(label, name-1, g.Ellipsis), ink: theme.Faint}, span{x: name + wide, text: readings.Figure(v, ref, g), right: true},
			span{x: name + 2*wide, text: readings.Figure(own, ref, g), right: true},
			span{x: name + 2*wide + 3, text: canvas.Cut(band+note, p.w-name-2*wide-3, g.Ellipsis), ink: theme.Faint})
	}
	root := func(v logs.Number) float64 { return float64(measures.RootOf(v)) }
	for i, e := range n.Sensors {
		v := o.Result.Innovations[i]
		own := root(n.Model[i])
		row("std "+withUnit(v.Name, v.Unit), root(e.Value), own, root(e.Low), root(e.High), own, "")
	}
	note := ""
	if !n.Apart {
		note = ", not told apart"
	}
	row("process noise Q, x", float64(n.Process.Value), 1, float64(n.Process.Low), float64(n.Process.High), 1, note)
	if words := measures.FitWords(n.Fit); words != "" {
		p.prose(2, words, theme.Text)
	}
	p.prose(2, "Taking them over is your choice: nothing was changed.", theme.Faint)
}

// chance prints how often a true model gives more.
func chance(p float64, g *theme.Glyphs) string {
	switch {
	case math.IsNaN(p):
		return "p " + g.Undefined
	case p < 1e-4:
		return "p < 0.0001"
	}
	return fmt.Sprintf("p %.4f", p)
}

func withUnit(name, unit string) string {
	if unit == "" {
		return name
	}
	return name + ", " + unit
}

// tick6 prints a time of a log.
func tick6(v float64) string {
	if math.Abs(v) < 1e9 {
		return fmt.Sprintf("%.9g", math.Round(v*1e6)/1e6)
	}
	return fmt.Sprintf("%.12g", v)
}
