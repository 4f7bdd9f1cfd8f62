package scenarios

import (
	"context"
	"errors"
	"math"
	"reflect"
	"slices"
	"strings"
	"testing"

	"gonum.org/v1/gonum/mat"

	"polewright/estimator"
)

const quiet = "[noise]\nprocess = 0\nsensor = 0\n"

// The run against the plain recursion with matrices, absolute values included.
func TestRunIsThePlainRecursion(t *testing.T) {
	p := plantOf(t, cart)
	m := modelOf(t, p)
	lf := mat.NewDense(2, 2, nil)
	if err := lf.Solve(m.A, cartGain); err != nil {
		t.Fatal(err)
	}
	for _, loop := range []string{"open", "closed"} {
		for _, form := range []estimator.Form{estimator.Prediction, estimator.Current} {
			s := scenarioOf(t, p, `
duration_s = 5
loop = "`+loop+`"
initial = { true = [0.5, -1], estimate = [0.1, 0.2] }
drive = [{ input = "force", shape = "step", at_s = 1, size = 2 }]
surprise = [{ input = "force", shape = "pulse", at_s = 2, until_s = 3, size = -1 }]
truth = { push = 1.2 }
`+quiet)
			run := runOf(t, p, s, Gain{cartGain, lf, form})
			if len(run.T) != 51 || run.T[50] != 5 {
				t.Fatalf("%d samples to %g s", len(run.T), run.T[len(run.T)-1])
			}
			x, est := []float64{0.5, -1}, []float64{0.1, 0.2}
			k := []float64{0.3, 0.4}
			const op0, op1, opu = 10, 1, 3
			for i := range run.T {
				d, surprise := 0.0, 0.0
				if i >= 10 {
					d = 2
				}
				if i >= 20 && i < 30 {
					surprise = -1
				}
				e0, e1 := x[0]-est[0], x[1]-est[1]
				shown := slices.Clone(est)
				if form == estimator.Current {
					shown[0] += lf.At(0, 0)*e0 + lf.At(0, 1)*e1
					shown[1] += lf.At(1, 0)*e0 + lf.At(1, 1)*e1
				}
				u := d
				if loop == "closed" {
					u -= k[0]*shown[0] + k[1]*shown[1]
				}
				for _, c := range []struct {
					what       string
					have, want float64
				}{
					{"true place", run.True[0][i], op0 + x[0]}, {"true speed", run.True[1][i], op1 + x[1]},
					{"place", run.Estimate[0][i], op0 + shown[0]}, {"speed", run.Estimate[1][i], op1 + shown[1]},
					{"ruler innovation", run.Innovations[0][i], e0}, {"tacho innovation", run.Innovations[1][i], e1},
					{"force", run.Inputs[0][i], opu + u}, {"ruler", run.Measured[0][i], op0 + x[0]},
				} {
					if math.Abs(c.have-c.want) > 1e-12*100 {
						t.Fatalf("%s loop, form %d, step %d: %s %v, want %v", loop, form, i, c.what, c.have, c.want)
					}
				}
				next := []float64{shown[0] + 0.1*shown[1] + 0.05*u, 0.9*shown[1] + 0.5*u}
				if form == estimator.Prediction {
					next[0] += cartGain.At(0, 0)*e0 + cartGain.At(0, 1)*e1
					next[1] += cartGain.At(1, 0)*e0 + cartGain.At(1, 1)*e1
				}
				est = next
				w := 1.2 * (u + surprise)
				x = []float64{x[0] + 0.1*x[1] + 0.05*w, 0.9*x[1] + 0.5*w}
			}
		}
	}
}

func TestSameSeedSameBits(t *testing.T) {
	p := plantOf(t, cart)
	s := scenarioOf(t, p, "duration_s = 100\nnoise = { seed = 5 }")
	g := Gain{L: cartGain}
	r, err := NewRunner(p, modelOf(t, p), s, nil)
	if err != nil {
		t.Fatal(err)
	}
	ctx := context.Background()
	first, err := r.Run(ctx, g)
	if err != nil {
		t.Fatal(err)
	}
	if again := runOf(t, p, s, g); !reflect.DeepEqual(first.Estimate, again.Estimate) {
		t.Error("another runner gives other values")
	}
	other := mat.DenseCopyOf(cartGain)
	other.Scale(0.5, other)
	if _, err := r.Run(ctx, Gain{L: other}); err != nil {
		t.Fatal(err)
	}
	if again, _ := r.Run(ctx, g); !reflect.DeepEqual(first.Estimate, again.Estimate) {
		t.Error("the same runner gives other values after another gain")
	}
	r.Reseed(6)
	if again, _ := r.Run(ctx, g); reflect.DeepEqual(first.Estimate, again.Estimate) {
		t.Error("another seed gives the same values")
	}
	r.Reseed(5)
	if again, _ := r.Run(ctx, g); !reflect.DeepEqual(first.Estimate, again.Estimate) {
		t.Error("the first seed gives other values")
	}
}

