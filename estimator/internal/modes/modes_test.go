package modes_test

import (
	"encoding/json"
	"errors"
	"math"
	"math/cmplx"
	"os"
	"testing"

	"gonum.org/v1/gonum/blas/blas64"
	"gonum.org/v1/gonum/mat"
	"pgregory.net/rapid"

	"polewright/estimator/internal/modes"
)

type observabilityCase struct {
	Name  string
	A, C  [][]float64
	Rank  int
	Modes []struct {
		Eigenvalue [2]float64
		Sigma      float64 `json:"pbh_sigma_min"`
	}
	Unobservable [][2]float64 `json:"unobservable_eigenvalues"`
	Tolerance    float64
}

func dense(rows [][]float64) *mat.Dense {
	m := mat.NewDense(len(rows), len(rows[0]), nil)
	for i, r := range rows {
		m.SetRow(i, r)
	}
	return m
}

// Cases of testdata/observability.json (70-digit arithmetic; sources inside).
func TestReference(t *testing.T) {
	text, err := os.ReadFile("testdata/observability.json")
	if err != nil {
		t.Fatal(err)
	}
	var file struct{ Cases []observabilityCase }
	if err := json.Unmarshal(text, &file); err != nil {
		t.Fatal(err)
	}
	if len(file.Cases) < 19 {
		t.Fatalf("only %d cases", len(file.Cases))
	}
	for _, c := range file.Cases {
		t.Run(c.Name, func(t *testing.T) { checkCase(t, c) })
	}
}

func checkCase(t *testing.T, c observabilityCase) {
	a, cm := dense(c.A), dense(c.C)
	r, err := modes.Analyse(a.RawMatrix(), cm.RawMatrix(), 1e-12)
	if err != nil {
		t.Fatal(err)
	}
	if r.Rank != c.Rank || len(r.Fixed) != len(c.A)-c.Rank {
		t.Fatalf("rank %d with %d fixed, want %d", r.Rank, len(r.Fixed), c.Rank)
	}
	size := math.Max(mat.Norm(a, 2), mat.Norm(cm, 2))
	used := make([]bool, len(c.Modes))
	for _, m := range r.Modes {
		best := -1
		for j, w := range c.Modes {
			at := complex(w.Eigenvalue[0], w.Eigenvalue[1])
			if !used[j] && (best < 0 || cmplx.Abs(at-m.Eigenvalue) < cmplx.Abs(complex(c.Modes[best].Eigenvalue[0], c.Modes[best].Eigenvalue[1])-m.Eigenvalue)) {
				best = j
			}
		}
		used[best] = true
		want := c.Modes[best]
		if d := cmplx.Abs(complex(want.Eigenvalue[0], want.Eigenvalue[1]) - m.Eigenvalue); d > 1e-7*size {
			t.Errorf("eigenvalue %v is %g from the nearest wanted one", m.Eigenvalue, d)
		}
		if d := math.Abs(m.Sigma - want.Sigma); !(d <= math.Max(c.Tolerance*want.Sigma, 1e-12*size)) {
			t.Errorf("sigma at %v: %g, want %g", m.Eigenvalue, m.Sigma, want.Sigma)
		}
	}
	for _, w := range c.Unobservable {
		near := math.Inf(1)
		for _, f := range r.Fixed {
			near = math.Min(near, cmplx.Abs(f-complex(w[0], w[1])))
		}
		if near > 1e-9*size {
			t.Errorf("fixed %v misses %v", r.Fixed, w)
		}
	}
	checkStructure(t, a, cm, r)
}

type failer interface{ Errorf(string, ...any) }

// checkStructure holds Q against its promise and the flags against the list.
func checkStructure(t failer, a, c *mat.Dense, r *modes.Result) {
	n, _ := a.Dims()
	p, _ := c.Dims()
	var qq, t1, aq, cq mat.Dense
	qq.Mul(r.Q.T(), r.Q)
	t1.Mul(a, r.Q)
	aq.Mul(r.Q.T(), &t1)
	cq.Mul(c, r.Q)
	size := 1e-11 * float64(n) * math.Max(mat.Norm(a, 2), mat.Norm(c, 2))
	for i := range n {
		for j := range n {
			want := 0.0
			if i == j {
				want = 1
			}
			if math.Abs(qq.At(i, j)-want) > 1e-13*float64(n) {
				t.Errorf("Q is not orthogonal at %d,%d", i, j)
			}
			if i < r.Rank && j >= r.Rank && math.Abs(aq.At(i, j)) > size {
				t.Errorf("QᵀAQ at %d,%d is %g", i, j, aq.At(i, j))
			}
		}
	}
	for i := range p {
		for j := r.Rank; j < n; j++ {
			if math.Abs(cq.At(i, j)) > size {
				t.Errorf("CQ at %d,%d is %g", i, j, cq.At(i, j))
			}
		}
	}
	hidden := 0
	for _, m := range r.Modes {
		if !m.Observable {
			hidden++
		}
	}
	if hidden != len(r.Fixed) || hidden != n-r.Rank {
		t.Errorf("%d hidden modes, %d fixed, rank %d of %d", hidden, len(r.Fixed), r.Rank, n)
	}
}

