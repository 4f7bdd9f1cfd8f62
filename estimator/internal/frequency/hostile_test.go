package frequency

import (
	"math"
	"math/rand/v2"
	"testing"

	"gonum.org/v1/gonum/blas/blas64"
)

// TestHostileNumbers asks for nothing but an answer: an error, or figures that
// are figures.
func TestHostileNumbers(t *testing.T) {
	sizes := []float64{0, 0, 1, -1, 0.5, 1e-300, -1e300, 5e-324, 1e150, -1e-150, 1e8, -1e-8, math.MaxFloat64}
	var answers int
	for seed := range uint64(1500) {
		r := rand.New(rand.NewPCG(seed, 17))
		n, out := 1+r.IntN(4), 1+r.IntN(2)
		draw := func(a, b int) blas64.General {
			m := gaussian(r, a, b)
			for i := range m.Data {
				if r.IntN(3) == 0 {
					m.Data[i] = sizes[r.IntN(len(sizes))]
				}
			}
			return m
		}
		sys := System{A: draw(n, n), B: draw(n, out), C: draw(out, n), D: draw(out, out), Period: float64(seed % 2)}
		for i := range n {
			if sys.Period == 0 {
				sys.A.Data[i*n+i] -= 3
			}
		}
		if v, w, err := PeakGain(sys); err == nil {
			answers++
			if !(v >= 0) || math.IsInf(v, 0) || !(w >= 0) {
				t.Errorf("seed %d: peak %v at %v", seed, v, w)
			}
		}
		if values, _, err := PeakGains(sys); err == nil {
			for _, v := range values {
				if !(v >= 0) || math.IsInf(v, 0) {
					t.Errorf("seed %d: peaks %v", seed, values)
				}
			}
		}
		if v, err := SensitivityPeakMIMO(sys); err == nil && (!(v >= 0) || math.IsInf(v, 0)) {
			t.Errorf("seed %d: sensitivity %v", seed, v)
		}
		sys.B.Cols, sys.C.Rows, sys.D.Rows, sys.D.Cols = 1, 1, 1, 1
		m, err := Margins(sys)
		if err != nil {
			continue
		}
		answers++
		for _, v := range []float64{m.GainAboveDB, m.GainBelowDB, m.PhaseDeg, m.DelayS, m.SensitivityPeak, m.SensitivityFrequency} {
			if math.IsNaN(v) {
				t.Errorf("seed %d: %+v", seed, m)
				break
			}
		}
	}
	if answers < 250 {
		t.Errorf("only %d answers", answers)
	}
}
