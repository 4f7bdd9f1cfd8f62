package seek

import (
	"math/cmplx"
	"testing"

	"pgregory.net/rapid"

	"polewright/estimator/poles"
)

// A list within the bounds comes back from its numbers.
func TestShapeRoundTrip(t *testing.T) {
	rapid.Check(t, func(t *rapid.T) {
		period := rapid.SampledFrom([]float64{0, 0.01}).Draw(t, "period")
		var s []complex128
		for range rapid.IntRange(0, 3).Draw(t, "pairs") {
			w := rapid.Float64Range(1, 50).Draw(t, "w")
			z := rapid.Float64Range(0.1, 0.95).Draw(t, "z")
			v := complex(-w*z, w*cmplxSqrt(1-z*z))
			s = append(s, v, cmplx.Conj(v))
		}
		for range rapid.IntRange(0, 3).Draw(t, "reals") {
			s = append(s, complex(-rapid.Float64Range(10, 50).Draw(t, "a"), 0))
		}
		own := s
		if period > 0 {
			own = nil
			for _, v := range s {
				own = append(own, poles.ToZ(v, period))
			}
			own = append(own, 0) // a delay register stays
		}
		f, x, err := newShape(own, period)
		if err != nil {
			t.Fatal(err)
		}
		back := f.poles(x)
		if len(back) != len(own) {
			t.Fatalf("%d poles, expected %d", len(back), len(own))
		}
		for i, k := range poles.Match(own, back) {
			if cmplx.Abs(back[k]-own[i]) > 1e-5*(1+cmplx.Abs(own[i])) { // a double real pole loses half its digits
				t.Errorf("%v came back as %v", own[i], back[k])
			}
		}
	})
}

func cmplxSqrt(v float64) float64 { return real(cmplx.Sqrt(complex(v, 0))) }
