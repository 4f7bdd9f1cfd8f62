package estimator

import (
	"math"
	"math/cmplx"

	"gonum.org/v1/gonum/mat"

	"polewright/estimator/internal/schur"
)

// normal serves as many independent sensors as movable poles: A − L C can be any matrix,
// and every normal one, F = U Λ Uᵀ with orthogonal U, has eigenvectors of condition 1.
// Among these it looks for the least noise, by descent over U along the gradient that the
// adjoint equation gives (Edelman, Arias & Smith 1998 for the geometry).
type normal struct {
	a, w, r       *mat.Dense // of the pair, with r the noise seen through C⁻¹
	weights       []float64
	discrete      bool
	lambda        *mat.Dense
	form          schur.Form
	f, l, p, y, q *mat.Dense
}

// quietNormal replaces the robust gain in part (n×n) by the least noisy of its kind and
// returns its U. It starts from that of an earlier design where the poles have kept
// their kinds; else from part, with each complex pair turning either way. Where there is
// no steady state it leaves part as it is and returns nil.
func (d *Designer) quietNormal(part *mat.Dense, movable []complex128, prev *Design) *frame {
	pr := &d.pair
	var inverse, rc mat.Dense
	if inverse.Inverse(pr.c) != nil {
		return nil
	}
	rc.Mul(&inverse, pr.r)
	s := &normal{a: pr.a, w: pr.w, r: new(mat.Dense), discrete: d.model.Discrete(), weights: pr.weights}
	s.r.Mul(&rc, inverse.T())
	n := pr.rank
	for _, m := range []**mat.Dense{&s.f, &s.l, &s.p, &s.y, &s.q} {
		*m = mat.NewDense(n, n, nil)
	}
	kinds, ok := s.blocks(movable)
	if !ok {
		return nil
	}
	var u *mat.Dense
	var best float64
	if prev != nil && prev.frame != nil && prev.frame.kinds == kinds {
		u = mat.DenseCopyOf(prev.frame.u)
		best = s.descend(u, 20)
	} else {
		u, best = s.cold(part)
	}
	if math.IsInf(best, 1) {
		return nil
	}
	s.value(u)
	part.Mul(s.l, &inverse)
	return &frame{u: u, kinds: kinds}
}

// frame is the orthogonal U of a normal F, and which of its poles are real: "r" or "c"
// in the order of the list.
type frame struct {
	u     *mat.Dense
	kinds string
}

// blocks fills Λ: a real pole alone, a pair as [a b; −b a], in the order of the list.
func (s *normal) blocks(movable []complex128) (kinds string, ok bool) {
	n := len(movable)
	s.lambda = mat.NewDense(n, n, nil)
	used := make([]bool, n)
	at := 0
	for i, v := range movable {
		if used[i] {
			continue
		}
		used[i] = true
		s.lambda.Set(at, at, real(v))
		if imag(v) == 0 {
			kinds += "r"
			at++
			continue
		}
		partner := -1
		for j := i + 1; j < n; j++ {
			if !used[j] && (partner < 0 || cmplx.Abs(movable[j]-cmplx.Conj(v)) < cmplx.Abs(movable[partner]-cmplx.Conj(v))) {
				partner = j
			}
		}
		if partner < 0 {
			return "", false
		}
		used[partner] = true
		b := math.Abs(imag(v))
		s.lambda.Set(at+1, at+1, real(v))
		s.lambda.Set(at, at+1, b)
		s.lambda.Set(at+1, at, -b)
		kinds += "c"
		at += 2
	}
	return kinds, true
}

// cold starts from the eigenvectors of the symmetric part of A in several orders, and
// turns each pair the other way where that is quieter.
func (s *normal) cold(part *mat.Dense) (best *mat.Dense, cost float64) {
	n, _ := s.a.Dims()
	cost = math.Inf(1)
	var e mat.EigenSym
	basis := identity(n)
	if half := symmetric(s.a); size(half) > 1e-100 && e.Factorize(half, true) {
		e.VectorsTo(basis)
	}
	for shift := range n {
		u := mat.NewDense(n, n, nil)
		for j := range n {
			for i := range n {
				u.Set(i, j, basis.At(i, (j+shift)%n))
			}
		}
		c := s.descend(u, 60)
		for j := 0; j+1 < n; j++ {
			if s.lambda.At(j, j+1) == 0 {
				continue
			}
			other := mat.DenseCopyOf(u)
			for i := range n {
				other.Set(i, j, -u.At(i, j))
			}
			if turned := s.descend(other, 60); turned < c {
				u, c = other, turned
			}
		}
		if c < cost {
			best, cost = u, c
		}
	}
	return best, cost
}

