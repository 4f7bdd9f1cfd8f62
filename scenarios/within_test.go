package scenarios_test

import (
	"math"
	"testing"

	"polewright/scenarios"
)

func TestWithin(t *testing.T) {
	period := 0.01
	for _, c := range []struct {
		value, limit float64
		atLeast      bool
		want         bool
	}{
		{35 * period, 0.35, false, true}, // 0.35000000000000003
		{36 * period, 0.35, false, false},
		{0.35 * (1 + 1e-9), 0.35, false, false},
		{29.999999999999996, 30, true, true},
		{29.9, 30, true, false},
		{math.NaN(), 1, false, false},
		{math.NaN(), 1, true, false},
		{math.Inf(1), 1, false, false},
		{math.Inf(1), 1, true, true},
		{0, 0, false, true},
	} {
		if got := scenarios.Within(c.value, c.limit, c.atLeast); got != c.want {
			t.Errorf("%g against %g (at least: %v): %v", c.value, c.limit, c.atLeast, got)
		}
	}
}
