package placement

import (
	"fmt"
	"math"

	"gonum.org/v1/gonum/blas/blas64"
)

// LeastNoise writes to dst (n×p), among the gains that give A − L C exactly the wanted
// poles, one of least Σ weightsᵢ Pᵢᵢ, where P is the steady-state covariance of the
// estimation error: F P + P Fᵀ + L R Lᵀ + W = 0, or P = F P Fᵀ + L R Lᵀ + W in discrete
// time, F = A − L C. W (n×n) and R (p×p) are symmetric and positive semidefinite, the
// weights (n) not negative. C is p×n of full row rank, (C, A) observable.
//
// Method: quasi-Newton descent over the eigenvectors as in Robust, from its choice and
// from further deterministic starts, with the gradient from the adjoint equation. The
// answer is a local minimum, the best of those found. With repeated poles the search
// goes over the block-triangular forms instead, slower and for n p ≤ 40 only; beyond
// that the gain is that of Robust and Converged is false.
//
// warm serves as in Robust. Use one per method.
//
// Errors: those of Robust and ErrUnstable, where P does not exist; dst then holds
// nothing of use.
func (s *Solver) LeastNoise(dst, a, c, w, r blas64.General, weights []float64, poles []complex128, discrete bool, warm *Warm) (Info, error) {
	if err := checkInput(dst, a, c, poles); err != nil {
		return Info{}, err
	}
	if err := checkNoise(a.Rows, c.Rows, w, r, weights); err != nil {
		return Info{}, err
	}
	for _, v := range poles {
		if !discrete && !(real(v) < 0) || discrete && !(abs(v) < 1) {
			return Info{}, fmt.Errorf("pole %v: %w", v, ErrUnstable)
		}
	}
	if err := s.pairUp(poles); err != nil {
		return Info{}, err
	}
	n, p := a.Rows, c.Rows
	q := &s.noise
	q.a, q.c, q.w, q.r, q.weights, q.discrete = a, c, w, r, weights, discrete
	q.reset(n, p)
	if !s.robust.load(a, c) {
		return Info{}, ErrSensors
	}
	if p == 1 {
		return s.leastOfOne(dst, a, c, poles, warm)
	}
	if s.robust.gather(s.list) > 1 {
		return s.quietRepeated(dst, a, c, poles, warm)
	}
	s.robust.noise = q
	info, ok := s.robust.quiet(warm)
	s.robust.noise = nil
	if !ok || !s.robust.gain(dst) {
		return s.leastOfOne(dst, a, c, poles, warm)
	}
	if warm != nil {
		warm.keep(&s.robust)
	}
	return s.finish(dst, info)
}

func checkNoise(n, p int, w, r blas64.General, weights []float64) error {
	if w.Rows != n || w.Cols != n || r.Rows != p || r.Cols != p || len(weights) != n {
		return fmt.Errorf("noise matrices %d×%d and %d×%d, %d weights: %w", w.Rows, w.Cols, r.Rows, r.Cols, len(weights), ErrShape)
	}
	for _, g := range []blas64.General{w, r} {
		if g.Stride < g.Cols || len(g.Data) < (g.Rows-1)*g.Stride+g.Cols {
			return fmt.Errorf("too little data: %w", ErrShape)
		}
		if !finite(g) {
			return fmt.Errorf("noise matrix: %w", ErrNotFinite)
		}
	}
	for _, v := range weights {
		if !(v >= 0) || math.IsInf(v, 1) {
			return fmt.Errorf("weight %g: %w", v, ErrNotFinite)
		}
	}
	return nil
}

// leastOfOne serves lists that leave no search: one sensor, or no independent
// eigenvectors.
func (s *Solver) leastOfOne(dst, a, c blas64.General, poles []complex128, warm *Warm) (Info, error) {
	info, err := s.Robust(dst, a, c, poles, nil)
	if warm != nil {
		warm.clear()
	}
	if err != nil {
		return info, err
	}
	info.Converged = c.Rows == 1
	return s.finish(dst, info)
}

// finish checks the gain and computes its cost.
func (s *Solver) finish(dst blas64.General, info Info) (Info, error) {
	q := &s.noise
	n, p := q.a.Rows, q.c.Rows
	for i := range n {
		copy(q.l[i*p:i*p+p], dst.Data[i*dst.Stride:i*dst.Stride+p])
	}
	if err := s.check.eigenvalues(dst, q.a, q.c, s.list); err != nil {
		return info, err
	}
	info.Cost = q.covariance()
	if math.IsNaN(info.Cost) {
		return info, ErrUnstable
	}
	return info, nil
}

var (
	quietRough  = stopping{squarings: powerNoise, steps: 25, gradient: 1e-5, drop: 1e-3}
	quietFine   = stopping{squarings: powerNoise, steps: 300, gradient: 1e-9, drop: 1e-12}
	quietNearby = stopping{squarings: powerNoise, steps: 40, gradient: 1e-7, drop: 1e-10}
)

// quiet finds the eigenvectors of least noise. It reports false where no independent
// ones were found.
func (r *robust) quiet(warm *Warm) (Info, bool) {
	r.nullSpaces()
	moved := warm.moved(r.groups)
	if ok, carried := warm.project(r); ok {
		rule := quietNearby
		rule.travel = restless + follow*moved
		f, steps, done := r.descend(rule, carried)
		if !math.IsInf(f, 1) {
			return Info{Condition: r.condition(), Iterations: steps, Converged: done}, true
		}
	}
	if !warm.Empty() {
		r.nullSpaces()
	}
	return r.quietCold()
}

// quietStarts is the number of cold starts: fewer where each is dear.
func (r *robust) quietStarts() int {
	if r.n > 16 {
		return 2
	}
	return 6
}

// quietCold descends from the choice of Robust, so that it cannot end noisier, and
// from scattered starts, then polishes the best.
func (r *robust) quietCold() (Info, bool) {
	info := Info{}
	best := math.Inf(1)
	seed := uint64(2)
	r.plain = append(r.plain[:0], r.frames...)
	r.quietest = grow(r.quietest, len(r.frames))
	for try := range r.quietStarts() {
		switch {
		case try > 0:
			copy(r.frames, r.plain)
			r.scatter(&seed)
			_, steps, _ := r.descend(rough, false) // away from singular eigenvectors
			info.Iterations += steps
		case r.n == r.p:
			r.normalVectors(nil)
		default:
			choice, _ := r.cold()
			info.Iterations += choice.Iterations
		}
		f, steps, _ := r.descend(quietRough, false)
		info.Iterations += steps
		if f < best {
			best = f
			copy(r.quietest, r.frames)
		}
		if r.free == 0 {
			break
		}
	}
	if math.IsInf(best, 1) {
		return info, false
	}
	copy(r.frames, r.quietest)
	_, steps, done := r.descend(quietFine, false)
	info.Iterations += steps
	info.Converged = done
	info.Condition = r.condition()
	return info, info.Condition < worstCondition
}
