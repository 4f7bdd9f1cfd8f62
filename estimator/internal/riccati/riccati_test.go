package riccati_test

import (
	"errors"
	"fmt"
	"math"
	"math/cmplx"
	"math/rand/v2"
	"strings"
	"testing"

	"gonum.org/v1/gonum/blas/blas64"
	"gonum.org/v1/gonum/mat"
	"pgregory.net/rapid"

	"polewright/estimator/internal/riccati"
)

type equation struct {
	name       string
	discrete   bool
	a, c, w, r []float64 // row by row; sizes follow from w and r
	want       string    // part of the reason; empty where there is a solution
}

func (e equation) matrices() (a, c, w, r *mat.Dense) {
	n, p := int(math.Sqrt(float64(len(e.w)))), int(math.Sqrt(float64(len(e.r))))
	return mat.NewDense(n, n, e.a), mat.NewDense(p, n, e.c), mat.NewDense(n, n, e.w), mat.NewDense(p, p, e.r)
}

func (e equation) solve() (*riccati.Solution, error) {
	a, c, w, r := e.matrices()
	return run(e.discrete, a, c, w, r)
}

func run(discrete bool, a, c, w, r *mat.Dense) (*riccati.Solution, error) {
	solve := riccati.Continuous
	if discrete {
		solve = riccati.Discrete
	}
	return solve(a.RawMatrix(), c.RawMatrix(), w.RawMatrix(), r.RawMatrix())
}

func TestExistence(t *testing.T) {
	for _, e := range []equation{
		{"integrator", false, []float64{0}, []float64{1}, []float64{1}, []float64{1}, ""},
		{"integrator without noise", false, []float64{0}, []float64{1}, []float64{0}, []float64{1}, "no process noise reaches the mode at 0,"},
		{"unstable without noise", false, []float64{2}, []float64{1}, []float64{0}, []float64{1}, ""},
		{"unstable unseen", false, []float64{2}, []float64{0}, []float64{1}, []float64{1}, "do not see the mode at 2,"},
		{"stable unseen", false, []float64{-2}, []float64{0}, []float64{1}, []float64{1}, ""},
		{"stable without noise", false, []float64{-2}, []float64{1}, []float64{0}, []float64{1}, ""},
		{"noise-free sensor", false, []float64{-2}, []float64{1}, []float64{1}, []float64{0}, "R must be positive definite"},
		{"indefinite R", true, []float64{0.5}, []float64{1}, []float64{1}, []float64{-1}, "R must be positive semi-definite"},
		{"double integrator, speed sensed", false, []float64{0, 1, 0, 0}, []float64{0, 1}, []float64{1, 0, 0, 1}, []float64{1}, "do not see the mode at 0,"},
		{"double integrator, noise on position", false, []float64{0, 1, 0, 0}, []float64{1, 0}, []float64{1, 0, 0, 0}, []float64{1}, "no process noise reaches the mode at 0,"},
		{"oscillator without noise", false, []float64{0, 3, -3, 0}, []float64{1, 0}, []float64{0, 0, 0, 0}, []float64{1}, "no process noise reaches the mode at 0+3i,"},
		{"turned integrator, speed sensed", false, []float64{-0.48, 0.64, -0.36, 0.48}, []float64{-0.6, 0.8}, []float64{1, 0, 0, 1}, []float64{1}, "do not see the mode at 0,"},
		{"oscillator", false, []float64{0, 3, -3, 0}, []float64{1, 0}, []float64{0, 0, 0, 1}, []float64{1}, ""},
		{"units apart", false, []float64{0, 1, 0, 0}, []float64{1e-6, 0}, []float64{0, 0, 0, 1e8}, []float64{1e-20}, ""},
		{"stiff with bias", false, []float64{-1e6, 1e6, 0, 0}, []float64{1, 0}, []float64{0, 0, 0, 1e-4}, []float64{1e-6}, ""},
		{"constant, discrete", true, []float64{1}, []float64{1}, []float64{0}, []float64{1}, "no process noise reaches the mode at 1,"},
		{"random walk", true, []float64{1}, []float64{1}, []float64{1}, []float64{1}, ""},
		{"random walk, noise-free sensor", true, []float64{1}, []float64{1}, []float64{1}, []float64{0}, ""},
		{"growing without noise", true, []float64{2}, []float64{1}, []float64{0}, []float64{1}, ""},
		{"growing unseen", true, []float64{-2}, []float64{0}, []float64{1}, []float64{1}, "do not see the mode at -2,"},
		{"delay registers", true, []float64{1, 0, 0, 1, 0, 0, 0, 1, 0}, []float64{0, 0, 1}, []float64{1, 0, 0, 0, 0, 0, 0, 0, 0}, []float64{1}, ""},
		{"delay registers, noise-free sensor", true, []float64{1, 0, 0, 1, 0, 0, 0, 1, 0}, []float64{0, 0, 1}, []float64{1, 0, 0, 0, 0, 0, 0, 0, 0}, []float64{0}, ""},
		{"nothing sensed, nothing noisy", true, []float64{0.5}, []float64{0}, []float64{1}, []float64{0}, "C P Cᵀ + R is singular"},
		{"twice the same noise-free sensor", true, []float64{0.5}, []float64{1, 1}, []float64{1}, []float64{0, 0, 0, 0}, "C P Cᵀ + R is singular"},
		{"mixed sensors", true, []float64{1, 0.1, 0, 1}, []float64{1, 0, 0, 1}, []float64{0.01, 0.1, 0.1, 1}, []float64{0, 0, 0, 0.5}, ""},
		{"noise cancels at the limit", true, []float64{0, 1, 0, 0}, []float64{-1, 1}, []float64{0, 0, 0, 1}, []float64{0}, "stability limit"},
	} {
		s, err := e.solve()
		if e.want == "" {
			if err != nil {
				t.Errorf("%s: %v", e.name, err)
				continue
			}
			a, c, w, r := e.matrices()
			if msg := flaw(e.discrete, a, c, w, r, s); msg != "" {
				t.Errorf("%s: %s", e.name, msg)
			}
			continue
		}
		var absence *riccati.Absence
		if !errors.As(err, &absence) || !strings.Contains(absence.Reason, e.want) {
			t.Errorf("%s: %v (%v), want %q", e.name, err, s, e.want)
		}
	}
}

