package readings_test

import (
	"math"
	"testing"

	"polewright/ui/readings"
	"polewright/ui/theme"
)

func TestFigure(t *testing.T) {
	g := &theme.New(theme.Options{}).Glyphs
	for _, c := range []struct {
		v, ref float64
		want   string
	}{
		{0.25, 0.3, "0.250"}, {12.5, 0.3, "12.500"}, {0.25, 300, "2.50e-01"}, {7.2, 300, "7"}, {0, 300, "0"}, {-0.0123, 0.01, "-0.0123"},
		{3e7, 1, "3.00e+07"}, {1e-9, 1, "1.00e-09"}, {math.NaN(), 1, "–"}, {math.Inf(1), 1, "unlimited"}, {1.5, math.NaN(), "1.500"}, {1.5, 0, "1.500"}, {1000, 1000, "1000"},
	} {
		if got := readings.Figure(c.v, c.ref, g); got != c.want {
			t.Errorf("%g at %g: %q, expected %q", c.v, c.ref, got, c.want)
		}
	}
}

func TestPlace(t *testing.T) {
	g := &theme.New(theme.Options{}).Glyphs
	for _, c := range []struct {
		p    complex128
		pair bool
		want string
	}{
		{-4 + 3i, true, "-4.00 ± 3.00i"}, {-6, false, "-6.00"}, {complex(-2, 31.4), false, "-2.00 + 31.40i"},
		{complex(math.Copysign(0, -1), 3), true, "0.00 ± 3.00i"},
	} {
		if got := readings.Place(c.p, c.pair, 5, g); got != c.want {
			t.Errorf("%v: %q, expected %q", c.p, got, c.want)
		}
	}
}
