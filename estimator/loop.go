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

// mostConfirmed is the number of states up to which exactLoop looks for crossings in
// Hamiltonian matrices of four times the size.
const mostConfirmed = 12

// exactLoop judges the loop of a complete design: the quick figures, with the margins of
// small loops found again where their crossings are eigenvalues and none can hide on a
// grid, and with the sensitivity of several inputs taken together.
func (d *Designer) exactLoop(out *Design) {
	quick := out.Loop
	if quick == nil || !quick.Stable {
		return
	}
	_, inputs, _ := d.model.Dims()
	if d.n > mostConfirmed && inputs == 1 {
		return
	}
	l, err := d.openLoop(d.model, out)
	if err != nil {
		return
	}
	loop := *quick
	if d.n > mostConfirmed {
		d.wholeSensitivity(&loop, l)
		out.Loop = &loop
		return
	}
	loop.Input, loop.DelayMarginSamples = -1, -1
	judged := &Design{Loop: &loop}
	d.loopMargins(judged, l)
	if loop.Input >= 0 {
		out.Loop = &loop
		out.Warnings = append(out.Warnings, judged.Warnings...)
	}
}

// wholeSensitivity replaces the sensitivity of one input at a time by that of all
// together.
func (d *Designer) wholeSensitivity(loop *Loop, l *broken) {
	whole := frequency.System{A: raw(l.a), B: raw(l.b), C: raw(l.c), D: raw(l.d), Period: d.model.Period}
	if peak, err := frequency.SensitivityPeakMIMO(whole); err == nil {
		loop.SensitivityPeak = peak
	}
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
		d.wholeSensitivity(loop, l)
	}
	if loop.Input < 0 {
		nan := math.NaN()
		loop.GainMarginBelow, loop.GainMarginAbove = nan, nan
		loop.PhaseMargin, loop.DelayMargin, loop.SensitivityPeak = nan, nan, nan
	}
}

// mostDelay is the longest delay whose eigenvalues are looked at, in samples. Beyond
// it the margin for real delays decides.
const mostDelay = 100

// delaySamples returns the largest whole delay that leaves the loop stable, by
// the eigenvalues of the loop with that many registers; bound is the margin of a
// real-valued delay in seconds. −1 is for none.
func (d *Designer) delaySamples(sys frequency.System, bound float64) int {
	n := sys.A.Rows
	real := bound / d.model.Period
	if real > math.MaxInt32 {
		return -1
	}
	limit := int(real) + 2
	if limit > mostDelay { // every delay below the margin is stable
		return int(math.Ceil(real)) - 1
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
