package riccati

import (
	"errors"
	"math"

	"gonum.org/v1/gonum/mat"

	"polewright/estimator/internal/schur"
)

var errUnsolved = errors.New("the doubling did not converge")

// start returns a covariance whose gain stabilises A − L C. The doubling comes
// to the smallest solution, which leaves unstable modes that no noise reaches
// as they are; a little noise added everywhere leads to the stabilising one,
// which Newton's method then makes exact.
func (p *problem) start() (*mat.Dense, error) {
	reason := absent("no gain was found that makes all errors die out: the equation is too close to having no solution")
	for _, extra := range []float64{0, 1e-10, 1e-6, 1e-2, 1} {
		x, err := p.tryDoubling(extra)
		if err == nil {
			return x, nil
		}
		errors.As(err, &reason)
	}
	if x := p.openLoop(); x != nil {
		return x, nil
	}
	return nil, reason
}

// openLoop returns the covariance without any correction, from which Newton's
// method starts as well; nil where the plant is not stable by itself.
func (p *problem) openLoop() *mat.Dense {
	poles, err := p.work.poles(p, mat.NewDense(p.n, p.p, nil))
	if err != nil {
		return nil
	}
	for _, v := range poles {
		if !p.strictly(v, 0) {
			return nil
		}
	}
	solve := p.work.form.Lyapunov
	if p.discrete {
		solve = p.work.form.Stein
	}
	x := mat.NewDense(p.n, p.n, nil)
	if solve(x.RawMatrix(), p.w.RawMatrix()) != nil {
		return nil
	}
	return x
}

// tryDoubling returns a covariance with a stabilising gain, found with extra
// noise.
func (p *problem) tryDoubling(extra float64) (*mat.Dense, error) {
	e, g, h, err := p.doublingStart(extra)
	if err != nil {
		return nil, err
	}
	x, err := double(e, g, h)
	if err != nil {
		return nil, err
	}
	l, err := p.work.gain(p, x)
	if err != nil {
		return nil, err
	}
	poles, err := p.work.poles(p, l)
	if err != nil {
		return nil, err
	}
	for _, v := range poles {
		if !p.strictly(v, 0) {
			return nil, errUnsolved
		}
	}
	return x, nil
}

// doublingStart returns the first triple (E, G, H) of the doubling, in discrete
// time Aᵀ, Cᵀ R⁻¹ C and W, with extra noise on states and noise-free sensors.
func (p *problem) doublingStart(extra float64) (e, g, h *mat.Dense, err error) {
	e = mat.DenseCopyOf(p.a.T())
	h = mat.DenseCopyOf(p.w)
	add := extra * max(mat.Norm(p.w, 2), mat.Norm(p.a, 2))
	for i := range p.n {
		h.Set(i, i, h.At(i, i)+add)
	}
	r := mat.DenseCopyOf(p.r)
	if p.noiseFree() {
		unit := max(1e-8, extra) * max(mat.Norm(p.w, 2), 1)
		for j := range p.p {
			r.Set(j, j, r.At(j, j)*(1+1e-8)+unit)
		}
	}
	x := mat.NewDense(p.p, p.n, nil)
	if err := solveInto(x, r, p.c); err != nil {
		return nil, nil, nil, err
	}
	g = mat.NewDense(p.n, p.n, nil)
	g.Mul(p.c.T(), x)
	symmetrise(g)
	if p.discrete {
		return e, g, h, nil
	}
	return cayley(e, g, h)
}

// noiseFree tells whether R is singular, for all practical purposes.
func (p *problem) noiseFree() bool { return lowest(p.r) < 1e-10 }

