package cli

import (
	"fmt"
	"maps"
	"math"
	"slices"
	"strings"

	"github.com/spf13/cobra"

	"polewright/estimator"
	"polewright/plants"
)

// designOptions are shared by the commands that need one design.
type designOptions struct {
	poles, useGain, plane, gain, form, scenario string
	candidate                                   string
	period                                      float64
	json                                        bool
}

func (o *designOptions) register(cmd *cobra.Command) {
	f := cmd.Flags()
	f.StringVar(&o.poles, "poles", "", `wanted poles: "-4±3i, -6, -8x2", "10@0.7", butterworth@W, bessel@W, equal@W, plant*K, controller*K or floor`)
	f.StringVar(&o.useGain, "use-gain", "", `judge this gain instead: "[[0.4],[2.1]]" or a JSON file (n x p, prediction form)`)
	f.StringVar(&o.plane, "plane", "", "plane the poles are given in: s or z (default: s for a continuous plant, z for a discrete one)")
	f.StringVar(&o.gain, "gain", "robust", "robust (best-conditioned eigenvectors) or least-noise")
	f.StringVar(&o.form, "form", "prediction", "prediction or current (discrete estimators)")
	f.StringVar(&o.scenario, "scenario", "", "scenario name (built-in plants) or file: its limits are judged")
	f.Float64Var(&o.period, "period", 0, "sample period in seconds in place of the plant file's; 0 drops it")
	f.StringVar(&o.candidate, "candidate", "", "with a session in place of PLANT: the candidate whose stored gain is used")
	f.BoolVar(&o.json, "json", false, "print JSON with every figure")
	cmd.MarkFlagsMutuallyExclusive("poles", "use-gain", "candidate")
	for name, words := range map[string][]string{
		"plane": {"s", "z"}, "gain": {"robust", "least-noise"}, "form": {"prediction", "current"},
	} {
		words := words
		cobra.CheckErr(cmd.RegisterFlagCompletionFunc(name, cobra.FixedCompletions(words, cobra.ShellCompDirectiveNoFileComp)))
	}
}

// usageError is a wrong option.
func usageError(option, wrong, expected string) error {
	return &plants.Error{Where: "--" + option, Wrong: wrong, Expected: expecting(expected)}
}

// expecting begins what is expected with that word where it does not yet.
func expecting(text string) string {
	if strings.Contains(text, "expected") {
		return text
	}
	return "expected " + text
}

// word looks up the word given for an option.
func word[T any](option, have string, list map[string]T) (T, error) {
	v, ok := list[have]
	if !ok {
		return v, usageError(option, fmt.Sprintf("%q", have), strings.Join(slices.Sorted(maps.Keys(list)), " or "))
	}
	return v, nil
}

// methods are the words of --gain.
var methods = map[string]estimator.Method{"robust": estimator.Robust, "least-noise": estimator.LeastNoise}

// designer reads the options that say what kind of estimator is wanted.
func (o *designOptions) designer() (estimator.Options, error) {
	form, err := word("form", o.form, map[string]estimator.Form{"prediction": estimator.Prediction, "current": estimator.Current})
	if err != nil {
		return estimator.Options{}, err
	}
	method, err := word("gain", o.gain, methods)
	return estimator.Options{Form: form, Method: method}, err
}

// model reads the options that change the design model.
func (o *designOptions) model(cmd *cobra.Command) (plants.Options, error) {
	return periodOption(cmd, &o.period)
}

func periodOption(cmd *cobra.Command, period *float64) (plants.Options, error) {
	if !cmd.Flags().Changed("period") {
		return plants.Options{}, nil
	}
	if *period < 0 || math.IsNaN(*period) || math.IsInf(*period, 0) {
		return plants.Options{}, usageError("period", fmt.Sprintf("%g", *period), "seconds above 0, or 0 for none")
	}
	return plants.Options{Period: period}, nil
}

func (o *designOptions) choosePlane(p *plants.Plant, m *estimator.Model) (string, error) {
	switch o.plane {
	case "":
		if p.Continuous {
			return "s", nil
		}
		return "z", nil
	case "s":
		return "s", nil
	case "z":
		if !m.Discrete() {
			return "", usageError("plane", "z for an estimator in continuous time", "s, or a sample period")
		}
		return "z", nil
	}
	return "", usageError("plane", fmt.Sprintf("%q", o.plane), "s or z")
}
