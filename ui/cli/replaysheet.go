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

// place says where a figure lies to its band.
func place(v, low, high logs.Number) string {
	switch {
	case v < low:
		return "BELOW"
	case v > high:
		return "ABOVE"
	case v >= low && v <= high:
		return "inside"
	}
	return ""
}

func unitOf(unit string) string {
	if unit == "" {
		return ""
	}
	return " [" + unit + "]"
}

func (s *replaySheet) printInnovations(line func(string, ...any)) {
	line("")
	line("innovations of this gain\tmean\t95 %% of true models\t\tstd\texpected\t95 %% of true models\t")
	for _, v := range s.result.Innovations {
		line("%s%s\t%s\t%s\t%s\t%s\t%s\t%s\t%s", v.Name, unitOf(v.Unit),
			figure(float64(v.Mean)), span(v.MeanLow, v.MeanHigh), place(v.Mean, v.MeanLow, v.MeanHigh),
			figure(float64(v.Std)), figure(float64(v.StdExpected)), span(v.StdLow, v.StdHigh), place(v.Std, v.StdLow, v.StdHigh))
	}
	for _, v := range s.result.Innovations {
		out, all := 0, 0
		for j, have := range v.Autocorrelation {
			switch place(have, v.AutocorrelationLow[j], v.AutocorrelationHigh[j]) {
			case "":
				continue
			case "inside":
			default:
				out++
			}
			all++
		}
		if all > 0 {
			line("autocorrelation of %s\t%d of %d lags outside this gain's own 95 %% band (neighbouring lags go together)", v.Name, out, all)
		}
	}
	r := s.result
	line("normalised innovation squared (NIS)\t%s\t%s\t%s", figure(float64(r.NISMean)), span(r.NISLow, r.NISHigh), place(r.NISMean, r.NISLow, r.NISHigh))
}

// Largest |autocorrelation| that is called small, and moderate.
const (
	smallCorrelation    = 0.1
	moderateCorrelation = 0.3
)

// whiteWords puts a test in words: what is significant in a long log can be a trifle.
func whiteWords(w *logs.Whiteness) string {
	p, size := float64(w.P), float64(w.EffectSize)
	switch {
	case math.IsNaN(p) || math.IsNaN(size):
		return "not defined"
	case p >= 0.05:
		return "nothing speaks against white"
	case size < smallCorrelation:
		return "not white, but the correlation is small"
	case size < moderateCorrelation:
		return "not white, moderate correlation"
	}
	return "NOT WHITE, strong correlation"
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
		line("%s\t%s\t%s\t%s", w.Name, figure(float64(w.P)), figure(float64(w.EffectSize)), whiteWords(w))
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

// root is the standard deviation of a variance.
func root(v logs.Number) logs.Number { return logs.Number(math.Sqrt(float64(v))) }

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
	line("noise figures from this log\tsuggested\t95 %% confidence\tplant file")
	for i, e := range n.Sensors {
		v := s.result.Innovations[i]
		line("std of %s%s\t%s\t%s\t%s", v.Name, unitOf(v.Unit), figure(float64(root(e.Value))), span(root(e.Low), root(e.High)), figure(float64(root(n.Model[i]))))
	}
	if n.Apart {
		line("factor on the process noise Q\t%s\t%s\t1", figure(float64(n.Process.Value)), span(n.Process.Low, n.Process.High))
	} else {
		line("factor on the process noise Q\tnot to be told from the sensors' noise\t\t1")
	}
	fit := float64(n.Fit)
	words := "the noise figures alone can explain this log"
	if fit < 0.05 {
		words = "noise figures ALONE DO NOT explain this log: look at the model"
	}
	if !math.IsNaN(fit) {
		line("fit\tp %.3g\t%s", fit, words)
	}
	line("(std of one sample, quantisation included; taking figures over is your choice, no file was changed)")
}
