package estimator

import (
	"fmt"
	"math"

	"gonum.org/v1/gonum/mat"

	"polewright/estimator/internal/ratio"
	"polewright/estimator/internal/schur"
)

// control is the controller u = −K x̂ on the plant without its unknowns, as far as it
// does not depend on the gain, with the workspaces of the loop. In scaled coordinates.
type control struct {
	own          []int // the plant's states
	b, k, d      *mat.Dense
	bk           *mat.Dense // own×n: B K, how an error drives the plant
	a            *mat.Dense // own×own: A − B K
	process      *mat.Dense // n×n: process noise of the plant's states alone
	open, closed []complex128

	form, joined, alone schur.Form // of a, of a and F together, of the estimator cut off
	sensitivity         ratio.Sensitivity
	aloneStable         bool
	zeros               []complex128
}

// prepareControl analyses the plant with its controller; nil without one.
func (d *Designer) prepareControl() error {
	m := d.model
	if m.K == nil || m.B == nil {
		return nil
	}
	c := &control{own: m.own()}
	np := len(c.own)
	c.b, c.k = mat.DenseCopyOf(m.B), mat.DenseCopyOf(m.K)
	c.b.Apply(func(i, _ int, v float64) float64 { return v / d.sx[i] }, c.b)
	c.k.Apply(func(_, j int, v float64) float64 { return v * d.sx[j] }, c.k)
	if m.D != nil {
		c.d = mat.DenseCopyOf(m.D)
		c.d.Apply(func(i, _ int, v float64) float64 { return v / d.sy[i] }, c.d)
	}
	var bk mat.Dense
	bk.Mul(c.b, c.k)
	if np == 0 {
		return nil
	}
	c.bk, c.a, c.process = rowsOf(&bk, c.own), mat.NewDense(np, np, nil), mat.NewDense(d.n, d.n, nil)
	free := mat.NewDense(np, np, nil)
	for i, r := range c.own {
		for j, s := range c.own {
			c.process.Set(r, s, d.w.At(r, s))
			free.Set(i, j, d.a.At(r, s))
			c.a.Set(i, j, d.a.At(r, s)-bk.At(r, s))
		}
	}
	for _, part := range []*mat.Dense{c.b, c.k, c.a, c.bk} {
		if err := checkScaled("the controller", part, mostGiven); err != nil {
			return err
		}
	}
	if err := c.form.Factor(raw(free)); err != nil {
		return fmt.Errorf("eigenvalues of the plant: %w", err)
	}
	c.open = append(c.open, c.form.Eigenvalues()...)
	if err := c.form.Factor(raw(c.a)); err != nil {
		return fmt.Errorf("eigenvalues of A − BK: %w", err)
	}
	c.closed = append(c.closed, c.form.Eigenvalues()...)
	d.control = c
	return nil
}

// judgeLoop judges the loop broken at the plant input. With the exact model the error
// does not depend on the plant, so that the closed loop's poles are those of A − BK and
// of F (the separation principle); its Schur form joins theirs.
func (d *Designer) judgeLoop(out *Design, ls, lf *mat.Dense) error {
	c := d.control
	if c == nil {
		return nil
	}
	if err := d.alone(ls); err != nil {
		return err
	}
	nan := math.NaN()
	loop := &Loop{Input: -1, GainMarginBelow: nan, GainMarginAbove: nan, PhaseMargin: nan, DelayMargin: nan, DelayMarginSamples: -1, SensitivityPeak: nan}
	loop.Poles = append(append(loop.Poles, c.closed...), d.form.Eigenvalues()...)
	loop.Stable = stable(loop.Poles, d.model.Discrete())
	simple := c.d == nil && d.opt.Form == Prediction
	_, inputs := c.b.Dims()
	var cut *broken
	if !simple || inputs > 1 {
		var err error
		if cut, err = d.openLoop(d.model, out); err == nil {
			_, _, err = cut.closed(all(inputs))
		}
		if err != nil {
			out.Warnings = append(out.Warnings, "loop: "+err.Error())
			return nil
		}
	}
	out.Loop = loop
	if !loop.Stable {
		out.Warnings = append(out.Warnings, "the nominal control loop is unstable: it has no margins")
		return nil
	}
	if cut == nil {
		c.zeros = append(append(c.zeros[:0], c.open...), c.alone.Eigenvalues()...)
		d.readMargins(loop, 0, 1)
	} else if err := d.cutMargins(out, cut); err != nil {
		return err
	}
	if loop.Input < 0 {
		out.Warnings = append(out.Warnings, "loop: its poles are too close to the stability limit, or too large, for margins")
	}
	if loop.InputStd = d.inputNoise(ls, lf); loop.InputStd == nil {
		out.Warnings = append(out.Warnings, "loop: the noise on the actuators cannot be computed")
	}
	return nil
}

// alone factors A − LC − BK, the estimator with its controller and without the plant.
func (d *Designer) alone(ls *mat.Dense) error {
	c := d.control
	cut := d.errorMatrix(ls)
	var bk mat.Dense
	bk.Mul(c.b, c.k)
	cut.Sub(cut, &bk)
	if err := c.alone.Factor(raw(cut)); err != nil {
		return fmt.Errorf("eigenvalues of A − BK − LC: %w", err)
	}
	c.aloneStable = stable(c.alone.Eigenvalues(), d.model.Discrete())
	return nil
}

