package riccati

import (
	"math"

	"gonum.org/v1/gonum/mat"

	"polewright/estimator/internal/schur"
)

// newton takes the steps that improve a covariance.
type newton struct {
	form schur.Form
}

// iterate is one covariance with its gain and residual.
type iterate struct {
	p, l     *mat.Dense
	residual float64
}

// gain returns P Cᵀ R⁻¹ or A P Cᵀ (C P Cᵀ + R)⁻¹.
func (n *newton) gain(p *problem, x *mat.Dense) (*mat.Dense, error) {
	var cp, s, t mat.Dense
	cp.Mul(p.c, x)
	s.CloneFrom(p.r)
	right := mat.DenseCopyOf(&cp)
	if p.discrete {
		t.Mul(&cp, p.c.T())
		s.Add(&s, &t)
		right.Mul(&cp, p.a.T())
	}
	symmetrise(&s)
	if !(lowest(&s) > definiteTolerance) {
		return nil, absent("C P Cᵀ + R is singular: the sensors without noise of their own tell the same thing twice, or nothing")
	}
	lt := mat.NewDense(p.p, p.n, nil)
	if err := solveInto(lt, &s, right); err != nil {
		return nil, absent("C P Cᵀ + R is singular")
	}
	return mat.DenseCopyOf(lt.T()), nil
}

// poles factors A − L C and returns a copy of its eigenvalues.
func (n *newton) poles(p *problem, l *mat.Dense) ([]complex128, error) {
	var f mat.Dense
	f.Mul(l, p.c)
	f.Sub(p.a, &f)
	if err := n.form.Factor(f.RawMatrix()); err != nil {
		return nil, err
	}
	return append([]complex128(nil), n.form.Eigenvalues()...), nil
}

// residual returns the Frobenius norm of what is left of the equation, relative
// to the products of the norms of its factors.
func (n *newton) residual(p *problem, x, l *mat.Dense) float64 {
	var ap, left, cp, lg mat.Dense
	a, px := mat.Norm(p.a, 2), mat.Norm(x, 2)
	size := mat.Norm(p.w, 2)
	ap.Mul(p.a, x)
	cp.Mul(p.c, x)
	if p.discrete { // A P Aᵀ − L (A P Cᵀ)ᵀ + W − P
		left.Mul(&ap, p.a.T())
		left.Sub(&left, x)
		var moved mat.Dense
		moved.Mul(&cp, p.a.T())
		cp.Copy(&moved)
		size += (1 + a*a) * px
	} else { // A P + P Aᵀ − L (P Cᵀ)ᵀ + W
		left.Add(&ap, ap.T())
		size += 2 * a * px
	}
	lg.Mul(l, &cp)
	left.Sub(&left, &lg)
	left.Add(&left, p.w)
	size += mat.Norm(l, 2) * mat.Norm(&cp, 2)
	if size == 0 {
		return 0
	}
	return mat.Norm(&left, 2) / size
}

// refine takes Newton steps from a stabilising covariance: each solves
//
//	F P + P Fᵀ + W + L R Lᵀ = 0   or   P = F P Fᵀ + W + L R Lᵀ,   F = A − L C,
//
// for the covariance that the last gain L gives. From a stabilising gain they
// come down to the stabilising solution, in the end quadratically; the best
// one is kept.
func (n *newton) refine(p *problem, x *mat.Dense) (*iterate, error) {
	l, err := n.gain(p, x)
	if err != nil {
		return nil, err
	}
	best := &iterate{p: x, l: l, residual: n.residual(p, x, l)}
	calm := 0
	for range 60 {
		next, change, err := n.step(p, l, x)
		if err != nil {
			break
		}
		x, l = next.p, next.l
		if next.residual <= best.residual || math.IsNaN(best.residual) {
			best = next
		}
		if change < 1e-7 {
			calm++ // rounding is reached in one more step
		}
		if calm == 2 {
			break
		}
	}
	return best, nil
}

// step returns the covariance of gain l and its own gain.
func (n *newton) step(p *problem, l, old *mat.Dense) (*iterate, float64, error) {
	poles, err := n.poles(p, l)
	if err != nil {
		return nil, 0, err
	}
	for _, v := range poles {
		if !p.strictly(v, 0) {
			return nil, 0, errUnsolved
		}
	}
	var lr, u, t mat.Dense
	lr.Mul(l, p.r)
	u.Mul(&lr, l.T())
	u.Add(&u, p.w)
	x := mat.NewDense(p.n, p.n, nil)
	solve := n.form.Lyapunov
	if p.discrete {
		solve = n.form.Stein
	}
	if err := solve(x.RawMatrix(), u.RawMatrix()); err != nil {
		return nil, 0, err
	}
	gain, err := n.gain(p, x)
	if err != nil {
		return nil, 0, err
	}
	t.Sub(x, old)
	change := mat.Norm(&t, 2) / mat.Norm(x, 2)
	return &iterate{p: x, l: gain, residual: n.residual(p, x, gain)}, change, nil
}
