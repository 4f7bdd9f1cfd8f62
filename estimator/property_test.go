package estimator_test

import (
	"errors"
	"math"
	"math/cmplx"
	"testing"

	"gonum.org/v1/gonum/mat"
	"pgregory.net/rapid"

	"polewright/estimator"
)

// anyModel draws a random model of moderate size: n up to 6, p up to 3, one or
// two inputs with a controller.
func anyModel(t *rapid.T) *estimator.Model {
	n := rapid.IntRange(1, 6).Draw(t, "n")
	p := rapid.IntRange(1, min(3, n)).Draw(t, "p")
	inputs := rapid.IntRange(1, 2).Draw(t, "m")
	// Multiples of 2⁻¹²: shrinking would else lead to numbers whose squares vanish.
	number := rapid.Map(rapid.IntRange(-8192, 8192), func(k int) float64 { return float64(k) / 4096 })
	fill := func(r, c int, name string) *mat.Dense {
		m := mat.NewDense(r, c, nil)
		for i := range r {
			for j := range c {
				m.Set(i, j, number.Draw(t, name))
			}
		}
		return m
	}
	covariance := func(k int, name string) *mat.SymDense {
		root := fill(k, k, name)
		s := mat.NewSymDense(k, nil)
		s.SymOuterK(1, root)
		for i := range k {
			s.SetSym(i, i, s.At(i, i)+0.1)
		}
		return s
	}
	m := &estimator.Model{
		A: fill(n, n, "A"), B: fill(n, inputs, "B"), C: fill(p, n, "C"), K: fill(inputs, n, "K"),
		Q: covariance(n, "Q"), R: covariance(p, "R"),
	}
	if rapid.Bool().Draw(t, "discrete") {
		m.Period = 0.1
		m.A.Scale(0.5, m.A)
	}
	return m
}

// anyPoles draws n stable poles, closed under conjugation and not all together.
func anyPoles(t *rapid.T, n int, discrete bool) []complex128 {
	var list []complex128
	for len(list) < n {
		if n-len(list) >= 2 && rapid.Bool().Draw(t, "pair") {
			v := complex(-rapid.Float64Range(0.5, 5).Draw(t, "re"), rapid.Float64Range(0.2, 5).Draw(t, "im"))
			if discrete {
				v = cmplx.Exp(v / 10)
			}
			list = append(list, v, cmplx.Conj(v))
			continue
		}
		v := complex(-rapid.Float64Range(0.5, 5).Draw(t, "re"), 0)
		if discrete {
			v = cmplx.Exp(v / 10)
		}
		list = append(list, v)
	}
	return list
}

// designOf makes a design of a drawn model whose modes are all well seen.
func designOf(t *rapid.T, m *estimator.Model, o estimator.Options) (*estimator.Designer, *estimator.Design, []complex128) {
	n, _, _ := m.Dims()
	d, err := estimator.NewDesigner(m, o)
	if err != nil {
		t.Fatal(err)
	}
	for _, mode := range d.Analysis().Observability.Modes {
		if mode.Sigma < 0.05 {
			t.Skip("a mode that is hardly seen")
		}
	}
	var svd mat.SVD
	if svd.Factorize(m.C, mat.SVDNone); svd.Cond() > 1e4 {
		t.Skip("sensors that nearly depend on each other")
	}
	wanted := anyPoles(t, n, m.Discrete())
	got, err := d.Place(wanted, nil)
	var fixed *estimator.FixedModesError
	if errors.As(err, &fixed) {
		t.Skip("nearly unobservable")
	}
	if o.Form == estimator.Current && errors.Is(err, estimator.ErrNotReached) {
		t.Skip("(C A, A) is nearly unobservable")
	}
	if err != nil {
		t.Fatal(err)
	}
	if lf := got.GainCurrent; o.Form == estimator.Current && mat.Norm(lf, 2) > 100 {
		t.Skip("A is nearly singular, so that A Lf = L is ill-conditioned")
	}
	return d, got, wanted
}

