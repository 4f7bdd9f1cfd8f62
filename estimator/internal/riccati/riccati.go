// Package riccati finds the stabilising solutions of the filter Riccati
// equations, or says in plain words why there is none.
//
// Method: balance, decide existence from the modes on and beyond the stability
// limit, solve by the structure-preserving doubling of Chu, Fan, Lin & Wang,
// "Structure-preserving algorithms for periodic discrete-time algebraic Riccati
// equations", Int. J. Control 77 (2004), in continuous time after the Cayley
// transform of Chu, Fan & Lin, "A structure-preserving doubling algorithm for
// continuous-time algebraic Riccati equations", Linear Algebra Appl. 396
// (2005). Then improve by Newton's method: Kleinman, "On an iterative technique
// for Riccati equation computations", IEEE Trans. Automatic Control 13 (1968),
// and Hewer, "An iterative technique for the computation of the steady state
// gains for the discrete optimal regulator", same journal, 16 (1971).
package riccati

import (
	"errors"
	"fmt"
	"math"
	"math/cmplx"

	"gonum.org/v1/gonum/blas/blas64"
	"gonum.org/v1/gonum/mat"
)

// Solution is a stabilising solution.
type Solution struct {
	// P is the n×n covariance: of the error (continuous), of the prediction
	// error (discrete).
	P *mat.Dense
	// L is the n×p gain: P Cᵀ R⁻¹, or A P Cᵀ (C P Cᵀ + R)⁻¹.
	L *mat.Dense
	// Poles are the n eigenvalues of A − L C, all strictly stable.
	Poles []complex128
	// Residual is the Frobenius norm of what is left of the equation, in
	// balanced coordinates, relative to the size of its terms: ‖A‖ ‖P‖ and so
	// on.
	Residual float64
}

// Absence is the error where there is no stabilising solution.
type Absence struct {
	// Reason says why, in a sentence without a capital or a full stop.
	Reason string
}

func (a *Absence) Error() string { return a.Reason }

func absent(format string, args ...any) *Absence {
	return &Absence{Reason: fmt.Sprintf(format, args...)}
}

// Continuous returns the stabilising solution of
//
//	A P + P Aᵀ − P Cᵀ R⁻¹ C P + W = 0.
//
// a is n×n, c p×n, w n×n positive semi-definite, r p×p positive definite; time
// in seconds. (An indefinite w is tried all the same: P is then what makes the
// poles stable, but no covariance.) It exists where (C, A) is detectable and (A, W^½) has no
// unreachable mode on the imaginary axis; else the error is an *Absence.
// Wrong shapes and numbers that are not finite are other errors.
func Continuous(a, c, w, r blas64.General) (*Solution, error) {
	return solve(a, c, w, r, false)
}

// Discrete returns the stabilising solution of
//
//	P = A P Aᵀ − A P Cᵀ (C P Cᵀ + R)⁻¹ C P Aᵀ + W.
//
// a is n×n, c p×n, w n×n and r p×p positive semi-definite. R may be singular
// so long as C P Cᵀ + R is not. It exists where (C, A) is detectable and
// (A, W^½) has no unreachable mode on the unit circle; a singular R asks for
// more, which is found out by trying. Else the error is an *Absence. Wrong
// shapes and numbers that are not finite are other errors.
func Discrete(a, c, w, r blas64.General) (*Solution, error) {
	return solve(a, c, w, r, true)
}

func solve(a, c, w, r blas64.General, discrete bool) (*Solution, error) {
	p := &problem{discrete: discrete}
	if err := p.read(a, c, w, r); err != nil {
		return nil, err
	}
	p.scale()
	if err := p.examine(); err != nil {
		return nil, err
	}
	x, err := p.start()
	if err != nil {
		return nil, err
	}
	return p.finish(x)
}

// problem is the equation in scaled coordinates: the state divided by the
// powers of two in d, the sensors by those in e.
type problem struct {
	discrete   bool
	n, p       int
	a, c, w, r *mat.Dense
	d, e       []float64
	unit       float64 // W and R are both divided by it

	work newton
}

