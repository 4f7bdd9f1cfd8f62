package riccati

import (
	"math"
	"math/cmplx"

	"gonum.org/v1/gonum/mat"

	"polewright/estimator/internal/schur"
)

const (
	// limitMargin is how close to the stability limit counts as on it,
	// relative to the eigenvalue (continuous) or to 1.
	limitMargin = 1e-9
	// rankTolerance decides whether a mode is seen or reached: the smallest
	// singular value of its test matrix relative to the largest.
	rankTolerance = 1e-12
	// definiteTolerance is the smallest eigenvalue of a covariance scaled to
	// a unit diagonal that still counts as positive.
	definiteTolerance = 1e-13
)

// examine decides whether a stabilising solution exists.
func (p *problem) examine() error {
	if err := p.examineNoise(); err != nil {
		return err
	}
	var form schur.Form
	if err := form.Factor(p.a.RawMatrix()); err != nil {
		return err
	}
	values := form.Eigenvalues()
	radius, err := form.Uncertainty()
	if err != nil {
		return err
	}
	reach := p.reach()
	at := mat.DenseCopyOf(p.a.T())
	size := mat.Norm(p.a, 2)
	for i, v := range values {
		if imag(v) < 0 {
			continue
		}
		margin := max(limitMargin, min(radius[i], 1e-6))
		if !p.discrete {
			margin = max(limitMargin*cmplx.Abs(v), min(radius[i], 1e-6*size))
		}
		if p.strictly(v, margin) {
			continue
		}
		if hidden(p.a, p.c, v) {
			return absent("the sensors do not see the mode at %s, which does not die out by itself", show(v, margin))
		}
		if p.beyond(v, margin) {
			continue
		}
		if hidden(at, reach, v) {
			return absent("no process noise reaches the mode at %s, which lies on the stability limit: the best estimator would in time stop correcting it", show(v, margin))
		}
	}
	return nil
}

// beyond tells whether the mode grows by more than the margin.
func (p *problem) beyond(v complex128, margin float64) bool {
	if p.discrete {
		return cmplx.Abs(v) > 1+margin
	}
	return real(v) > margin
}

// examineNoise checks that R is what a covariance can be. W is not held to it:
// published examples have indefinite ones, with a stabilising solution.
func (p *problem) examineNoise() error {
	low := lowest(p.r)
	if !p.discrete && !(low > definiteTolerance) {
		return absent("R must be positive definite: in continuous time a sensor without noise would make the gain infinite")
	}
	if low < -1e-10 {
		return absent("R must be positive semi-definite")
	}
	return nil
}

// lowest returns the smallest eigenvalue of x scaled to a unit diagonal; 0 or
// less where a diagonal entry is. Entries beside a zero on the diagonal that
// are not zero make it -1.
func lowest(x *mat.Dense) float64 {
	s, kept := correlation(x)
	if s == nil {
		return -1
	}
	low := 0.0
	if len(kept) > 0 {
		var e mat.EigenSym
		if !e.Factorize(s, false) {
			return -1
		}
		low = e.Values(nil)[0]
	}
	if n, _ := x.Dims(); len(kept) < n {
		low = min(low, 0)
	}
	return low
}

// correlation returns x scaled to a unit diagonal, without the rows and columns
// of zeros, and the indices it kept; nil where x is no covariance.
func correlation(x *mat.Dense) (*mat.SymDense, []int) {
	n, _ := x.Dims()
	var kept []int
	for i := range n {
		switch v := x.At(i, i); {
		case v > 0:
			kept = append(kept, i)
		case v < 0:
			return nil, nil
		default:
			for j := range n {
				if x.At(i, j) != 0 {
					return nil, nil
				}
			}
		}
	}
	if len(kept) == 0 {
		return &mat.SymDense{}, nil
	}
	s := mat.NewSymDense(len(kept), nil)
	for a, i := range kept {
		for b := a; b < len(kept); b++ {
			j := kept[b]
			v := x.At(i, j) / math.Sqrt(x.At(i, i)) / math.Sqrt(x.At(j, j))
			if math.Abs(v) > 1e100 {
				return nil, nil
			}
			s.SetSym(a, b, v)
		}
	}
	return s, kept
}

// reach returns rows that span the directions W drives.
func (p *problem) reach() *mat.Dense {
	s, kept := correlation(p.w)
	if s == nil {
		return mat.DenseCopyOf(p.w)
	}
	if len(kept) == 0 {
		return mat.NewDense(1, p.n, nil)
	}
	var e mat.EigenSym
	if !e.Factorize(s, true) {
		return mat.DenseCopyOf(p.w)
	}
	var v mat.Dense
	e.VectorsTo(&v)
	out := mat.NewDense(len(kept), p.n, nil)
	for k, value := range e.Values(nil) {
		if math.Abs(value) < definiteTolerance*float64(len(kept)) {
			continue
		}
		for a, i := range kept {
			out.Set(k, i, v.At(a, k)*math.Sqrt(p.w.At(i, i)))
		}
	}
	return out
}

// hidden tells whether the mode at v of a is in no row of c: the test of
// Popov, Belevitch & Hautus, rank [A − vI; C] < n, with the rows of C at the
// size of A − vI, as their size does not matter. The complex matrix is taken as
// a real one of twice the size.
func hidden(a, c *mat.Dense, v complex128) bool {
	n, _ := a.Dims()
	p, _ := c.Dims()
	m := mat.NewDense(2*(n+p), 2*n, nil)
	for i := range n {
		for j := range n {
			x := a.At(i, j)
			if i == j {
				x -= real(v)
				m.Set(i, n+j, imag(v))
				m.Set(n+p+i, j, -imag(v))
			}
			m.Set(i, j, x)
			m.Set(n+p+i, n+j, x)
		}
	}
	size := mat.Norm(m, 2) / math.Sqrt2
	if size == 0 {
		size = 1
	}
	for i := range p {
		norm := mat.Norm(c.RowView(i), 2)
		if norm == 0 {
			continue
		}
		for j := range n {
			x := c.At(i, j) / norm * size
			m.Set(n+i, j, x)
			m.Set(n+p+n+i, n+j, x)
		}
	}
	var svd mat.SVD
	if !svd.Factorize(m, mat.SVDNone) {
		return false
	}
	s := svd.Values(nil)
	return !(s[2*n-1] > rankTolerance*s[0])
}
