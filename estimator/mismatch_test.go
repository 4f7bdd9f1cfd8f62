package estimator_test

import (
	"math"
	"testing"

	"gonum.org/v1/gonum/mat"
	"pgregory.net/rapid"

	"polewright/estimator"
)

// On the very plant it was designed for, an estimator has the noise that Judge
// gives, no bias, and the loop's own poles.
func TestAgainstTheModelItselfChangesNothing(t *testing.T) {
	rapid.Check(t, func(t *rapid.T) {
		m := anyModel(t)
		m.K.Scale(0.1, m.K) // loops that are mostly stable
		m.A.Scale(0.5, m.A)
		if n, _, _ := m.Dims(); !m.Discrete() {
			for i := range n {
				m.A.Set(i, i, m.A.At(i, i)-2)
			}
		}
		_, inputs, p := m.Dims()
		m.D = mat.NewDense(p, inputs, nil)
		m.D.Set(0, 0, rapid.Float64Range(-0.3, 0.3).Draw(t, "D"))
		o := estimator.Options{}
		if m.Discrete() && rapid.Bool().Draw(t, "current") {
			o.Form = estimator.Current
		}
		d, got, _ := designOf(t, m, o)
		if !got.Loop.Stable || got.EigenvectorCondition > 1e3 {
			t.Skip("no stable loop")
		}
		for _, v := range got.Loop.Poles {
			if edge := real(v); !m.Discrete() && edge > -0.05 || m.Discrete() && math.Hypot(real(v), imag(v)) > 0.99 {
				t.Skip("a loop on the edge")
			}
		}
		mm, err := d.Against(m, got)
		if err != nil {
			t.Fatal(err)
		}
		for i, s := range mm.Std {
			if math.Abs(s-got.Noise.Std[i]) > 1e-6*s {
				t.Errorf("state %d: %g, expected %g", i, s, got.Noise.Std[i])
			}
		}
		if len(mm.Std) == 0 {
			t.Error("no noise")
		}
		if b := mat.Norm(mm.Bias, 2); b > 1e-6*(1+got.GainNorm)*(1+got.GainNorm) {
			t.Errorf("bias %g", b)
		}
		if math.Abs(mm.Loop.PhaseMargin-got.Loop.PhaseMargin) > 1e-6 {
			t.Errorf("phase margin %g, expected %g", mm.Loop.PhaseMargin, got.Loop.PhaseMargin)
		}
	})
}

// A heavier mass on a first-order plant, by hand: x' = (−x + r)/θ is modelled with
// θ = 1 while the real plant has the gain 1 but θ = 2, or the gain 2 at θ = 1.
func TestBiasByHand(t *testing.T) {
	number := func(v float64) *mat.Dense { return mat.NewDense(1, 1, []float64{v}) }
	m := &estimator.Model{A: number(-1), B: number(1), C: number(1), Q: mat.NewSymDense(1, []float64{1}), R: mat.NewSymDense(1, []float64{1})}
	d := newDesigner(t, m, estimator.Options{})
	got, err := d.Place([]complex128{-4}, nil) // L = 3
	if err != nil {
		t.Fatal(err)
	}
	real := *m
	real.B = number(2)
	mm, err := d.Against(&real, got)
	if err != nil {
		t.Fatal(err)
	}
	// x = 2 r, 0 = −x̂ + r + 3 (2 r − x̂): x̂ = 7/4 r, e = r/4
	near(t, "bias", mm.Bias.At(0, 0), 0.25, 1e-12)
	// with the sensor's unit noise and process noise on both: e' = −4 e + …, as modelled
	near(t, "noise", mm.Std[0], math.Sqrt((1+9)/8.0), 1e-12)
	matched(t, mm.Poles, []complex128{-1, -4}, 1e-12)
	if mm.Loop != nil {
		t.Error("margins without a controller")
	}
}
