package lines

import (
	"fmt"
	"math"
	"strings"

	"polewright/estimator/poles"
	"polewright/ui/measures"
	"polewright/ui/plane/targets"
	"polewright/ui/readings"
)

// figure prints four digits, or says that there is no number.
func figure(v float64) string {
	switch {
	case math.IsNaN(v):
		return "undefined"
	case math.IsInf(v, 0):
		return "unlimited"
	}
	return fmt.Sprintf("%.4g", v)
}

func (d *dialogue) showHeld() {
	if len(d.now.set.List) == 0 {
		d.say("no pole can be moved: the sensors see none of the modes")
		return
	}
	t := d.now.set.List[d.now.held]
	what := "pole"
	if t.Pair {
		what = "pair"
	}
	about := poles.Describe(t.At, d.period())
	at, ok := targets.Shown(t.At, d.plane, d.period())
	place := "z = 0"
	if ok {
		place = fmt.Sprintf("%.5g", real(at))
		if t.Pair {
			place += fmt.Sprintf(" +- %.5gi", imag(at))
		}
		if d.plane == targets.S {
			place += " rad/s"
		}
	}
	d.say("%s %d of %d at %s, frequency %s rad/s, damping %s, time constant %s s", what, d.now.held+1, len(d.now.set.List),
		place, figure(about.Frequency), figure(about.Damping), figure(about.TimeConstant))
}

// brief is what every change says.
func (d *dialogue) brief() {
	d.figures()
	d.limits(false)
}

func (d *dialogue) figures() {
	a := d.now.answer
	design := a.Design
	if a.Err != nil {
		d.say("no run: %s", clean(a.Err.Error()))
	}
	if !design.Stable {
		d.say("unstable: noise and start-up are not defined")
		return
	}
	d.say("settles in %s s, peak %s, noise %s x floor", figure(design.Transient.Settle), figure(design.Transient.Peak), figure(design.Noise.OverFloorRMS))
}

// limits says which limits are broken, or all of them.
func (d *dialogue) limits(all bool) {
	list := d.now.answer.Limits
	if len(list) == 0 {
		return
	}
	broken := 0
	for _, l := range list {
		if !l.Met {
			broken++
		}
	}
	d.say("%d of %d limits broken", broken, len(list))
	for _, l := range list {
		if l.Met && !all {
			continue
		}
		word, side := "ok", "at most"
		if !l.Met {
			word = "broken"
		}
		if l.AtLeast {
			side = "at least"
		}
		d.say("  %s: %s, %s, %s %s", word, l.Name, figure(l.Value), side, figure(l.Limit))
	}
}

// show is everything about the design in hand.
func (d *dialogue) show() {
	b, design := d.Work.Bench, d.now.answer.Design
	d.say("%s, %s form, %s gain", d.title(), measures.FormName(design.Form), measures.MethodName(design.Method))
	for i, t := range d.now.set.List {
		at, ok := targets.Shown(t.At, d.plane, d.period())
		switch {
		case !ok:
			d.say("pole %d: z = 0", i+1)
		case t.Pair:
			d.say("pair %d: %.6g +- %.6gi", i+1, real(at), imag(at))
		default:
			d.say("pole %d: %.6g", i+1, real(at))
		}
	}
	for i := range b.Model.StateNames {
		row := make([]string, 0, 4)
		for j, sensor := range b.Model.SensorNames {
			row = append(row, fmt.Sprintf("%s from %s", figure(design.Gain.At(i, j)), sensor))
		}
		d.say("gain of %s: %s", b.Model.StateNames[i], strings.Join(row, ", "))
	}
	if design.Stable && design.Noise.Std != nil {
		for i, name := range b.Model.StateNames {
			d.say("noise of %s: %s %s, %s x floor", name, figure(design.Noise.Std[i]), readings.StateUnit(b, i), figure(design.Noise.OverFloor[i]))
		}
	}
	d.figures()
	d.limits(true)
	if l := design.Loop; l != nil && l.Stable {
		d.say("loop: phase margin %s deg, gain margin %s to %s dB, delay margin %s s, sensitivity peak %s", figure(l.PhaseMargin),
			figure(l.GainMarginBelow), figure(l.GainMarginAbove), figure(l.DelayMargin), figure(l.SensitivityPeak))
	}
	d.say("eigenvector condition %s", figure(design.EigenvectorCondition))
	for _, w := range design.Warnings {
		d.say("note: %s", clean(w))
	}
}

func (d *dialogue) compare() {
	if len(d.candidates) == 0 {
		d.say("no candidate yet; keep makes one")
		return
	}
	for _, c := range d.candidates {
		met := 0
		for _, l := range c.Limits {
			if l.Met {
				met++
			}
		}
		mark := ""
		if c.Letter == d.current {
			mark = ", in hand"
		}
		d.say("%s: settles in %s s, peak %s, noise %s x floor, gain norm %s, %d of %d limits met%s", c.Letter, figure(c.Design.Transient.Settle),
			figure(c.Design.Transient.Peak), figure(c.Design.Noise.OverFloorRMS), figure(c.Design.GainNorm), met, len(c.Limits), mark)
	}
}

func (d *dialogue) help() {
	for _, v := range verbs() {
		d.say("%s: %s", strings.TrimSpace(strings.Join(v.names, ", ")+" "+v.args), v.does)
	}
	d.say("%s", measures.Caution)
	d.say("Feed the estimator the input that is actually applied; reject NaN and samples out of range; wait out the settle time before closing the loop.")
}
