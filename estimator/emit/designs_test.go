package emit_test

import (
	"math"
	"math/rand/v2"
	"testing"

	"gonum.org/v1/gonum/mat"

	"polewright/estimator"
	"polewright/estimator/emit"
)

// shape describes a random design.
type shape struct {
	n, m, p    int
	form       estimator.Form
	arithmetic emit.Arithmetic
	through    bool // D is not zero
	wrap       bool
	ranges     bool
	unknowns   int // added random-walk states that the inputs do not reach
}

// fractionBits is the format of the fixed-point designs, Q15.16.
const fractionBits = 16

// randomSource makes a stable design: a random A of spectral radius about 0.97
// (with unknowns: integrators on the input) and the gain that 400 steps of the
// Riccati recursion give.
func randomSource(t testing.TB, s shape, seed uint64) emit.Source {
	t.Helper()
	rng := rand.New(rand.NewPCG(seed, 1))
	n := s.n + s.unknowns
	a := random(rng, n, n)
	a.Scale(0.97/radius(t, a), a)
	b := random(rng, n, s.m)
	for k := range s.unknowns {
		for i := range n {
			a.Set(s.n+k, i, 0)
			if i < s.n {
				a.Set(i, s.n+k, b.At(i, k%s.m))
			}
		}
		for j := range n - s.n {
			a.Set(s.n+k, s.n+j, 0)
		}
		a.Set(s.n+k, s.n+k, 1)
		for j := range s.m {
			b.Set(s.n+k, j, 0)
		}
	}
	if s.unknowns > 0 {
		// the plant's own part alone sets its speed
		sub := mat.DenseCopyOf(a.Slice(0, s.n, 0, s.n))
		sub.Scale(0.9/radius(t, sub), sub)
		for i := range s.n {
			for j := range s.n {
				a.Set(i, j, sub.At(i, j))
			}
		}
	}
	c := random(rng, s.p, n)
	for k := range s.unknowns {
		for i := range s.p {
			c.Set(i, s.n+k, 0)
		}
	}
	model := &estimator.Model{Period: 0.005, A: a, C: c}
	if s.m > 0 {
		model.B = b
	}
	if s.through {
		model.D = random(rng, s.p, s.m)
	}
	lf := riccatiGain(a, c)
	l := new(mat.Dense)
	l.Mul(a, lf)
	src := emit.Source{
		Model: model, Form: s.form, L: l, Lf: lf, Arithmetic: s.arithmetic, FractionBits: fractionBits,
		Plant: "Random plant", Candidate: "quick", PlantSHA256: "ab12", SessionSHA256: "cd34", Version: "test",
	}
	for range n {
		src.States = append(src.States, emit.Signal{Unit: "m", Offset: 4 * (rng.Float64() - 0.5)})
	}
	for range s.m {
		src.Inputs = append(src.Inputs, emit.Signal{Unit: "N", Offset: 100 * rng.Float64()})
	}
	for i := range s.p {
		y := emit.Signal{Unit: "rad", Offset: rng.Float64()}
		if s.wrap && i == 0 {
			y.Wrap = 2 * math.Pi
		}
		if s.ranges && i == s.p-1 {
			y.Range = []float64{-3.1, 4.7}
		}
		src.Sensors = append(src.Sensors, y)
	}
	return src
}

func random(rng *rand.Rand, r, c int) *mat.Dense {
	if c == 0 {
		return &mat.Dense{}
	}
	m := mat.NewDense(r, c, nil)
	for i := range r {
		for j := range c {
			m.Set(i, j, 2*rng.Float64()-1)
		}
	}
	return m
}

func radius(t testing.TB, a mat.Matrix) float64 {
	t.Helper()
	var e mat.Eigen
	if !e.Factorize(a, mat.EigenNone) {
		t.Fatal("no eigenvalues")
	}
	r := 0.0
	for _, v := range e.Values(nil) {
		r = max(r, math.Hypot(real(v), imag(v)))
	}
	return r
}

// riccatiGain iterates the filter's Riccati equation with Q = 0.05 I, R = I.
func riccatiGain(a, c *mat.Dense) *mat.Dense {
	n, _ := a.Dims()
	p, _ := c.Dims()
	cov := mat.NewDense(n, n, nil)
	for i := range n {
		cov.Set(i, i, 1)
	}
	lf := new(mat.Dense)
	for range 400 {
		var pc, s, inv, lc, f, af mat.Dense
		pc.Mul(cov, c.T())
		s.Mul(c, &pc)
		for i := range p {
			s.Set(i, i, s.At(i, i)+1)
		}
		if err := inv.Inverse(&s); err != nil {
			panic(err)
		}
		lf.Reset()
		lf.Mul(&pc, &inv)
		lc.Mul(lf, c)
		lc.Mul(&lc, cov)
		f.Sub(cov, &lc)
		af.Mul(a, &f)
		cov.Mul(&af, a.T())
		for i := range n {
			cov.Set(i, i, cov.At(i, i)+0.05)
		}
	}
	return lf
}
