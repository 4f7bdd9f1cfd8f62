package placement_test

import (
	"encoding/json"
	"errors"
	"math"
	"os"
	"testing"

	"gonum.org/v1/gonum/blas/blas64"
	"gonum.org/v1/gonum/mat"
	"pgregory.net/rapid"

	"polewright/estimator/internal/placement"
	"polewright/estimator/internal/schur"
)

type riccatiCase struct {
	Name, Domain string
	A, C, W, R   [][]float64
	P            [][]float64
	PPred        [][]float64  `json:"P_pred"`
	Poles        [][2]float64 `json:"error_eigenvalues"`
}

// At the poles of the best linear estimator the least noise is that estimator's own:
// cases of testdata/riccati.json (70-digit arithmetic; sources inside) with several
// sensors.
func TestLeastNoiseReachesFloor(t *testing.T) {
	text, err := os.ReadFile("testdata/riccati.json")
	if err != nil {
		t.Fatal(err)
	}
	var file struct{ Cases []riccatiCase }
	if err := json.Unmarshal(text, &file); err != nil {
		t.Fatal(err)
	}
	var s placement.Solver
	seen := 0
	for _, c := range file.Cases {
		if len(c.C) < 2 {
			continue
		}
		seen++
		var poles []complex128
		for _, v := range c.Poles {
			poles = append(poles, complex(v[0], v[1]))
		}
		floor := c.P
		if c.Domain == "discrete" {
			floor = c.PPred
		}
		n := len(c.A)
		weights, want := make([]float64, n), 0.0
		for i := range weights {
			weights[i] = 1 / floor[i][i]
			want += 1
		}
		l := zeros(n, len(c.C))
		info, err := s.LeastNoise(l, general(c.A), general(c.C), general(c.W), general(c.R), weights, poles, c.Domain == "discrete", nil)
		if err != nil {
			t.Errorf("%s: %v", c.Name, err)
			continue
		}
		worst := 0.0
		p := covariance(t, general(c.A), general(c.C), general(c.W), general(c.R), l, c.Domain == "discrete")
		for i := range n {
			worst = math.Max(worst, math.Abs(p.At(i, i)/floor[i][i]-1))
		}
		t.Logf("%-28s cost over floor − 1 = %.1e, worst variance %.1e, %d steps, condition %.3g, poles %.1e", c.Name, info.Cost/want-1, worst,
			info.Iterations, info.Condition, poleError(closed(general(c.A), general(c.C), l), poles))
		if !(math.Abs(info.Cost/want-1) <= 1e-6) || !(worst <= 1e-6) {
			t.Errorf("%s: cost %g times the floor, variances off by %g", c.Name, info.Cost/want, worst)
		}
	}
	if seen < 7 {
		t.Errorf("only %d cases", seen)
	}
}

func covariance(t interface{ Fatal(...any) }, a, c, w, r, l blas64.General, discrete bool) *mat.Dense {
	var q, lr mat.Dense
	lr.Mul(wrap(l), wrap(r))
	q.Mul(&lr, wrap(l).T())
	q.Add(&q, wrap(w))
	n := a.Rows
	p := zeros(n, n)
	var form schur.Form
	if err := form.Factor(closed(a, c, l).RawMatrix()); err != nil {
		t.Fatal(err)
	}
	solve := form.Lyapunov
	if discrete {
		solve = form.Stein
	}
	if err := solve(p, q.RawMatrix()); err != nil {
		t.Fatal(err)
	}
	return wrap(p)
}

// Never noisier than the robust gain, at exactly the same poles, and the cost told is
// that of the gain returned.
func TestLeastNoiseAgainstRobust(t *testing.T) {
	var s placement.Solver
	rapid.Check(t, func(t *rapid.T) {
		n := rapid.IntRange(2, 6).Draw(t, "n")
		p := rapid.IntRange(1, n).Draw(t, "p")
		a, c := drawPlant(t, n, p)
		poles := drawPoles(t, n)
		w, r := zeros(n, n), zeros(p, p)
		for i := range n {
			w.Data[i*n+i] = rapid.Float64Range(0, 2).Draw(t, "w")
		}
		for i := range p {
			r.Data[i*p+i] = rapid.Float64Range(0.1, 2).Draw(t, "r")
		}
		weights := make([]float64, n)
		for i := range weights {
			weights[i] = rapid.Float64Range(0.1, 2).Draw(t, "weight")
		}
		robust, least := zeros(n, p), zeros(n, p)
		if _, err := s.Robust(robust, a, c, poles, nil); err != nil {
			t.Skip(err)
		}
		info, err := s.LeastNoise(least, a, c, w, r, weights, poles, false, nil)
		if err != nil {
			t.Fatal(err)
		}
		cost := func(l blas64.General) float64 {
			p, sum := covariance(t, a, c, w, r, l, false), 0.0
			for i, v := range weights {
				sum += v * p.At(i, i)
			}
			return sum
		}
		if got := cost(least); math.Abs(got-info.Cost) > 1e-9*got {
			t.Fatalf("cost %g, told %g", got, info.Cost)
		}
		if base := cost(robust); info.Cost > base*(1+1e-9) {
			t.Fatalf("least noise %g, robust %g", info.Cost, base)
		}
		f := closed(a, c, least)
		limit := math.Max(1e-8, 0x1p-45*mat.Norm(f, 2)*info.Condition)
		if miss := poleError(f, poles); !(miss <= limit) {
			t.Fatalf("poles off by %g, allowed %g", miss, limit)
		}
	})
}

