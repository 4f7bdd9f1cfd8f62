package transient

import (
	"math"
	"testing"
)

// Entries whose squares vanish beside the largest one do not spoil the norm.
func TestNormWithVanishingEntries(t *testing.T) {
	for _, small := range []float64{1e-80, 1e-155, 1e-160, 1e-200, 5e-324} {
		x := []float64{
			1, 0, small,
			0, 0.5, small,
			small, small, 1e-3,
		}
		var g spectral
		g.reset(3)
		if got := g.norm(3, x, []int{0, 1, 2}, []int{0, 0, 0}); math.Abs(got-1) > 1e-14 {
			t.Errorf("with %g: norm %g, expected 1", small, got)
		}
	}
}
