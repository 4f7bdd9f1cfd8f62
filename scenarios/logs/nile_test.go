package logs_test

import (
	"bytes"
	"context"
	"math"
	"os"
	"testing"

	"gonum.org/v1/gonum/mat"

	"polewright/plants"
	"polewright/scenarios/logs"
)

// The local level model of Durbin & Koopman, "Time Series Analysis by State Space
// Methods", section 2: variances 15099 of the observations and 1469.1 of the level,
// figures from memory. One row per year, time counted in years.
const nilePlant = `
format = 1
name = "Level of the Nile at Aswan"
[model]
time = "discrete"
period_s = 1.0
A = [[1]]
C = [[1]]
[operating_point]
states = [1120]
sensors = [1120]
[[states]]
name = "level"
[[sensors]]
name = "flow"
noise_std = 122.87798826478244 # sqrt(15099)
[process_noise]
std = [38.328840317953]        # sqrt(1469.1)
`

func nile(t testing.TB) (*logs.Log, *logs.Layout) {
	t.Helper()
	p, err := plants.Parse("nile.toml", []byte(nilePlant))
	if err != nil {
		t.Fatal(err)
	}
	m, err := p.Model(plants.Options{})
	if err != nil {
		t.Fatal(err)
	}
	l, err := logs.NewLayout(p, m)
	if err != nil {
		t.Fatal(err)
	}
	data, err := os.ReadFile("testdata/nile.csv")
	if err != nil {
		t.Fatal(err)
	}
	log, err := logs.Open(context.Background(), bytes.NewReader(data), l, logs.Options{
		File: "nile.csv", Names: map[string]string{"year": "t", "volume": "flow"},
	})
	if err != nil {
		t.Fatal(err)
	}
	return log, l
}

func TestNile(t *testing.T) {
	log, l := nile(t)
	p, _ := plants.Parse("nile.toml", []byte(nilePlant))
	m, err := p.Model(plants.Options{})
	if err != nil {
		t.Fatal(err)
	}
	// Random walk plus noise: P = P² / (P + R) taken off and W added gives
	// P = (W + √(W² + 4 W R)) / 2.
	const r, w = 15099.0, 1469.1
	prediction := (w + math.Sqrt(w*w+4*w*r)) / 2
	gain := prediction / (prediction + r)
	// Durbin & Koopman, figure 2.1: the filtered variance settles at 4032.2 and
	// the variance of the innovation at 20600 (their table of the filter; from
	// memory).
	if filtered := prediction * (1 - gain); math.Abs(filtered-4032.16) > 0.05 {
		t.Errorf("filtered variance %.2f, published 4032.16", filtered)
	}
	l1 := mat.NewDense(1, 1, []float64{gain})
	g := logs.Gain{L: l1}
	zero := 0.0
	res, err := logs.Replay(context.Background(), log, logs.Request{Model: m, Gain: g, Floor: &g, Skip: &zero, Start: logs.Start{FirstSample: true}})
	if err != nil {
		t.Fatal(err)
	}
	in := res.Innovations[0]
	if want := math.Sqrt(prediction + r); math.Abs(float64(in.StdExpected)/want-1) > 1e-7 {
		t.Errorf("expected std %g, want %g", in.StdExpected, want)
	}
	if res.Samples != 100 || res.Counted != 100 || l.Period != 1 {
		t.Errorf("%d samples, %d counted", res.Samples, res.Counted)
	}
	if in.Std < in.StdLow || in.Std > in.StdHigh {
		t.Errorf("std %g outside %g..%g", in.Std, in.StdLow, in.StdHigh)
	}
	if res.NISMean < res.NISLow || res.NISMean > res.NISHigh {
		t.Errorf("NIS %g outside %g..%g", res.NISMean, res.NISLow, res.NISHigh)
	}
	if p := res.Whiteness[0].P; p < 0.05 {
		t.Errorf("whiteness rejected with p = %g", p)
	}
	// The same recursion and Ljung & Box's Q in NumPy 1.24 and SciPy 1.10.
	for _, c := range []struct {
		what       string
		have, want float64
	}{
		{"mean", float64(in.Mean), -12.043890695730516},
		{"std", float64(in.Std), 142.3035729635856},
		{"NIS", float64(res.NISMean), 0.9900537284001962},
		{"Q", float64(res.Whiteness[0].Q), 15.74237202605315},
		{"p", float64(res.Whiteness[0].P), 0.7324729243093868},
	} {
		if math.Abs(c.have/c.want-1) > 1e-7 {
			t.Errorf("%s %.12g, want %.12g", c.what, c.have, c.want)
		}
	}
	t.Logf("innovations: mean %.4g (%.4g..%.4g), std %.4g, expected %.4g (%.4g..%.4g)", in.Mean, in.MeanLow, in.MeanHigh, in.Std, in.StdExpected, in.StdLow, in.StdHigh)
	t.Logf("whiteness: Q %.4g, p %.4g, effect %.3g; NIS %.4g (%.4g..%.4g)", res.Whiteness[0].Q, res.Whiteness[0].P, res.Whiteness[0].EffectSize, res.NISMean, res.NISLow, res.NISHigh)
}
