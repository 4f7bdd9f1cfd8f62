// Package placement finds estimator gains L that give A − L C wanted eigenvalues.
//
// It works on the dual problem: with M = Aᵀ, B = Cᵀ and K = Lᵀ, the matrix
// M − B K is the transpose of A − L C, and its right eigenvectors are the left
// eigenvectors of A − L C.
package placement

import (
	"errors"
	"fmt"
	"math"
	"math/cmplx"

	"gonum.org/v1/gonum/blas/blas64"
)

// Errors of the Solver.
var (
	ErrShape        = errors.New("matrices and poles do not fit together")
	ErrNotFinite    = errors.New("a number is not finite")
	ErrRange        = errors.New("the numbers are too large or too small to be squared")
	ErrPairs        = errors.New("a complex pole has no conjugate partner")
	ErrUnobservable = errors.New("the sensors do not see every mode")
	ErrSensors      = errors.New("the sensors are linearly dependent")
	ErrUnstable     = errors.New("the noise of an unstable estimator has no limit")
	ErrNotReached   = errors.New("the poles are not reached in double precision")
)

// Info tells how Robust went.
type Info struct {
	// Condition is the 2-norm condition number of the unit-length left
	// eigenvectors of A − L C; NaN where a wanted multiplicity exceeds the
	// attainable number of eigenvectors.
	Condition float64
	// Cost is Σ weightsᵢ Pᵢᵢ of LeastNoise; 0 from Robust.
	Cost float64
	// Iterations counts the steps of the descent, over all starts.
	Iterations int
	// Converged is false where the descent was cut short; the gain still gives
	// the wanted poles, only its condition number might be better.
	Converged bool
}

// Solver places poles. The zero value is ready; it owns its workspaces and must
// not be used by two goroutines at once.
type Solver struct {
	one    single
	robust robust
	noise  noise
	check  checker
	list   []pole
	used   []bool
}

// pole is one real wanted eigenvalue, or the upper one of a conjugate pair.
type pole struct {
	at   complex128
	pair bool
}

// width is the number of eigenvalues that a pole stands for.
func (p pole) width() int {
	if p.pair {
		return 2
	}
	return 1
}

// checkInput refuses what no later step should see.
func checkInput(dst, a, c blas64.General, poles []complex128) error {
	n, p := a.Rows, c.Rows
	if n < 1 || p < 1 || p > n || a.Cols != n || c.Cols != n || dst.Rows != n || dst.Cols != p || len(poles) != n {
		return fmt.Errorf("matrix A is %d×%d, C is %d×%d, L is %d×%d, %d poles: %w",
			n, a.Cols, p, c.Cols, dst.Rows, dst.Cols, len(poles), ErrShape)
	}
	for _, g := range []blas64.General{dst, a, c} {
		if g.Stride < g.Cols || len(g.Data) < (g.Rows-1)*g.Stride+g.Cols {
			return fmt.Errorf("too little data: %w", ErrShape)
		}
	}
	for _, g := range []blas64.General{a, c} {
		if !finite(g) {
			return fmt.Errorf("matrix: %w", ErrNotFinite)
		}
	}
	for _, v := range poles {
		if cmplx.IsNaN(v) || cmplx.IsInf(v) {
			return fmt.Errorf("pole: %w", ErrNotFinite)
		}
	}
	speed := largestOf(a)
	for _, v := range poles {
		speed = math.Max(speed, math.Max(math.Abs(real(v)), math.Abs(imag(v))))
	}
	for _, size := range []float64{speed, largestOf(c)} {
		if size > 1e120 || size < 1e-120 && size != 0 {
			return fmt.Errorf("size %.2g: %w", size, ErrRange)
		}
	}
	return nil
}

func largestOf(g blas64.General) float64 {
	m := 0.0
	for i := range g.Rows {
		m = math.Max(m, largest(g.Data[i*g.Stride:i*g.Stride+g.Cols]))
	}
	return m
}

func finite(g blas64.General) bool {
	for i := range g.Rows {
		for _, v := range g.Data[i*g.Stride : i*g.Stride+g.Cols] {
			if math.IsNaN(v) || math.IsInf(v, 0) {
				return false
			}
		}
	}
	return true
}

// pairUp writes the poles to list with each conjugate pair as one entry, in the
// order given. Partners may differ by 1e-9 relative; their mean counts. An imaginary
// part of rounding size counts as zero.
func (s *Solver) pairUp(poles []complex128) error {
	s.list = s.list[:0]
	s.used = grow(s.used, len(poles))
	clear(s.used)
	for i, v := range poles {
		if s.used[i] {
			continue
		}
		if math.Abs(imag(v)) <= 0x1p-50*math.Abs(real(v)) {
			s.list = append(s.list, pole{at: complex(real(v), 0)})
			continue
		}
		best := -1
		for j := i + 1; j < len(poles); j++ {
			if !s.used[j] && imag(poles[j])*imag(v) < 0 &&
				(best < 0 || cmplx.Abs(poles[j]-cmplx.Conj(v)) < cmplx.Abs(poles[best]-cmplx.Conj(v))) {
				best = j
			}
		}
		if best < 0 || cmplx.Abs(poles[best]-cmplx.Conj(v)) > 1e-9*cmplx.Abs(v) {
			return fmt.Errorf("%v: %w", v, ErrPairs)
		}
		s.used[best] = true
		mean := (v + cmplx.Conj(poles[best])) / 2
		s.list = append(s.list, pole{at: complex(real(mean), math.Abs(imag(mean))), pair: true})
	}
	return nil
}

// grow returns a slice of length n, reusing the capacity of s. Its content is
// unspecified.
func grow[T any](s []T, n int) []T {
	if cap(s) < n {
		return make([]T, n)
	}
	return s[:n]
}
