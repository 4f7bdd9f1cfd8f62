package estimator

import (
	"fmt"
	"math"

	"gonum.org/v1/gonum/mat"

	"polewright/estimator/internal/transient"
)

// rounding rounds one design to words of any length.
type rounding struct {
	m *Model
	d *Design
	o WordOptions

	a, b, c, gain, through *mat.Dense // as they are kept; c nil when folded
	keep                   []bool
	settle                 transient.Solver
	last                   roundedDesign
}

// roundedDesign is what a word length leaves of a design.
type roundedDesign struct {
	model  Model
	design Design
	f, e   *mat.Dense // A − L C, and the matrix of the transient
	// The rows that a new state is summed from: by the states, the inputs and the
	// sensors. In current form the sensors have entered the states already: l is nil.
	a, b, l *mat.Dense
}

func newRounding(m *Model, d *Design, o WordOptions) (*rounding, error) {
	if err := designFits(m, d); err != nil {
		return nil, err
	}
	n, inputs, _ := m.Dims()
	switch {
	case !m.Discrete():
		return nil, fmt.Errorf("a word length needs a sample period: %w", ErrMethod)
	case o.Bits < MinWord || o.Bits > MaxWord:
		return nil, fmt.Errorf("words of %d bits, expected %d to %d: %w", o.Bits, MinWord, MaxWord, ErrMethod)
	case !(o.Headroom >= 0) || math.IsInf(o.Headroom, 0):
		return nil, fmt.Errorf("headroom %g: %w", o.Headroom, ErrNotFinite)
	case o.InputSize != nil && len(o.InputSize) != inputs:
		return nil, fmt.Errorf("%d input sizes, expected %d: %w", len(o.InputSize), inputs, ErrShape)
	case o.States != nil && len(o.States) != n:
		return nil, fmt.Errorf("%d binary points for %d states: %w", len(o.States), n, ErrShape)
	}
	for _, q := range o.States {
		if max(q.Integer, -q.Integer, q.Fraction, -q.Fraction) > 2000 || q.Bits() < 1 {
			return nil, fmt.Errorf("binary point %v: %w", q, ErrMethod)
		}
	}
	for _, v := range o.InputSize {
		if math.IsNaN(v) || math.IsInf(v, 0) {
			return nil, fmt.Errorf("input size: %w", ErrNotFinite)
		}
	}
	if o.Headroom == 0 {
		o.Headroom = 1
	}
	r := &rounding{m: m, d: d, o: o, a: m.A, b: m.B, c: m.C, gain: d.Gain, through: m.D}
	if d.Form == Current && !o.Folded {
		r.gain = d.GainCurrent
	}
	if o.Folded {
		r.a, r.c, r.through = closedError(m.A, d.Gain, m.C), nil, nil
		if m.D != nil && m.B != nil {
			r.b = closedError(m.B, d.Gain, m.D)
		}
	}
	if m.Roles != nil {
		r.keep = make([]bool, n)
		for i, role := range m.Roles {
			r.keep[i] = role != DelayRegister
		}
	}
	return r, nil
}

// poles rounds everything to words of that many bits and finds the poles.
func (r *rounding) poles(bits int) (*Words, error) {
	w := &Words{Bits: bits, Settle: math.NaN()}
	if r.o.Common {
		q := pointFor(bits, entries(r.a, r.b, r.c, r.gain, r.through)...)
		w.A, w.B, w.C, w.Gain = q, q, q, q
	} else {
		w.A, w.B = pointFor(bits, entries(r.a)...), pointFor(bits, entries(r.b, r.through)...)
		w.C, w.Gain = pointFor(bits, entries(r.c)...), pointFor(bits, entries(r.gain)...)
	}
	var lost [5]int
	var a, b, c, gain, through *mat.Dense
	a, lost[0] = w.A.rounded(r.a)
	b, lost[1] = w.B.rounded(r.b)
	c, lost[2] = w.C.rounded(r.c)
	gain, lost[3] = w.Gain.rounded(r.gain)
	through, lost[4] = w.B.rounded(r.through)
	for _, k := range lost {
		w.Lost += k
	}
	r.last = r.rebuild(a, b, c, gain, through)
	var err error
	if w.Poles, w.Worst, err = shiftsOf(r.m, r.d, r.last.f); err != nil {
		return nil, err
	}
	list := make([]complex128, len(w.Poles))
	for i, s := range w.Poles {
		list[i] = s.To
	}
	w.Stable = stable(list, true)
	return w, nil
}

