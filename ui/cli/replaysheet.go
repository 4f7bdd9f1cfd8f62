package cli

import (
	"errors"
	"fmt"
	"io"
	"math"
	"strings"
	"text/tabwriter"

	"polewright/scenarios"
	"polewright/scenarios/logs"
	"polewright/ui/measures"
)

// replaySheet is what replay prints for a person.
type replaySheet struct {
	task    *task
	options *replayOptions
	survey  *logs.Survey
	result  *logs.Result
	noise   *logs.NoiseFigures
	noNoise error
	best    *swept   // nil without --sweep
	skip    *float64 // s; nil for a tenth
	limits  []scenarios.LimitResult
}

func (s *replaySheet) print(w io.Writer) error {
	tw := tabwriter.NewWriter(w, 0, 8, 2, ' ', 0)
	line := func(format string, args ...any) { fmt.Fprintf(tw, format+"\n", args...) }
	line("%s, every %g s, %s form", s.task.Plant.Name, s.task.Model.Period, measures.FormName(s.task.design.Form))
	s.printLog(line)
	s.printInnovations(line)
	s.printWhiteness(line)
	s.printReferences(line)
	s.printNoise(line)
	if s.best != nil {
		s.printSweep(line)
	}
	if len(s.limits) > 0 {
		line("")
		line("limit\tvalue\tlimit\t")
		for _, l := range s.limits {
			met := "met"
			if !l.Met {
				met = "NOT MET"
			}
			line("%s\t%s\t%s\t%s", l.Name, figure(l.Value), figure(l.Limit), met)
		}
	}
	line("")
	for _, text := range s.result.Warnings {
		line("note: %s", text)
	}
	for _, text := range s.task.design.Warnings {
		line("note on the design: %s", text)
	}
	if s.options.out != "" {
		line("written: %s", s.options.out)
	}
	line("%s", measures.Caution)
	return tw.Flush()
}

func (s *replaySheet) printLog(line func(string, ...any)) {
	v, r := s.survey, s.result
	line("")
	line("log\t%s", s.options.log)
	line("samples\t%d, %d of them in the statistics", r.Samples, r.Counted)
	line("time\t%g to %g s", v.Start, v.End)
	resampled := ""
	if v.Resampled {
		resampled = fmt.Sprintf("; last values held on %g s", s.task.Model.Period)
	}
	line("period\t%s s, largest jitter %.2g %%%s", figure(v.Period), 100*v.Jitter, resampled)
	line("rows missing\t%d", r.Missing)
	for i, n := range r.Lost {
		if n > 0 || len(r.Lost) == 1 {
			line("lost\t%d of %s", n, r.Innovations[i].Name)
		}
	}
	if sumOf(r.Lost) == 0 && len(r.Lost) > 1 {
		line("lost\t0")
	}
	if r.Held > 0 {
		line("inputs held\t%d rows without one", r.Held)
	}
	if len(v.PassedOver) > 0 {
		line("columns left out\t%s", strings.Join(v.PassedOver, ", "))
	}
}

func sumOf(list []int64) (n int64) {
	for _, v := range list {
		n += v
	}
	return n
}

// span is a band of 95 in 100.
func span(low, high logs.Number) string {
	if math.IsNaN(float64(low)) || math.IsNaN(float64(high)) {
		return "–"
	}
	return figure(float64(low)) + " to " + figure(float64(high))
}

func unitOf(unit string) string {
	if unit == "" {
		return ""
	}
	return " [" + unit + "]"
}

func (s *replaySheet) printInnovations(line func(string, ...any)) {
	r := s.result
	line("")
	line("innovations of this gain\tmeasured\texpected\t95 of 100 true logs\t")
	row := func(what string, v, expected, low, high logs.Number) {
		line("%s\t%s\t%s\t%s\t%s", what, figure(float64(v)), figure(float64(expected)), span(low, high), measures.Place(v, low, high))
	}
	for _, v := range r.Innovations {
		row(v.Name+unitOf(v.Unit)+", mean", v.Mean, 0, v.MeanLow, v.MeanHigh)
		row(v.Name+unitOf(v.Unit)+", std", v.Std, v.StdExpected, v.StdLow, v.StdHigh)
	}
	row("normalised squared (NIS), mean", r.NISMean, logs.Number(len(r.Innovations)), r.NISLow, r.NISHigh)
	for i := range r.Innovations {
		if out, all := measures.OutsideLags(&r.Innovations[i]); all > 0 {
			line("%s, autocorrelation\t%d of %d lags outside this gain's own 95 %% band (neighbours go together)", r.Innovations[i].Name, out, all)
		}
	}
}

func (s *replaySheet) printWhiteness(line func(string, ...any)) {
	if len(s.result.Whiteness) == 0 {
		return
	}
	line("")
	line("only the floor gain's innovations are white, and only if model and noise figures are right")
	line("whiteness at the floor gain\tp\tlargest |autocorrelation|\t")
	for i := range s.result.Whiteness {
		w := &s.result.Whiteness[i]
		line("%s\t%s\t%s\t%s", w.Name, figure(float64(w.P)), figure(float64(w.EffectSize)), measures.WhiteWords(w))
	}
}

func (s *replaySheet) printReferences(line func(string, ...any)) {
	if len(s.result.References) == 0 {
		return
	}
	line("")
	line("estimate - reference\trms\tbias\tsamples")
	for _, c := range s.result.References {
		line("%s%s\t%s\t%s\t%d", c.Name, unitOf(c.Unit), figure(float64(c.RMS)), figure(float64(c.Bias)), c.Count)
	}
}

func (s *replaySheet) printNoise(line func(string, ...any)) {
	line("")
	if s.noNoise != nil {
		why := s.noNoise.Error()
		if errors.Is(s.noNoise, logs.ErrTooFew) || errors.Is(s.noNoise, logs.ErrNoFit) {
			line("noise figures from this log\tnone: %s", why)
			return
		}
		line("noise figures from this log\tnone: the estimator cannot tell them (%s)", why)
		return
	}
	n := s.noise
	line("noise figures from this log\tsuggested\tplant file\t95 %% confidence")
	for i, e := range n.Sensors {
		v := s.result.Innovations[i]
		line("std of %s%s\t%s\t%s\t%s", v.Name, unitOf(v.Unit), figure(float64(measures.RootOf(e.Value))), figure(float64(measures.RootOf(n.Model[i]))), span(measures.RootOf(e.Low), measures.RootOf(e.High)))
	}
	apart := ""
	if !n.Apart {
		apart = ", not to be told from the sensors' noise"
	}
	line("factor on the process noise Q\t%s\t1\t%s%s", figure(float64(n.Process.Value)), span(n.Process.Low, n.Process.High), apart)
	if words := measures.FitWords(n.Fit); words != "" {
		line("fit\tp %.3g\t%s", float64(n.Fit), words)
	}
	line("(std of one sample, quantisation included; taking figures over is your choice, no file was changed)")
}

// printSweep says which speed predicts the log best.
func (s *replaySheet) printSweep(line func(string, ...any)) {
	unit := ""
	if len(s.result.Innovations) == 1 {
		unit = unitOf(s.result.Innovations[0].Unit)
	}
	skipped := (s.survey.End - s.survey.Start) / 10
	if s.skip != nil {
		skipped = *s.skip
	}
	s.best.print(line, unit, skipped)
}
