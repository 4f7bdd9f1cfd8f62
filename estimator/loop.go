package estimator

import (
	"errors"
	"fmt"
	"math"

	"gonum.org/v1/gonum/mat"

	"polewright/estimator/internal/frequency"
	"polewright/estimator/internal/schur"
)

// broken is the loop cut open at the plant input: from the input u of the plant
// to w = K x̂ of the controller, so that closing it is u = −w. Its state is the
// plant's without the unknowns, then the estimator's.
type broken struct {
	a, b, c, d *mat.Dense
	plant      int        // plant states
	noise      *mat.Dense // how a sensor sample enters the state
	direct     *mat.Dense // and w
}

// openLoop builds the cut loop in the user's units. With e = y − C x̂ − D u the
// controller's own command stands for u, which in current form leaves the
// algebraic loop (I − D K Lf) e = y − (C − D K) x̂.
func (d *Designer) openLoop(out *Design) (*broken, error) {
	m := d.model
	_, inputs, _ := m.Dims()
	var own []int // plant states that are no unknowns
	for i := range d.n {
		if m.Roles == nil || m.Roles[i] != UnknownState {
			own = append(own, i)
		}
	}
	np := len(own)
	N := np + d.n
	feed := m.D
	if feed == nil {
		feed = mat.NewDense(d.p, inputs, nil)
	}
	take := mat.NewDense(d.n, np, nil) // x = take·xp
	for k, i := range own {
		take.Set(i, k, 1)
	}

	// e = ey·(C xp + D u) + ex·x̂
	ey, direct := identity(d.p), mat.NewDense(inputs, d.p, nil)
	if d.opt.Form == Current {
		direct.Mul(m.K, out.GainCurrent)
		var loop mat.Dense
		loop.Mul(feed, direct)
		loop.Sub(identity(d.p), &loop)
		if err := ey.Solve(&loop, identity(d.p)); err != nil {
			return nil, errors.New("the direct feedthrough closes an algebraic loop that has no answer")
		}
		direct.Mul(direct, ey)
	}
	var ex, dk mat.Dense
	dk.Mul(feed, m.K)
	dk.Sub(&dk, m.C)
	ex.Mul(ey, &dk)

	// w = K x̂ + (K Lf) e in current form, K x̂ in prediction form
	var eC, eD, cp mat.Dense
	cp.Mul(m.C, take)
	eC.Mul(ey, &cp)
	eD.Mul(ey, feed)
	c, dd := mat.NewDense(inputs, N, nil), mat.NewDense(inputs, inputs, nil)
	set(c, 0, np, m.K)
	if d.opt.Form == Current {
		var kl, part mat.Dense
		kl.Mul(m.K, out.GainCurrent)
		part.Mul(&kl, &eC)
		add(c, 0, 0, &part)
		part.Reset()
		part.Mul(&kl, &ex)
		add(c, 0, np, &part)
		dd.Mul(&kl, &eD)
	}

	// xp' = A xp + B u;  x̂' = A x̂ + L e − B w
	a, b := mat.NewDense(N, N, nil), mat.NewDense(N, inputs, nil)
	var at, ap, bp mat.Dense
	at.Mul(m.A, take)
	ap.Mul(take.T(), &at)
	bp.Mul(take.T(), m.B)
	set(a, 0, 0, &ap)
	set(b, 0, 0, &bp)
	var lc, lx, bw, ld, bd mat.Dense
	lc.Mul(out.Gain, &eC)
	set(a, np, 0, &lc)
	lx.Mul(out.Gain, &ex)
	lx.Add(&lx, m.A)
	set(a, np, np, &lx)
	bw.Mul(m.B, c)
	bw.Scale(-1, &bw)
	add(a, np, 0, &bw)
	ld.Mul(out.Gain, &eD)
	bd.Mul(m.B, dd)
	ld.Sub(&ld, &bd)
	set(b, np, 0, &ld)

	noise := mat.NewDense(N, d.p, nil)
	var ln, bn mat.Dense
	ln.Mul(out.Gain, ey)
	bn.Mul(m.B, direct)
	ln.Sub(&ln, &bn)
	set(noise, np, 0, &ln)
	return &broken{a: a, b: b, c: c, d: dd, plant: np, noise: noise, direct: direct}, nil
}