// flaw checks a solution from its definition alone.
func flaw(discrete bool, a, c, w, r *mat.Dense, s *riccati.Solution) string {
	n, _ := a.Dims()
	scale := make([]float64, n)
	for i := range scale {
		scale[i] = math.Sqrt(s.P.At(i, i))
		if !(scale[i] > 0) {
			scale[i] = 1
		}
	}
	if !mat.Equal(s.P, s.P.T()) {
		return "P is not symmetric"
	}
	sym := mat.NewSymDense(n, nil)
	for i := range n {
		for j := range i + 1 {
			sym.SetSym(i, j, s.P.At(i, j)/scale[i]/scale[j])
		}
	}
	var e mat.EigenSym
	if !e.Factorize(sym, false) || e.Values(nil)[0] < -1e-9 {
		return "P is not positive semi-definite"
	}
	for _, v := range s.Poles {
		if discrete && cmplx.Abs(v) >= 1 || !discrete && real(v) >= 0 {
			return "a pole is not stable"
		}
	}
	var cp, left, gain, ap, rest, lg mat.Dense
	cp.Mul(c, s.P)
	left.Mul(s.L, r) // L R = P Cᵀ, or L (C P Cᵀ + R) = A P Cᵀ
	gain.CloneFrom(cp.T())
	if discrete {
		var cpc, more mat.Dense
		cpc.Mul(&cp, c.T())
		more.Mul(s.L, &cpc)
		left.Add(&left, &more)
		gain.Mul(a, cp.T())
	}
	if distance(&left, &gain) > 1e-9 {
		return "L is not the gain of P"
	}
	ap.Mul(a, s.P)
	if discrete {
		rest.Mul(&ap, a.T())
		rest.Sub(&rest, s.P)
	} else {
		rest.Add(&ap, ap.T())
	}
	size := 2*mat.Norm(a, 2)*mat.Norm(s.P, 2) + mat.Norm(w, 2) + mat.Norm(&rest, 2)
	lg.Mul(s.L, gain.T())
	rest.Add(&rest, w)
	rest.Sub(&rest, &lg)
	if mat.Norm(&rest, 2) > 1e-10*(size+mat.Norm(&lg, 2)) {
		return "the equation is not met"
	}
	return ""
}

