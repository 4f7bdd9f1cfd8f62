package schur_test

import (
	"errors"
	"math"
	"math/cmplx"
	"math/rand/v2"
	"testing"

	"gonum.org/v1/gonum/blas/blas64"
	"gonum.org/v1/gonum/mat"
	"pgregory.net/rapid"

	"polewright/estimator/internal/schur"
)

// random draws an n×n matrix whose entries differ in size.
func random(t *rapid.T, n int, label string) *mat.Dense {
	m := mat.NewDense(n, n, nil)
	for i := range n {
		for j := range n {
			v := rapid.Float64Range(-1, 1).Draw(t, label)
			if rapid.IntRange(0, 4).Draw(t, label) == 0 {
				v *= math.Pow(10, float64(rapid.IntRange(-3, 3).Draw(t, label)))
			}
			m.Set(i, j, v)
		}
	}
	return m
}

func dense(g blas64.General) *mat.Dense {
	m := mat.NewDense(g.Rows, g.Cols, nil)
	for i := range g.Rows {
		for j := range g.Cols {
			m.Set(i, j, g.Data[i*g.Stride+j])
		}
	}
	return m
}

func TestFactorRebuildsA(t *testing.T) {
	rapid.Check(t, func(t *rapid.T) {
		n := rapid.IntRange(1, 20).Draw(t, "n")
		a := random(t, n, "a")
		padded := blas64.General{Rows: n, Cols: n, Stride: n + 3, Data: make([]float64, n*(n+3))}
		for i := range padded.Data {
			padded.Data[i] = math.NaN()
		}
		for i := range n {
			copy(padded.Data[i*(n+3):], a.RawRowView(i))
		}
		var f schur.Form
		if err := f.Factor(padded); err != nil {
			t.Fatal(err)
		}
		z, tt := dense(f.Z()), dense(f.T())
		var back, one mat.Dense
		back.Mul(z, tt)
		back.Mul(&back, z.T())
		if e := distance(&back, a); e > 1e-13 && mat.Norm(a, 2) > 0 {
			t.Fatalf("Z T Zᵀ is off by %g", e)
		}
		one.Mul(z.T(), z)
		id := mat.NewDense(n, n, nil)
		for i := range n {
			id.Set(i, i, 1)
		}
		if e := distance(&one, id); e > 1e-13 {
			t.Fatalf("Z is not orthogonal: %g", e)
		}
		checkForm(t, tt, f.Eigenvalues())
	})
}

// checkForm asserts the standardised quasi-triangular form and that the
// eigenvalues are those of its blocks.
func checkForm(t *rapid.T, m *mat.Dense, values []complex128) {
	n, _ := m.Dims()
	size := mat.Norm(m, 2)
	for i := range n {
		for j := range i {
			if v := m.At(i, j); v != 0 && (j != i-1 || j > 0 && m.At(j, j-1) != 0) {
				t.Fatalf("T(%d,%d) = %g", i, j, v)
			}
		}
		if i+1 < n && m.At(i+1, i) != 0 {
			b, c := m.At(i, i+1), m.At(i+1, i)
			if m.At(i, i) != m.At(i+1, i+1) || !(math.Signbit(b) != math.Signbit(c)) {
				t.Fatalf("block at %d is not standardised", i)
			}
			if math.Abs(imag(values[i])-math.Sqrt(math.Abs(b))*math.Sqrt(math.Abs(c))) > 1e-14*size {
				t.Fatalf("eigenvalue %d is %v", i, values[i])
			}
		}
		if math.Abs(real(values[i])-m.At(i, i)) > 1e-14*size {
			t.Fatalf("eigenvalue %d is %v", i, values[i])
		}
	}
}

