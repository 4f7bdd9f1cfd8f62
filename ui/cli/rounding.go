package cli

import (
	"errors"
	"fmt"

	"polewright/estimator"
)

// What a fixed-point word has to keep, and the largest design that is examined
// for it.
const (
	wordPoleShift = 0.01
	wordNearZero  = 0.1
	wordSettle    = 0.1
	wordMaxStates = 50
)

// printRounding says which pole rounding moves most, and how long a fixed-point
// word has to be.
func (t *task) printRounding(line func(string, ...any)) {
	d, m := t.design, t.Model
	most := ""
	if shifts, worst, err := estimator.Float32Poles(m, d); err == nil && shifts[worst].Distance > 0 {
		most = ", most at " + shown(shifts[worst].From, t.plane, m.Period)
	}
	line("pole shift in float32\t%s relative%s", figure(d.Float32Shift), most)
	if !m.Discrete() || !d.Stable || len(d.Reached) > wordMaxStates {
		return
	}
	w, err := estimator.SmallestWord(m, d, estimator.WordOptions{}, estimator.WordLimits{Shift: wordPoleShift, NearZero: wordNearZero, Settle: wordSettle})
	switch {
	case err == nil:
		line("shortest fixed-point word\t%d bits: A in %v, gain in %v, C in %v", w.Bits, w.A, w.Gain, w.C)
		line("\t(no pole outside %g of z = 0 moves by more than %g %%, the start-up takes at most %g %% longer)",
			wordNearZero, 100*wordPoleShift, 100*wordSettle)
	case errors.Is(err, estimator.ErrWord):
		line("shortest fixed-point word\tnone up to %d bits keeps every pole within %g %%", estimator.MaxWord, 100*wordPoleShift)
	default:
		line("shortest fixed-point word\t%s", fmt.Sprintf("not judged: %s", oneLine(err)))
	}
}
