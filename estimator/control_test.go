package estimator_test

import (
	"context"
	"math"
	"math/cmplx"
	"testing"

	"gonum.org/v1/gonum/mat"
	"pgregory.net/rapid"

	"polewright/estimator"
	"polewright/estimator/internal/schur"
)

// drawLoop draws a design whose control loop is stable.
func drawLoop(t *rapid.T) (*estimator.Model, *estimator.Designer, *estimator.Design) {
	m := anyModel(t)
	m.K.Scale(0.1, m.K)
	m.A.Scale(0.5, m.A)
	if n, _, _ := m.Dims(); !m.Discrete() {
		for i := range n {
			m.A.Set(i, i, m.A.At(i, i)-2)
		}
	}
	o := estimator.Options{}
	if m.Discrete() && rapid.Bool().Draw(t, "current") {
		o.Form = estimator.Current
	}
	d, got, wanted := designOf(t, m, o)
	if !got.Loop.Stable || got.EigenvectorCondition > 1e3 {
		t.Skip("no stable loop")
	}
	quick, err := d.QuickPlace(wanted, nil)
	if err != nil {
		t.Fatal(err)
	}
	return m, d, quick
}

// The margins that a drag shows are those that Complete confirms.
func TestQuickMarginsAreConfirmed(t *testing.T) {
	rapid.Check(t, func(t *rapid.T) {
		_, d, quick := drawLoop(t)
		whole, err := d.Complete(context.Background(), quick)
		if err != nil {
			t.Fatal(err)
		}
		if !quick.Partial || whole.Partial {
			t.Fatal("the quick design should be the partial one")
		}
		a, b := quick.Loop, whole.Loop
		if b.SensitivityPeak > 50 || whole.GainNorm > 100 {
			t.Skip("nearly unstable, or eigenvalues with few digits")
		}
		same := func(what string, got, want float64) {
			t.Helper()
			if math.IsInf(want, 0) && got == want {
				return
			}
			if !(math.Abs(got-want) <= 1e-5*math.Abs(want)+1e-9) {
				t.Errorf("%s is %.10g, confirmed %.10g", what, got, want)
			}
		}
		same("gain margin below", a.GainMarginBelow, b.GainMarginBelow)
		same("gain margin above", a.GainMarginAbove, b.GainMarginAbove)
		same("phase margin", a.PhaseMargin, b.PhaseMargin)
		same("delay margin", a.DelayMargin, b.DelayMargin)
		if len(a.InputStd) == 1 { // else Complete has the peak of all inputs together
			same("sensitivity", a.SensitivityPeak, b.SensitivityPeak)
		}
		if a.DelayMarginSamples != b.DelayMarginSamples {
			t.Errorf("whole delay %d samples, confirmed %d", a.DelayMarginSamples, b.DelayMarginSamples)
		}
	})
}

// The noise on the actuators follows from plant and estimator written out with the
// estimate itself as state.
func TestInputNoiseOfTheWrittenOutLoop(t *testing.T) {
	rapid.Check(t, func(t *rapid.T) {
		m, _, got := drawLoop(t)
		n, inputs, _ := m.Dims()
		lf := mat.DenseCopyOf(got.Gain)
		lf.Zero()
		if got.Form == estimator.Current {
			lf = got.GainCurrent
		}
		// u = −K (x̂ + Lf (C x + v − C x̂)), x' = A x + B u + w, x̂' = A x̂ + B u + L (C x + v − C x̂)
		var klf, klfc, bk, lc mat.Dense
		klf.Mul(m.K, lf)
		klfc.Mul(&klf, m.C)
		ux, ue := mat.NewDense(inputs, n, nil), mat.NewDense(inputs, n, nil)
		ux.Scale(-1, &klfc)
		ue.Sub(&klfc, m.K)
		lc.Mul(got.Gain, m.C)
		a, enter := mat.NewDense(2*n, 2*n, nil), mat.NewDense(2*n, len(got.Gain.RawRowView(0)), nil)
		put := func(dst *mat.Dense, i, j int, parts ...mat.Matrix) {
			for _, p := range parts {
				r, c := p.Dims()
				s := dst.Slice(i, i+r, j, j+c).(*mat.Dense)
				s.Add(s, p)
			}
		}
		bk.Mul(m.B, ux)
		put(a, 0, 0, m.A, &bk)
		put(a, n, 0, &lc, &bk)
		var be, minus, bv mat.Dense
		be.Mul(m.B, ue)
		minus.Scale(-1, &lc)
		put(a, 0, n, &be)
		put(a, n, n, m.A, &minus, &be)
		bv.Mul(m.B, &klf)
		bv.Scale(-1, &bv)
		put(enter, 0, 0, &bv)
		put(enter, n, 0, &bv, got.Gain)
		var er, q mat.Dense
		er.Mul(enter, m.R)
		q.Mul(&er, enter.T())
		put(&q, 0, 0, m.Q)
		var form schur.Form
		if err := form.Factor(a.RawMatrix()); err != nil {
			t.Fatal(err)
		}
		p := mat.NewDense(2*n, 2*n, nil)
		solve := form.Lyapunov
		if m.Discrete() {
			solve = form.Stein
		}
		if err := solve(p.RawMatrix(), q.RawMatrix()); err != nil {
			t.Skip(err)
		}
		if mat.Norm(a, 2) > 1e3 || mat.Norm(p, 2) > 1e8 {
			t.Skip("a loop that doubles cannot hold to six digits")
		}
		for _, v := range form.Eigenvalues() { // near the limit both lose digits
			if m.Discrete() && cmplx.Abs(v) > 0.999 || !m.Discrete() && real(v) > -1e-3 {
				t.Skip("a loop on the edge")
			}
		}
		for u := range inputs {
			row := mat.NewVecDense(2*n, append(mat.Row(nil, u, ux), mat.Row(nil, u, ue)...))
			want := mat.Inner(row, p, row)
			if got.Form == estimator.Current {
				want += mat.Inner(klf.RowView(u), m.R, klf.RowView(u))
			}
			if want = math.Sqrt(want); want > 1e4 {
				t.Skip("a loop on the edge") // its drives are near 1
			}
			if have := got.Loop.InputStd[u]; !(math.Abs(have-want) <= 1e-6*want) {
				t.Errorf("input %d: %.10g, expected %.10g", u, have, want)
			}
		}
	})
}