// Forcing that is too large to keep is drawn anew: the same values.
func TestForcingIsTheSameKeptOrNot(t *testing.T) {
	p := plantOf(t, cart)
	s := scenarioOf(t, p, `
duration_s = 100
surprise = [{ input = "force", shape = "random-binary", size = 0.5, frequency_hz = 1.3 }, { input = "force", shape = "chirp", size = 1, frequency_hz = 0.1, to_hz = 2 }]
`)
	kept, err := NewRunner(p, modelOf(t, p), s, nil)
	if err != nil {
		t.Fatal(err)
	}
	drawn, err := NewRunner(p, modelOf(t, p), s, nil)
	if err != nil {
		t.Fatal(err)
	}
	if !kept.forcing.keep {
		t.Fatal("not kept")
	}
	drawn.forcing.keep = false
	ctx := context.Background()
	a, _ := kept.Run(ctx, Gain{L: cartGain})
	for range 2 {
		b, err := drawn.Run(ctx, Gain{L: cartGain})
		if err != nil || !reflect.DeepEqual(a.True, b.True) || !reflect.DeepEqual(a.Measured, b.Measured) {
			t.Fatalf("other values (%v)", err)
		}
	}
}

// Turning one source off leaves the others as they are.
func TestSourcesAreSeparate(t *testing.T) {
	p := plantOf(t, cart)
	g := Gain{L: cartGain}
	full := runOf(t, p, scenarioOf(t, p, `duration_s = 20`+"\nloop = \"open\""), g)
	process := runOf(t, p, scenarioOf(t, p, `duration_s = 20`+"\nloop = \"open\"\nnoise = { sensor = 0 }"), g)
	if !reflect.DeepEqual(full.True, process.True) {
		t.Error("the sensors' noise changes the process noise")
	}
	one := plantOf(t, strings.Replace(cart, "noise_std = 0.01", "noise_std = 0.01\nenabled = false", 1))
	alone := runOf(t, one, scenarioOf(t, one, `duration_s = 20`+"\nloop = \"open\""), Gain{L: mat.NewDense(2, 1, []float64{0.05, 0.3})})
	if !reflect.DeepEqual(full.Measured[1], alone.Measured[0]) {
		t.Error("unplugging the ruler changes the noise of the tacho")
	}
}

// The errors of a long run have the covariance that the Lyapunov equation gives.
func TestNoiseHasTheCovarianceOfTheModel(t *testing.T) {
	p := plantOf(t, cart)
	m := modelOf(t, p)
	s := scenarioOf(t, p, "duration_s = 20000\nnoise = { seed = 3 }")
	run := runOf(t, p, s, Gain{L: cartGain})
	var f, want, step mat.Dense
	f.Mul(cartGain, m.C)
	f.Sub(m.A, &f)
	var lr, noise mat.Dense
	lr.Mul(cartGain, m.R)
	noise.Mul(&lr, cartGain.T())
	noise.Add(&noise, m.Q) // G is the identity
	want.CloneFrom(&noise)
	for range 500 {
		step.Mul(&f, &want)
		want.Mul(&step, f.T())
		want.Add(&want, &noise)
	}
	for i := range 2 {
		var sum float64
		for k := 200; k < len(run.T); k++ {
			e := run.True[i][k] - run.Estimate[i][k]
			sum += e * e
		}
		// 200 000 samples, correlated over about ten: 5 % is above five
		// standard errors.
		if have := sum / float64(len(run.T)-200); math.Abs(have/want.At(i, i)-1) > 0.05 {
			t.Errorf("state %d: variance %g, want %g", i+1, have, want.At(i, i))
		}
	}
}

