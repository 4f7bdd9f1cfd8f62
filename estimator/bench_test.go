package estimator_test

import (
	"fmt"
	"math"
	"math/cmplx"
	"math/rand/v2"
	"testing"
	"time"

	"gonum.org/v1/gonum/mat"

	"polewright/estimator"
)

// benchModel draws a plant of n states and p sensors that is well seen, its own poles,
// and these made faster, as wanted ones. With feedback, its loop is stable.
func benchModel(n, p int, discrete, feedback bool) (*estimator.Model, []complex128) {
	rng := rand.New(rand.NewPCG(uint64(n), uint64(p)))
	draw := func(r, c int) *mat.Dense {
		m := mat.NewDense(r, c, nil)
		m.Apply(func(_, _ int, _ float64) float64 { return rng.NormFloat64() }, m)
		return m
	}
	m := &estimator.Model{A: draw(n, n), B: draw(n, 1), C: draw(p, n), Q: unit(n), R: unit(p)}
	m.A.Scale(1/math.Sqrt(float64(n)), m.A)
	var e mat.Eigen
	e.Factorize(m.A, mat.EigenNone)
	own := e.Values(nil)
	fastest := 0.0
	for _, v := range own {
		fastest = max(fastest, real(v))
	}
	for i := range n { // all poles are stable
		m.A.Set(i, i, m.A.At(i, i)-fastest-0.1)
	}
	for i, v := range own {
		own[i] = v - complex(fastest+0.1, 0)
	}
	wanted := make([]complex128, n)
	for i, v := range own {
		wanted[i] = v - 0.3
		// Few sensors cannot move many poles far in double precision.
		if far := most(n, p); i > far && !(i == far+1 && imag(v) < 0) {
			wanted[i] = v
		}
	}
	if feedback {
		m.K = draw(1, n)
		m.K.Scale(0.02/math.Sqrt(float64(n)), m.K)
	}
	if discrete {
		m.Period = 0.1
		var a mat.Dense
		a.Scale(m.Period, m.A)
		m.A.Exp(&a)
		m.B.Scale(m.Period, m.B)
		for i, v := range wanted {
			wanted[i] = cmplx.Exp(v * complex(m.Period, 0))
		}
	}
	return m, wanted
}

// most is the index up to which poles are moved.
func most(n, p int) int {
	switch {
	case p == 1:
		return 3
	case n > 50:
		return 20*(p-1) - 1
	}
	return n
}

// aside moves the first pole, or pair, by a step of the screen.
func aside(list []complex128) []complex128 {
	there := append([]complex128(nil), list...)
	there[0] *= 0.98
	if imag(there[0]) != 0 {
		there[1] = cmplx.Conj(there[0])
	}
	return there
}

var sink *estimator.Design

// kind is one sort of redesign that the benchmarks time.
type kind struct {
	n, p                     int
	discrete, feedback, warm bool
}

func (k kind) String() string {
	word := func(yes bool, a, b string) string {
		if yes {
			return a
		}
		return b
	}
	return fmt.Sprintf("%s/%s/p=%d/%s/n=%d", word(k.discrete, "discrete", "continuous"), word(k.feedback, "closed", "open"), k.p, word(k.warm, "warm", "cold"), k.n)
}

func kinds() (list []kind) {
	for _, discrete := range []bool{false, true} {
		for _, feedback := range []bool{false, true} {
			for _, p := range []int{1, 2, 3} {
				for _, warm := range []bool{false, true} {
					for _, n := range []int{2, 4, 6, 10, 20, 50, 100} {
						if n >= p && !(p == 1 && (warm || n > 50)) { // one sensor leaves no choice to follow
							list = append(list, kind{n, p, discrete, feedback, warm})
						}
					}
				}
			}
		}
	}
	return list
}

type placing func([]complex128, *estimator.Design) (*estimator.Design, error)

// redesign returns a function that moves one pole to and fro by one step of the screen.
func (k kind) redesign(t testing.TB, method func(*estimator.Designer) placing) func() {
	m, wanted := benchModel(k.n, k.p, k.discrete, k.feedback)
	d, err := estimator.NewDesigner(m, estimator.Options{})
	if err != nil {
		t.Fatal(err)
	}
	there := aside(wanted)
	place := method(d)
	var prev *estimator.Design
	calls := 0
	return func() {
		list := wanted
		if calls%2 == 1 {
			list = there
		}
		calls++
		if sink, err = place(list, prev); err != nil {
			t.Fatal(k, err)
		}
		if k.warm {
			prev = sink
		}
	}
}

func benchmark(b *testing.B, method func(*estimator.Designer) placing) {
	for _, k := range kinds() {
		b.Run(k.String(), func(b *testing.B) {
			f := k.redesign(b, method)
			f()
			b.ReportAllocs()
			least := time.Duration(math.MaxInt64)
			for b.Loop() {
				start := time.Now()
				f()
				least = min(least, time.Since(start))
			}
			b.ReportMetric(float64(least), "least-ns/op") // what other work on the machine leaves alone
		})
	}
}

// BenchmarkPlace is one redesign with every figure.
func BenchmarkPlace(b *testing.B) {
	benchmark(b, func(d *estimator.Designer) placing { return d.Place })
}

// BenchmarkQuickPlace is one redesign as a dragged pole asks for it: gain, reached poles,
// conditioning, noise against the floor, transient, margins.
func BenchmarkQuickPlace(b *testing.B) {
	benchmark(b, func(d *estimator.Designer) placing { return d.QuickPlace })
}

// BenchmarkJudge is every figure of a gain at hand.
func BenchmarkJudge(b *testing.B) {
	benchmark(b, func(d *estimator.Designer) placing {
		return func(list []complex128, prev *estimator.Design) (*estimator.Design, error) {
			if prev == nil {
				return d.Place(list, nil)
			}
			return d.Judge(estimator.Given{L: prev.Gain})
		}
	})
}
