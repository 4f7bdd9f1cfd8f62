package estimator

import (
	"fmt"
	"math"

	"gonum.org/v1/gonum/mat"

	"polewright/estimator/internal/frequency"
	"polewright/estimator/internal/schur"
)

func all(n int) []int {
	list := make([]int, n)
	for i := range list {
		list[i] = i
	}
	return list
}

func (d *Designer) judgeLoop(out *Design) error {
	m := d.model
	if m.K == nil || m.B == nil {
		return nil
	}
	_, inputs, _ := m.Dims()
	l, err := d.openLoop(m, out)
	if err != nil {
		out.Warnings = append(out.Warnings, "loop: "+err.Error())
		return nil
	}
	a, inverse, err := l.closed(all(inputs))
	if err != nil {
		out.Warnings = append(out.Warnings, "loop: "+err.Error())
		return nil
	}
	var form schur.Form
	if err := form.Factor(raw(a)); err != nil {
		return fmt.Errorf("closed loop: %w", err)
	}
	nan := math.NaN()
	loop := &Loop{Poles: append([]complex128(nil), form.Eigenvalues()...), Input: -1,
		GainMarginBelow: nan, GainMarginAbove: nan, PhaseMargin: nan, DelayMargin: nan, DelayMarginSamples: -1, SensitivityPeak: nan}
	loop.Stable = stable(loop.Poles, m.Discrete())
	out.Loop = loop
	if !loop.Stable {
		out.Warnings = append(out.Warnings, "the nominal control loop is unstable: it has no margins")
		return nil
	}
	d.loopMargins(out, l)
	loop.InputStd = d.inputNoise(l, a, inverse, &form)
	return nil
}

// loopMargins examines one input at a time and keeps the worst of each margin;
// Input is the one with the least phase margin.
func (d *Designer) loopMargins(out *Design, l *broken) {
	loop := out.Loop
	_, inputs := l.b.Dims()
	inf := math.Inf(1)
	loop.GainMarginBelow, loop.GainMarginAbove = -inf, inf
	loop.PhaseMargin, loop.DelayMargin, loop.SensitivityPeak = inf, inf, 0
	for u := range inputs {
		sys, err := l.single(u)
		sys.Period = d.model.Period
		var r frequency.Result
		if err == nil {
			r, err = frequency.Margins(sys)
		}
		if err != nil {
			out.Warnings = append(out.Warnings, fmt.Sprintf("margins at input %s: %v", d.inputName(u), err))
			continue
		}
		if loop.Input < 0 || r.PhaseDeg < loop.PhaseMargin {
			loop.Input = u
		}
		loop.GainMarginBelow = max(loop.GainMarginBelow, r.GainBelowDB)
		loop.GainMarginAbove = min(loop.GainMarginAbove, r.GainAboveDB)
		loop.PhaseMargin = min(loop.PhaseMargin, r.PhaseDeg)
		loop.DelayMargin = min(loop.DelayMargin, r.DelayS)
		loop.SensitivityPeak = max(loop.SensitivityPeak, r.SensitivityPeak)
		if d.model.Discrete() && !math.IsInf(r.DelayS, 0) {
			k := d.delaySamples(sys, r.DelayS)
			if loop.DelayMarginSamples < 0 || k < loop.DelayMarginSamples {
				loop.DelayMarginSamples = k
			}
		}
	}
	if inputs > 1 {
		whole := frequency.System{A: raw(l.a), B: raw(l.b), C: raw(l.c), D: raw(l.d), Period: d.model.Period}
		if peak, err := frequency.SensitivityPeakMIMO(whole); err == nil {
			loop.SensitivityPeak = peak
		}
	}
	if loop.Input < 0 {
		nan := math.NaN()
		loop.GainMarginBelow, loop.GainMarginAbove = nan, nan
		loop.PhaseMargin, loop.DelayMargin, loop.SensitivityPeak = nan, nan, nan
	}
}

// delaySamples returns the largest whole delay that leaves the loop stable, by
// the eigenvalues of the loop with that many registers; bound is the margin of a
// real-valued delay in seconds. It gives up at 100 samples and says −1.
func (d *Designer) delaySamples(sys frequency.System, bound float64) int {
	n := sys.A.Rows
	limit := int(bound/d.model.Period) + 2
	if limit > 100 {
		return -1
	}
	var form schur.Form
	for k := 1; k <= limit; k++ {
		a := mat.NewDense(n+k, n+k, nil)
		for i := range n {
			for j := range n {
				a.Set(i, j, sys.A.Data[i*sys.A.Stride+j])
			}
			a.Set(i, n+k-1, sys.B.Data[i*sys.B.Stride])
		}
		for j := range n {
			a.Set(n, j, -sys.C.Data[j])
		}
		a.Set(n, n+k-1, -sys.D.Data[0])
		for i := 1; i < k; i++ {
			a.Set(n+i, n+i-1, 1)
		}
		if form.Factor(raw(a)) != nil {
			return -1
		}
		if !stable(form.Eigenvalues(), true) {
			return k - 1
		}
	}
	return limit
}

// inputNoise returns the standard deviation of u = −K x̂ in the closed loop
// whose matrix is a, with its Schur form at hand.
func (d *Designer) inputNoise(l *broken, a, inverse *mat.Dense, form *schur.Form) []float64 {
	m := d.model
	_, inputs := l.b.Dims()
	// u = −(I + D)⁻¹ (C x + direct·v)
	var uc, uv mat.Dense
	uc.Mul(inverse, l.c)
	uv.Mul(inverse, l.direct)
	cov := d.loopCovariance(l, m, &uv, form)
	if cov == nil {
		return nil
	}
	std := make([]float64, inputs)
	for u := range std {
		v := mat.Inner(uc.RowView(u), cov, uc.RowView(u))
		if m.Discrete() {
			v += mat.Inner(uv.RowView(u), m.R, uv.RowView(u))
		}
		std[u] = math.Sqrt(max(v, 0))
	}
	return std
}

// loopCovariance returns the steady-state covariance of plant and estimator in
// closed loop, whose Schur form is at hand, under the plant's own noises; nil
// where there is none. uv is how a sensor sample reaches −u.
func (d *Designer) loopCovariance(l *broken, plant *Model, uv *mat.Dense, form *schur.Form) *mat.SymDense {
	n, _ := l.a.Dims()
	var enter, bv, er mat.Dense
	bv.Mul(l.b, uv)
	enter.Sub(l.noise, &bv)
	q := mat.NewDense(n, n, nil)
	er.Mul(&enter, plant.R)
	q.Mul(&er, enter.T())
	w, own := processNoise(plant), plant.own()
	for i, r := range own {
		for j, c := range own {
			q.Set(i, j, q.At(i, j)+w.At(r, c))
		}
	}
	p := mat.NewDense(n, n, nil)
	solve := form.Lyapunov
	if d.model.Discrete() {
		solve = form.Stein
	}
	if solve(raw(p), raw(q)) != nil {
		return nil
	}
	return symmetric(p)
}