func identity(n int) *mat.Dense {
	m := mat.NewDense(n, n, nil)
	for i := range n {
		m.Set(i, i, 1)
	}
	return m
}

// set copies src into dst with its corner at (row, col); add adds it.
func set(dst *mat.Dense, row, col int, src mat.Matrix) {
	r, c := src.Dims()
	dst.Slice(row, row+r, col, col+c).(*mat.Dense).Copy(src)
}

func add(dst *mat.Dense, row, col int, src mat.Matrix) {
	r, c := src.Dims()
	part := dst.Slice(row, row+r, col, col+c).(*mat.Dense)
	part.Add(part, src)
}

// closed returns the cut loop with the inputs in shut closed by u = −w, seen
// from the others: A − B (I + D)⁻¹ C on the closed part.
func (l *broken) closed(shut []int) (a *mat.Dense, inverse *mat.Dense, err error) {
	k := len(shut)
	if k == 0 {
		return mat.DenseCopyOf(l.a), nil, nil
	}
	n, _ := l.a.Dims()
	b, c, one := mat.NewDense(n, k, nil), mat.NewDense(k, n, nil), identity(k)
	for i, u := range shut {
		for r := range n {
			b.Set(r, i, l.b.At(r, u))
			c.Set(i, r, l.c.At(u, r))
		}
		for j, v := range shut {
			one.Set(i, j, one.At(i, j)+l.d.At(u, v))
		}
	}
	inverse = new(mat.Dense)
	if err := inverse.Inverse(one); err != nil {
		return nil, nil, errors.New("the direct feedthrough closes an algebraic loop that has no answer")
	}
	var ic, bic mat.Dense
	ic.Mul(inverse, c)
	bic.Mul(b, &ic)
	a = mat.NewDense(n, n, nil)
	a.Sub(l.a, &bic)
	return a, inverse, nil
}

// single returns the loop of one input with all the others closed.
func (l *broken) single(input int) (frequency.System, error) {
	_, inputs := l.b.Dims()
	n, _ := l.a.Dims()
	var others []int
	for u := range inputs {
		if u != input {
			others = append(others, u)
		}
	}
	a, inverse, err := l.closed(others)
	if err != nil {
		return frequency.System{}, err
	}
	b, c := mat.NewDense(n, 1, nil), mat.NewDense(1, n, nil)
	b.Copy(l.b.ColView(input))
	c.Copy(l.c.RowView(input).T())
	through := mat.NewDense(1, 1, []float64{l.d.At(input, input)})
	for i, u := range others {
		for j, v := range others {
			// u_others = −(I + D)⁻¹ (C x + D_oi u)
			g := -inverse.At(i, j)
			for r := range n {
				b.Set(r, 0, b.At(r, 0)+l.b.At(r, u)*g*l.d.At(v, input))
				c.Set(0, r, c.At(0, r)+l.d.At(input, u)*g*l.c.At(v, r))
			}
			through.Set(0, 0, through.At(0, 0)+l.d.At(input, u)*g*l.d.At(v, input))
		}
	}
	return frequency.System{A: raw(a), B: raw(b), C: raw(c), D: raw(through)}, nil
}

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
	l, err := d.openLoop(out)
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
	n, _ := a.Dims()
	_, inputs := l.b.Dims()
	// u = −(I + D)⁻¹ (C x + direct·v); v enters the state as noise − B (I + D)⁻¹ direct
	var uc, uv, enter, bv mat.Dense
	uc.Mul(inverse, l.c)
	uv.Mul(inverse, l.direct)
	bv.Mul(l.b, &uv)
	enter.Sub(l.noise, &bv)
	q := mat.NewDense(n, n, nil)
	var er mat.Dense
	er.Mul(&enter, m.R)
	q.Mul(&er, enter.T())
	w := processNoise(m)
	var own []int
	for i := range d.n {
		if m.Roles == nil || m.Roles[i] != UnknownState {
			own = append(own, i)
		}
	}
	for i, r := range own {
		for j, c := range own {
			q.Set(i, j, q.At(i, j)+w.At(r, c))
		}
	}
	p := mat.NewDense(n, n, nil)
	solve := form.Lyapunov
	if m.Discrete() {
		solve = form.Stein
	}
	if solve(raw(p), raw(q)) != nil {
		return nil
	}
	cov := symmetric(p)
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