// Closed forms: p = 2 a r / c² of the unstable mode that no noise reaches
// (continuous), p = (a² − 1) r / c² (discrete); the prediction of a random walk
// with a noise-free sensor has the variance of one step.
func TestClosedForms(t *testing.T) {
	for _, c := range []struct {
		e    equation
		want float64
	}{
		{equation{"continuous", false, []float64{2}, []float64{3}, []float64{0}, []float64{0.5}, ""}, 2 * 2 * 0.5 / 9},
		{equation{"discrete", true, []float64{2}, []float64{1}, []float64{0}, []float64{1}, ""}, 3},
		{equation{"noise-free", true, []float64{1}, []float64{1}, []float64{7}, []float64{0}, ""}, 7},
	} {
		s, err := c.e.solve()
		if err != nil || math.Abs(s.P.At(0, 0)/c.want-1) > 1e-14 {
			t.Errorf("%s: %v, want %g (%v)", c.e.name, s, c.want, err)
		}
	}
}

// Any pair with full noise is solvable where it is observable; the answer
// must meet its definition.
func TestSolutionsMeetTheirDefinition(t *testing.T) {
	rapid.Check(t, func(t *rapid.T) {
		n, p := rapid.IntRange(1, 10).Draw(t, "n"), rapid.IntRange(1, 3).Draw(t, "p")
		draw := func(r, c int) *mat.Dense {
			m := mat.NewDense(r, c, nil)
			for i := range r {
				for j := range c {
					m.Set(i, j, float64(rapid.IntRange(-1000, 1000).Draw(t, "entry"))/500)
				}
			}
			return m
		}
		discrete := rapid.Bool().Draw(t, "discrete")
		a, c, g, h := draw(n, n), draw(p, n), draw(n, 2), draw(p, p)
		a.Scale(1/math.Sqrt(float64(n)), a) // else ten modes grow fourfold a step
		var w, r mat.Dense
		w.Mul(g, g.T())
		r.Mul(h, h.T())
		for i := range n {
			w.Set(i, i, w.At(i, i)+0.01)
		}
		for i := range p {
			r.Set(i, i, r.At(i, i)+0.01)
		}
		s, err := run(discrete, a, c, &w, &r)
		var absence *riccati.Absence
		if errors.As(err, &absence) && strings.Contains(absence.Reason, "do not see") {
			return
		}
		if err != nil {
			t.Fatal(err)
		}
		if msg := flaw(discrete, a, c, &w, &r, s); msg != "" {
			t.Fatal(msg)
		}
		if s.Residual > 1e-10 {
			t.Fatalf("residual %g", s.Residual)
		}
	})
}

func TestRefuses(t *testing.T) {
	one := mat.NewDense(1, 1, []float64{1}).RawMatrix()
	two := mat.NewDense(2, 2, []float64{1, 0, 0, 1}).RawMatrix()
	nan := mat.NewDense(1, 1, []float64{math.NaN()}).RawMatrix()
	for want, m := range map[string][4]blas64.General{
		"the Riccati equation needs at least one state and one sensor": {{}, one, one, one},
		"A is 2×1, it must be 2×2":                                     {mat.NewDense(2, 1, nil).RawMatrix(), one, two, one},
		"C is 1×1, it must be 1×2":                                     {two, one, two, one},
		"W is 1×1, it must be 2×2":                                     {two, two, one, two},
		"R is 1×1, it must be 2×2":                                     {two, two, two, one},
		"A is not finite":                                              {nan, one, one, one},
		"R is not finite":                                              {one, one, one, nan},
	} {
		for _, solve := range []func(a, c, w, r blas64.General) (*riccati.Solution, error){riccati.Continuous, riccati.Discrete} {
			if _, err := solve(m[0], m[1], m[2], m[3]); err == nil || err.Error() != want {
				t.Errorf("%v, want %s", err, want)
			}
		}
	}
}

// Numbers of any size give an answer that meets its definition, or an error;
// nothing panics.
func TestAnySize(t *testing.T) {
	rapid.Check(t, func(t *rapid.T) {
		n, p := rapid.IntRange(1, 4).Draw(t, "n"), rapid.IntRange(1, 2).Draw(t, "p")
		draw := func(r, c int) *mat.Dense {
			m := mat.NewDense(r, c, nil)
			wild := rapid.Bool().Draw(t, "wild")
			unit := math.Pow(10, float64(rapid.IntRange(-110, 110).Draw(t, "unit")))
			for i := range r {
				for j := range c {
					v := float64(rapid.IntRange(-9, 9).Draw(t, "entry")) * unit
					if wild {
						v = rapid.Float64().Draw(t, "entry")
					}
					m.Set(i, j, v)
				}
			}
			return m
		}
		a, c, w, r := draw(n, n), draw(p, n), draw(n, n), draw(p, p)
		if rapid.Bool().Draw(t, "squares") {
			var ww, rr mat.Dense
			ww.Mul(w, w.T())
			rr.Mul(r, r.T())
			w, r = &ww, &rr
		}
		s, err := run(rapid.Bool().Draw(t, "discrete"), a, c, w, r)
		if err != nil {
			return
		}
		for _, m := range []*mat.Dense{s.P, s.L} {
			if norm := mat.Norm(m, 1); math.IsNaN(norm) || math.IsInf(norm, 0) {
				t.Fatalf("%v", mat.Formatted(m))
			}
		}
		if !(s.Residual < 1e-6) {
			t.Fatalf("residual %g", s.Residual)
		}
	})
}