func TestReachedPolesAreTheWantedOnes(t *testing.T) {
	rapid.Check(t, func(t *rapid.T) {
		m := anyModel(t)
		_, got, wanted := designOf(t, m, estimator.Options{})
		// Two poles that nearly meet lose half their digits for any method.
		near := math.Inf(1)
		for i, v := range wanted {
			for _, w := range wanted[:i] {
				near = min(near, cmplx.Abs(v-w))
			}
		}
		tolerance := 1e-7
		if near < 0.1 {
			tolerance = 1e-4
		}
		if k := got.EigenvectorCondition; k > 1e4 || math.IsNaN(k) {
			t.Skip("no method reaches these poles in double precision")
		}
		if !(got.WorstError < tolerance) {
			t.Errorf("wanted %v, reached %v: off by %.2g", got.Wanted, got.Reached, got.WorstError)
		}
	})
}

func TestCovarianceSolvesItsEquation(t *testing.T) {
	rapid.Check(t, func(t *rapid.T) {
		m := anyModel(t)
		_, got, _ := designOf(t, m, estimator.Options{})
		if !got.Stable || got.EigenvectorCondition > 1e4 {
			t.Skip("unstable by rounding")
		}
		n, _, _ := m.Dims()
		var f, fp, res, lr, lrl mat.Dense
		f.Mul(got.Gain, m.C)
		f.Sub(m.A, &f)
		lr.Mul(got.Gain, m.R)
		lrl.Mul(&lr, got.Gain.T())
		lrl.Add(&lrl, m.Q)
		p := mat.DenseCopyOf(got.Noise.Covariance)
		fp.Mul(&f, p)
		if m.Discrete() { // P = F P Fᵀ + Q + L R Lᵀ
			res.Mul(&fp, f.T())
			res.Add(&res, &lrl)
			res.Sub(&res, p)
		} else { // F P + P Fᵀ + Q + L R Lᵀ = 0
			res.Add(&fp, fp.T())
			res.Add(&res, &lrl)
		}
		size := mat.Norm(p, 2)*(1+mat.Norm(&f, 2))*(1+mat.Norm(&f, 2)) + mat.Norm(&lrl, 2)
		if r := mat.Norm(&res, 2) / size; r > 1e-11 {
			t.Errorf("residual %.2g for n = %d", r, n)
		}
		for i, over := range got.Noise.OverFloor {
			if over < 1-1e-7 {
				t.Errorf("state %d is quieter than the best linear estimator: %g", i, over)
			}
		}
	})
}

// With the exact model the loop's poles are the controller's and the
// estimator's, whatever the form (the separation principle).
func TestSeparation(t *testing.T) {
	rapid.Check(t, func(t *rapid.T) {
		m := anyModel(t)
		o := estimator.Options{}
		if m.Discrete() && rapid.Bool().Draw(t, "current") {
			o.Form = estimator.Current
		}
		_, got, _ := designOf(t, m, o)
		var bk mat.Dense
		bk.Mul(m.B, m.K)
		bk.Sub(m.A, &bk)
		var e mat.Eigen
		if !e.Factorize(&bk, mat.EigenNone) {
			t.Skip("no eigenvalues")
		}
		want := append(e.Values(nil), got.Reached...)
		if len(got.Loop.Poles) != len(want) {
			t.Fatalf("%d loop poles, expected %d", len(got.Loop.Poles), len(want))
		}
		// Compare det(μ − ·) at points away from the eigenvalues: clusters move
		// much, their product little.
		for _, mu := range []complex128{5 + 7i, -11 + 2i, 13} {
			ratio := complex(1, 0)
			for i := range want {
				ratio *= (mu - got.Loop.Poles[i]) / (mu - want[i])
			}
			if cmplx.Abs(ratio-1) > 1e-7*(1+got.GainNorm) {
				t.Errorf("loop poles %v, expected %v", got.Loop.Poles, want)
			}
		}
	})
}
