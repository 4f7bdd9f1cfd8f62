package estimator

import (
	"fmt"
	"math"

	"gonum.org/v1/gonum/mat"

	"polewright/estimator/internal/schur"
)

// Mismatch is how a finished design does on a plant that differs from its model:
// separation no longer holds, so plant and estimator are judged together. With a
// controller the loop is closed, u = r − K x̂; without, u = r.
type Mismatch struct {
	Stable bool
	// Poles of plant (without its unknowns) and estimator together.
	Poles []complex128
	// Std is the steady-state error per state of the plant, noise only; nil where
	// Stable is false.
	Std []float64
	// Bias is the steady-state error per state and input for a constant r of one
	// unit; nil where Stable is false.
	Bias *mat.Dense
	// Loop has the margins at the plant input; nil without feedback.
	Loop *Loop
	// Warnings name margins that could not be found.
	Warnings []string
}

// Against judges a design of this Designer on a real plant: a model with the
// same inputs, sensors and period, and the same states but for the unknowns. The
// error of a state is the real one minus its estimate.
func (d *Designer) Against(real *Model, design *Design) (_ *Mismatch, err error) {
	defer guard(&err)
	if err := real.Check(); err != nil {
		return nil, err
	}
	m := d.model
	_, inputs, _ := m.Dims()
	own, mine := real.own(), m.own()
	if _, ri, rp := real.Dims(); ri != inputs || rp != d.p || len(own) != len(mine) {
		return nil, fmt.Errorf("the real plant has %d states, %d inputs and %d sensors, expected %d, %d and %d: %w",
			len(own), ri, rp, len(mine), inputs, d.p, ErrShape)
	}
	if len(own) == 0 {
		return nil, fmt.Errorf("every state is an unknown, there is no plant: %w", ErrShape)
	}
	if real.Period != m.Period {
		return nil, fmt.Errorf("the real plant has the period %g s, expected %g: %w", real.Period, m.Period, ErrMethod)
	}
	if err := d.owns(design); err != nil {
		return nil, err
	}
	free := d
	if m.K == nil || m.B == nil { // no controller: the same with K = 0
		free = d.withoutControl()
		if m.B == nil {
			bare := *real
			bare.B, bare.D = mat.NewDense(real.A.RawMatrix().Rows, 1, nil), nil
			real = &bare
		}
	}
	out, l, err := free.against(real, design, own, mine)
	if err != nil || !out.Stable || free != d {
		return out, err
	}
	judged := &Design{Loop: &Loop{Stable: true, Poles: out.Poles, Input: -1, DelayMarginSamples: -1}}
	d.loopMargins(judged, l)
	out.Loop, out.Warnings = judged.Loop, judged.Warnings
	return out, nil
}

// withoutControl is the designer with a controller that does nothing.
func (d *Designer) withoutControl() *Designer {
	m := *d.model
	if m.B == nil {
		m.B, m.D = mat.NewDense(d.n, 1, nil), nil
	}
	_, inputs := m.B.Dims()
	m.K = mat.NewDense(inputs, d.n, nil)
	c := *d
	c.model = &m
	return &c
}

func (d *Designer) against(real *Model, design *Design, own, mine []int) (*Mismatch, *broken, error) {
	_, inputs := real.B.Dims()
	l, err := d.openLoop(real, design)
	if err != nil {
		return nil, nil, err
	}
	a, inverse, err := l.closed(all(inputs))
	if err != nil {
		return nil, nil, err
	}
	var form schur.Form
	if err := form.Factor(raw(a)); err != nil {
		return nil, nil, fmt.Errorf("plant and estimator: %w", err)
	}
	out := &Mismatch{Poles: append([]complex128(nil), form.Eigenvalues()...)}
	out.Stable = stable(out.Poles, d.model.Discrete())
	if !out.Stable {
		return out, l, nil
	}
	// e = x − x̂ of the plant's states; in current form x̂f = x̂ + Lf e_y
	pick := mat.NewDense(len(own), l.plant+d.n, nil)
	for i, k := range mine {
		pick.Set(i, i, 1)
		pick.Set(i, l.plant+k, -1)
	}
	lf := d.ownGain(design, mine)
	view, sample := d.errorView(real, l, lf, pick, inverse)
	var uv mat.Dense
	uv.Mul(inverse, l.direct)
	if cov := d.loopCovariance(l, real, &uv, &form); cov != nil {
		out.Std = make([]float64, len(own))
		for i := range out.Std {
			v := mat.Inner(view.RowView(i), cov, view.RowView(i))
			if sample != nil {
				v += mat.Inner(sample.RowView(i), real.R, sample.RowView(i))
			}
			out.Std[i] = math.Sqrt(max(v, 0))
		}
	}
	out.Bias = d.bias(real, l, a, inverse, view, lf)
	return out, l, nil
}

