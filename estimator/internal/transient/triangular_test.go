package transient_test

import (
	"math"
	"math/rand/v2"
	"testing"

	"gonum.org/v1/gonum/mat"

	"polewright/estimator/internal/schur"
	"polewright/estimator/internal/transient"
)

// A matrix and its real Schur form have the same transient.
func TestSchurForm(t *testing.T) {
	r := rand.New(rand.NewPCG(3, 4))
	var s transient.Solver
	for k := range 60 {
		n := 1 + k%12
		a := mat.NewDense(n, n, nil)
		a.Apply(func(_, _ int, _ float64) float64 { return r.NormFloat64() }, a)
		var form schur.Form
		if err := form.Factor(a.RawMatrix()); err != nil {
			t.Fatal(err)
		}
		period, worst, radius := 0.0, math.Inf(-1), 0.0
		for _, v := range form.Eigenvalues() {
			worst, radius = max(worst, real(v)), max(radius, math.Hypot(real(v), imag(v)))
		}
		if k%2 == 0 {
			for i := range n {
				a.Set(i, i, a.At(i, i)-worst-0.3)
			}
		} else {
			period = 0.1
			a.Scale(0.9/radius, a)
		}
		if err := form.Factor(a.RawMatrix()); err != nil {
			t.Fatal(err)
		}
		settle, peak, err := s.Settle(a.RawMatrix(), period, nil)
		if err != nil {
			t.Fatal(err)
		}
		settleT, peakT, err := s.Settle(form.T(), period, nil)
		if err != nil {
			t.Fatal(err)
		}
		if math.Abs(settle-settleT) > 2e-5*settle || math.Abs(peak-peakT) > 2e-5*peak {
			t.Errorf("n = %d: settle %.9g, peak %.9g; of the Schur form %.9g, %.9g", n, settle, peak, settleT, peakT)
		}
	}
}
