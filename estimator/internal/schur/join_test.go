package schur_test

import (
	"math/rand/v2"
	"testing"

	"gonum.org/v1/gonum/mat"

	"polewright/estimator/internal/schur"
)

// The joined form is that of the whole matrix: Z T Zᵀ gives it back, and a Lyapunov
// equation on it is solved.
func TestJoin(t *testing.T) {
	r := rand.New(rand.NewPCG(1, 2))
	draw := func(rows, cols int) *mat.Dense {
		m := mat.NewDense(rows, cols, nil)
		m.Apply(func(_, _ int, _ float64) float64 { return r.NormFloat64() }, m)
		return m
	}
	for _, size := range [][2]int{{1, 1}, {2, 3}, {5, 2}, {7, 7}} {
		n, m := size[0], size[1]
		a, b, x := draw(n, n), draw(m, m), draw(n, m)
		for i := range n {
			a.Set(i, i, a.At(i, i)-6)
		}
		for i := range m {
			b.Set(i, i, b.At(i, i)-6)
		}
		var fa, fb, whole schur.Form
		if err := fa.Factor(a.RawMatrix()); err != nil {
			t.Fatal(err)
		}
		if err := fb.Factor(b.RawMatrix()); err != nil {
			t.Fatal(err)
		}
		if err := whole.Join(&fa, &fb, x.RawMatrix()); err != nil {
			t.Fatal(err)
		}
		full := mat.NewDense(n+m, n+m, nil)
		full.Slice(0, n, 0, n).(*mat.Dense).Copy(a)
		full.Slice(0, n, n, n+m).(*mat.Dense).Copy(x)
		full.Slice(n, n+m, n, n+m).(*mat.Dense).Copy(b)
		var tt, zz, back, res mat.Dense
		tt.SetRawMatrix(whole.T())
		zz.SetRawMatrix(whole.Z())
		back.Mul(&zz, &tt)
		back.Mul(&back, zz.T())
		back.Sub(&back, full)
		if e := mat.Norm(&back, 2); e > 1e-12 {
			t.Errorf("%v: Z T Zᵀ is off by %.2g", size, e)
		}
		p, q := mat.NewDense(n+m, n+m, nil), mat.NewDense(n+m, n+m, nil)
		for i := range n + m {
			q.Set(i, i, 1)
		}
		if err := whole.Lyapunov(p.RawMatrix(), q.RawMatrix()); err != nil {
			t.Fatal(err)
		}
		res.Mul(full, p)
		res.Add(&res, mat.DenseCopyOf(res.T()))
		res.Add(&res, q)
		if e := mat.Norm(&res, 2); e > 1e-11 {
			t.Errorf("%v: residual %.2g", size, e)
		}
		if err := whole.Join(&fa, &fb, draw(m+1, n).RawMatrix()); err == nil {
			t.Error("a coupling of the wrong shape was taken")
		}
	}
}
