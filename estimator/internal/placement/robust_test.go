package placement_test

import (
	"testing"

	"polewright/estimator/internal/placement"
)

// Published multi-output cases of testdata/robust.json (sources inside): never worse
// than 1.05 times the best listed condition number.
func TestRobustReference(t *testing.T) {
	var s placement.Solver
	for _, c := range load(t, "robust.json", 16) {
		a, cm := general(c.A), general(c.C)
		l := zeros(len(c.A), len(c.C))
		info, err := s.Robust(l, a, cm, c.list(), nil)
		if err != nil {
			t.Errorf("%s: %v", c.Name, err)
			continue
		}
		f := closed(a, cm, l)
		cond := info.Condition
		if c.Multiplicity == 1 {
			cond = leftCondition(t, f)
		}
		miss := poleError(f, c.list())
		t.Logf("%-24s %9.3f ratio to best %.3f, to optimum %.4f, poles %.0e of %.0e, %d steps %v", c.Name, cond,
			cond/c.Best, cond/c.Optimum.Cond, miss, c.PoleTolerance, info.Iterations, info.Converged)
		if !(cond <= 1.05*c.Best) {
			t.Errorf("%s: condition %g, best listed %g", c.Name, cond, c.Best)
		}
		if !(miss <= c.PoleTolerance) {
			t.Errorf("%s: poles off by %g, allowed %g", c.Name, miss, c.PoleTolerance)
		}
	}
}