// What the states are counted in must not matter: P in other units is
// S P S, S = diag(units), to a small part of the standard deviations.
func TestUnitsDoNotMatter(t *testing.T) {
	rapid.Check(t, func(t *rapid.T) {
		n, p := rapid.IntRange(1, 8).Draw(t, "n"), rapid.IntRange(1, 2).Draw(t, "p")
		seed := rand.New(rand.NewPCG(rapid.Uint64().Draw(t, "seed"), 1))
		draw := func(r, c int) *mat.Dense {
			m := mat.NewDense(r, c, nil)
			for i := range r {
				for j := range c {
					m.Set(i, j, seed.NormFloat64()/math.Sqrt(float64(n)))
				}
			}
			return m
		}
		a, c, g, r := draw(n, n), draw(p, n), draw(n, n), mat.NewDense(p, p, nil)
		for j := range p {
			r.Set(j, j, 1)
		}
		var w mat.Dense
		w.Mul(g, g.T())
		unit := make([]float64, n)
		for i := range unit {
			unit[i] = math.Pow(10, float64(seed.IntN(17)-8))
		}
		discrete := rapid.Bool().Draw(t, "discrete")
		first, err := run(discrete, a, c, &w, r)
		if err != nil {
			t.Skip(err)
		}
		a.Apply(func(i, j int, v float64) float64 { return v * unit[i] / unit[j] }, a)
		c.Apply(func(_, j int, v float64) float64 { return v / unit[j] }, c)
		w.Apply(func(i, j int, v float64) float64 { return v * unit[i] * unit[j] }, &w)
		second, err := run(discrete, a, c, &w, r)
		if err != nil {
			t.Fatal(err)
		}
		for i := range n {
			for j := range n {
				e := second.P.At(i, j)/unit[i]/unit[j] - first.P.At(i, j)
				if math.Abs(e) > 1e-6*math.Sqrt(first.P.At(i, i)*first.P.At(j, j)) {
					t.Fatalf("P(%d,%d) differs by %g", i, j, e)
				}
			}
		}
	})
}

// A nearly constant unknown gives a pole close to the limit, p ≈ sqrt(w r) and
// l ≈ sqrt(w/r): the closed forms of the scalar equations.
func TestSlowUnknown(t *testing.T) {
	for _, w := range []float64{1e-4, 1e-10, 1e-16, 1e-20} {
		c := equation{"", false, []float64{0}, []float64{1}, []float64{w}, []float64{1}, ""}
		s, err := c.solve()
		if err != nil || math.Abs(s.P.At(0, 0)/math.Sqrt(w)-1) > 1e-14 {
			t.Errorf("continuous, w = %g: %v, %v", w, s, err)
		}
		c.a, c.discrete = []float64{1}, true
		s, err = c.solve()
		if want := (w + math.Sqrt(w*w+4*w)) / 2; err != nil || math.Abs(s.P.At(0, 0)/want-1) > 1e-8 {
			t.Errorf("discrete, w = %g: %v, want %g, %v", w, s, want, err)
		}
	}
}

var sink float64

func BenchmarkRiccati(b *testing.B) {
	for _, n := range []int{4, 6, 10, 20, 50} {
		a, c, w := mat.NewDense(n, n, nil), mat.NewDense(1, n, nil), mat.NewDense(n, n, nil)
		for i := range n {
			a.Set(i, i, -0.1*float64(i+1)/float64(n))
			w.Set(i, i, 1)
			if i > 0 {
				a.Set(i, i-1, -a.At(i, i))
			}
		}
		c.Set(0, n-1, 1)
		r := mat.NewDense(1, 1, []float64{1})
		for name, discrete := range map[string]bool{"Continuous": false, "Discrete": true} {
			b.Run(fmt.Sprintf("%s/n=%d", name, n), func(b *testing.B) {
				b.ReportAllocs()
				for b.Loop() {
					s, err := run(discrete, a, c, w, r)
					if err != nil {
						b.Fatal(err)
					}
					sink += s.Residual
				}
			})
		}
	}
}