// A plant built from a seen and a hidden block, then turned by a random
// orthogonal matrix, must come apart again.
func TestHiddenBlockIsFound(t *testing.T) {
	rapid.Check(t, func(t *rapid.T) {
		seen := rapid.IntRange(1, 5).Draw(t, "seen")
		hidden := rapid.IntRange(0, 4).Draw(t, "hidden")
		p := rapid.IntRange(1, 3).Draw(t, "p")
		entry := rapid.Float64Range(-2, 2)
		n := seen + hidden
		a, c := mat.NewDense(n, n, nil), mat.NewDense(p, n, nil)
		for i := range n {
			for j := range n {
				if i >= seen || j < seen {
					a.Set(i, j, entry.Draw(t, "a"))
				}
			}
		}
		for i := range seen - 1 { // a chain of unit links keeps the block observable
			for j := i + 1; j < seen; j++ {
				a.Set(i, j, 0)
			}
			a.Set(i, i+1, 1)
		}
		c.Set(0, 0, 1)
		var qr mat.QR
		g := mat.NewDense(n, n, nil)
		for i := range n {
			for j := range n {
				g.Set(i, j, entry.Draw(t, "g"))
			}
		}
		qr.Factorize(g)
		var q, t1, at, ct mat.Dense
		qr.QTo(&q)
		t1.Mul(a, &q)
		at.Mul(q.T(), &t1)
		ct.Mul(c, &q)
		r, err := modes.Analyse(at.RawMatrix(), ct.RawMatrix(), 1e-12)
		if err != nil {
			t.Fatal(err)
		}
		if r.Rank != seen {
			t.Fatalf("rank %d, want %d", r.Rank, seen)
		}
		checkStructure(t, &at, &ct, r)
	})
}

func TestBadInput(t *testing.T) {
	ok := blas64.General{Rows: 2, Cols: 2, Stride: 2, Data: []float64{1, 2, 3, 4}}
	row := blas64.General{Rows: 1, Cols: 2, Stride: 2, Data: []float64{1, 0}}
	bad := []struct {
		name string
		a, c blas64.General
		want error
	}{
		{"empty", blas64.General{}, blas64.General{}, modes.ErrShape},
		{"not square", row, row, modes.ErrShape},
		{"short data", blas64.General{Rows: 2, Cols: 2, Stride: 2, Data: []float64{1}}, row, modes.ErrShape},
		{"NaN", ok, blas64.General{Rows: 1, Cols: 2, Stride: 2, Data: []float64{math.NaN(), 0}}, modes.ErrNotFinite},
	}
	for _, b := range bad {
		if _, err := modes.Analyse(b.a, b.c, 0); !errors.Is(err, b.want) {
			t.Errorf("%s: error %v, want %v", b.name, err, b.want)
		}
	}
	zero := blas64.General{Rows: 1, Cols: 2, Stride: 2, Data: make([]float64, 2)}
	r, err := modes.Analyse(ok, zero, 0)
	if err != nil || r.Rank != 0 || len(r.Fixed) != 2 {
		t.Errorf("no sensor signal: %+v, %v", r, err)
	}
}

// Whatever the input, the answer is finite or an error.
func TestNoPanicAndNoNaN(t *testing.T) {
	values := []float64{0, 0, 1, -1, 1e-8, 1e8, -1e-30, 1e30, 1e-160, 1e160, 1e-300, 1e300, math.Inf(1)}
	rapid.Check(t, func(t *rapid.T) {
		n := rapid.IntRange(1, 5).Draw(t, "n")
		p := rapid.IntRange(1, n+1).Draw(t, "p")
		some := rapid.SampledFrom(values[:rapid.IntRange(4, len(values)).Draw(t, "wildness")])
		a, c := mat.NewDense(n, n, nil), mat.NewDense(p, n, nil)
		a.Apply(func(_, _ int, _ float64) float64 { return some.Draw(t, "a") }, a)
		c.Apply(func(_, _ int, _ float64) float64 { return some.Draw(t, "c") }, c)
		r, err := modes.Analyse(a.RawMatrix(), c.RawMatrix(), 1e-12)
		if err != nil {
			return
		}
		for _, m := range r.Modes {
			if cmplx.IsNaN(m.Eigenvalue) || cmplx.IsInf(m.Eigenvalue) || math.IsNaN(m.Sigma) || math.IsInf(m.Sigma, 0) {
				t.Fatalf("mode %+v without an error", m)
			}
		}
		for _, v := range r.Q.RawMatrix().Data {
			if !(math.Abs(v) < 1.1) {
				t.Fatalf("Q holds %g without an error", v)
			}
		}
	})
}
