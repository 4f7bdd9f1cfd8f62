package riccati_test

import (
	"encoding/json"
	"math"
	"math/cmplx"
	"os"
	"testing"

	"gonum.org/v1/gonum/mat"

	"polewright/estimator/internal/riccati"
)

type riccatiCase struct {
	Name       string       `json:"name"`
	Domain     string       `json:"domain"`
	A          [][]float64  `json:"A"`
	C          [][]float64  `json:"C"`
	W          [][]float64  `json:"W"`
	R          [][]float64  `json:"R"`
	P          [][]float64  `json:"P"`
	L          [][]float64  `json:"L"`
	PPred      [][]float64  `json:"P_pred"`
	LP         [][]float64  `json:"L_p"`
	Values     [][2]float64 `json:"error_eigenvalues"`
	Tolerance  float64      `json:"tolerance"`
	ToleranceL float64      `json:"tolerance_L"`
}

// The cases were computed at 70 digits and more; each carries its source.
func TestReference(t *testing.T) {
	data, err := os.ReadFile("testdata/riccati.json")
	if err != nil {
		t.Fatal(err)
	}
	var file struct{ Cases []riccatiCase }
	if err := json.Unmarshal(data, &file); err != nil {
		t.Fatal(err)
	}
	if len(file.Cases) < 25 {
		t.Fatalf("only %d cases", len(file.Cases))
	}
	for _, c := range file.Cases {
		solve, p, l := riccati.Continuous, c.P, c.L
		if c.Domain == "discrete" {
			solve, p, l = riccati.Discrete, c.PPred, c.LP
		}
		s, err := solve(rows(c.A).RawMatrix(), rows(c.C).RawMatrix(), rows(c.W).RawMatrix(), rows(c.R).RawMatrix())
		if err != nil {
			t.Errorf("%s: %v", c.Name, err)
			continue
		}
		ep, el, ev := distance(s.P, rows(p)), distance(s.L, rows(l)), unmatched(s.Poles, c.Values)
		if !(ep <= c.Tolerance) || !(el <= c.ToleranceL) || !(ev <= 1e-6) || !(s.Residual < 1e-12) {
			t.Errorf("%s: P %g of %g, L %g of %g, poles %g, residual %g", c.Name, ep, c.Tolerance, el, c.ToleranceL, ev, s.Residual)
		}
		t.Logf("%s: error P %.2g, L %.2g, poles %.2g, residual %.2g", c.Name, ep, el, ev, s.Residual)
	}
}

// unmatched returns the largest distance from a wanted pole to the nearest one
// that is left, relative to the largest.
func unmatched(got []complex128, want [][2]float64) float64 {
	left := append([]complex128(nil), got...)
	worst, size := 0.0, 0.0
	for _, w := range want {
		v := complex(w[0], w[1])
		size = max(size, cmplx.Abs(v))
		best := -1
		for i, x := range left {
			if best < 0 || cmplx.Abs(x-v) < cmplx.Abs(left[best]-v) {
				best = i
			}
		}
		if best < 0 {
			return math.Inf(1)
		}
		worst = max(worst, cmplx.Abs(left[best]-v))
		left = append(left[:best], left[best+1:]...)
	}
	if size == 0 {
		return worst
	}
	return worst / size
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
	if size := mat.Norm(y, 2); size > 0 {
		return mat.Norm(&d, 2) / size
	}
	return mat.Norm(&d, 2)
}
