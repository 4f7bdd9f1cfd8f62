package estimator

import (
	"errors"
	"fmt"
	"math"
	"runtime"

	"gonum.org/v1/gonum/mat"
)

// ErrRange reports numbers too large, too small or too far apart to compute with.
var ErrRange = errors.New("beyond what can be computed with")

// largest sizes: of a number that is given, and of the scaled matrices, whose products
// of three must still be numbers. Balancing and singular values of package lapack can
// run forever where a norm overflows.
const (
	mostGiven  = 1e100
	mostScaled = 1e60
	mostNoise  = 1e120
)

// size returns the largest magnitude in a, NaN where it holds one.
func size(a mat.Matrix) float64 {
	most := 0.0
	r, c := a.Dims()
	for i := range r {
		for j := range c {
			v := math.Abs(a.At(i, j))
			if math.IsNaN(v) {
				return v
			}
			most = max(most, v)
		}
	}
	return most
}

// checkEntries refuses what is no number or too large to be squared.
func checkEntries(name string, a mat.Matrix) error {
	switch s := size(a); {
	case math.IsNaN(s) || math.IsInf(s, 0):
		return fmt.Errorf("%s: %w", name, ErrNotFinite)
	case s > mostGiven:
		return fmt.Errorf("%s has an entry of the size %.1g, expected at most %.0g: %w", name, s, mostGiven, ErrRange)
	}
	return nil
}

// checkScaled refuses sizes that only the scales bring about.
func checkScaled(name string, a mat.Matrix, most float64) error {
	if s := size(a); !(s <= most) {
		return fmt.Errorf("%s, in the units of the given scales, has an entry of the size %.1g, expected at most %.0g: %w", name, s, most, ErrRange)
	}
	return nil
}

// guard turns the panics of package lapack, which are strings, and of package mat into
// an error: they give up in this way where an iteration does not converge.
func guard(err *error) {
	switch p := recover().(type) {
	case nil:
	case runtime.Error:
		panic(p)
	case string:
		*err = fmt.Errorf("numbers too far apart (%s): %w", p, ErrRange)
	case mat.Error:
		*err = fmt.Errorf("numbers too far apart (%v): %w", p, ErrRange)
	default:
		panic(p)
	}
}
