package estimator

import (
	"fmt"
	"math/cmplx"

	"gonum.org/v1/gonum/mat"

	"polewright/estimator/internal/modes"
)

// pair is what placement works on: the observable part of the pair whose
// eigenvalues are assigned, (C, A) in prediction form, (C A, A) in current form,
// with the noise that the gain weighs.
type pair struct {
	q       *mat.Dense // n×n orthogonal; its first rank columns span the observable part
	rank    int
	fixed   []complex128
	a, c    *mat.Dense // rank×rank and p1×rank, p1 independent sensors
	combine *mat.Dense // p1×p: how the sensors are combined; nil when none depends on others

	// inject (n×p) is added to the gain; nil in prediction form.
	inject *mat.Dense
	// For the least noise, where it is asked for: noise of the observable part (rank×rank), of the
	// combined sensors (p1×p1), and the weights of the variances.
	w, r    *mat.Dense
	weights []float64
}

// split finds the part of the model whose eigenvalues a gain can move.
func (d *Designer) split(seen *modes.Result) error {
	a, c, w, r := d.a, d.c, d.w, d.r
	var inject *mat.Dense
	if d.opt.Form == Current {
		a, c, w, r, inject = d.decorrelate()
		var err error
		if seen, err = modes.Analyse(raw(d.a), raw(c), d.opt.Tolerance); err != nil {
			return fmt.Errorf("observability of the current form: %w", err)
		}
	}
	size := mat.Norm(d.a, 2)
	for i, v := range seen.Fixed { // zero but for rounding, as those of ker A are
		if cmplx.Abs(v) <= 1e-13*size {
			seen.Fixed[i] = 0
		}
	}
	d.pair = pair{q: seen.Q, rank: seen.Rank, fixed: seen.Fixed, inject: inject}
	if seen.Rank == 0 {
		return nil
	}
	pr := &d.pair
	if _, p := c.Dims(); d.opt.Method == LeastNoise || p >= pr.rank {
		pr.weigh(d.noiseWeights())
	}
	q1 := pr.q.Slice(0, d.n, 0, pr.rank)
	pr.a, pr.w = turned(a, q1), turned(w, q1)
	pr.c, pr.r = new(mat.Dense), r
	pr.c.Mul(c, q1)
	pr.combineSensors()
	return nil
}

// turned returns Qᵀ M Q.
func turned(m *mat.Dense, q mat.Matrix) *mat.Dense {
	var mq, out mat.Dense
	mq.Mul(m, q)
	out.Mul(q.T(), &mq)
	return &out
}

// decorrelate returns the pair of the current form with its noise. The filtered
// error obeys e⁺ = (A − Lf C A) e + (I − Lf C) w − Lf v: the process noise comes in
// through the sensors as well. With N = C W Cᵀ + R and Lf = W Cᵀ N⁻¹ + L' this is
//
//	e⁺ = (A' − L' C A) e + w' − L' v',   A' = A − W Cᵀ N⁻¹ C A,
//
// where w' and v' are independent, with covariances W − W Cᵀ N⁻¹ C W and N. A
// singular N is inverted as far as it goes, which is as far as it matters.
func (d *Designer) decorrelate() (a, c, w, r, inject *mat.Dense) {
	a, c, w, r, inject = new(mat.Dense), new(mat.Dense), new(mat.Dense), new(mat.Dense), mat.NewDense(d.n, d.p, nil)
	c.Mul(d.c, d.a)
	var cw mat.Dense
	cw.Mul(d.c, d.w)
	r.Mul(&cw, d.c.T())
	r.Add(r, d.r)
	var svd mat.SVD
	if svd.Factorize(r, mat.SVDFull) {
		if rank := svd.Rank(1e-13); rank > 0 {
			var x mat.Dense
			svd.SolveTo(&x, &cw, rank)
			inject.Copy(x.T())
		}
	}
	a.Mul(inject, c)
	a.Sub(d.a, a)
	w.Mul(inject, &cw)
	w.Sub(d.w, w)
	return a, c, w, r, inject
}

// weigh turns the observable part so that the weighted sum of all states' variances
// that come from it is a weighted sum of its own. What lies beyond is left to
// addUnseenRows, given this choice.
func (pr *pair) weigh(all []float64) {
	n := len(all)
	if pr.rank == n {
		pr.weights = all
		return
	}
	q1 := pr.q.Slice(0, n, 0, pr.rank)
	var scaled, gram mat.Dense
	scaled.Apply(func(i, _ int, v float64) float64 { return v * all[i] }, q1)
	gram.Mul(q1.T(), &scaled)
	size := mat.Norm(&gram, 1)
	gram.Scale(1/size, &gram)
	var e mat.EigenSym
	if !e.Factorize(symmetric(&gram), true) {
		pr.weights = make([]float64, pr.rank)
		for i := range pr.weights {
			pr.weights[i] = gram.At(i, i) * size
		}
		return
	}
	var v, turnedQ mat.Dense
	e.VectorsTo(&v)
	turnedQ.Mul(q1, &v)
	pr.q = mat.DenseCopyOf(pr.q)
	set(pr.q, 0, 0, &turnedQ)
	pr.weights = e.Values(nil)
	for i, x := range pr.weights {
		pr.weights[i] = max(x, 0) * size
	}
}

// combineSensors replaces linearly dependent rows C = M C₁ by C₁ and remembers
// the combination (Mᵀ R⁻¹ M)⁻¹ Mᵀ R⁻¹ that wastes no information.
func (pr *pair) combineSensors() {
	p, _ := pr.c.Dims()
	var svd mat.SVD
	if !svd.Factorize(pr.c, mat.SVDThin) {
		return
	}
	s := svd.Values(nil)
	rank := 0
	for rank < len(s) && s[rank] > 1e-13*s[0]*float64(p) {
		rank++
	}
	if rank == p || rank == 0 {
		return
	}
	var u, v mat.Dense
	svd.UTo(&u)
	svd.VTo(&v)
	m := mat.DenseCopyOf(u.Slice(0, p, 0, rank))
	m.Apply(func(_, j int, x float64) float64 { return x * s[j] }, m)
	var rm, mrm, combine mat.Dense
	if rm.Solve(pr.r, m) != nil { // R singular: every sensor counts alike
		rm.CloneFrom(m)
	}
	mrm.Mul(m.T(), &rm)
	if combine.Solve(&mrm, rm.T()) != nil {
		return
	}
	pr.combine = &combine
	_, cols := pr.c.Dims()
	pr.c = mat.DenseCopyOf(v.Slice(0, cols, 0, rank).T())
	var cr, crc mat.Dense
	cr.Mul(&combine, pr.r)
	crc.Mul(&cr, combine.T())
	pr.r = &crc
}