func TestEquationsHaveSmallResiduals(t *testing.T) {
	rapid.Check(t, func(t *rapid.T) {
		n := rapid.IntRange(1, 20).Draw(t, "n")
		a, half := random(t, n, "a"), random(t, n, "q")
		var q mat.Dense
		q.Mul(half, half.T())
		if size := mat.Norm(&q, 2); size > 0 && size < 1e-200 {
			return // its last digits are lost to underflow
		}
		var f schur.Form
		if err := f.Factor(a.RawMatrix()); err != nil {
			t.Fatal(err)
		}
		p := mat.NewDense(n, n, nil)
		for name, s := range map[string]struct {
			solve             func(dst, q blas64.General) error
			discrete, adjoint bool
		}{
			"Lyapunov": {f.Lyapunov, false, false}, "LyapunovAdjoint": {f.LyapunovAdjoint, false, true},
			"Stein": {f.Stein, true, false}, "SteinAdjoint": {f.SteinAdjoint, true, true},
		} {
			if err := s.solve(p.RawMatrix(), q.RawMatrix()); err != nil {
				continue // a random matrix may be singular; the table tests say when
			}
			if !mat.Equal(p, p.T()) {
				t.Fatalf("%s: not symmetric", name)
			}
			m := mat.Matrix(a)
			if s.adjoint {
				m = a.T()
			}
			if e := residual(m, p, &q, s.discrete); e > 1e-12 {
				t.Fatalf("%s: residual %g", name, e)
			}
		}
	})
}

// residual is the Frobenius norm of what is left of the equation, relative to
// the size of its terms.
func residual(a mat.Matrix, p, q *mat.Dense, discrete bool) float64 {
	var ap, r mat.Dense
	ap.Mul(a, p)
	size := mat.Norm(q, 2)
	if discrete {
		r.Mul(&ap, a.T())
		r.Sub(&r, p)
		size += mat.Norm(p, 2) * (1 + math.Pow(mat.Norm(a, 2), 2))
	} else {
		r.Add(&ap, ap.T())
		size += 2 * mat.Norm(p, 2) * mat.Norm(a, 2)
	}
	r.Add(&r, q)
	if size == 0 {
		return 0
	}
	return mat.Norm(&r, 2) / size
}

func TestStableGivesPositive(t *testing.T) {
	rapid.Check(t, func(t *rapid.T) {
		n := rapid.IntRange(1, 10).Draw(t, "n")
		a, half := random(t, n, "a"), random(t, n, "q")
		size := mat.Norm(a, 2) + 0.1
		discrete := rapid.Bool().Draw(t, "discrete")
		if discrete {
			a.Scale(0.9/size, a)
		} else {
			for i := range n {
				a.Set(i, i, a.At(i, i)-1.1*size)
			}
		}
		var q mat.Dense
		q.Mul(half, half.T())
		var f schur.Form
		if err := f.Factor(a.RawMatrix()); err != nil {
			t.Fatal(err)
		}
		solve := f.Lyapunov
		if discrete {
			solve = f.Stein
		}
		p := mat.NewDense(n, n, nil)
		if err := solve(p.RawMatrix(), q.RawMatrix()); err != nil {
			t.Fatal(err)
		}
		var e mat.EigenSym
		s := mat.NewSymDense(n, nil)
		for i := range n {
			for j := range i + 1 {
				s.SetSym(i, j, p.At(i, j))
			}
		}
		size = mat.Norm(p, 2)
		if size < 1e-200 {
			return
		}
		s.ScaleSym(1/size, s)
		if !e.Factorize(s, false) {
			t.Fatal("no eigenvalues")
		}
		if low := e.Values(nil)[0]; low < -1e-13 {
			t.Fatalf("smallest eigenvalue %g, relative to the norm", low)
		}
	})
}

