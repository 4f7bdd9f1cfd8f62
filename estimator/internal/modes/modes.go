// Package modes finds which modes of a plant its sensors see, and which
// eigenvalues no estimator gain can move.
package modes

import (
	"errors"
	"fmt"
	"math"

	"gonum.org/v1/gonum/blas/blas64"
	"gonum.org/v1/gonum/mat"
)

// Errors of Analyse.
var (
	ErrShape         = errors.New("matrices do not fit together")
	ErrNotFinite     = errors.New("a matrix entry is not finite")
	ErrNoConvergence = errors.New("the eigenvalue or singular value iteration did not converge")
)

// Mode is one eigenvalue of A, repeated by algebraic multiplicity, and how well
// the sensors see it.
type Mode struct {
	Eigenvalue complex128
	// Sigma is the smallest singular value of [A − λI; C], the distance to the
	// nearest pair with an unobservable mode at λ (Popov, Belevitch, Hautus;
	// Paige 1981). It has the unit of the given matrices.
	Sigma float64
	// Observable tells whether a gain can move the eigenvalue. It follows the
	// rank decisions of the staircase, not a threshold on Sigma.
	Observable bool
}

// Result is the observability of a pair (C, A).
type Result struct {
	// Rank is the rank of the observability matrix.
	Rank int
	// Modes lists the eigenvalues of A in the order of the eigenvalue
	// iteration; a complex pair stands together, positive imaginary part first.
	Modes []Mode
	// Fixed lists the n − Rank eigenvalues that no gain can move.
	Fixed []complex128
	// Q is orthogonal, n×n: Qᵀ A Q = [Ao 0; A21 Aū] and C Q = [Co 0] with Ao of
	// order Rank and (Co, Ao) observable. Where Rank = n it is the identity.
	Q *mat.Dense
}

// Analyse decomposes the pair (C, A), C p×n and A n×n, by the staircase
// algorithm (Van Dooren 1981): only orthogonal transformations, each rank
// decided at tol relative to the norm of C for the first step and of A for the
// others. tol ≤ 0 means 1e-12. The matrices should be scaled so that unlike
// units compare; they are not changed.
func Analyse(a, c blas64.General, tol float64) (*Result, error) {
	am, cm, err := check(a, c)
	if err != nil {
		return nil, err
	}
	if !(tol > 0) {
		tol = 1e-12
	}
	q, rank, err := staircase(am, cm, tol)
	if err != nil {
		return nil, err
	}
	n := a.Rows
	res := &Result{Rank: rank, Q: q}
	if rank < n {
		res.Fixed, err = eigenvalues(unseen(am, q, rank))
		if err != nil {
			return nil, err
		}
	} else {
		res.Q = identity(n)
	}
	values, err := eigenvalues(am)
	if err != nil {
		return nil, err
	}
	seen := visible(values, res.Fixed)
	res.Modes = make([]Mode, n)
	for i, v := range values {
		sigma, err := hautus(am, cm, v)
		if err != nil {
			return nil, err
		}
		res.Modes[i] = Mode{Eigenvalue: v, Sigma: sigma, Observable: seen[i]}
	}
	return res, nil
}

func check(a, c blas64.General) (am, cm *mat.Dense, err error) {
	n, p := a.Rows, c.Rows
	if n < 1 || p < 1 || a.Cols != n || c.Cols != n {
		return nil, nil, fmt.Errorf("matrix A is %d×%d, C is %d×%d: %w", n, a.Cols, p, c.Cols, ErrShape)
	}
	for _, g := range []blas64.General{a, c} {
		if g.Stride < g.Cols || len(g.Data) < (g.Rows-1)*g.Stride+g.Cols {
			return nil, nil, fmt.Errorf("too little data: %w", ErrShape)
		}
		for i := range g.Rows {
			for _, v := range g.Data[i*g.Stride : i*g.Stride+g.Cols] {
				if math.IsNaN(v) || math.IsInf(v, 0) {
					return nil, nil, ErrNotFinite
				}
			}
		}
	}
	am, cm = new(mat.Dense), new(mat.Dense)
	am.SetRawMatrix(a)
	cm.SetRawMatrix(c)
	return am, cm, nil
}

func identity(n int) *mat.Dense {
	q := mat.NewDense(n, n, nil)
	for i := range n {
		q.Set(i, i, 1)
	}
	return q
}
