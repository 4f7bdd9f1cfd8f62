package placement_test

import (
	"fmt"
	"math"
	"math/rand/v2"
	"testing"

	"gonum.org/v1/gonum/blas/blas64"
	"gonum.org/v1/gonum/mat"

	"polewright/estimator/internal/placement"
)

// plant returns a random plant with p sensors and, as wanted poles, its own poles
// made faster.
func plant(n, p int, seed uint64, faster float64) (a, c blas64.General, poles []complex128) {
	rng := rand.New(rand.NewPCG(seed, 1))
	a, c = zeros(n, n), zeros(p, n)
	for i := range a.Data {
		a.Data[i] = rng.NormFloat64()
	}
	for i := range c.Data {
		c.Data[i] = rng.NormFloat64()
	}
	var eig mat.Eigen
	eig.Factorize(wrap(a), mat.EigenNone)
	poles = eig.Values(nil)
	for i, v := range poles {
		poles[i] = complex(-math.Abs(real(v))-faster, imag(v))
	}
	return a, c, poles
}

var sizes = []int{4, 6, 10, 20}

func BenchmarkSingle(b *testing.B) {
	for _, n := range sizes {
		b.Run(fmt.Sprint("n=", n), func(b *testing.B) {
			a, c, poles := plant(n, 1, 3, 0.1)
			l := zeros(n, 1)
			var s placement.Solver
			b.ReportAllocs()
			for b.Loop() {
				if err := s.Single(l, a, c, poles); err != nil {
					b.Fatal(err)
				}
			}
		})
	}
}

func BenchmarkRobustCold(b *testing.B) {
	for _, n := range sizes {
		b.Run(fmt.Sprint("n=", n), func(b *testing.B) {
			a, c, poles := plant(n, 2, 3, 0.6)
			l := zeros(n, 2)
			var s placement.Solver
			b.ReportAllocs()
			for b.Loop() {
				if _, err := s.Robust(l, a, c, poles, nil); err != nil {
					b.Fatal(err)
				}
			}
		})
	}
}

// One cell of a drag to and fro: the first pole or pair moves by 2 %.
func BenchmarkRobustWarm(b *testing.B) {
	for _, n := range sizes {
		b.Run(fmt.Sprint("n=", n), func(b *testing.B) {
			a, c, poles := plant(n, 2, 3, 0.6)
			l := zeros(n, 2)
			var s placement.Solver
			var w placement.Warm
			there := append([]complex128(nil), poles...)
			there[0] *= 1.02
			if imag(there[0]) != 0 {
				there[1] *= 1.02
			}
			steps := 0
			b.ReportAllocs()
			for i := 0; b.Loop(); i++ {
				list := poles
				if i%2 == 1 {
					list = there
				}
				info, err := s.Robust(l, a, c, list, &w)
				if err != nil {
					b.Fatal(err)
				}
				steps += info.Iterations
			}
			b.ReportMetric(float64(steps)/float64(b.N), "steps/op")
		})
	}
}

func BenchmarkLeastNoise(b *testing.B) {
	for _, start := range []string{"cold", "warm"} {
		for _, n := range []int{4, 6, 10} {
			b.Run(fmt.Sprint(start, "/n=", n), func(b *testing.B) {
				a, c, poles := plant(n, 2, 3, 0.6)
				w, r, l := zeros(n, n), zeros(2, 2), zeros(n, 2)
				weights := make([]float64, n)
				for i := range n {
					w.Data[i*n+i], weights[i] = 1, 1
				}
				r.Data[0], r.Data[3] = 0.1, 0.2
				there := append([]complex128(nil), poles...)
				there[0] *= 1.02
				if imag(there[0]) != 0 {
					there[1] *= 1.02
				}
				var s placement.Solver
				var warm *placement.Warm
				if start == "warm" {
					warm = new(placement.Warm)
				}
				b.ReportAllocs()
				for i := 0; b.Loop(); i++ {
					list := poles
					if i%2 == 1 {
						list = there
					}
					if _, err := s.LeastNoise(l, a, c, w, r, weights, list, false, warm); err != nil {
						b.Fatal(err)
					}
				}
			})
		}
	}
}