func (p *problem) read(a, c, w, r blas64.General) error {
	p.n, p.p = a.Rows, c.Rows
	if p.n == 0 || p.p == 0 {
		return errors.New("the Riccati equation needs at least one state and one sensor")
	}
	for _, m := range []struct {
		name string
		m    blas64.General
		rows int
		cols int
		to   **mat.Dense
	}{
		{"A", a, p.n, p.n, &p.a}, {"C", c, p.p, p.n, &p.c}, {"W", w, p.n, p.n, &p.w}, {"R", r, p.p, p.p, &p.r},
	} {
		g := m.m
		if g.Rows != m.rows || g.Cols != m.cols || g.Stride < g.Cols || len(g.Data) < (g.Rows-1)*g.Stride+g.Cols {
			return fmt.Errorf("%s is %d×%d, it must be %d×%d", m.name, g.Rows, g.Cols, m.rows, m.cols)
		}
		x := mat.NewDense(m.rows, m.cols, nil)
		for i := range m.rows {
			for j := range m.cols {
				v := g.Data[i*g.Stride+j]
				if math.IsNaN(v) || math.IsInf(v, 0) {
					return fmt.Errorf("%s is not finite", m.name)
				}
				x.Set(i, j, v)
			}
		}
		if size := mat.Max(absolute(x)); size > 0 && (size > 1e100 || size < 1e-100) {
			return fmt.Errorf("the largest entry of %s has the size %.1g, too far from 1 to work with", m.name, size)
		}
		*m.to = x
	}
	symmetrise(p.w)
	symmetrise(p.r)
	return nil
}

func absolute(x *mat.Dense) *mat.Dense {
	var out mat.Dense
	out.Apply(func(_, _ int, v float64) float64 { return math.Abs(v) }, x)
	return &out
}

func symmetrise(x *mat.Dense) {
	n, _ := x.Dims()
	for i := range n {
		for j := range i {
			v := x.At(i, j)/2 + x.At(j, i)/2
			x.Set(i, j, v)
			x.Set(j, i, v)
		}
	}
}

// strictly tells whether the mode v dies out by itself, with a relative margin.
func (p *problem) strictly(v complex128, margin float64) bool {
	if p.discrete {
		return cmplx.Abs(v) < 1-margin
	}
	return real(v) < 0 && real(v) < -margin
}

// finish improves x by Newton's method, checks it and undoes the scaling.
func (p *problem) finish(x *mat.Dense) (*Solution, error) {
	n := &p.work
	best, err := n.refine(p, x)
	if err != nil {
		return nil, err
	}
	poles, err := n.poles(p, best.l)
	if err != nil {
		return nil, err
	}
	margin := 0.0
	if p.noiseFree() {
		margin = 1e-7 // where Newton's method stalls on its way to a pole on the limit
	}
	for _, v := range poles {
		if !p.strictly(v, margin) {
			return nil, absent("with the best gain a pole would stay at %s, on the stability limit", show(v, 0))
		}
	}
	if !(best.residual < 1e-6) {
		return nil, absent("the Riccati equation is too ill-conditioned to be solved: what is left of it stays at %.1g of its terms", best.residual)
	}
	s := &Solution{P: best.p, L: best.l, Poles: poles, Residual: best.residual}
	s.P.Apply(func(i, j int, v float64) float64 { return v * p.d[i] * p.d[j] * p.unit }, s.P)
	s.L.Apply(func(i, j int, v float64) float64 { return v * p.d[i] / p.e[j] }, s.L)
	for _, m := range []*mat.Dense{s.P, s.L} {
		if norm := mat.Norm(m, 1); math.IsNaN(norm) || math.IsInf(norm, 0) {
			return nil, absent("the solution of the Riccati equation is out of the range of numbers")
		}
	}
	return s, nil
}

// show writes an eigenvalue for a sentence, with parts below rounding as 0.
func show(v complex128, rounding float64) string {
	re, im := real(v), imag(v)
	if math.Abs(re) <= rounding {
		re = 0
	}
	if math.Abs(im) <= rounding {
		return fmt.Sprintf("%.4g", re)
	}
	return fmt.Sprintf("%.4g%+.4gi", re, im)
}
