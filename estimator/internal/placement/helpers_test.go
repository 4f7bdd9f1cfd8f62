package placement_test

import (
	"encoding/json"
	"math"
	"math/cmplx"
	"os"
	"testing"

	"gonum.org/v1/gonum/blas/blas64"
	"gonum.org/v1/gonum/mat"
)

// placementCase holds the fields that the reference files share.
type placementCase struct {
	Name          string
	A, C, L       [][]float64
	Poles         [][2]float64
	Tolerance     float64
	ToleranceKind string      `json:"tolerance_kind"`
	CharTolerance float64     `json:"charpoly_tolerance"`
	Exact         [][]float64 `json:"L_exact"`
	PoleTolerance float64     `json:"pole_error_tolerance"`
	Best          float64     `json:"best_listed_cond2_left"`
	Optimum       struct {
		Cond float64 `json:"cond2_left"`
	} `json:"optimum_estimate"`
	Multiplicity int `json:"max_pole_multiplicity"`
	Methods      map[string]struct {
		Seen float64 `json:"as_seen_by_double_eigensolver"`
	}
}

func load(t testing.TB, file string, atLeast int) []placementCase {
	text, err := os.ReadFile("testdata/" + file)
	if err != nil {
		t.Fatal(err)
	}
	var content struct{ Cases []placementCase }
	if err := json.Unmarshal(text, &content); err != nil {
		t.Fatal(err)
	}
	if len(content.Cases) < atLeast {
		t.Fatalf("%s: only %d cases", file, len(content.Cases))
	}
	return content.Cases
}

func (c placementCase) list() []complex128 {
	var p []complex128
	for _, v := range c.Poles {
		p = append(p, complex(v[0], v[1]))
	}
	return p
}

func general(rows [][]float64) blas64.General {
	m := mat.NewDense(len(rows), len(rows[0]), nil)
	for i, r := range rows {
		m.SetRow(i, r)
	}
	return m.RawMatrix()
}

func zeros(n, p int) blas64.General {
	return mat.NewDense(n, p, nil).RawMatrix()
}

func wrap(g blas64.General) *mat.Dense {
	m := new(mat.Dense)
	m.SetRawMatrix(g)
	return m
}

// closed returns A − L C.
func closed(a, c, l blas64.General) *mat.Dense {
	var f mat.Dense
	f.Mul(wrap(l), wrap(c))
	f.Sub(wrap(a), &f)
	return &f
}

// poleError is max |λ − p| / max |p| over a one-to-one matching, nearest pairs
// first; absolute where every pole is 0.
func poleError(f *mat.Dense, poles []complex128) float64 {
	var eig mat.Eigen
	if !eig.Factorize(f, mat.EigenNone) {
		return math.NaN()
	}
	got := eig.Values(nil)
	usedGot, usedPole := make([]bool, len(got)), make([]bool, len(got))
	worst, size := 0.0, 0.0
	for _, p := range poles {
		size = math.Max(size, cmplx.Abs(p))
	}
	if size == 0 {
		size = 1
	}
	for range got {
		bi, bj, best := 0, 0, math.Inf(1)
		for i, v := range got {
			for j, p := range poles {
				if d := cmplx.Abs(v - p); !usedGot[i] && !usedPole[j] && d < best {
					bi, bj, best = i, j, d
				}
			}
		}
		usedGot[bi], usedPole[bj] = true, true
		worst = math.Max(worst, best)
	}
	return worst / size
}

// leftCondition is the 2-norm condition number of the unit left eigenvectors of f,
// from a general eigenvalue routine: an independent check for distinct poles.
func leftCondition(t testing.TB, f *mat.Dense) float64 {
	var eig mat.Eigen
	if !eig.Factorize(mat.DenseCopyOf(f.T()), mat.EigenRight) {
		t.Fatal("no eigenvectors")
	}
	var v mat.CDense
	eig.VectorsTo(&v)
	n, _ := v.Dims()
	x := mat.NewDense(2*n, 2*n, nil) // [Re −Im; Im Re] has the same singular values, twice
	for j := range n {
		norm := 0.0
		for i := range n {
			norm = math.Hypot(norm, cmplx.Abs(v.At(i, j)))
		}
		for i := range n {
			z := v.At(i, j) / complex(norm, 0)
			x.Set(i, j, real(z))
			x.Set(n+i, n+j, real(z))
			x.Set(i, n+j, -imag(z))
			x.Set(n+i, j, imag(z))
		}
	}
	return mat.Cond(x, 2)
}
