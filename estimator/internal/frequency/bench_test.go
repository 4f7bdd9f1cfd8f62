package frequency_test

import (
	"fmt"
	"math"
	"math/rand/v2"
	"testing"

	"gonum.org/v1/gonum/mat"

	"polewright/estimator/internal/frequency"
)

// randomStable draws a stable system.
func randomStable(r *rand.Rand, n, in, out int, period float64) frequency.System {
	draw := func(a, b int) *mat.Dense {
		m := mat.NewDense(a, b, nil)
		m.Apply(func(_, _ int, _ float64) float64 { return r.NormFloat64() }, m)
		return m
	}
	a := draw(n, n)
	var e mat.Eigen
	e.Factorize(a, mat.EigenNone)
	radius, abscissa := 0.0, math.Inf(-1)
	for _, v := range e.Values(nil) {
		radius, abscissa = max(radius, math.Hypot(real(v), imag(v))), max(abscissa, real(v))
	}
	if period > 0 {
		a.Scale((0.5+0.49*r.Float64())/radius, a)
	} else {
		for i := range n {
			a.Set(i, i, a.At(i, i)-abscissa-0.05)
		}
	}
	return frequency.System{A: a.RawMatrix(), B: draw(n, in).RawMatrix(), C: draw(out, n).RawMatrix(), D: draw(out, in).RawMatrix(), Period: period}
}

var sink float64

func BenchmarkPeakGain(b *testing.B) {
	for _, n := range []int{4, 6, 10, 20, 50} {
		b.Run(fmt.Sprint(n), func(b *testing.B) {
			sys := randomStable(rand.New(rand.NewPCG(1, uint64(n))), n, 2, 1, 0.1)
			b.ReportAllocs()
			for b.Loop() {
				v, _, err := frequency.PeakGain(sys)
				if err != nil {
					b.Fatal(err)
				}
				sink = v
			}
		})
	}
}

func BenchmarkPeakGains(b *testing.B) {
	for _, n := range []int{4, 6, 10, 20, 50} {
		b.Run(fmt.Sprint(n), func(b *testing.B) {
			sys := randomStable(rand.New(rand.NewPCG(1, uint64(n))), n, 2, n, 0.1)
			b.ReportAllocs()
			for b.Loop() {
				v, _, err := frequency.PeakGains(sys)
				if err != nil {
					b.Fatal(err)
				}
				sink = v[0]
			}
		})
	}
}

func BenchmarkMargins(b *testing.B) {
	for _, n := range []int{4, 8, 12, 20, 40, 100} {
		b.Run(fmt.Sprint(n), func(b *testing.B) {
			sys := randomStable(rand.New(rand.NewPCG(2, uint64(n))), n, 1, 1, 0.1)
			sys.D.Data[0] = 0.1
			var size float64
			for i := range sys.B.Data {
				size += math.Abs(sys.B.Data[i])
			}
			for i := range sys.B.Data {
				sys.B.Data[i] *= 1e-3 / size // a small loop gain keeps the closed loop stable ...
			}
			peak, _, err := frequency.PeakGain(sys)
			if err != nil {
				b.Fatal(err)
			}
			for i := range sys.B.Data {
				sys.B.Data[i] *= 0.7 / peak // ... and this one is far from trivial
			}
			sys.D.Data[0] = 0
			b.ReportAllocs()
			for b.Loop() {
				r, err := frequency.Margins(sys)
				if err != nil {
					b.Fatal(err)
				}
				sink = r.PhaseDeg
			}
		})
	}
}