func TestLeastNoiseBadInput(t *testing.T) {
	a := general([][]float64{{0, 1}, {-1, 0}})
	c := general([][]float64{{1, 0}})
	w, r := general([][]float64{{0, 0}, {0, 1}}), general([][]float64{{1}})
	one := []float64{1, 1}
	cases := []struct {
		name    string
		w, r    blas64.General
		weights []float64
		poles   []complex128
		want    error
	}{
		{"few weights", w, r, one[:1], []complex128{-1, -2}, placement.ErrShape},
		{"wrong R", w, w, one, []complex128{-1, -2}, placement.ErrShape},
		{"negative weight", w, r, []float64{1, -1}, []complex128{-1, -2}, placement.ErrNotFinite},
		{"NaN noise", general([][]float64{{0, 0}, {0, math.NaN()}}), r, one, []complex128{-1, -2}, placement.ErrNotFinite},
		{"unstable", w, r, one, []complex128{1, -2}, placement.ErrUnstable},
		{"on the limit", w, r, one, []complex128{1i, -1i}, placement.ErrUnstable},
		{"lone complex pole", w, r, one, []complex128{-1 + 1i, -1}, placement.ErrPairs},
	}
	var s placement.Solver
	for _, x := range cases {
		_, err := s.LeastNoise(zeros(2, 1), a, c, x.w, x.r, x.weights, x.poles, false, nil)
		if !errors.Is(err, x.want) {
			t.Errorf("%s: error %v, want %v", x.name, err, x.want)
		}
	}
	info, err := s.LeastNoise(zeros(2, 1), a, c, zeros(2, 2), r, make([]float64, 2), []complex128{-1, -2}, false, nil)
	if err != nil || info.Cost != 0 {
		t.Errorf("no weights: cost %g, error %v", info.Cost, err)
	}
}

// Repeated poles: never noisier than robust, nor than poles slightly apart, which are
// searched in another way.
func TestLeastNoiseOfRepeatedPoles(t *testing.T) {
	masses := general([][]float64{{0, 1, 0, 0}, {-2, -0.1, 1, 0.05}, {0, 0, 0, 1}, {1, 0.05, -2, -0.1}})
	both := general([][]float64{{1, 0, 0, 0}, {0, 0, 1, 0}})
	w, r := zeros(4, 4), general([][]float64{{0.02, 0}, {0, 0.05}})
	w.Data[5], w.Data[15] = 1, 0.3
	weights := []float64{1, 2, 1, 0.5}
	cases := []struct {
		name     string
		poles    []complex128
		discrete bool
		chain    int
	}{
		{"double", []complex128{-3, -3, -4, -5}, false, 2},
		{"all equal", []complex128{-3, -3, -3, -3}, false, 4},
		{"double pair", []complex128{-3 + 1i, -3 - 1i, -3 + 1i, -3 - 1i}, false, 2},
		{"discrete", []complex128{0.4, 0.4, 0.4, 0.1}, true, 3},
		{"deadbeat", []complex128{0, 0, 0, 0}, true, 4},
	}
	var s placement.Solver
	for _, c := range cases {
		robust, l := zeros(4, 2), zeros(4, 2)
		if _, err := s.Robust(robust, masses, both, c.poles, nil); err != nil {
			t.Fatal(err)
		}
		cost := func(l blas64.General) float64 {
			p, sum := covariance(t, masses, both, w, r, l, c.discrete), 0.0
			for i, v := range weights {
				sum += v * p.At(i, i)
			}
			return sum
		}
		var warm placement.Warm
		info, err := s.LeastNoise(l, masses, both, w, r, weights, c.poles, c.discrete, &warm)
		if err != nil {
			t.Errorf("%s: %v", c.name, err)
			continue
		}
		apart := append([]complex128(nil), c.poles...)
		for i := range apart {
			apart[i] -= complex(4e-3*float64(i/2), 0)
			if imag(apart[i]) == 0 {
				apart[i] -= complex(2e-3*float64(i%2), 0)
			}
		}
		limit, err := s.LeastNoise(zeros(4, 2), masses, both, w, r, weights, apart, c.discrete, nil)
		if err != nil { // poles this close to 0 and to each other are out of reach apart
			limit.Cost = cost(robust)
		}
		miss := poleError(closed(masses, both, l), c.poles)
		t.Logf("%-12s cost %.6g, robust %.6g, apart %.6g, poles %.1e, %d steps %v", c.name, info.Cost, cost(robust), limit.Cost, miss, info.Iterations, info.Converged)
		if info.Cost > cost(robust)*(1+1e-9) || math.Abs(cost(l)/info.Cost-1) > 1e-6 {
			t.Errorf("%s: cost %g, told %g, robust %g", c.name, cost(l), info.Cost, cost(robust))
		}
		if info.Cost > 1.01*limit.Cost {
			t.Errorf("%s: cost %g, of poles slightly apart %g", c.name, info.Cost, limit.Cost)
		}
		if allowed := 20 * math.Pow(0x1p-48, 1/float64(c.chain)); miss > allowed {
			t.Errorf("%s: poles off by %g, allowed %g", c.name, miss, allowed)
		}
		again, err := s.LeastNoise(l, masses, both, w, r, weights, c.poles, c.discrete, warm.Clone())
		if err != nil || again.Cost > info.Cost*(1+1e-6) {
			t.Errorf("%s, warm: cost %g after %g, %v", c.name, again.Cost, info.Cost, err)
		}
	}
}
