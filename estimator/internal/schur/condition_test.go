package schur_test

import (
	"fmt"
	"math"
	"testing"

	"gonum.org/v1/gonum/mat"

	"polewright/estimator/internal/schur"
)

// similar returns M D M⁻¹.
func similar(t *testing.T, m, d *mat.Dense) *mat.Dense {
	t.Helper()
	var inv, out mat.Dense
	must(t, inv.Inverse(m))
	out.Mul(m, d)
	out.Mul(&out, &inv)
	return &out
}

func well(n int) *mat.Dense {
	m := stable(n)
	for i := range n {
		m.Set(i, i, m.At(i, i)+2)
	}
	return m
}

func TestVectorConditionKnown(t *testing.T) {
	rotated := similar(t, mat.NewDense(2, 2, []float64{0.6, -0.8, 0.8, 0.6}), mat.NewDense(2, 2, []float64{-1, 3, 0, -2}))
	for _, c := range []struct {
		name string
		a    *mat.Dense
		want float64
	}{
		{"scalar", mat.NewDense(1, 1, []float64{-3}), 1},
		{"symmetric", mat.NewDense(2, 2, []float64{-2, 1, 1, -5}), 1},
		{"normal pair", mat.NewDense(2, 2, []float64{-2, 7, -7, -2}), 1},
		{"identity", mat.NewDense(3, 3, []float64{-2, 0, 0, 0, -2, 0, 0, 0, -2}), 1},
		// Unit eigenvectors at the angle with cosine c have the condition
		// sqrt((1 + c)/(1 − c)). Of [−1 3; 0 −2]ᵀ: (1, 3)/√10 and (0, 1).
		{"angle", mat.NewDense(2, 2, []float64{-1, 3, 0, -2}), math.Sqrt((1 + 3/math.Sqrt(10)) / (1 - 3/math.Sqrt(10)))},
		{"angle, rotated", rotated, math.Sqrt((1 + 3/math.Sqrt(10)) / (1 - 3/math.Sqrt(10)))},
		// Of [0 1; −w² 0]ᵀ: (w, ±i)/√(1 + w²), cosine (w² − 1)/(w² + 1): w.
		{"oscillator", mat.NewDense(2, 2, []float64{0, 1, -9, 0}), 3},
		{"repeated pair", kron(mat.NewDense(2, 2, []float64{0, 1, -9, 0})), 3},
	} {
		var f schur.Form
		must(t, f.Factor(c.a.RawMatrix()))
		got, err := f.VectorCondition()
		if err != nil || math.Abs(got/c.want-1) > 1e-12 {
			t.Errorf("%s: %v, want %v (%v)", c.name, got, c.want, err)
		}
	}
}

// kron returns diag(a, a).
func kron(a *mat.Dense) *mat.Dense {
	n, _ := a.Dims()
	out := mat.NewDense(2*n, 2*n, nil)
	out.Slice(0, n, 0, n).(*mat.Dense).Copy(a)
	out.Slice(n, 2*n, n, 2*n).(*mat.Dense).Copy(a)
	return out
}

// Copies that a general similarity splits by rounding are still one repeated
// eigenvalue; the basis of its eigenspace then follows from M alone.
func TestVectorConditionRepeated(t *testing.T) {
	for n := 3; n <= 12; n++ {
		m := well(n)
		d := mat.NewDense(n, n, nil)
		for i := range n {
			d.Set(i, i, -2)
		}
		d.Set(n-1, n-1, -7)
		var f schur.Form
		must(t, f.Factor(similar(t, m, d).RawMatrix()))
		got, err := f.VectorCondition()
		must(t, err)
		// Left eigenvectors: rows of M⁻¹. Those of −2 span what is at right
		// angles to the last column of M, the other is the last row of M⁻¹.
		var inv mat.Dense
		must(t, inv.Inverse(m))
		cos := 1 / (mat.Norm(m.ColView(n-1), 2) * mat.Norm(inv.RowView(n-1), 2))
		sin := math.Sqrt(1 - cos*cos)
		want := math.Sqrt((1 + sin) / (1 - sin))
		if math.Abs(got/want-1) > 1e-9 {
			t.Errorf("n = %d: %g, want %g", n, got, want)
		}
	}
}

// A Jordan block has too few eigenvectors however its eigenvalues split.
func TestVectorConditionDefective(t *testing.T) {
	for n := 2; n <= 6; n++ {
		for _, pair := range []bool{false, true} {
			t.Run(fmt.Sprintf("size %d, complex %v", n, pair), func(t *testing.T) {
				size, step := n, 1
				if pair {
					size, step = 2*n, 2
				}
				j := mat.NewDense(size, size, nil)
				for i := range size {
					j.Set(i, i, -1)
					if i+step < size {
						j.Set(i, i+step, 1)
					}
				}
				if pair {
					for i := 0; i < size; i += 2 {
						j.Set(i, i+1, 2)
						j.Set(i+1, i, -2)
					}
				}
				for _, a := range []*mat.Dense{j, similar(t, well(size), j)} {
					var f schur.Form
					must(t, f.Factor(a.RawMatrix()))
					if k, err := f.VectorCondition(); err != nil || !math.IsInf(k, 1) {
						t.Errorf("condition %g (%v), eigenvalues %v", k, err, f.Eigenvalues())
					}
				}
			})
		}
	}
}

// Against the eigenvectors of another routine.
func TestVectorConditionSimple(t *testing.T) {
	for n := 1; n <= 20; n++ {
		a := stable(n)
		var e mat.Eigen
		if !e.Factorize(a, mat.EigenLeft) {
			t.Fatal("no eigenvectors")
		}
		var v mat.CDense
		e.LeftVectorsTo(&v)
		wide := mat.NewDense(2*n, 2*n, nil) // [Re −Im; Im Re] has the same singular values, twice
		for i := range n {
			for j := range n {
				x := v.At(i, j)
				wide.Set(i, j, real(x))
				wide.Set(n+i, n+j, real(x))
				wide.Set(i, n+j, -imag(x))
				wide.Set(n+i, j, imag(x))
			}
		}
		var f schur.Form
		must(t, f.Factor(a.RawMatrix()))
		got, err := f.VectorCondition()
		must(t, err)
		if want := mat.Cond(wide, 2); math.Abs(got/want-1) > 1e-9 {
			t.Errorf("n = %d: %g, want %g", n, got, want)
		}
	}
}

func TestUncertaintyCoversRounding(t *testing.T) {
	a := similar(t, well(4), mat.NewDense(4, 4, []float64{-1, 1, 0, 0, 0, -1, 0, 0, 0, 0, -3, 0, 0, 0, 0, -4}))
	var f schur.Form
	must(t, f.Factor(a.RawMatrix()))
	radius, err := f.Uncertainty()
	must(t, err)
	for i, v := range f.Eigenvalues() {
		off := math.Inf(1)
		for _, w := range []float64{-1, -3, -4} {
			off = min(off, math.Hypot(real(v)-w, imag(v)))
		}
		if off > radius[i] || radius[i] > 1e-5 {
			t.Errorf("%v is off by %g, radius %g", v, off, radius[i])
		}
	}
}
