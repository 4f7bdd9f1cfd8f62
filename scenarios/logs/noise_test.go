package logs_test

import (
	"context"
	"errors"
	"math"
	"math/rand/v2"
	"testing"

	"gonum.org/v1/gonum/mat"

	"polewright/estimator"
	"polewright/plants"
	"polewright/scenarios/logs"
)

// TestNoiseFigures makes logs of a plant whose noise is not what the model says and
// counts how often the intervals hold the truth, at two gains. Of 40 runs, a level
// of 95 % gives 33 or more in all but one of 1000 tests (binomial).
func TestNoiseFigures(t *testing.T) {
	if testing.Short() {
		t.Skip("80 replays")
	}
	const runs, steps, factor = 40, 3000, 4.0
	truth, m := tracker(), tracker()
	truth.Q = mat.NewSymDense(2, nil)
	truth.Q.ScaleSym(factor, m.Q)
	truth.R = mat.NewSymDense(2, []float64{4e-4, 2e-5, 2e-5, 1e-4})
	l := layoutOf(m)
	want := []float64{factor, 4e-4, 1e-4}
	rng := rand.New(rand.NewPCG(21, 22))
	gains := []logs.Gain{{L: kalman(m, 1)}, {L: kalman(m, 30)}}
	hits, sums, fits := [2][3]int{}, [2][3]float64{}, [2]int{}
	for range runs {
		u, y, _ := simulate(truth, steps, rng)
		log := memoryOf(l, u, y)
		for k, g := range gains {
			f, err := replay(t, log, logs.Request{Model: m, Gain: g}).NoiseFigures()
			if err != nil {
				t.Fatal(err)
			}
			if !f.Apart {
				t.Errorf("process and sensor noise are not told apart: %+v", f)
			}
			for i, e := range append([]logs.Estimate{f.Process}, f.Sensors...) {
				hits[k][i] += inside(logs.Number(want[i]), e.Low, e.High)
				sums[k][i] += float64(e.Value) / want[i] / runs
			}
			fits[k] += inside(f.Fit, 0.01, 1)
		}
	}
	for k := range gains {
		for i := range want {
			if hits[k][i] < 33 || math.Abs(sums[k][i]-1) > 0.03 {
				t.Errorf("gain %d, figure %d: in its interval %d times of %d, mean %.3f of the truth", k, i, hits[k][i], runs, sums[k][i])
			}
		}
		if fits[k] < 36 {
			t.Errorf("gain %d: the fit is refused %d times", k, runs-fits[k])
		}
	}
	t.Logf("in their intervals %v of %d, means %.3f, fits %v", hits, runs, sums, fits)
}

// Where nothing moves the plant, its process noise cannot be told from the log.
func TestNoiseFiguresOfAStillPlant(t *testing.T) {
	m := &estimator.Model{
		Period: 1, A: dense([][]float64{{0.9}}), C: dense([][]float64{{1}}),
		Q: mat.NewSymDense(1, nil), R: mat.NewSymDense(1, []float64{1}),
	}
	rng := rand.New(rand.NewPCG(1, 2))
	y := make([][]float64, 2000)
	for k := range y {
		y[k] = []float64{3 * rng.NormFloat64()}
	}
	f, err := replay(t, memoryOf(layoutOf(m), nil, y), logs.Request{Model: m, Gain: logs.Gain{L: dense([][]float64{{0.1}})}}).NoiseFigures()
	if err != nil {
		t.Fatal(err)
	}
	if v := f.Sensors[0]; f.Apart || !math.IsNaN(float64(f.Process.Value)) || v.Low > 9 || v.High < 9 || v.High-v.Low > 2 {
		t.Errorf("%+v", f)
	}
	short := replay(t, memoryOf(layoutOf(m), nil, y[:40]), logs.Request{Model: m, Gain: logs.Gain{L: dense([][]float64{{0.1}})}})
	if _, err := short.NoiseFigures(); !errors.Is(err, logs.ErrTooFew) {
		t.Errorf("error %v", err)
	}
	unstable := replay(t, memoryOf(layoutOf(m), nil, y[:100]), logs.Request{Model: m, Gain: logs.Gain{L: dense([][]float64{{-0.5}})}})
	if _, err := unstable.NoiseFigures(); err == nil {
		t.Error("noise figures without a steady state")
	}
}

// The published variances of the Nile lie in the intervals, and in the middle of
// them rather than at their ends.
func TestNileNoiseFigures(t *testing.T) {
	log, _ := nile(t)
	p, err := plants.Parse("nile.toml", []byte(nilePlant))
	if err != nil {
		t.Fatal(err)
	}
	m, err := p.Model(plants.Options{})
	if err != nil {
		t.Fatal(err)
	}
	zero := 0.0
	f, err := replay(t, log, logs.Request{Model: m, Gain: logs.Gain{L: dense([][]float64{{0.267}})}, Skip: &zero, Start: logs.Start{FirstSample: true}}).NoiseFigures()
	if err != nil {
		t.Fatal(err)
	}
	t.Logf("factor on the published 1469.1: %+v; sensor variance beside the published 15099: %+v; fit %.2f, apart %v", f.Process, f.Sensors[0], f.Fit, f.Apart)
	if inside(1, f.Process.Low, f.Process.High) == 0 || inside(15099, f.Sensors[0].Low, f.Sensors[0].High) == 0 {
		t.Errorf("the published variances are outside %+v, %+v", f.Process, f.Sensors[0])
	}
}

