package aim_test

import (
	"fmt"
	"math"
	"math/cmplx"
	"strings"
	"testing"

	"gonum.org/v1/gonum/mat"

	"polewright/estimator"
	"polewright/estimator/poles"
	"polewright/ui/aim"
	"polewright/ui/desk/desktest"
)

// tank is a two-mode plant, sampled where period is above 0, by hand: A is
// diagonal, so that sampling is the exponential of its entries.
func tank(t *testing.T, period float64) (*estimator.Model, *estimator.Designer) {
	t.Helper()
	m := &estimator.Model{
		A: mat.NewDense(2, 2, []float64{-1, 0, 0, -3}),
		C: mat.NewDense(1, 2, []float64{1, 1}),
		B: mat.NewDense(2, 1, []float64{1, 1}),
		K: mat.NewDense(1, 2, []float64{0, 2}),
		Q: mat.NewSymDense(2, []float64{1, 0, 0, 1}),
		R: mat.NewSymDense(1, []float64{0.1}),
	}
	if period > 0 {
		m.Period = period
		m.A = mat.NewDense(2, 2, []float64{math.Exp(-period), 0, 0, math.Exp(-3 * period)})
	}
	d, err := estimator.NewDesigner(m, estimator.Options{})
	if err != nil {
		t.Fatal(err)
	}
	return m, d
}

func own(t *testing.T, text, plane string, period float64) ([]complex128, error) {
	t.Helper()
	m, d := tank(t, period)
	spec, err := poles.Parse(text)
	if err != nil {
		t.Fatal(err)
	}
	return aim.Own(spec, plane, m, d)
}

func TestOwnPlane(t *testing.T) {
	z := func(s complex128) complex128 { return cmplx.Exp(s * 0.1) }
	for _, c := range []struct {
		text, plane string
		period      float64
		want        []complex128
	}{
		{"-2, -4", "s", 0, []complex128{-2, -4}},
		{"-2, -4", "s", 0.1, []complex128{z(-2), z(-4)}},
		{"0.5, 0.6", "z", 0.1, []complex128{0.5, 0.6}},
		{"10@0.6", "s", 0.1, []complex128{z(-6 + 8i), z(-6 - 8i)}},
		{"10@0.6", "z", 0.1, []complex128{z(-6 + 8i), z(-6 - 8i)}}, // frequency and damping belong to s
		{"equal@7", "z", 0.1, []complex128{z(-7), z(-7)}},
		{"butterworth@2", "s", 0, []complex128{complex(-math.Sqrt2, math.Sqrt2), complex(-math.Sqrt2, -math.Sqrt2)}},
		{"plant*2", "s", 0, []complex128{-2, -6}},
		{"plant*2", "s", 0.1, []complex128{z(-2), z(-6)}},
		{"controller*3", "s", 0, []complex128{-3, -15}}, // A − BK is triangular: −1, −3 − 2
	} {
		got, err := own(t, c.text, c.plane, c.period)
		if err != nil {
			t.Errorf("%s: %v", c.text, err)
			continue
		}
		if len(got) != len(c.want) {
			t.Fatalf("%s: got %v, expected %v", c.text, got, c.want)
		}
		for i, k := range poles.Match(c.want, got) {
			if cmplx.Abs(got[k]-c.want[i]) > 1e-12 {
				t.Errorf("%s in %s, period %g: got %v, expected %v", c.text, c.plane, c.period, got, c.want)
				break
			}
		}
	}
}

func TestRefusals(t *testing.T) {
	if _, err := own(t, "-2±40i", "s", 0.1); err == nil || !strings.Contains(err.Error(), "period") {
		t.Errorf("beyond the sampling limit: %v", err)
	}
	if _, err := own(t, "bessel@500", "s", 0.1); err == nil {
		t.Error("a pattern beyond the sampling limit was taken")
	}
	m, d := tank(t, 0)
	m.K = nil
	spec, err := poles.Parse("controller*2")
	if err != nil {
		t.Fatal(err)
	}
	if _, err := aim.Own(spec, "s", m, d); err == nil || !strings.Contains(err.Error(), "feedback") {
		t.Errorf("no controller: %v", err)
	}
}

// A prompt takes no list that is too short or too long; only delay registers may
// be left out.
func TestResolverCounts(t *testing.T) {
	m, _ := tank(t, 0.1)
	resolve := aim.Resolver(m)
	for text, want := range map[string]string{
		"0.5": "1 poles were given; expected 2", "0.5, 0.6, 0.7": "3 poles were given; expected 2", "0.5, 0.6": "", "equal@3": "",
	} {
		if _, err := resolve(text, "z", estimator.Prediction); fmt.Sprint(err) != want && (err != nil || want != "") {
			t.Errorf("%s: %v, expected %q", text, err, want)
		}
	}
	b := desktest.Bench(t, "gangway")
	d, err := estimator.NewDesigner(b.Model, estimator.Options{})
	if err != nil {
		t.Fatal(err)
	}
	movable, registers := d.Movable()
	if registers == 0 {
		t.Fatal("no delay registers: the test shows nothing")
	}
	resolve = aim.Resolver(b.Model)
	for k := 1; k <= movable+1; k++ {
		list := strings.TrimSuffix(strings.Repeat("0.5, ", k), ", ")
		_, err := resolve(list, "z", estimator.Prediction)
		if ok := k == movable || k == movable-registers; ok != (err == nil) {
			t.Errorf("%d poles of %d, %d delay registers: %v", k, movable, registers, err)
		} else if !ok && !strings.HasSuffix(err.Error(), "expected 11, or 5 without the delay registers") {
			t.Errorf("%d poles: %v", k, err)
		}
	}
}

func TestStartIsTheFloorWhereThereIsOne(t *testing.T) {
	m, d := tank(t, 0.1)
	got, err := aim.Start(m, d)
	if err != nil {
		t.Fatal(err)
	}
	floor := d.Analysis().Floor.Poles
	for i, k := range poles.Match(floor, got) {
		if cmplx.Abs(got[k]-floor[i]) > 1e-12 {
			t.Errorf("got %v, expected %v", got, floor)
		}
	}
	m.R = mat.NewSymDense(1, []float64{0}) // no floor in continuous time
	c, _ := tank(t, 0)
	c.R = m.R
	d, err = estimator.NewDesigner(c, estimator.Options{})
	if err != nil {
		t.Fatal(err)
	}
	if d.Analysis().Floor != nil {
		t.Fatal("a floor without sensor noise in continuous time")
	}
	got, err = aim.Start(c, d)
	if err != nil {
		t.Fatal(err)
	}
	for _, v := range got {
		if cmplx.Abs(v+6) > 1e-9 { // twice the fastest, −3
			t.Errorf("got %v, expected −6 twice", got)
		}
	}
}
