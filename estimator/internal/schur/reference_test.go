package schur_test

import (
	"encoding/json"
	"math"
	"os"
	"testing"

	"gonum.org/v1/gonum/blas/blas64"
	"gonum.org/v1/gonum/mat"

	"polewright/estimator/internal/schur"
)

type lyapunovCase struct {
	Name      string      `json:"name"`
	Domain    string      `json:"domain"`
	A         [][]float64 `json:"A"`
	Q         [][]float64 `json:"Q"`
	P         [][]float64 `json:"P"`
	Tolerance float64     `json:"tolerance"`
}

// The cases were computed at 70 digits and more; each carries its source.
func TestReferenceEquations(t *testing.T) {
	data, err := os.ReadFile("testdata/lyapunov.json")
	if err != nil {
		t.Fatal(err)
	}
	var file struct{ Cases []lyapunovCase }
	if err := json.Unmarshal(data, &file); err != nil {
		t.Fatal(err)
	}
	if len(file.Cases) < 16 {
		t.Fatalf("only %d cases", len(file.Cases))
	}
	for _, c := range file.Cases {
		a, q, want := rows(c.A), rows(c.Q), rows(c.P)
		var f, turned schur.Form
		must(t, f.Factor(a.RawMatrix()))
		must(t, turned.Factor(mat.DenseCopyOf(a.T()).RawMatrix()))
		solve, adjoint := f.Lyapunov, turned.LyapunovAdjoint
		if c.Domain == "discrete" {
			solve, adjoint = f.Stein, turned.SteinAdjoint
		}
		for i, s := range []func(dst, q blas64.General) error{solve, adjoint} {
			p := mat.DenseCopyOf(q)
			must(t, s(p.RawMatrix(), p.RawMatrix()))
			if e := distance(p, want); !(e <= c.Tolerance) {
				t.Errorf("%s (adjoint %v): error %g, allowed %g", c.Name, i == 1, e, c.Tolerance)
			} else {
				t.Logf("%s: error %.2g of %.2g", c.Name, e, c.Tolerance)
			}
		}
	}
}

func must(t testing.TB, err error) {
	t.Helper()
	if err != nil {
		t.Fatal(err)
	}
}

func rows(list [][]float64) *mat.Dense {
	m := mat.NewDense(len(list), len(list[0]), nil)
	for i, r := range list {
		m.SetRow(i, r)
	}
	return m
}

// distance returns ‖x − y‖F / ‖y‖F.
func distance(x, y mat.Matrix) float64 {
	var d mat.Dense
	d.Sub(x, y)
	size := mat.Norm(y, 2)
	if size == 0 {
		return mat.Norm(&d, 2)
	}
	if e := mat.Norm(&d, 2); !math.IsNaN(e) {
		return e / size
	}
	return math.Inf(1)
}

// The optimum of each case lists its gain, its condition number in mpmath, and
// its poles; a repeated pole counts with an orthonormal basis.
func TestReferenceConditions(t *testing.T) {
	data, err := os.ReadFile("testdata/robust.json")
	if err != nil {
		t.Fatal(err)
	}
	var file struct {
		Cases []struct {
			Name    string      `json:"name"`
			A       [][]float64 `json:"A"`
			C       [][]float64 `json:"C"`
			Optimum struct {
				L    [][]float64 `json:"L"`
				Cond float64     `json:"cond2_left"`
			} `json:"optimum_estimate"`
		}
	}
	if err := json.Unmarshal(data, &file); err != nil {
		t.Fatal(err)
	}
	if len(file.Cases) < 16 {
		t.Fatalf("only %d cases", len(file.Cases))
	}
	for _, c := range file.Cases {
		var m mat.Dense
		m.Mul(rows(c.Optimum.L), rows(c.C))
		m.Sub(rows(c.A), &m)
		var f schur.Form
		must(t, f.Factor(m.RawMatrix()))
		got, err := f.VectorCondition()
		if e := math.Abs(got/c.Optimum.Cond - 1); err != nil || !(e < 1e-9) {
			t.Errorf("%s: %.12g, want %.12g (%v)", c.Name, got, c.Optimum.Cond, err)
		} else {
			t.Logf("%s: error %.2g", c.Name, e)
		}
	}
}
