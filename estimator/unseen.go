package estimator

import (
	"gonum.org/v1/gonum/mat"
)

// maxUnseen bounds the entries of the rows that addUnseenRows optimises.
const maxUnseen = 40

// addUnseenRows adds to the scaled gain g (the current form's in current form)
// the rows that act on what the sensors do not see. They move no pole. The
// weighted noise Σ wᵢ Pᵢᵢ is quadratic in them, so that its values at few gains
// give the least exactly. Where there is no steady state they stay zero.
func (d *Designer) addUnseenRows(g *mat.Dense) {
	d.quieten(g, d.pair.q.Slice(0, d.n, d.pair.rank, d.n))
}

// quieten adds to g the columns of q2 (n×k) in the amounts (k×p) that make the
// weighted noise least. They must move no pole.
func (d *Designer) quieten(g *mat.Dense, q2 mat.Matrix) {
	_, rows := q2.Dims()
	count := rows * d.p
	if count > maxUnseen {
		return
	}
	weights := d.noiseWeights()
	try := func(theta []float64) (float64, bool) {
		var l mat.Dense
		l.Mul(q2, mat.NewDense(rows, d.p, theta))
		l.Add(&l, g)
		return d.weightedNoise(&l, weights)
	}
	theta := make([]float64, count)
	base, ok := try(theta)
	if !ok {
		return
	}
	// A step as large as the gain at hand: a quadratic has no step of its own, but
	// its values must differ beyond rounding.
	step := mat.Norm(g, 2)
	if step == 0 {
		step = 1
	}
	h, slope := mat.NewDense(count, count, nil), mat.NewVecDense(count, nil)
	plus := make([]float64, count)
	for i := range theta {
		theta[i] = step
		up, ok1 := try(theta)
		theta[i] = -step
		down, ok2 := try(theta)
		theta[i] = 0
		if !ok1 || !ok2 {
			return
		}
		plus[i] = up
		h.Set(i, i, up+down-2*base)
		slope.SetVec(i, (down-up)/2)
	}
	for i := range theta {
		for j := range i {
			theta[i], theta[j] = step, step
			both, ok := try(theta)
			theta[i], theta[j] = 0, 0
			if !ok {
				return
			}
			v := both - plus[i] - plus[j] + base
			h.Set(i, j, v)
			h.Set(j, i, v)
		}
	}
	var svd mat.SVD
	if !svd.Factorize(h, mat.SVDFull) {
		return
	}
	rank := svd.Rank(1e-10)
	if rank == 0 {
		return
	}
	var best mat.Dense
	svd.SolveTo(&best, slope, rank)
	for i := range theta {
		theta[i] = best.At(i, 0) * step
	}
	if least, ok := try(theta); !ok || least > base {
		return
	}
	var add mat.Dense
	add.Mul(q2, mat.NewDense(rows, d.p, theta))
	g.Add(g, &add)
}

// noiseWeights returns wᵢ of Σ wᵢ Pᵢᵢ in scaled coordinates: one over the floor's
// variance where that is defined and not zero, else one.
func (d *Designer) noiseWeights() []float64 {
	w := make([]float64, d.n)
	for i := range w {
		w[i] = 1
		if f := d.analysis.Floor; f != nil && f.Std[i] > 0 {
			ratio := d.sx[i] / f.Std[i]
			w[i] = ratio * ratio
		}
	}
	return w
}

// weightedNoise is Σ wᵢ Pᵢᵢ of the scaled gain g in the form at hand; false where
// there is no steady state.
func (d *Designer) weightedNoise(g *mat.Dense, weights []float64) (float64, bool) {
	ls := g
	if d.opt.Form == Current {
		ls = new(mat.Dense)
		ls.Mul(d.a, g)
	}
	f := d.errorMatrix(ls)
	if d.form.Factor(raw(f)) != nil || !stable(d.form.Eigenvalues(), d.model.Discrete()) {
		return 0, false
	}
	var lr, q mat.Dense
	lr.Mul(ls, d.r)
	q.Mul(&lr, ls.T())
	q.Add(&q, d.w)
	p, err := d.solveNoise(f, &q)
	if err != nil {
		return 0, false
	}
	if d.opt.Form == Current {
		p = d.filteredBy(p, g)
	}
	var sum float64
	for i, w := range weights {
		sum += w * p.At(i, i)
	}
	return sum, true
}
