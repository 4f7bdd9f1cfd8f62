package estimator

import (
	"fmt"
	"math/cmplx"

	"gonum.org/v1/gonum/mat"

	"polewright/estimator/internal/modes"
	"polewright/estimator/internal/placement"
	"polewright/estimator/poles"
)

// split finds the part of the model whose eigenvalues a gain can move.
func (d *Designer) split(seen *modes.Result) error {
	c := d.c
	if d.opt.Form == Current {
		c = new(mat.Dense)
		c.Mul(d.c, d.a)
		var err error
		if seen, err = modes.Analyse(raw(d.a), raw(c), d.opt.Tolerance); err != nil {
			return fmt.Errorf("observability of the current form: %w", err)
		}
	}
	pr := pair{q: seen.Q, rank: seen.Rank, fixed: seen.Fixed}
	if pr.rank > 0 {
		q1 := seen.Q.Slice(0, d.n, 0, pr.rank)
		var aq mat.Dense
		aq.Mul(d.a, q1)
		pr.a = new(mat.Dense)
		pr.a.Mul(q1.T(), &aq)
		pr.c = new(mat.Dense)
		pr.c.Mul(c, q1)
		pr.combineSensors(d.r)
	}
	d.pair = pr
	return nil
}

// combineSensors replaces linearly dependent rows C = M C₁ by C₁ and remembers
// the combination (Mᵀ R⁻¹ M)⁻¹ Mᵀ R⁻¹ that wastes no information.
func (pr *pair) combineSensors(r *mat.Dense) {
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
	if rm.Solve(r, m) != nil { // R singular: every sensor counts alike
		rm.CloneFrom(m)
	}
	mrm.Mul(m.T(), &rm)
	if combine.Solve(&mrm, rm.T()) != nil {
		return
	}
	pr.combine = &combine
	_, cols := pr.c.Dims()
	pr.c = mat.DenseCopyOf(v.Slice(0, cols, 0, rank).T())
}

// Place designs the gain whose eigenvalues are the wanted poles, in the model's
// own plane (s in continuous, z in discrete time), a complex pole with its
// partner. The list holds the movable poles, or all n with the fixed ones among
// them; poles of delay registers may be left out and default to zero. A previous
// design of the same Designer, or nil, tells which branch to follow.
//
// It fails with a *FixedModesError where the list does not fit what the sensors
// give. An unstable list is an answer too: its design says so.
func (d *Designer) Place(wanted []complex128, prev *Design) (*Design, error) {
	movable, err := d.movable(wanted)
	if err != nil {
		return nil, err
	}
	ls := mat.NewDense(d.n, d.p, nil)
	var branch *placement.Warm
	if d.pair.rank > 0 {
		if branch, err = d.assign(ls, movable, prev); err != nil {
			return nil, err
		}
	}
	if d.pair.rank < d.n {
		d.addUnseenRows(ls)
	}
	var lf *mat.Dense
	if d.opt.Form == Current {
		lf = d.unscaleGain(ls)
		ls.Mul(d.a, mat.DenseCopyOf(ls))
	}
	out, err := d.judge(d.unscaleGain(ls), lf, append(movable, d.pair.fixed...))
	if err != nil {
		return nil, err
	}
	out.branch = branch
	return out, nil
}

// movable reduces a list to the poles that placement can choose.
func (d *Designer) movable(wanted []complex128) ([]complex128, error) {
	for _, v := range wanted {
		if cmplx.IsNaN(v) || cmplx.IsInf(v) {
			return nil, fmt.Errorf("pole: %w", ErrNotFinite)
		}
	}
	for _, v := range d.pair.fixed {
		if !strictlyStable(v, d.model.Discrete()) {
			return nil, &FixedModesError{Fixed: d.Fixed(), Movable: d.pair.rank, Wanted: len(wanted), Unstable: true}
		}
	}
	refuse := &FixedModesError{Fixed: d.Fixed(), Movable: d.pair.rank, Wanted: len(wanted)}
	list := append([]complex128(nil), wanted...)
	rank, registers := d.Movable()
	if k := len(list); registers > 0 && (k == rank-registers || k == d.n-registers) {
		list = append(list, make([]complex128, registers)...)
	}
	switch len(list) {
	case rank:
		return list, nil
	case d.n:
		return withoutFixed(list, d.pair.fixed, refuse)
	}
	return nil, refuse
}

func withoutFixed(list, fixed []complex128, refuse error) ([]complex128, error) {
	for _, f := range fixed {
		best := -1
		for i, v := range list {
			if best < 0 || cmplx.Abs(v-f) < cmplx.Abs(list[best]-f) {
				best = i
			}
		}
		if best < 0 || cmplx.Abs(list[best]-f) > 1e-6*max(cmplx.Abs(f), 1e-3) {
			return nil, refuse
		}
		list = append(list[:best], list[best+1:]...)
	}
	return list, nil
}

// assign writes the scaled gain for the movable poles to ls.
func (d *Designer) assign(ls *mat.Dense, movable []complex128, prev *Design) (branch *placement.Warm, err error) {
	pr := &d.pair
	p1, _ := pr.c.Dims()
	part := mat.NewDense(pr.rank, p1, nil)
	switch {
	case d.opt.Method == LeastNoise && p1 > 1:
		return nil, fmt.Errorf("least-noise gain for several sensors: %w", ErrMethod)
	case p1 == 1:
		err = d.placement.Single(raw(part), raw(pr.a), raw(pr.c), movable)
	default:
		branch = new(placement.Warm)
		if prev != nil && prev.branch != nil {
			branch = prev.branch.Clone()
		}
		_, err = d.placement.Robust(raw(part), raw(pr.a), raw(pr.c), movable, branch)
	}
	if err != nil {
		return nil, fmt.Errorf("placement: %w", err)
	}
	full := part
	if pr.combine != nil {
		full = new(mat.Dense)
		full.Mul(part, pr.combine)
	}
	ls.Mul(pr.q.Slice(0, d.n, 0, pr.rank), full)
	return branch, nil
}

func formatPole(v complex128) string { return poles.Format(v) }
