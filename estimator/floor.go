package estimator

import (
	"math"

	"gonum.org/v1/gonum/mat"

	"polewright/estimator/internal/riccati"
	"polewright/estimator/internal/schur"
)

func (d *Designer) findFloor() {
	solve := riccati.Continuous
	if d.model.Discrete() {
		solve = riccati.Discrete
	}
	sol, err := solve(raw(d.a), raw(d.c), raw(d.w), raw(d.r))
	if err != nil {
		d.analysis.FloorReason = "no best linear estimator to compare with: " + err.Error()
		return
	}
	cov := sol.P
	d.clearKnown(cov, sol.L)
	if d.opt.Form == Current {
		if cov = d.filtered(sol.P); cov == nil {
			d.analysis.FloorReason = "no best linear estimator to compare with: the innovation covariance is singular"
			return
		}
		d.clearKnown(cov, nil)
	}
	f := &Floor{Covariance: d.unscaleCovariance(cov), Gain: d.unscaleGain(sol.L), Poles: sol.Poles}
	f.Std = roots(f.Covariance)
	d.analysis.Floor = f
}

// clearKnown sets to zero what the floor has for states that are known exactly: no
// process noise reaches them through the entries of A, and they die out by
// themselves, as the lag of a known input does. Rounding leaves dust there, which a
// ratio to the floor would take for a figure.
func (d *Designer) clearKnown(p, l *mat.Dense) {
	noisy := make([]bool, d.n)
	for i := range noisy {
		noisy[i] = d.w.At(i, i) > 0
	}
	for changed := true; changed; {
		changed = false
		for i := range noisy {
			for j := range noisy {
				if !noisy[i] && noisy[j] && d.a.At(i, j) != 0 {
					noisy[i], changed = true, true
				}
			}
		}
	}
	var known []int
	for i, n := range noisy {
		if !n {
			known = append(known, i)
		}
	}
	if len(known) == 0 {
		return
	}
	part := mat.NewDense(len(known), len(known), nil)
	for i, r := range known {
		for j, c := range known {
			part.Set(i, j, d.a.At(r, c))
		}
	}
	var form schur.Form
	if form.Factor(raw(part)) != nil || !stable(form.Eigenvalues(), d.model.Discrete()) {
		return
	}
	for _, i := range known {
		for j := range d.n {
			p.Set(i, j, 0)
			p.Set(j, i, 0)
		}
		if l != nil {
			for j := range d.p {
				l.Set(i, j, 0)
			}
		}
	}
}

// filtered returns P − P Cᵀ (C P Cᵀ + R)⁻¹ C P; nil where that is singular.
func (d *Designer) filtered(p *mat.Dense) *mat.Dense {
	var cp, s, x, out mat.Dense
	cp.Mul(d.c, p)
	s.Mul(&cp, d.c.T())
	s.Add(&s, d.r)
	if x.Solve(&s, &cp) != nil {
		return nil
	}
	out.Mul(cp.T(), &x)
	out.Sub(p, &out)
	return &out
}

// filteredBy returns (I − Lf C) P (I − Lf C)ᵀ + Lf R Lfᵀ.
func (d *Designer) filteredBy(p, lf *mat.Dense) *mat.Dense {
	var j, jp, jpj, lr, lrl mat.Dense
	j.Mul(lf, d.c)
	j.Apply(func(i, k int, v float64) float64 {
		if i == k {
			return 1 - v
		}
		return -v
	}, &j)
	jp.Mul(&j, p)
	jpj.Mul(&jp, j.T())
	lr.Mul(lf, d.r)
	lrl.Mul(&lr, lf.T())
	jpj.Add(&jpj, &lrl)
	return &jpj
}

func (d *Designer) compareWithFloor(noise *Noise) {
	noise.OverFloor = make([]float64, d.n)
	var sum float64
	var count int
	floor := d.analysis.Floor
	for i := range d.n {
		noise.OverFloor[i] = math.NaN()
		if floor == nil || !(floor.Std[i] > 0) {
			continue
		}
		ratio := noise.Std[i] / floor.Std[i]
		noise.OverFloor[i] = ratio
		if d.keep == nil || d.keep[i] {
			sum += ratio * ratio
			count++
		}
	}
	noise.OverFloorRMS = math.NaN()
	if count > 0 {
		noise.OverFloorRMS = math.Sqrt(sum / float64(count))
	}
}