// cayley turns the continuous equation FᵀX + XF − XGX + H = 0 into a discrete
// one with the same stabilising solution (Chu, Fan & Lin 2005). Its parameter
// lies above the size of every eigenvalue of F, so that F − γI is regular.
func cayley(f, g, h *mat.Dense) (e0, g0, h0 *mat.Dense, err error) {
	n, _ := f.Dims()
	var form schur.Form
	if err := form.Factor(f.RawMatrix()); err != nil {
		return nil, nil, nil, err
	}
	gamma := math.Sqrt(mat.Norm(g, 2)) * math.Sqrt(mat.Norm(h, 2))
	for _, v := range form.Eigenvalues() {
		gamma = max(gamma, 1.5*math.Hypot(real(v), imag(v)))
	}
	if gamma == 0 {
		gamma = 1
	}
	shifted := mat.DenseCopyOf(f)
	for i := range n {
		shifted.Set(i, i, shifted.At(i, i)-gamma)
	}
	inverse := mat.NewDense(n, n, nil)
	if err := solveInto(inverse, shifted, identity(n)); err != nil {
		return nil, nil, nil, err
	}
	var ig, ih, k mat.Dense
	ig.Mul(inverse, g) // F_γ⁻¹ G
	ih.Mul(h, inverse) // H F_γ⁻¹
	k.Mul(g, ih.T())   // G F_γ⁻ᵀ H
	k.Add(&k, shifted) // K
	e0 = mat.NewDense(n, n, nil)
	if err := solveInto(e0, &k, identity(n)); err != nil {
		return nil, nil, nil, err
	}
	g0, h0 = mat.NewDense(n, n, nil), mat.NewDense(n, n, nil)
	g0.Mul(&ig, e0.T())
	g0.Scale(2*gamma, g0)
	h0.Mul(e0.T(), &ih)
	h0.Scale(2*gamma, h0)
	e0.Scale(2*gamma, e0)
	for i := range n {
		e0.Set(i, i, e0.At(i, i)+1)
	}
	symmetrise(g0)
	symmetrise(h0)
	return e0, g0, h0, nil
}

// double runs the doubling
//
//	E ← E (I + GH)⁻¹ E,  G ← G + E (I + GH)⁻¹ G Eᵀ,  H ← H + Eᵀ H (I + GH)⁻¹ E
//
// until H stands still: step k has taken 2ᵏ steps of the Riccati recursion.
func double(e, g, h *mat.Dense) (*mat.Dense, error) {
	n, _ := e.Dims()
	both := mat.NewDense(n, 2*n, nil) // [E G], then (I + GH)⁻¹ [E G]
	solved := mat.NewDense(n, 2*n, nil)
	var m, x, y, next mat.Dense
	for range 60 {
		m.Mul(g, h)
		for i := range n {
			m.Set(i, i, m.At(i, i)+1)
		}
		both.Slice(0, n, 0, n).(*mat.Dense).Copy(e)
		both.Slice(0, n, n, 2*n).(*mat.Dense).Copy(g)
		if err := solveInto(solved, &m, both); err != nil {
			return nil, err
		}
		se, sg := solved.Slice(0, n, 0, n), solved.Slice(0, n, n, 2*n)
		x.Mul(h, se)
		y.Mul(e.T(), &x) // Eᵀ H (I + GH)⁻¹ E
		x.Mul(sg, e.T())
		next.Mul(e, &x)
		g.Add(g, &next)
		next.Mul(e, se)
		e.Copy(&next)
		h.Add(h, &y)
		symmetrise(g)
		symmetrise(h)
		change, size := mat.Norm(&y, 2), mat.Norm(h, 2)
		if math.IsNaN(change) || math.IsInf(size, 0) {
			return nil, errUnsolved
		}
		if change <= 1e-15*size {
			return h, nil
		}
	}
	return nil, errUnsolved
}

func identity(n int) *mat.Dense {
	m := mat.NewDense(n, n, nil)
	for i := range n {
		m.Set(i, i, 1)
	}
	return m
}

// solveInto sets x to m⁻¹ b. A poor condition is not an error here: what is
// found is improved and checked later.
func solveInto(x, m, b *mat.Dense) error {
	var lu mat.LU
	lu.Factorize(m)
	var poor mat.Condition
	if err := lu.SolveTo(x, false, b); err != nil && (!errors.As(err, &poor) || math.IsInf(float64(poor), 1)) {
		return err
	}
	return nil
}