// ownGain takes the rows of Lf that belong to the plant's states; nil in
// prediction form.
func (d *Designer) ownGain(design *Design, mine []int) *mat.Dense {
	if d.opt.Form == Prediction {
		return nil
	}
	lf := mat.NewDense(len(mine), d.p, nil)
	for i, k := range mine {
		for j := range d.p {
			lf.Set(i, j, design.GainCurrent.At(k, j))
		}
	}
	return lf
}

// errorView returns how the error of the plant's states follows from the state of
// the closed loop and, in current form, from the sensor samples.
func (d *Designer) errorView(real *Model, l *broken, lf, pick, inverse *mat.Dense) (view, sample *mat.Dense) {
	if lf == nil {
		return pick, nil
	}
	state, noise := d.innovation(real, l, inverse)
	var part mat.Dense
	part.Mul(lf, state)
	view = mat.DenseCopyOf(pick)
	view.Sub(view, &part)
	sample = new(mat.Dense)
	sample.Mul(lf, noise)
	sample.Scale(-1, sample)
	return view, sample
}

// innovation returns how y − C x̂ − D u follows from the state of the closed loop
// and from the sensors' noise.
func (d *Designer) innovation(real *Model, l *broken, inverse *mat.Dense) (state, noise *mat.Dense) {
	N, _ := l.b.Dims()
	state = mat.NewDense(d.p, N, nil)
	own := real.own()
	for j := range d.p {
		for i, k := range own {
			state.Set(j, i, real.C.At(j, k))
		}
		for k := range d.n {
			state.Set(j, l.plant+k, -d.model.C.At(j, k))
		}
	}
	noise = identity(d.p)
	through := throughDifference(real, d.model)
	var ti, tic, tiv mat.Dense
	ti.Mul(through, inverse)
	tic.Mul(&ti, l.c)
	state.Sub(state, &tic)
	tiv.Mul(&ti, l.direct)
	noise.Sub(noise, &tiv)
	return state, noise
}

// bias returns the steady-state error for a constant r on each input, u = r − w,
// of which the estimator is told; nil where there is no steady state.
func (d *Designer) bias(real *Model, l *broken, a, inverse, view *mat.Dense, lf *mat.Dense) *mat.Dense {
	N, inputs := l.b.Dims()
	// w loses direct·D r, so u = (I + D)⁻¹ ((I + direct·D) r − C x); the estimator
	// gains B r, and its innovation loses D r.
	own := mat.NewDense(d.p, inputs, nil)
	if d.model.D != nil {
		own.Copy(d.model.D)
	}
	var command, told, enter mat.Dense
	command.Mul(l.direct, own)
	command.Add(&command, identity(inputs))
	command.Mul(inverse, &command)
	enter.Mul(l.b, &command)
	told.Mul(l.noise, own)
	enter.Sub(&enter, &told)
	add(&enter, l.plant, 0, d.model.B)
	static := mat.DenseCopyOf(a)
	static.Scale(-1, static)
	if d.model.Discrete() {
		for i := range N {
			static.Set(i, i, static.At(i, i)+1)
		}
	}
	var x, out mat.Dense
	if err := x.Solve(static, &enter); err != nil {
		return nil
	}
	out.Mul(view, &x)
	if lf != nil { // current form: the innovation of this sample, with its own part of r
		var through, part mat.Dense
		through.Mul(throughDifference(real, d.model), &command)
		part.Mul(lf, &through)
		out.Sub(&out, &part)
	}
	return &out
}

// throughDifference is the direct feedthrough of the real plant less the model's.
func throughDifference(real, model *Model) *mat.Dense {
	p, _ := real.C.Dims()
	_, inputs := real.B.Dims()
	t := mat.NewDense(p, inputs, nil)
	if real.D != nil {
		t.Add(t, real.D)
	}
	if model.D != nil {
		t.Sub(t, model.D)
	}
	return t
}
