package scenarios

import (
	"math"
	"strings"
	"testing"

	"gonum.org/v1/gonum/mat"
)

func TestSaturationAndQuantisation(t *testing.T) {
	text := strings.Replace(cart, `name = "ruler"`, "name = \"ruler\"\nrange = [9.0, 10.3]\nresolution = 0.25", 1)
	text = strings.Replace(text, `name = "force"`, "name = \"force\"\nrange = [2.0, 4.1]\nresolution = 0.5", 1)
	p := plantOf(t, text)
	s := scenarioOf(t, p, `
duration_s = 2
loop = "open"
drive = [{ input = "force", shape = "step", at_s = 0.5, size = 0.7 }, { input = "force", shape = "step", at_s = 1.0, size = 5 }]
[initial]
true = [0.2, 0]
`+quiet)
	run := runOf(t, p, s, Gain{L: mat.NewDense(2, 2, nil)})
	// 10.2 is read as 10.25; from t = 0.6 on the cart leaves the ruler, whose end
	// 10.3 lies between two marks.
	near(t, "ruler at 0 s", run.Measured[0][0], 10.25, 0)
	near(t, "innovation at 0 s", run.Innovations[0][0], 0.25, 1e-15)
	near(t, "ruler at the end", run.Measured[0][20], 10.25, 0)
	near(t, "true place at the end", run.True[0][20], 10.2+place(20), 1e-12)
	for k, want := range map[int]float64{0: 3, 4: 3, 5: 3.5, 9: 3.5, 10: 4.1, 20: 4.1} {
		near(t, "force", run.Inputs[0][k], want, 1e-15)
	}
}

// place is where the cart gets with the force of the test above.
func place(k int) float64 {
	var x, v float64
	for i := range k {
		u := 0.0
		if i >= 10 {
			u = 1.1
		} else if i >= 5 {
			u = 0.5
		}
		x, v = x+0.1*v+0.05*u, 0.9*v+0.5*u
	}
	return x
}

// The noise of a quantised sensor is what its figure says: the steps are not
// counted twice.
func TestQuantisationNoiseIsNotCountedTwice(t *testing.T) {
	text := strings.Replace(cart, "noise_std = 0.01", "noise_std = 0.01\nresolution = 0.02\nnoise_includes_resolution = true", 1)
	p := plantOf(t, text)
	run := runOf(t, p, scenarioOf(t, p, "duration_s = 2000\nloop = \"closed\""), Gain{L: cartGain})
	var sum float64
	for k := range run.T {
		e := run.Measured[0][k] - run.True[0][k]
		sum += e * e
	}
	// 20 000 samples: five standard errors of a variance are 5 %.
	if have := math.Sqrt(sum / float64(len(run.T))); math.Abs(have/0.01-1) > 0.05 {
		t.Errorf("noise %g, want 0.01", have)
	}
}

func TestInnovationsAreTakenModuloWrap(t *testing.T) {
	p := plantOf(t, strings.Replace(cart, `name = "ruler"`, "name = \"ruler\"\nwrap = 6.283185307179586", 1))
	s := scenarioOf(t, p, "duration_s = 1\n[initial]\ntrue = [6.0, 0]\n"+quiet)
	run := runOf(t, p, s, Gain{L: mat.NewDense(2, 2, nil)})
	near(t, "innovation", run.Innovations[0][0], 6-2*math.Pi, 1e-14)
	near(t, "reading", run.Measured[0][0], 16, 1e-14)
}