func TestDivergedRunKeepsItsFinitePart(t *testing.T) {
	p := plantOf(t, cart)
	s := scenarioOf(t, p, "duration_s = 100\n"+quiet+"[initial]\ntrue = [1, 0]")
	wild := mat.NewDense(2, 2, []float64{9, 0, 0, 9})
	run := runOf(t, p, s, Gain{L: wild})
	if !run.Diverged || len(run.T) == 0 || len(run.T) > 100 {
		t.Fatalf("diverged %v after %d samples", run.Diverged, len(run.T))
	}
	for _, group := range [][][]float64{run.True, run.Estimate, run.Innovations, run.Inputs, run.Measured} {
		for _, list := range group {
			if len(list) != len(run.T) || !finite(list) {
				t.Error("lists of another length or with infinite values")
			}
		}
	}
	last := len(run.T) - 1
	if math.Abs(run.Estimate[1][last]) > 1e12+1 {
		t.Errorf("%g in the run", run.Estimate[1][last])
	}
}

func TestRunStopsWithItsContext(t *testing.T) {
	p := plantOf(t, cart)
	r, err := NewRunner(p, modelOf(t, p), scenarioOf(t, p, "duration_s = 1"), nil)
	if err != nil {
		t.Fatal(err)
	}
	ctx, cancel := context.WithCancel(context.Background())
	cancel()
	if _, err := r.Run(ctx, Gain{L: cartGain}); !errors.Is(err, context.Canceled) {
		t.Errorf("error %v", err)
	}
}

func TestRunRefusesGainsThatDoNotFit(t *testing.T) {
	p := plantOf(t, cart)
	r, err := NewRunner(p, modelOf(t, p), scenarioOf(t, p, "duration_s = 1"), nil)
	if err != nil {
		t.Fatal(err)
	}
	for _, c := range []struct {
		g    Gain
		want error
	}{
		{Gain{}, estimator.ErrShape},
		{Gain{L: mat.NewDense(2, 1, nil)}, estimator.ErrShape},
		{Gain{L: cartGain, Form: estimator.Current}, estimator.ErrShape},
		{Gain{L: mat.NewDense(2, 2, []float64{math.NaN(), 0, 0, 0})}, estimator.ErrNotFinite},
		{Gain{L: cartGain, Form: 9}, estimator.ErrMethod},
	} {
		if _, err := r.Run(context.Background(), c.g); !errors.Is(err, c.want) {
			t.Errorf("error %v, want %v", err, c.want)
		}
	}
}

func TestPlantWithoutInputs(t *testing.T) {
	for _, model := range []string{"time = \"discrete\"\nperiod_s = 0.1\nA = [[0.9]]", "time = \"continuous\"\nA = [[-1]]"} {
		p := plantOf(t, "format = 1\n[model]\n"+model+"\nC = [[1]]\n")
		s := scenarioOf(t, p, "duration_s = 3\ninitial = { true = [2] }\n[[fault]]\nsensor = \"y1\"\nkind = \"dropout\"\nfrom_s = 1")
		run := runOf(t, p, s, Gain{L: mat.NewDense(1, 1, []float64{0.5})})
		last := len(run.T) - 1
		if run.Diverged || len(run.Inputs) != 0 || !(math.Abs(run.Estimate[0][last]-run.True[0][last]) < 0.2) {
			t.Errorf("%s: true %g, estimate %g", model, run.True[0][last], run.Estimate[0][last])
		}
	}
}

func TestRunnerRefuses(t *testing.T) {
	p := plantOf(t, cart)
	m := modelOf(t, p)
	s := scenarioOf(t, p, "duration_s = 1")
	if _, err := NewRunner(p, m, nil, nil); err == nil {
		t.Error("no scenario")
	}
	other := plantOf(t, strings.ReplaceAll(cart, "tacho", "gauge"))
	if _, err := NewRunner(other, m, s, nil); err == nil || !strings.Contains(err.Error(), `no sensor "tacho"`) {
		t.Errorf("another plant's model: %v", err)
	}
	long := *s
	long.Duration = 1e12
	if _, err := NewRunner(p, m, &long, nil); err == nil || err.Error() != "s.toml: duration_s: 1e+12 s in steps of 0.1 s; expected at most 2000000 steps" {
		t.Errorf("too long: %v", err)
	}
	open := *m
	open.K = nil
	if _, err := NewRunner(p, &open, s, nil); err == nil {
		t.Error("a closed loop without a controller")
	}
	if _, err := Parse("s.toml", nil, nil); err == nil {
		t.Error("no plant")
	}
}
