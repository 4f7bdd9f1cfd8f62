package estimator

import (
	"context"
	"fmt"
	"math"
	"math/cmplx"

	"gonum.org/v1/gonum/mat"

	"polewright/estimator/poles"
)

// Given is a gain found elsewhere, or stored.
type Given struct {
	L *mat.Dense // n×p, prediction form
	// Lf is the current form's gain, A Lf = L; nil leaves it to be solved for.
	// Without L, L is A Lf.
	Lf *mat.Dense
	// Wanted are the poles that the gain was made for, as for Place; nil without.
	Wanted []complex128
}

// Judge examines a gain. It answers for every finite gain; an unstable F leaves
// figures undefined and is named in the warnings. In current form it fails where
// no Lf solves A Lf = L.
func (d *Designer) Judge(g Given) (*Design, error) {
	quick, err := d.QuickJudge(g)
	if err != nil {
		return nil, err
	}
	return d.Complete(context.Background(), quick)
}

// QuickJudge is Judge without what Design.Partial lists.
func (d *Designer) QuickJudge(g Given) (_ *Design, err error) {
	defer guard(&err)
	for _, l := range []*mat.Dense{g.L, g.Lf} {
		if l == nil {
			continue
		}
		if l.IsEmpty() {
			return nil, fmt.Errorf("the gain is empty, expected %d×%d: %w", d.n, d.p, ErrShape)
		}
		if r, c := l.Dims(); r != d.n || c != d.p {
			return nil, fmt.Errorf("the gain is %d×%d, expected %d×%d: %w", r, c, d.n, d.p, ErrShape)
		}
		if err := checkEntries("the gain", l); err != nil {
			return nil, err
		}
	}
	l, lf := g.L, g.Lf
	if !d.model.Discrete() {
		lf = nil
	}
	switch {
	case lf != nil:
		product := new(mat.Dense)
		product.Mul(d.model.A, lf)
		if l == nil {
			l = product
			break
		}
		if product.Sub(product, l); mat.Norm(d.scaleGain(product), 2) > 1e-6*mat.Norm(d.scaleGain(l), 2) {
			return nil, fmt.Errorf("the two gains are no pair, A Lf is not L: %w", ErrMethod)
		}
	case l == nil:
		return nil, fmt.Errorf("no gain was given, expected %d×%d: %w", d.n, d.p, ErrShape)
	}
	var wanted []complex128
	if g.Wanted != nil {
		movable, err := d.movable(g.Wanted)
		if err != nil {
			return nil, err
		}
		wanted = append(movable, d.pair.fixed...)
	}
	return d.judge(l, lf, wanted)
}

// judge examines a gain in the user's units, as it is stored: judging a stored
// gain again gives the same figures. current is its current form where that is
// known, wanted the poles asked for where there are any.
func (d *Designer) judge(gain, current *mat.Dense, wanted []complex128) (*Design, error) {
	if err := checkEntries("the gain for these poles", gain); err != nil {
		return nil, err
	}
	out := &Design{Form: d.opt.Form, Method: d.opt.Method, Partial: true, WorstError: math.NaN(), Float32Shift: math.NaN()}
	out.Gain = mat.DenseCopyOf(gain)
	ls := d.scaleGain(gain)
	var lf *mat.Dense
	switch {
	case current != nil:
		out.GainCurrent = mat.DenseCopyOf(current)
		lf = d.scaleGain(current)
	case d.model.Discrete():
		if lf = d.currentGain(ls); lf != nil {
			out.GainCurrent = d.unscaleGain(lf)
		} else if d.opt.Form == Current {
			return nil, fmt.Errorf("no current-form gain Lf solves A Lf = L: %w", ErrMethod)
		}
	}
	out.GainNorm = norm2(out.Gain)

	f := d.errorMatrix(ls)
	if err := d.form.Factor(raw(f)); err != nil {
		return nil, fmt.Errorf("eigenvalues of A − LC: %w", err)
	}
	out.Reached = append([]complex128(nil), d.form.Eigenvalues()...)
	if wanted != nil {
		out.Wanted = wanted
		out.Reached, out.WorstError = matchPoles(wanted, out.Reached)
	}
	out.Stable = stable(out.Reached, d.model.Discrete())
	out.EigenvectorCondition = math.NaN()
	if k, err := d.form.VectorCondition(); err == nil && !math.IsInf(k, 0) && !d.tooManyAlike(wanted) {
		out.EigenvectorCondition = k
	}
	d.judgeNoise(out, f, ls, lf)
	d.judgeTransient(out, f, ls, lf)
	if err := d.judgeLoop(out, ls, lf); err != nil {
		return nil, err
	}
	d.warn(out)
	return out, nil
}

