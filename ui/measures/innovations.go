package measures

import (
	"math"

	"polewright/scenarios/logs"
)

// Place says where a figure lies to its band: "inside", "BELOW", "ABOVE", or nothing
// where one of them is not defined.
func Place(v, low, high logs.Number) string {
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

// OutsideLags counts the lags whose autocorrelation is outside its band, and those
// that have one.
func OutsideLags(v *logs.Innovation) (out, all int) {
	for j, have := range v.Autocorrelation {
		switch Place(have, v.AutocorrelationLow[j], v.AutocorrelationHigh[j]) {
		case "BELOW", "ABOVE":
			out++
			all++
		case "inside":
			all++
		}
	}
	return out, all
}

// Largest |autocorrelation| that is called small, and moderate.
const (
	smallCorrelation    = 0.1
	moderateCorrelation = 0.3
)

// WhiteWords puts a test in words: what is significant in a long log can be a trifle.
func WhiteWords(w *logs.Whiteness) string {
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

// FitWords puts in words what Fit of the noise figures of a log means; empty where
// it is not defined.
func FitWords(fit logs.Number) string {
	switch {
	case math.IsNaN(float64(fit)):
		return ""
	case fit < 0.05:
		return "noise figures ALONE DO NOT explain this log: look at the model"
	}
	return "the noise figures alone can explain this log"
}

// RootOf is the standard deviation of a variance.
func RootOf(v logs.Number) logs.Number { return logs.Number(math.Sqrt(float64(v))) }
