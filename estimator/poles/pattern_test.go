package poles_test

import (
	"encoding/json"
	"math"
	"math/cmplx"
	"os"
	"strings"
	"testing"

	"polewright/estimator/poles"
)

type poleSet struct {
	Name, Family, Normalisation string
	Order                       int
	Poles                       [][2]float64
	Tolerance                   float64
}

// readSets reads the files in testdata, which carry their sources.
func readSets(t *testing.T) (all []poleSet) {
	t.Helper()
	for _, name := range []string{"testdata/polesets.json", "testdata/bessel.json"} {
		text, err := os.ReadFile(name)
		if err != nil {
			t.Fatal(err)
		}
		var file struct{ Cases []poleSet }
		if err := json.Unmarshal(text, &file); err != nil {
			t.Fatal(err)
		}
		all = append(all, file.Cases...)
	}
	return all
}

func worst(t *testing.T, wanted, have []complex128) float64 {
	t.Helper()
	if len(wanted) != len(have) {
		t.Fatalf("%d poles, want %d", len(have), len(wanted))
	}
	var e float64
	for i, k := range poles.Match(wanted, have) {
		e = max(e, cmplx.Abs(wanted[i]-have[k])/cmplx.Abs(wanted[i]))
	}
	return e
}

func TestPatternsAgainstPublishedSets(t *testing.T) {
	var seen int
	var largest float64
	for _, c := range readSets(t) {
		var have []complex128
		switch {
		case c.Family == "butterworth":
			have = poles.ButterworthAt(c.Order, 1)
		case c.Family == "bessel" && strings.HasPrefix(c.Normalisation, "-3"):
			have = poles.BesselAt(c.Order, 1)
		case c.Family == "critically_damped":
			have = poles.EqualAt(c.Order, 1)
		default:
			continue
		}
		seen++
		wanted := make([]complex128, len(c.Poles))
		for i, p := range c.Poles {
			wanted[i] = complex(p[0], p[1])
		}
		e := worst(t, wanted, have)
		largest = max(largest, e)
		if e > c.Tolerance {
			t.Errorf("%s: relative error %.2g, want %.2g", c.Name, e, c.Tolerance)
		}
	}
	if seen < 22 {
		t.Errorf("only %d sets were compared", seen)
	}
	t.Logf("%d sets, largest relative error %.2g", seen, largest)
}

func TestPatternsHaveTheirBandwidth(t *testing.T) {
	const w = 37.5
	for n := 1; n <= 40; n++ {
		for name, list := range map[string][]complex128{"butterworth": poles.ButterworthAt(n, w), "bessel": poles.BesselAt(n, w)} {
			if len(list) != n || poles.ConjugateClosed(list) != nil {
				t.Fatalf("%s %d: %v", name, n, list)
			}
			power := 1.0
			for _, p := range list {
				if real(p) >= 0 {
					t.Errorf("%s %d: %v is not stable", name, n, p)
				}
				power *= math.Pow(cmplx.Abs(p)/cmplx.Abs(complex(0, w)-p), 2)
			}
			if math.Abs(power-0.5) > 1e-11 {
				t.Errorf("%s %d: power %.15g at the bandwidth, want 0.5", name, n, power)
			}
		}
	}
}

func TestPatternsOfNothing(t *testing.T) {
	for _, w := range []float64{0, -1, math.NaN(), math.Inf(1)} {
		if poles.ButterworthAt(3, w) != nil || poles.BesselAt(3, w) != nil || poles.EqualAt(3, w) != nil {
			t.Errorf("a pattern at %v exists", w)
		}
	}
	if poles.ButterworthAt(0, 1) != nil || poles.BesselAt(-1, 1) != nil || poles.EqualAt(0, 1) != nil {
		t.Error("a pattern without poles exists")
	}
}