// tooManyAlike tells whether a pole is wanted more often than there can be
// eigenvectors for it: as many as independent sensors.
func (d *Designer) tooManyAlike(wanted []complex128) bool {
	if d.pair.rank == 0 || len(wanted) < d.pair.rank {
		return false
	}
	movable := wanted[:d.pair.rank]
	sensors, _ := d.pair.c.Dims()
	for _, v := range movable {
		count := 0
		for _, w := range movable {
			if w == v {
				count++
			}
		}
		if count > sensors {
			return true
		}
	}
	return false
}

// norm2 is the largest singular value; mat.Norm(a, 2) is Frobenius's norm.
func norm2(a *mat.Dense) float64 {
	var svd mat.SVD
	if !svd.Factorize(a, mat.SVDNone) {
		return math.NaN()
	}
	return svd.Values(nil)[0]
}

// errorMatrix returns F = A − L C in scaled coordinates.
func (d *Designer) errorMatrix(ls *mat.Dense) *mat.Dense {
	f := mat.NewDense(d.n, d.n, nil)
	f.Mul(ls, d.c)
	f.Sub(d.a, f)
	return f
}

// currentGain solves A Lf = L in scaled coordinates; nil where nothing does. Where A
// is singular and several do, in current form it is the one with the least noise.
func (d *Designer) currentGain(ls *mat.Dense) *mat.Dense {
	var svd mat.SVD
	if !svd.Factorize(d.a, mat.SVDFull) {
		return nil
	}
	rank := svd.Rank(1e-13)
	if rank == 0 {
		if mat.Norm(ls, 2) == 0 {
			return mat.NewDense(d.n, d.p, nil)
		}
		return nil
	}
	lf := mat.NewDense(d.n, d.p, nil)
	svd.SolveTo(lf, ls, rank)
	var back mat.Dense
	back.Mul(d.a, lf)
	back.Sub(&back, ls)
	if mat.Norm(&back, 2) > 1e-9*mat.Norm(ls, 2) {
		return nil
	}
	if rank < d.n && d.opt.Form == Current {
		var v mat.Dense
		svd.VTo(&v)
		d.quieten(lf, v.Slice(0, d.n, rank, d.n))
	}
	return lf
}

// matchPoles orders have like wanted and returns the worst relative distance.
func matchPoles(wanted, have []complex128) (ordered []complex128, worst float64) {
	index := poles.Match(wanted, have)
	ordered = make([]complex128, len(have))
	for i, w := range wanted {
		ordered[i] = have[index[i]]
		size := cmplx.Abs(w)
		if size == 0 {
			size = 1
		}
		worst = max(worst, cmplx.Abs(ordered[i]-w)/size)
	}
	return ordered, worst
}

// judgeNoise fills the steady-state figures from the Schur form of F at hand.
func (d *Designer) judgeNoise(out *Design, f, ls, lf *mat.Dense) {
	out.Noise.OverFloorRMS = math.NaN()
	if !out.Stable {
		return
	}
	var lr, q mat.Dense
	lr.Mul(ls, d.r)
	q.Mul(&lr, ls.T())
	q.Add(&q, d.w)
	p, err := d.solveNoise(f, &q)
	if err != nil {
		out.Warnings = append(out.Warnings, "the noise has no steady state that can be computed: "+err.Error())
		return
	}
	if d.opt.Form == Current {
		p = d.filteredBy(p, lf)
	}
	noise := &out.Noise
	noise.Covariance = d.unscaleCovariance(p)
	noise.Std = roots(noise.Covariance)
	d.compareWithFloor(noise)
	for i := range outputRows(d.model) {
		row := d.model.Outputs.RowView(i)
		o := OutputNoise{Std: math.Sqrt(max(mat.Inner(row, noise.Covariance, row), 0)), FloorStd: math.NaN()}
		if f := d.analysis.Floor; f != nil {
			o.FloorStd = math.Sqrt(max(mat.Inner(row, f.Covariance, row), 0))
		}
		noise.Outputs = append(noise.Outputs, o)
	}
}

func outputRows(m *Model) int {
	if m.Outputs == nil {
		return 0
	}
	r, _ := m.Outputs.Dims()
	return r
}

func (d *Designer) judgeTransient(out *Design, f, ls, lf *mat.Dense) {
	out.Transient = Transient{Settle: math.NaN(), Peak: math.NaN()}
	if !out.Stable {
		return
	}
	form := &d.form
	if d.opt.Form == Current { // the error after each sample: (I − Lf C) A
		var ca mat.Dense
		ca.Mul(d.c, d.a)
		f = mat.NewDense(d.n, d.n, nil)
		f.Mul(lf, &ca)
		f.Sub(d.a, f)
		if form = &d.filteredForm; form.Factor(raw(f)) != nil {
			form = nil
		}
	}
	shape := raw(f)
	if d.keep == nil && form != nil { // orthogonal coordinates change no norm of the whole
		shape = form.T()
	}
	settle, peak, err := d.transient.Settle(shape, d.model.Period, d.keep)
	if err != nil {
		out.Warnings = append(out.Warnings, "the start-up transient could not be computed: "+err.Error())
		return
	}
	out.Transient = Transient{Settle: settle, Peak: peak}
}