func TestNoUniqueSolution(t *testing.T) {
	one := mat.NewDense(2, 2, []float64{1, 0, 0, 1})
	for _, c := range []struct {
		name     string
		a        []float64
		lyapunov bool
		stein    bool
	}{
		{"double integrator", []float64{0, 1, 0, 0}, false, true},
		{"opposite", []float64{1, 5, 0, -1}, false, false},
		{"oscillator", []float64{0, 1, -1, 0}, false, false},
		{"fast oscillator", []float64{0, 1e6, -1e2, 0}, false, true},
		{"reciprocal", []float64{4, 1, 0, 0.25}, true, false},
		{"nothing", []float64{0, 0, 0, 0}, false, true},
		{"stiff", []float64{-1e9, 0, 0, -1e-3}, true, true},
	} {
		var f schur.Form
		must(t, f.Factor(mat.NewDense(2, 2, c.a).RawMatrix()))
		p := mat.NewDense(2, 2, []float64{7, 7, 7, 7})
		for name, got := range map[string]struct {
			err  error
			want bool
		}{
			"Lyapunov": {f.Lyapunov(p.RawMatrix(), one.RawMatrix()), c.lyapunov},
			"Stein":    {f.Stein(p.RawMatrix(), one.RawMatrix()), c.stein},
		} {
			if (got.err == nil) != got.want || got.err != nil && !errors.Is(got.err, schur.ErrSingular) {
				t.Errorf("%s, %s: %v", c.name, name, got.err)
			}
		}
	}
}

func TestBadInput(t *testing.T) {
	var f schur.Form
	good := mat.NewDense(2, 2, []float64{-1, 2, 0, -3}).RawMatrix()
	if err := f.Lyapunov(good, good); !errors.Is(err, schur.ErrEmpty) {
		t.Errorf("nothing factored: %v", err)
	}
	for name, m := range map[string]struct {
		m    blas64.General
		want error
	}{
		"not square": {blas64.General{Rows: 2, Cols: 3, Stride: 3, Data: make([]float64, 6)}, schur.ErrShape},
		"short":      {blas64.General{Rows: 2, Cols: 2, Stride: 2, Data: make([]float64, 3)}, schur.ErrShape},
		"stride":     {blas64.General{Rows: 2, Cols: 2, Stride: 1, Data: make([]float64, 9)}, schur.ErrShape},
		"NaN":        {blas64.General{Rows: 1, Cols: 1, Stride: 1, Data: []float64{math.NaN()}}, schur.ErrNotFinite},
		"infinity":   {blas64.General{Rows: 1, Cols: 1, Stride: 1, Data: []float64{math.Inf(-1)}}, schur.ErrNotFinite},
	} {
		must(t, f.Factor(good))
		if err := f.Factor(m.m); !errors.Is(err, m.want) {
			t.Errorf("%s: %v", name, err)
		}
		if f.Eigenvalues() != nil || f.T().Data != nil || f.Z().Data != nil {
			t.Errorf("%s: the old factors are still there", name)
		}
	}
	must(t, f.Factor(good))
	if err := f.Stein(good, blas64.General{Rows: 1, Cols: 1, Stride: 1, Data: []float64{1}}); !errors.Is(err, schur.ErrShape) {
		t.Errorf("wrong right side: %v", err)
	}
	must(t, f.Factor(blas64.General{}))
	must(t, f.Lyapunov(blas64.General{}, blas64.General{}))
	if k, err := f.VectorCondition(); err != nil || k != 1 {
		t.Errorf("n = 0: condition %g, %v", k, err)
	}
}

func TestExtremeSizes(t *testing.T) {
	for _, size := range []float64{1e-300, 1e-150, 1e150, 1e300} {
		var f schur.Form
		must(t, f.Factor(mat.NewDense(2, 2, []float64{-size, 2 * size, -2 * size, -size}).RawMatrix()))
		for _, v := range f.Eigenvalues() {
			if math.Abs(real(v)/size+1) > 1e-15 || math.Abs(math.Abs(imag(v)/size)-2) > 1e-14 {
				t.Errorf("size %g: eigenvalue %v", size, v)
			}
		}
	}
}