func TestQuiet(t *testing.T) {
	l := &logs.Layout{Period: 0.01, Sensors: []logs.Signal{{Name: "a"}, {Name: "b", Wrap: 2 * math.Pi}}}
	rng := rand.New(rand.NewPCG(31, 32))
	hits, mean, shaken := 0, 0.0, 0.0
	const runs = 100
	for range runs {
		var y [][]float64
		for k := range 2000 {
			at := float64(k)
			// A ramp, a slow swing, three tenths of the log shaken, a spike.
			a := 5*at + math.Sin(0.01*at) + 0.2*rng.NormFloat64()
			if k > 1400 {
				a += math.Sin(2 * at)
			}
			if k == 407 {
				a += 100
			}
			y = append(y, []float64{a, math.Remainder(0.4*at+0.01*rng.NormFloat64(), 2*math.Pi)})
		}
		all, err := logs.Quiet(context.Background(), memoryOf(l, nil, y), math.Inf(-1), math.Inf(1))
		if err != nil {
			t.Fatal(err)
		}
		shaken += float64(all.Sensors[0].Value) / 0.04 / runs
		q, err := logs.Quiet(context.Background(), memoryOf(l, nil, y), math.Inf(-1), 14)
		if err != nil {
			t.Fatal(err)
		}
		e := q.Sensors[0]
		hits += inside(0.04, e.Low, e.High)
		mean += float64(q.Sensors[1].Value) / 1e-4 / runs
		if q.Samples != 1401 || q.From != 0 || q.To != 14 {
			t.Fatalf("%+v", q)
		}
	}
	t.Logf("in its interval %d times of %d; with the shaken part %.3f, wrapped sensor %.3f of the truth", hits, runs, shaken, mean)
	// The block with the spike shifts the median a little upwards.
	if hits < 90 {
		t.Errorf("in its interval %d times of %d", hits, runs)
	}
	if shaken > 1.2 {
		t.Errorf("with the shaken part %.3f of the truth", shaken)
	}
	if math.Abs(mean-1) > 0.02 {
		t.Errorf("wrapped sensor: mean %.3f of the truth", mean)
	}
}

// A long log joins its blocks; a short or broken one has no figure.
func TestQuietLengths(t *testing.T) {
	l := &logs.Layout{Period: 1, Sensors: []logs.Signal{{Name: "a"}}}
	rng := rand.New(rand.NewPCG(31, 32))
	y := make([][]float64, 150000)
	for k := range y {
		y[k] = []float64{2 * rng.NormFloat64()}
	}
	all := math.Inf(1)
	q, err := logs.Quiet(context.Background(), memoryOf(l, nil, y), -all, all)
	if err != nil {
		t.Fatal(err)
	}
	if e := q.Sensors[0]; e.Low > 4 || e.High < 4 || e.High-e.Low > 0.1 {
		t.Errorf("%+v", e)
	}
	for k := range y {
		if k%3 == 2 {
			y[k][0] = nan
		}
	}
	if q, err = logs.Quiet(context.Background(), memoryOf(l, nil, y[:1000]), -all, all); err != nil || !math.IsNaN(float64(q.Sensors[0].Value)) {
		t.Errorf("%+v %v", q, err)
	}
}

// TestSweep finds the least error of an exact model at the floor gain.
func TestSweep(t *testing.T) {
	m := tracker()
	l := layoutOf(m)
	u, y, _ := simulate(m, 20000, rand.New(rand.NewPCG(41, 42)))
	log := memoryOf(l, u, y)
	log.samples[3000].Y = []float64{nan, nan}
	factors := []float64{1e-4, 1e-2, 1, 1e2, 1e4}
	var gains []logs.Gain
	for _, f := range factors {
		gains = append(gains, logs.Gain{L: kalman(m, f), Settle: 0.5})
	}
	gains = append(gains, logs.Gain{L: dense([][]float64{{-5, 0}, {0, 0}, {0, -5}, {0, 0}})})
	points, err := logs.Sweep(context.Background(), log, logs.Request{Model: m}, gains)
	if err != nil {
		t.Fatal(err)
	}
	for k, p := range points[:5] {
		if k != 2 && !(p.Error > points[2].Error) || p.Counted != 18000-51 {
			t.Errorf("factor %g: %+v", factors[k], p)
		}
		r := replay(t, log, logs.Request{Model: m, Gain: gains[k]})
		for i, in := range r.Innovations {
			if want := math.Hypot(float64(in.Mean), float64(in.Std)); math.Abs(float64(p.RMS[i])/want-1) > 1e-12 {
				t.Errorf("factor %g, sensor %d: %g, the replay has %g", factors[k], i, p.RMS[i], want)
			}
		}
	}
	if p := points[5]; !math.IsNaN(float64(p.Error)) || !math.IsNaN(float64(p.RMS[0])) {
		t.Errorf("an unstable gain gives %+v", p)
	}
	if _, err := logs.Sweep(context.Background(), log, logs.Request{Model: m}, nil); err == nil {
		t.Error("a sweep of nothing")
	}
}
