package placement_test

import (
	"math"
	"strings"
	"testing"

	"gonum.org/v1/gonum/mat"

	"polewright/estimator/internal/placement"
)

// Unique gains of testdata/gains.json (70-digit arithmetic; sources inside).
func TestSingleGains(t *testing.T) {
	var s placement.Solver
	for _, c := range load(t, "gains.json", 28) {
		a, cm := general(c.A), general(c.C)
		l := zeros(len(c.A), 1)
		if err := s.Single(l, a, cm, c.list()); err != nil {
			t.Errorf("%s: %v", c.Name, err)
			continue
		}
		var d mat.Dense
		d.Sub(wrap(l), wrap(general(c.L)))
		miss := mat.Norm(&d, 2)
		if !strings.HasPrefix(c.ToleranceKind, "absolute") {
			miss /= mat.Norm(wrap(general(c.L)), 2)
		}
		t.Logf("%-32s %.1e of %.0e", c.Name, miss, c.Tolerance)
		if !(miss <= c.Tolerance) {
			t.Errorf("%s: gain off by %g, allowed %g", c.Name, miss, c.Tolerance)
		}
	}
}

// Hard one-sensor cases of testdata/placement_hard.json. The eigenvalues are those
// of a double-precision solver, so what such a solver makes of the exact gain counts
// ten times as well.
func TestSingleHard(t *testing.T) {
	var s placement.Solver
	for _, c := range load(t, "placement_hard.json", 10) {
		a, cm := general(c.A), general(c.C)
		l := zeros(len(c.A), 1)
		if err := s.Single(l, a, cm, c.list()); err != nil {
			t.Errorf("%s: %v", c.Name, err)
			continue
		}
		limit := math.Max(c.Tolerance, 10*c.Methods["exact_gain_rounded_to_double"].Seen)
		got := poleError(closed(a, cm, l), c.list())
		t.Logf("%-32s %.1e of %.1e", c.Name, got, limit)
		if !(got <= limit) {
			t.Errorf("%s: poles off by %g, allowed %g", c.Name, got, limit)
		}
	}
}

// For a chain of integrators the gain is the characteristic polynomial itself, so it
// is held to the file's tolerance on the coefficients, relative to the largest one: a
// norm-wise stable method promises no more for the small ones.
func TestSingleIntegratorsCoefficients(t *testing.T) {
	var s placement.Solver
	for _, c := range load(t, "placement_hard.json", 10) {
		if !strings.HasPrefix(c.Name, "integrators") {
			continue
		}
		l := zeros(len(c.A), 1)
		if err := s.Single(l, general(c.A), general(c.C), c.list()); err != nil {
			t.Fatal(err)
		}
		worst, entrywise, size := 0.0, 0.0, 0.0
		for i, want := range c.Exact {
			size = math.Max(size, math.Abs(want[0]))
			worst = math.Max(worst, math.Abs(l.Data[i]-want[0]))
			entrywise = math.Max(entrywise, math.Abs(l.Data[i]-want[0])/math.Abs(want[0]))
		}
		worst /= size
		t.Logf("%-32s %.1e of %.0e, worst single coefficient %.1e", c.Name, worst, c.CharTolerance, entrywise)
		if !(worst <= c.CharTolerance) {
			t.Errorf("%s: coefficients off by %g, allowed %g", c.Name, worst, c.CharTolerance)
		}
	}
}