// stable returns a seeded matrix that is stable in both senses.
func stable(n int) *mat.Dense {
	r := rand.New(rand.NewPCG(1, uint64(n)))
	m := mat.NewDense(n, n, nil)
	for i := range n {
		for j := range n {
			m.Set(i, j, r.NormFloat64()/(6*math.Sqrt(float64(n))))
		}
		m.Set(i, i, m.At(i, i)-0.5)
	}
	return m
}

func TestNoAllocationAfterFirstUse(t *testing.T) {
	for _, n := range []int{1, 4, 6, 10, 20} {
		a := stable(n)
		q, p := mat.NewDense(n, n, nil), mat.NewDense(n, n, nil)
		q.Mul(a, a.T())
		var f schur.Form
		if got := testing.AllocsPerRun(20, func() {
			must(t, f.Factor(a.RawMatrix()))
			must(t, f.Lyapunov(p.RawMatrix(), q.RawMatrix()))
			must(t, f.LyapunovAdjoint(p.RawMatrix(), q.RawMatrix()))
			must(t, f.Stein(p.RawMatrix(), q.RawMatrix()))
			must(t, f.SteinAdjoint(p.RawMatrix(), q.RawMatrix()))
			if _, err := f.VectorCondition(); err != nil {
				t.Fatal(err)
			}
		}); got != 0 {
			t.Errorf("n = %d: %g allocations", n, got)
		}
	}
}

// Matrices of small whole numbers are often exactly singular, defective or
// split in blocks, where rounding decides what an eigenvalue is. Whatever is
// answered must still solve the equation.
func TestWholeNumbers(t *testing.T) {
	r := rand.New(rand.NewPCG(1, 2))
	solved := 0
	for range 2000 {
		n := 2 + r.IntN(19)
		fill := r.Float64()
		a, q, p := mat.NewDense(n, n, nil), mat.NewDense(n, n, nil), mat.NewDense(n, n, nil)
		for i := range n {
			for j := range n {
				if r.Float64() < fill {
					a.Set(i, j, float64(r.IntN(3)-1))
				}
				q.Set(i, j, 1)
			}
		}
		var f schur.Form
		must(t, f.Factor(a.RawMatrix()))
		z := dense(f.Z())
		var back mat.Dense
		back.Mul(z, dense(f.T()))
		back.Mul(&back, z.T())
		if e := distance(&back, a); e > 2e-14 {
			t.Fatalf("Z T Zᵀ is off by %g for\n%v", e, mat.Formatted(a))
		}
		if f.Lyapunov(p.RawMatrix(), q.RawMatrix()) == nil {
			solved++
			if e := residual(a, p, q, false); e > 1e-13 {
				t.Fatalf("Lyapunov: residual %g for\n%v", e, mat.Formatted(a))
			}
		}
		if f.Stein(p.RawMatrix(), q.RawMatrix()) == nil {
			if e := residual(a, p, q, true); e > 1e-13 {
				t.Fatalf("Stein: residual %g for\n%v", e, mat.Formatted(a))
			}
		}
	}
	if solved < 500 {
		t.Errorf("only %d solved", solved)
	}
}

// The eigenvalues of a cyclic shift are the roots of unity: plain shifts of
// the iteration leave it as it is.
func TestCyclicShift(t *testing.T) {
	for n := 1; n <= 53; n++ {
		a := mat.NewDense(n, n, nil)
		for i := range n {
			a.Set(i, (i+1)%n, 1)
		}
		var f schur.Form
		must(t, f.Factor(a.RawMatrix()))
		for k := range n {
			want := cmplx.Rect(1, 2*math.Pi*float64(k)/float64(n))
			off := math.Inf(1)
			for _, v := range f.Eigenvalues() {
				off = min(off, cmplx.Abs(v-want))
			}
			if off > 1e-13 {
				t.Errorf("n = %d: %v is missed by %g", n, want, off)
			}
		}
	}
}