// value returns the weighted noise of F = U Λ Uᵀ, with F, L C and P at hand; +Inf where
// there is none.
func (s *normal) value(u *mat.Dense) float64 {
	s.q.Mul(u, s.lambda)
	s.f.Mul(s.q, u.T())
	s.l.Sub(s.a, s.f)
	s.y.Mul(s.l, s.r)
	s.q.Mul(s.y, s.l.T())
	s.q.Add(s.q, s.w)
	if s.form.Factor(raw(s.f)) != nil || steady(&s.form, s.p, s.q, s.discrete) != nil {
		return math.Inf(1)
	}
	var sum float64
	for i, w := range s.weights {
		if !(s.p.At(i, i) >= 0) {
			return math.Inf(1)
		}
		sum += w * s.p.At(i, i)
	}
	return sum
}

// slope returns the skew direction Ω of steepest descent, for U (I + Ω), at the F whose
// value was taken last; nil where it cannot be had.
func (s *normal) slope(u *mat.Dense) *mat.Dense {
	n, _ := u.Dims()
	s.q.Zero()
	for i, w := range s.weights {
		s.q.Set(i, i, w)
	}
	solve := s.form.LyapunovAdjoint
	if s.discrete {
		solve = s.form.SteinAdjoint
	}
	if solve(raw(s.y), raw(s.q)) != nil {
		return nil
	}
	// dJ = tr(Gᵀ dF) with G = 2 Y (P − L R C⁻ᵀ), in discrete time 2 Y (F P − …)
	var inner, g, turned, left, right mat.Dense
	inner.Mul(s.l, s.r)
	if s.discrete {
		var fp mat.Dense
		fp.Mul(s.f, s.p)
		inner.Sub(&fp, &inner)
	} else {
		inner.Sub(s.p, &inner)
	}
	g.Mul(s.y, &inner)
	turned.Mul(u.T(), &g)
	g.Mul(&turned, u)
	// dF = U (Ω Λ − Λ Ω) Uᵀ, so dJ = tr(Ω (Λ G̃ᵀ − G̃ᵀ Λ))
	left.Mul(s.lambda, g.T())
	right.Mul(g.T(), s.lambda)
	left.Sub(&left, &right)
	omega := mat.NewDense(n, n, nil)
	for i := range n {
		for j := range n {
			omega.Set(i, j, left.At(i, j)-left.At(j, i))
		}
	}
	return omega
}

// descend moves u to less noise by at most so many steps and returns what it reaches.
func (s *normal) descend(u *mat.Dense, steps int) float64 {
	cost := s.value(u)
	step := 1.0
	next := new(mat.Dense)
	for range steps {
		omega := s.slope(u)
		if math.IsInf(cost, 1) || omega == nil {
			break
		}
		length := mat.Norm(omega, 2)
		if !(length > 1e-12*cost) {
			break
		}
		step = min(4*step, 0.5/length)
		moved := false
		for range 40 {
			turn(next, u, omega, step)
			if c := s.value(next); c < cost-1e-3*step*length*length {
				moved = cost-c > 1e-12*cost
				cost = c
				u.Copy(next)
				break
			}
			step /= 2
		}
		if !moved {
			break
		}
	}
	s.value(u)
	return cost
}

// turn sets dst to U (I − hΩ/2)⁻¹ (I + hΩ/2), Cayley's orthogonal matrix near I + hΩ.
func turn(dst, u, omega *mat.Dense, h float64) {
	n, _ := u.Dims()
	plus, minus := identity(n), identity(n)
	var half, c mat.Dense
	half.Scale(h/2, omega)
	plus.Add(plus, &half)
	minus.Sub(minus, &half)
	if c.Solve(minus, plus) != nil {
		dst.CloneFrom(u)
		return
	}
	dst.Mul(u, &c)
}