// cutMargins examines one input at a time, the others closed.
func (d *Designer) cutMargins(out *Design, cut *broken) error {
	c := d.control
	_, inputs := cut.b.Dims()
	for u := range inputs {
		sys, err := cut.single(u)
		if err != nil {
			out.Warnings = append(out.Warnings, fmt.Sprintf("margins at input %s: %v", d.inputName(u), err))
			continue
		}
		if err := c.alone.Factor(sys.A); err != nil {
			return fmt.Errorf("loop open at input %s: %w", d.inputName(u), err)
		}
		c.zeros = append(c.zeros[:0], c.alone.Eigenvalues()...)
		d.readMargins(out.Loop, u, 1/(1+sys.D.Data[0]))
	}
	return nil
}

// readMargins takes the margins at one input into loop where they are worse; the
// zeros of the sensitivity are at hand, factor is its value at infinity.
func (d *Designer) readMargins(loop *Loop, input int, factor float64) {
	x := &d.control.sensitivity
	if x.Reset(d.control.zeros, loop.Poles, factor, d.model.Discrete()) != nil {
		return
	}
	m := x.Margins()
	samples := -1
	delay := m.Delay
	if d.model.Discrete() {
		delay *= d.model.Period
		switch {
		case m.Delay < mostDelay-2:
			samples = x.WholeDelay(int(m.Delay) + 2)
		case m.Delay < math.MaxInt32: // every delay below the margin is stable
			samples = int(math.Ceil(m.Delay)) - 1
		}
	}
	phase, below, above := m.Phase*180/math.Pi, 20*math.Log10(m.GainBelow), 20*math.Log10(m.GainAbove)
	if loop.Input < 0 {
		loop.Input, loop.GainMarginBelow, loop.GainMarginAbove = input, below, above
		loop.PhaseMargin, loop.DelayMargin, loop.SensitivityPeak, loop.DelayMarginSamples = phase, delay, m.Peak, samples
		return
	}
	if phase < loop.PhaseMargin {
		loop.Input = input
	}
	loop.GainMarginBelow, loop.GainMarginAbove = max(loop.GainMarginBelow, below), min(loop.GainMarginAbove, above)
	loop.PhaseMargin, loop.DelayMargin = min(loop.PhaseMargin, phase), min(loop.DelayMargin, delay)
	loop.SensitivityPeak = max(loop.SensitivityPeak, m.Peak)
	if samples >= 0 && (loop.DelayMarginSamples < 0 || samples < loop.DelayMarginSamples) {
		loop.DelayMarginSamples = samples
	}
}

// inputNoise returns the standard deviation of each actuator, u = −K x̂, with the Schur
// form of F at hand. The plant obeys x' = (A − BK) x + BK e + w in prediction form; in
// current form the controller sees the error (I − Lf C) e − Lf v. Nil where there is no
// steady state.
func (d *Designer) inputNoise(ls, lf *mat.Dense) []float64 {
	c := d.control
	np, n := len(c.own), d.n
	inputs, _ := c.k.Dims()
	bk, kx := c.bk, mat.NewDense(inputs, np+n, nil)
	see := mat.DenseCopyOf(c.k) // K (I − Lf C)
	kl := mat.NewDense(inputs, d.p, nil)
	var bl mat.Dense // B K Lf, how a sample enters the plant
	if lf != nil && d.opt.Form == Current {
		kl.Mul(c.k, lf)
		var klc, b mat.Dense
		klc.Mul(kl, d.c)
		see.Sub(see, &klc)
		b.Mul(c.b, see)
		bk = rowsOf(&b, c.own)
		b.Reset()
		b.Mul(c.b, kl)
		bl = *rowsOf(&b, c.own)
	}
	if c.joined.Join(&c.form, &d.form, raw(bk)) != nil {
		return nil
	}
	// e' = F e + w − L v, and u = −K x + see·e − kl·v
	q := mat.NewDense(np+n, np+n, nil)
	d.loopNoise(q, ls, &bl)
	p := q
	solve := c.joined.Lyapunov
	if d.model.Discrete() {
		solve = c.joined.Stein
	}
	if solve(raw(p), raw(q)) != nil {
		return nil
	}
	for i := range inputs {
		for j, s := range c.own {
			kx.Set(i, j, -c.k.At(i, s))
		}
	}
	set(kx, 0, np, see)
	std := make([]float64, inputs)
	for u := range std {
		v := mat.Inner(kx.RowView(u), p, kx.RowView(u))
		if d.opt.Form == Current {
			v += mat.Inner(kl.RowView(u), d.r, kl.RowView(u))
		}
		std[u] = math.Sqrt(max(v, 0))
	}
	return std
}

// loopNoise fills q with the covariance of what drives the plant and the error: w and
// −bl·v, w and −L v. An empty bl is zero.
func (d *Designer) loopNoise(q, ls, bl *mat.Dense) {
	c := d.control
	np := len(c.own)
	var lr, lrl mat.Dense
	lr.Mul(ls, d.r)
	lrl.Mul(&lr, ls.T())
	lrl.Add(&lrl, c.process)
	set(q, np, np, &lrl)
	for i, r := range c.own {
		for j := range d.n {
			q.Set(i, np+j, c.process.At(r, j))
		}
		for j, s := range c.own {
			q.Set(i, j, c.process.At(r, s))
		}
	}
	if !bl.IsEmpty() {
		var br, brb, brl mat.Dense
		br.Mul(bl, d.r)
		brb.Mul(&br, bl.T())
		brl.Mul(&br, ls.T())
		add(q, 0, 0, &brb)
		add(q, 0, np, &brl)
	}
	for i := range np {
		for j := np; j < np+d.n; j++ {
			q.Set(j, i, q.At(i, j))
		}
	}
}

// rowsOf takes some rows of m.
func rowsOf(m *mat.Dense, rows []int) *mat.Dense {
	_, cols := m.Dims()
	out := mat.NewDense(len(rows), cols, nil)
	for i, r := range rows {
		out.SetRow(i, m.RawRowView(r))
	}
	return out
}
