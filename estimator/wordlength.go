package estimator

import (
	"errors"
	"fmt"
)

// Shortest and longest word of a rounding study, in bits with the sign.
const (
	MinWord = 8
	MaxWord = 64
)

// ErrWord reports that no word length keeps the limits.
var ErrWord = errors.New("no word is long enough")

// WordOptions say how numbers are kept on a target without floating point.
type WordOptions struct {
	// Bits is the length of every word, sign included, MinWord to MaxWord.
	Bits int
	// Common gives all matrices one binary point, and all states one; else each
	// matrix and each state has its own, as far left as its values allow.
	Common bool
	// Folded keeps F = A − L C as one matrix, x̂⁺ = F x̂ + (B − L D) u + L y, in
	// place of A, C and the gain.
	Folded bool
	// Headroom multiplies what the states are expected to reach; if zero, 1.
	Headroom float64
	// InputSize are the largest inputs, for the guard bits of the sums; nil counts
	// them as 0.
	InputSize []float64
	// States are the states' binary points, one per state; nil chooses them.
	States []Point
}

// StateWord is the word of one state.
type StateWord struct {
	Point Point
	// Reach is what the estimate is expected to reach, in the state's unit: the
	// real state of one scale and the start-up error from one scale,
	// (1 + Transient.Peak)·scale, times the headroom.
	Reach float64
	// Overflows tells that Reach is beyond the word.
	Overflows bool
	// StepOverStd compares the word's step with the noise of the state; NaN where
	// the noise is not defined or 0. Well below 1, rounding drowns in the noise.
	StepOverStd float64
}

// Words is what rounding a design to fixed point does.
type Words struct {
	Bits int
	// The matrices' binary points: Gain is that of L, in current form of Lf. Folded,
	// A is that of F and there is no C. B is that of the input matrix and of D.
	A, B, C, Gain Point
	// Lost counts the entries that are not 0 and round to 0.
	Lost int
	// Poles in the order of the design's Reached; Worst is the index of the one
	// that moves most, relatively.
	Poles  []PoleShift
	Worst  int
	Stable bool // of the rounded estimator by itself
	// Settle is the start-up time of the rounded estimator in s, as
	// Transient.Settle; NaN where that is not stable.
	Settle float64
	// Loop is the rounded estimator on the plant as modelled: rounding A and C
	// leaves a bias. Nil without a controller, where the loop is not stable even
	// unrounded, and for a folded current form.
	Loop   *Mismatch
	States []StateWord
	// Guard is the number of bits that the sum of a new state needs above the
	// integer bits of its word.
	Guard int
}

// RoundWords rounds the matrices of a discrete design to words of o.Bits bits,
// to the nearest and halves to even, and finds where the poles go. The sums are
// taken as exact. A continuous model, bits out of range and a design that does
// not fit the model are errors.
func RoundWords(m *Model, d *Design, o WordOptions) (*Words, error) {
	r, err := newRounding(m, d, o)
	if err != nil {
		return nil, err
	}
	w, err := r.poles(o.Bits)
	if err != nil {
		return nil, err
	}
	if err := r.judge(w); err != nil {
		return nil, err
	}
	r.states(w)
	return w, nil
}

// WordLimits are what a word length must keep.
type WordLimits struct {
	// Shift is the largest relative movement of a pole, > 0. Poles that stay within
	// NearZero of z = 0 do not count, and NearZero is the least size to compare with:
	// they die out within a sample or two wherever exactly they are, and several at
	// 0 spread at the slightest rounding. If zero, it is 0.1.
	Shift, NearZero float64
	// Settle is the largest relative growth of the settle time; if zero, it is not
	// judged.
	Settle float64
}

// SmallestWord returns the shortest word from MinWord to MaxWord that keeps the
// limits with a stable estimator and, where the unrounded loop is stable, a
// stable loop. o.Bits is ignored. Rounding is a lottery: a shorter word may hit
// the poles by luck, so every longer word keeps the limits on stability and poles
// as well. Where none does the error is ErrWord, with the study of the longest
// word beside it.
func SmallestWord(m *Model, d *Design, o WordOptions, limits WordLimits) (*Words, error) {
	if !(limits.Shift > 0) || !(limits.Settle >= 0) || !(limits.NearZero >= 0) {
		return nil, fmt.Errorf("limits %+v, expected numbers above 0: %w", limits, ErrMethod)
	}
	if limits.NearZero == 0 {
		limits.NearZero = 0.1
	}
	o.Bits = MaxWord
	r, err := newRounding(m, d, o)
	if err != nil {
		return nil, err
	}
	shortest := MaxWord + 1
	var w *Words
	for bits := MaxWord; bits >= MinWord; bits-- {
		if w, err = r.poles(bits); err != nil {
			return nil, err
		}
		if !w.Stable || farthest(w.Poles, limits.NearZero) > limits.Shift {
			break
		}
		shortest = bits
	}
	for bits := min(shortest, MaxWord); bits <= MaxWord; bits++ {
		if w, err = r.poles(bits); err != nil {
			return nil, err
		}
		if err := r.judge(w); err != nil {
			return nil, err
		}
		r.states(w)
		slow := limits.Settle > 0 && !(w.Settle <= d.Transient.Settle*(1+limits.Settle))
		if bits >= shortest && !slow && (w.Loop == nil || w.Loop.Stable) {
			return w, nil
		}
	}
	return w, fmt.Errorf("at %d bits a pole moves by %.2g and the start-up takes %.3g s: %w", MaxWord, farthest(w.Poles, limits.NearZero), w.Settle, ErrWord)
}
