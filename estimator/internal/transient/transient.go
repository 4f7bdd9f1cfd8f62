// Package transient finds how long the error of an estimator takes to die out
// and how large it becomes on the way, from the 2-norm of its transition matrix.
package transient

import (
	"errors"
	"fmt"
	"math"

	"gonum.org/v1/gonum/blas/blas64"
)

// Level is the norm at which the transient counts as over.
const Level = 0.02

const (
	smooth    = 0.15 // largest second difference of a step, relative
	tolerance = 1e-5 // relative accuracy of the peak
	fine      = 3e-3 // bend below which a parabola is as accurate
	most      = 20000
	levels    = 46 // beyond, rounding decides whether it dies out
)

var (
	// ErrShape is returned for a matrix that is empty or not square, or a mask
	// of another length.
	ErrShape = errors.New("transient: the error matrix is not square")
	// ErrNotFinite is returned for NaN, infinities and a bad period.
	ErrNotFinite = errors.New("transient: a value is not finite")
	// ErrUnstable is returned where the error does not die out.
	ErrUnstable = errors.New("transient: the error does not die out")
)

// Solver holds the workspace; its zero value is ready. It is not safe for use by
// several goroutines at once, and does not allocate after the first matrix of a
// size.
//
// The transition matrix runs over times k·h with whole k. The steps E_j =
// Φ(2ʲh) − I come from each other by squaring, E_{j+1} = 2 E_j + E_j², which keeps
// slow modes accurate beside fast ones (as in scaling and squaring, Moler & Van
// Loan 2003). A step doubles while Φ bends little over it, so that fast modes
// cost steps only while they live. Where a step could hide the peak or the last
// crossing of Level, judged by the bend, it is halved down to h.
type Solver struct {
	n        int
	discrete bool
	keep     []int       // kept rows and columns
	first    []int       // per row the first column that F and all its functions fill
	steps    [][]float64 // E_j
	mids     [][]float64 // middle of the interval under examination at level j
	at, next []float64
	gram     spectral

	peak     float64
	last     int64   // last k known to be above Level
	fraction float64 // of h after last where the norm falls to Level, continuous
}

// Settle returns the time after which the 2-norm of Φ stays at or below Level,
// and the largest norm from time 0 on. Continuous (period 0): Φ(t) = exp(F·t), t
// in seconds; both figures are accurate to about 1e-5. Discrete: Φ = Fᵏ at time
// k·period, settle is a whole number of periods. keep, of length n or nil for
// all, says which rows and columns of Φ the norm looks at. f, n×n, is not
// changed.
//
// Where the transient has more than 20000 steps (damping below about 3e-4), the
// settle time comes from a bisection that takes the envelope over 64 steps as
// falling.
//
// A real Schur form in place of F, which has the same norms, takes a third of the work.
func (s *Solver) Settle(f blas64.General, period float64, keep []bool) (settle, peak float64, err error) {
	if err := s.load(f, period, keep); err != nil {
		return math.NaN(), math.NaN(), err
	}
	if len(s.keep) == 0 {
		return 0, 0, nil
	}
	h, err := s.prepare(f, period)
	if err != nil {
		return math.NaN(), math.NaN(), err
	}
	if err := s.run(); err != nil {
		return math.NaN(), math.NaN(), err
	}
	if s.discrete {
		return float64(s.last+1) * period, s.peak, nil
	}
	return (float64(s.last) + s.fraction) * h, s.peak, nil
}

// load checks the input and sizes the workspace.
func (s *Solver) load(f blas64.General, period float64, keep []bool) error {
	n := f.Rows
	if n == 0 || f.Cols != n || f.Stride < n || len(f.Data) < (n-1)*f.Stride+n {
		return ErrShape
	}
	if keep != nil && len(keep) != n {
		return fmt.Errorf("%w: %d rows but %d marks of what to keep", ErrShape, n, len(keep))
	}
	if !(period >= 0) || math.IsInf(period, 0) {
		return fmt.Errorf("%w: period %v", ErrNotFinite, period)
	}
	for i := range n {
		for _, v := range f.Data[i*f.Stride : i*f.Stride+n] {
			if math.IsNaN(v) || math.IsInf(v, 0) {
				return ErrNotFinite
			}
		}
	}
	if s.n != n {
		*s = Solver{n: n, at: make([]float64, n*n), next: make([]float64, n*n), keep: make([]int, 0, n), first: make([]int, n)}
		s.gram.reset(n)
	}
	s.findBlocks(f)
	s.discrete = period > 0
	s.keep = s.keep[:0]
	for i := range n {
		if keep == nil || keep[i] {
			s.keep = append(s.keep, i)
		}
	}
	return nil
}

// findBlocks fills first: the starts of the diagonal blocks of order 1 and 2 where f is
// triangular but for these, a form that sums and products keep; else zeros.
func (s *Solver) findBlocks(f blas64.General) {
	for i := range s.n {
		row := f.Data[i*f.Stride : i*f.Stride+s.n]
		s.first[i] = i
		for j, v := range row[:i] {
			if v == 0 {
				continue
			}
			if j < i-1 || s.first[i-1] != i-1 { // deeper, or a block of order 3
				clear(s.first)
				return
			}
			s.first[i] = j
		}
	}
}

// step returns the storage of E_j, mid that of the middle of level j.
func (s *Solver) step(j int) []float64 {
	for len(s.steps) <= j {
		s.steps = append(s.steps, make([]float64, s.n*s.n))
	}
	return s.steps[j]
}

func (s *Solver) mid(j int) []float64 {
	for len(s.mids) <= j {
		s.mids = append(s.mids, make([]float64, s.n*s.n))
	}
	return s.mids[j]
}
