package logs_test

import (
	"math"
	"math/rand/v2"
	"testing"

	"gonum.org/v1/gonum/mat"

	"polewright/scenarios/logs"
)

// TestLevels runs an exact model 300 times and counts how often each stated 95 %
// band holds the figure it is for. With 300 runs a true level of 95 % gives at
// least 90.7 % and at most 98.7 % in all but one of 1000 tests of one figure
// (binomial, ± 3.3 standard deviations of 1.26 %).
func TestLevels(t *testing.T) {
	if testing.Short() {
		t.Skip("900 replays")
	}
	const runs, steps = 300, 2000
	m := tracker()
	l := layoutOf(m)
	floor := logs.Gain{L: kalman(m, 1)}
	gains := []struct {
		name string
		gain logs.Gain
	}{
		{"floor", floor},
		{"fast", logs.Gain{L: kalman(m, 1000)}},
		{"slow", logs.Gain{L: kalman(m, 0.01)}},
	}
	// A filter that is not the floor's must be told apart from it.
	for _, g := range gains[1:] {
		var d mat.Dense
		d.Sub(g.gain.L, floor.L)
		if mat.Norm(&d, 2) < 0.3*mat.Norm(floor.L, 2) {
			t.Fatalf("the %s gain is close to the floor's", g.name)
		}
	}
	type tally struct {
		mean, std, nis, white int
		correlation           [20]int
	}
	tallies := make([]tally, len(gains))
	rng := rand.New(rand.NewPCG(11, 7))
	for range runs {
		u, y, _ := simulate(m, steps, rng)
		log := memoryOf(l, u, y)
		for k, g := range gains {
			q := logs.Request{Model: m, Gain: g.gain}
			if k == 0 {
				q.Floor = &floor
			}
			r, c := replay(t, log, q), &tallies[k]
			in := &r.Innovations[0]
			c.mean += inside(in.Mean, in.MeanLow, in.MeanHigh)
			c.std += inside(in.Std, in.StdLow, in.StdHigh)
			c.nis += inside(r.NISMean, r.NISLow, r.NISHigh)
			for j := range c.correlation {
				c.correlation[j] += inside(in.Autocorrelation[j], in.AutocorrelationLow[j], in.AutocorrelationHigh[j])
			}
			if k == 0 {
				c.white += inside(r.Whiteness[0].P, 0.05, 1)
			}
		}
	}
	for k, g := range gains {
		c := &tallies[k]
		level := func(what string, count int) {
			t.Helper()
			if p := float64(count) / runs; math.Abs(p-0.95) > 3.3*math.Sqrt(0.95*0.05/runs) {
				t.Errorf("%s gain: %s is in its band in %.1f %% of the runs", g.name, what, 100*p)
			}
		}
		level("the mean", c.mean)
		level("the standard deviation", c.std)
		level("the NIS", c.nis)
		all := 0
		for j, n := range c.correlation {
			all += n
			if j == 0 || j == 4 || j == 19 {
				level("the autocorrelation", n)
			}
		}
		if k == 0 {
			level("whiteness", c.white)
		}
		t.Logf("%s: mean %d, std %d, NIS %d, white %d of %d; all lags %.1f %%", g.name, c.mean, c.std, c.nis, c.white, runs, float64(all)/runs/20*100)
	}
}

func inside(v, low, high logs.Number) int {
	if low <= v && v <= high {
		return 1
	}
	return 0
}

// TestUnits: figures without a unit do not depend on the units of the sensors.
func TestUnits(t *testing.T) {
	m, scaled := tracker(), tracker()
	factors := []float64{1e9, 1e-7}
	scaled.R = mat.NewSymDense(2, nil)
	g := kalman(m, 20)
	other := mat.DenseCopyOf(g)
	for i, f := range factors {
		for j := range 4 {
			scaled.C.Set(i, j, m.C.At(i, j)*f)
			other.Set(j, i, g.At(j, i)/f)
		}
		for j := range i + 1 {
			scaled.R.SetSym(i, j, m.R.At(i, j)*f*factors[j])
		}
	}
	u, y, _ := simulate(m, 1500, rand.New(rand.NewPCG(81, 82)))
	a := replay(t, memoryOf(layoutOf(m), u, y), logs.Request{Model: m, Gain: logs.Gain{L: g}})
	for k := range y {
		y[k] = []float64{y[k][0] * factors[0], y[k][1] * factors[1]}
	}
	b := replay(t, memoryOf(layoutOf(m), u, y), logs.Request{Model: scaled, Gain: logs.Gain{L: other}})
	near := func(what string, x, y logs.Number, tolerance float64) {
		t.Helper()
		if !(math.Abs(float64(x-y)) <= tolerance*math.Abs(float64(y))) {
			t.Errorf("%s: %g and %g", what, x, y)
		}
	}
	near("NIS", a.NISMean, b.NISMean, 1e-9)
	near("NIS low", a.NISLow, b.NISLow, 1e-9)
	near("NIS high", a.NISHigh, b.NISHigh, 1e-9)
	fa, errA := a.NoiseFigures()
	fb, errB := b.NoiseFigures()
	if errA != nil || errB != nil {
		t.Fatal(errA, errB)
	}
	near("factor", fa.Process.Value, fb.Process.Value, 1e-5)
	near("factor, high", fa.Process.High, fb.Process.High, 1e-5)
	for i, f := range factors {
		near("std", a.Innovations[i].Std*logs.Number(f), b.Innovations[i].Std, 1e-9)
		near("lag 3", a.Innovations[i].AutocorrelationExpected[2], b.Innovations[i].AutocorrelationExpected[2], 1e-9)
		near("lag 3, low", a.Innovations[i].AutocorrelationLow[2], b.Innovations[i].AutocorrelationLow[2], 1e-9)
		near("variance", fa.Sensors[i].Value*logs.Number(f*f), fb.Sensors[i].Value, 1e-5)
	}
}