// rebuild makes a model and a design of the rounded matrices, so that A − L C,
// B and D are what the firmware computes with.
func (r *rounding) rebuild(a, b, c, gain, through *mat.Dense) roundedDesign {
	out := roundedDesign{model: *r.m, design: Design{Form: r.d.Form, Gain: gain}, a: a, b: b, l: gain}
	switch {
	case r.o.Folded: // A = F + L C, B = B' + L D give back F and B'
		out.f = a
		var lc mat.Dense
		lc.Mul(gain, r.m.C)
		a = mat.DenseCopyOf(a)
		a.Add(a, &lc)
		if r.m.D != nil && b != nil {
			var ld mat.Dense
			ld.Mul(gain, r.m.D)
			b = mat.DenseCopyOf(b)
			b.Add(b, &ld)
		}
		c, through = r.m.C, r.m.D
		out.design.Form = Prediction
		out.e = out.f
	case r.d.Form == Current: // x̂⁺ = A (x̂ + Lf (y − C x̂)): L = A Lf
		out.design.GainCurrent = gain
		l := new(mat.Dense)
		l.Mul(a, gain)
		out.design.Gain, out.l = l, nil
		out.f = closedError(a, l, c)
		var ca mat.Dense
		ca.Mul(c, a)
		out.e = closedError(a, gain, &ca)
	default:
		out.f = closedError(a, gain, c)
		out.e = out.f
	}
	out.model.A, out.model.B, out.model.C, out.model.D = a, b, c, through
	return out
}

// judge fills in the settle time and the loop of the words just made.
func (r *rounding) judge(w *Words) error {
	if w.Stable {
		// An error here leaves the settle time NaN.
		if settle, _, err := r.settle.Settle(raw(scaled(r.m, r.last.e)), r.m.Period, r.keep); err == nil {
			w.Settle = settle
		}
	}
	if r.m.K == nil || r.m.B == nil || r.d.Loop == nil || !r.d.Loop.Stable || r.o.Folded && r.d.Form == Current {
		return nil
	}
	d := &Designer{model: &r.last.model, opt: Options{Form: r.last.design.Form}}
	d.n, _, d.p = r.m.Dims()
	var err error
	if w.Loop, err = d.Against(r.m, &r.last.design); err != nil {
		return fmt.Errorf("the rounded loop: %w", err)
	}
	return nil
}

// states gives each state its word and finds the guard bits of the sums.
func (r *rounding) states(w *Words) {
	n, _, p := r.m.Dims()
	scale, sensor := ones(r.m.StateScale, n), ones(r.m.SensorScale, p)
	peak := r.d.Transient.Peak
	if !(peak >= 1) || math.IsInf(peak, 0) {
		peak = 1
	}
	reach := make([]float64, n)
	for i := range reach {
		reach[i] = r.o.Headroom * (1 + peak) * scale[i]
	}
	w.States = make([]StateWord, n)
	for i := range w.States {
		s := StateWord{Reach: reach[i], StepOverStd: math.NaN()}
		switch {
		case r.o.States != nil:
			s.Point = r.o.States[i]
		case r.o.Common:
			s.Point = pointFor(w.Bits, reach...)
		default:
			s.Point = pointFor(w.Bits, reach[i])
		}
		_, fits := s.Point.Round(reach[i])
		s.Overflows = !fits
		if i < len(r.d.Noise.Std) && r.d.Noise.Std[i] > 0 {
			s.StepOverStd = s.Point.Step() / r.d.Noise.Std[i]
		}
		w.States[i] = s
	}
	for i := range n {
		sum := 0.0
		for j := range n {
			sum += math.Abs(r.last.a.At(i, j)) * reach[j]
		}
		for j := range p {
			if r.last.l != nil {
				sum += math.Abs(r.last.l.At(i, j)) * sensor[j] * r.o.Headroom
			}
		}
		for j, u := range r.o.InputSize {
			sum += math.Abs(r.last.b.At(i, j)) * math.Abs(u)
		}
		if room := math.Ldexp(1, w.States[i].Point.Integer); sum > room && !math.IsInf(sum, 0) {
			w.Guard = max(w.Guard, int(math.Ceil(math.Log2(sum/room))))
		}
	}
}
