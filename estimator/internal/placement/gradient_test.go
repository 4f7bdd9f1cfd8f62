package placement

import (
	"math"
	"math/rand/v2"
	"testing"

	"gonum.org/v1/gonum/blas/blas64"
)

// The gradients of the measures agree with central differences along the path that a
// descent moves on.
func TestGradients(t *testing.T) {
	rng := rand.New(rand.NewPCG(5, 5))
	fill := func(n, m int) blas64.General {
		g := matrix(n, m, make([]float64, n*m))
		for i := range g.Data {
			g.Data[i] = rng.NormFloat64()
		}
		return g
	}
	lists := map[string][]pole{
		"real":     {{at: -0.1}, {at: -0.2}, {at: -0.3}, {at: -0.4}, {at: -0.5}},
		"pairs":    {{at: -0.3 + 0.4i, pair: true}, {at: -0.2 + 0.1i, pair: true}, {at: -0.5}},
		"repeated": {{at: -0.3}, {at: -0.3}, {at: -0.2 + 0.1i, pair: true}, {at: -0.5}},
	}
	for name, list := range lists {
		for _, squarings := range []int{powerRough, powerFine, powerNoise, powerNoise - 1} {
			const n, p = 5, 3
			discrete := squarings < powerNoise
			squarings = max(squarings, powerNoise)
			a, c, half := fill(n, n), fill(p, n), fill(n, n)
			w, r := matrix(n, n, make([]float64, n*n)), matrix(p, p, make([]float64, p*p))
			gramian(w.Data, half.Data, n)
			gramian(r.Data, fill(p, p).Data, p)
			s := Solver{list: list}
			q := &s.noise
			q.a, q.c, q.w, q.r, q.weights, q.discrete = a, c, w, r, []float64{1, 2, 0, 3, 1}, discrete
			q.reset(n, p)
			rb := &s.robust
			rb.noise = q
			if !rb.load(a, c) {
				t.Fatal("dependent sensors")
			}
			rb.gather(list)
			rb.nullSpaces()
			seed := uint64(3)
			rb.scatter(&seed)
			g := make([]float64, rb.free)
			rb.value(squarings)
			rb.pullBack(g)
			from := append([]complex128(nil), rb.frames...)
			for k := range g {
				d := make([]float64, rb.free)
				d[k] = 1
				const h = 1e-5
				rb.move(from, d, h)
				up := rb.value(squarings)
				rb.move(from, d, -h)
				down := rb.value(squarings)
				if want := (up - down) / (2 * h); math.Abs(g[k]-want) > 1e-6*(1+math.Abs(want)) {
					t.Errorf("%s, measure %d, discrete %v: slope %d is %g, differences give %g", name, squarings, discrete, k, g[k], want)
				}
			}
		}
	}
}
