package transient

import (
	"math"
	"math/rand/v2"
	"testing"
)

// TestHostileNumbers asks for nothing but an answer: an error, or figures that
// are figures.
func TestHostileNumbers(t *testing.T) {
	sizes := []float64{0, 0, 1, -1, 0.5, 1e-300, -1e300, 5e-324, 1e150, -1e-150, 1e8, -1e-8, math.MaxFloat64}
	var s Solver
	var answers int
	for seed := range uint64(2000) {
		r := rand.New(rand.NewPCG(seed, 17))
		n := 1 + r.IntN(4)
		f := matrix(n, make([]float64, n*n)...)
		for i := range f.Data {
			f.Data[i] = r.NormFloat64()
			if r.IntN(3) == 0 {
				f.Data[i] = sizes[r.IntN(len(sizes))]
			}
		}
		period := float64(seed % 2)
		for i := range n {
			if period == 0 {
				f.Data[i*n+i] -= 3
			} else {
				f.Data[i*n+i] /= 4
			}
		}
		settle, peak, err := s.Settle(f, period, nil)
		if err != nil {
			continue
		}
		answers++
		if !(settle > 0) || math.IsInf(settle, 0) || !(peak >= 1) || math.IsInf(peak, 0) {
			t.Errorf("seed %d: settle %v, peak %v", seed, settle, peak)
		}
	}
	if answers < 100 {
		t.Errorf("only %d answers", answers)
	}
}
