package estimator_test

import (
	"math"
	"math/rand/v2"
	"testing"

	"gonum.org/v1/gonum/mat"

	"polewright/estimator"
)

// With as many sensors as states every normal F is best conditioned. Robust takes the
// least noisy: no turn of its eigenvectors, tried at random, gives less.
func TestRobustOfAsManySensorsAsStates(t *testing.T) {
	rng := rand.New(rand.NewPCG(8, 9))
	draw := func(n int) *mat.Dense {
		m := mat.NewDense(n, n, nil)
		m.Apply(func(_, _ int, _ float64) float64 { return rng.NormFloat64() }, m)
		return m
	}
	cases := []struct {
		name   string
		period float64
		poles  []complex128
	}{
		{"two real", 0, []complex128{-1, -4}}, {"a pair", 0, []complex128{-2 + 3i, -2 - 3i}},
		{"three real", 0, []complex128{-1, -2, -6}}, {"a pair and one", 0, []complex128{-1 + 2i, -1 - 2i, -5}},
		{"sampled", 1, []complex128{0.2, 0.7, -0.1}}, {"sampled pair", 1, []complex128{0.5 + 0.3i, 0.5 - 0.3i}},
	}
	for _, c := range cases {
		n := len(c.poles)
		m := &estimator.Model{A: draw(n), C: draw(n), Q: unit(n), R: diagonal([]float64{0.1, 1, 3}[:n]...), Period: c.period}
		for i := range n {
			m.C.Set(i, i, m.C.At(i, i)+2)
		}
		d := newDesigner(t, m, estimator.Options{})
		got, err := d.Place(c.poles, nil)
		if err != nil {
			t.Fatalf("%s: %v", c.name, err)
		}
		if got.WorstError > 1e-10 || math.Abs(got.EigenvectorCondition-1) > 1e-9 {
			t.Errorf("%s: poles off by %.2g, condition %.12g", c.name, got.WorstError, got.EigenvectorCondition)
		}
		least := cost(d, got)
		var f mat.Dense
		f.Mul(got.Gain, m.C)
		f.Sub(m.A, &f)
		for range 300 {
			var qr mat.QR
			qr.Factorize(draw(n))
			var u, turned, l mat.Dense
			qr.QTo(&u)
			turned.Mul(&u, &f)
			turned.Mul(&turned, u.T())
			l.Sub(m.A, &turned)
			var inverse mat.Dense
			if err := inverse.Inverse(m.C); err != nil {
				t.Fatal(err)
			}
			l.Mul(&l, &inverse)
			other, err := d.QuickJudge(estimator.Given{L: &l})
			if err != nil {
				t.Fatal(err)
			}
			if x := cost(d, other); x < least*(1-1e-6) {
				t.Errorf("%s: noise %.9g, a turn of it has %.9g", c.name, least, x)
				break
			}
		}
		// A small step of one pole is followed.
		moved := append([]complex128(nil), c.poles...)
		for i := range moved {
			moved[i] *= 1.001
		}
		next, err := d.QuickPlace(moved, got)
		if err != nil {
			t.Fatal(err)
		}
		if jump := distance(next.Gain, got.Gain); jump > 0.02 {
			t.Errorf("%s: a step of 0.001 changes the gain by %.2g", c.name, jump)
		}
	}
}