func TestFaults(t *testing.T) {
	p := plantOf(t, cart)
	s := scenarioOf(t, p, `
duration_s = 6
loop = "open"
fault = [
  { sensor = "ruler", kind = "dropout", from_s = 1.0, until_s = 1.3 },
  { sensor = "ruler", kind = "freeze", from_s = 2.0, until_s = 2.5 },
  { sensor = "ruler", kind = "offset", from_s = 3.0, until_s = 3.2, size = 0.5 },
  { sensor = "tacho", kind = "spike", from_s = 4.0, until_s = 4.5, size = -2 },
  { sensor = "tacho", kind = "dropout", from_s = 5.5 },
]
[initial]
true = [0, 1]
`+quiet)
	run := runOf(t, p, s, Gain{L: cartGain})
	ruler, tacho := run.Measured[0], run.Measured[1]
	for k := range run.T {
		want, speed := run.True[0][k], run.True[1][k]
		switch {
		case k >= 10 && k < 13:
			if !math.IsNaN(ruler[k]) || run.Innovations[0][k] != 0 {
				t.Errorf("step %d: lost, but %g with innovation %g", k, ruler[k], run.Innovations[0][k])
			}
			continue
		case k >= 20 && k < 25:
			want = run.True[0][19]
		case k >= 30 && k < 32:
			want += 0.5
		}
		near(t, "ruler", ruler[k], want, 1e-12)
		near(t, "innovation", run.Innovations[0][k]+run.Estimate[0][k], ruler[k], 1e-12)
		switch {
		case k == 40:
			speed -= 2
		case k >= 55:
			if !math.IsNaN(tacho[k]) {
				t.Errorf("step %d: tacho %g", k, tacho[k])
			}
			continue
		}
		near(t, "tacho", tacho[k], speed, 1e-12)
	}
	// Predicted through: the lost ruler leaves x⁺ = A x + l₂ e₂.
	e := run.Innovations[1][11]
	near(t, "estimate after a lost sample", run.Estimate[0][12]-10, run.Estimate[0][11]-10+0.1*(run.Estimate[1][11]-1)+0.05*e, 1e-12)
}

func TestShapes(t *testing.T) {
	p := plantOf(t, cart)
	for _, c := range []struct {
		drive string
		want  map[float64]float64
	}{
		{`shape = "ramp", at_s = 1, until_s = 3, size = 2`, map[float64]float64{0.9: 0, 1: 0, 1.5: 1, 3: 4, 5: 4}},
		{`shape = "pulse", at_s = 1, until_s = 3, size = 2`, map[float64]float64{0.9: 0, 1: 2, 2.9: 2, 3: 0}},
		{`shape = "sine", at_s = 1, until_s = 3, size = 2, frequency_hz = 0.5`, map[float64]float64{0.5: 0, 1.5: 2, 2.5: -2, 3: 0, 3.5: 0}},
		// A sweep from 0.5 to 1.5 Hz over 4 s has the phase π t + π t²/4.
		{`shape = "chirp", at_s = 0, until_s = 4, size = 2, frequency_hz = 0.5, to_hz = 1.5`, map[float64]float64{0: 0, 2: 2 * math.Sin(3*math.Pi), 1: 2 * math.Sin(1.25*math.Pi), 4: 0}},
		{`shape = "step", at_s = 1, size = 2`, map[float64]float64{0.9: 0, 1: 2, 5: 2}},
	} {
		s := scenarioOf(t, p, "duration_s = 5\nloop = \"open\"\ndrive = [{ input = \"force\", "+c.drive+" }]\n"+quiet)
		run := runOf(t, p, s, Gain{L: cartGain})
		for at, want := range c.want {
			near(t, c.drive, run.Inputs[0][int(math.Round(at*10))]-3, want, 1e-12)
		}
	}
	s := scenarioOf(t, p, `
duration_s = 1000
loop = "open"
drive = [{ input = "force", shape = "random-binary", size = 2, frequency_hz = 2.5 }]`)
	run := runOf(t, p, s, Gain{L: cartGain})
	up, changes := 0, 0
	for k, u := range run.Inputs[0] {
		if math.Abs(math.Abs(u-3)-2) > 1e-12 {
			t.Fatalf("%g", u)
		}
		if u > 3 {
			up++
		}
		if k > 0 && u != run.Inputs[0][k-1] {
			if changes++; k%4 != 0 {
				t.Fatalf("a change at step %d", k)
			}
		}
	}
	// 2500 draws: five standard errors.
	if math.Abs(float64(up)/10001-0.5) > 0.05 || math.Abs(float64(changes)/2500-0.5) > 0.05 {
		t.Errorf("%d up of 10001, %d changes of 2500", up, changes)
	}
}
