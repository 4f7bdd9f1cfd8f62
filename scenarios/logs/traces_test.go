package logs_test

import (
	"encoding/json"
	"fmt"
	"math"
	"os"
	"testing"

	"gonum.org/v1/gonum/mat"

	"polewright/estimator"
	"polewright/scenarios/logs"
)

type traceStatistics struct {
	Skip, Samples int
	Channels      []struct {
		Mean            float64
		Variance        float64 `json:"variance_biased"`
		Autocorrelation []float64
		Q               float64 `json:"ljung_box_Q"`
		P               float64 `json:"p_value"`
	}
	NISMean   float64    `json:"nis_mean"`
	NISBounds [2]float64 `json:"nis_bounds_95"`
}

type traceForm struct {
	Predicted  [][]float64 `json:"xhat_pred"`
	Filtered   [][]float64 `json:"xhat_filt"`
	Innovation [][]float64
	Statistics traceStatistics
}

type traceCase struct {
	Name                 string
	A, B, C, D, L, Lf, S [][]float64
	Start                []float64 `json:"xhat0"`
	U, Y                 [][]float64
	Prediction           traceForm `json:"prediction_form"`
	Current              traceForm `json:"current_form"`
}

// Noise figures (process, sensor standard deviations) that the gains of the
// traces are the floor gains for. The gain of the last trace is for other figures
// than its S, so its NIS is not compared.
var traceNoise = map[string]struct {
	g      [][]float64
	sw, sv []float64
}{
	"double_integrator_kalman":      {[][]float64{{0.1 * 0.1 / 2}, {0.1}}, []float64{0.5}, []float64{0.2}},
	"oscillator_direct_feedthrough": {[][]float64{{0.00124}, {0.049}}, []float64{2}, []float64{0.05}},
	"two_outputs_three_states":      {nil, []float64{0.1, 0.2, 0.1}, []float64{0.3, 0.2}},
}

func TestTraces(t *testing.T) {
	data, err := os.ReadFile("testdata/traces.json")
	if err != nil {
		t.Fatal(err)
	}
	var file struct{ Cases []traceCase }
	if err := json.Unmarshal(data, &file); err != nil {
		t.Fatal(err)
	}
	if len(file.Cases) < 4 {
		t.Fatalf("%d cases", len(file.Cases))
	}
	for _, c := range file.Cases {
		for _, current := range []bool{false, true} {
			t.Run(fmt.Sprintf("%s/current=%v", c.Name, current), func(t *testing.T) { checkTrace(t, &c, current) })
		}
	}
}

func checkTrace(t *testing.T, c *traceCase, current bool) {
	n, p := len(c.A), len(c.C)
	m := &estimator.Model{
		Period: 1, A: dense(c.A), B: dense(c.B), C: dense(c.C), D: dense(c.D),
		Q: mat.NewSymDense(n, nil), R: mat.NewSymDense(p, nil),
	}
	noise, known := traceNoise[c.Name]
	if known {
		if noise.g != nil {
			m.G = dense(noise.g)
		}
		m.Q, m.R = squares(noise.sw), squares(noise.sv)
	}
	form, g := &c.Prediction, logs.Gain{L: dense(c.L)}
	estimates := form.Predicted
	if current {
		form, g.Lf = &c.Current, dense(c.Lf)
		estimates = form.Filtered
	}
	k := 0
	worst := func(have []float64, want []float64, all [][]float64) {
		t.Helper()
		for i := range want {
			size := 0.0
			for _, row := range all {
				size = math.Max(size, math.Abs(row[i]))
			}
			if d := math.Abs(have[i] - want[i]); !(d <= 1e-12*size) {
				t.Fatalf("step %d, signal %d: %.17g, want %.17g", k, i, have[i], want[i])
			}
		}
	}
	l := layoutOf(m)
	floor := g
	r := replay(t, memoryOf(l, c.U, c.Y), logs.Request{
		Model: m, Gain: g, Floor: &floor, Start: logs.Start{State: c.Start},
		Each: func(r *logs.Row) error {
			worst(r.Estimate, estimates[k], estimates)
			worst(r.Innovation, form.Innovation[k], form.Innovation)
			k++
			return nil
		},
	})
	s := &form.Statistics
	if k != len(c.Y) || r.Counted != int64(s.Samples) || s.Skip != len(c.Y)/10 {
		t.Fatalf("%d steps, %d counted, want %d", k, r.Counted, s.Samples)
	}
	near := func(what string, have logs.Number, want float64) {
		t.Helper()
		if d := math.Abs(float64(have) - want); !(d <= 1e-8*math.Max(1, math.Abs(want))) {
			t.Errorf("%s %.15g, want %.15g", what, have, want)
		}
	}
	for i, ch := range s.Channels {
		near("mean", r.Innovations[i].Mean, ch.Mean)
		near("std", r.Innovations[i].Std, math.Sqrt(ch.Variance))
		for j, v := range ch.Autocorrelation {
			near(fmt.Sprint("lag ", j+1), r.Innovations[i].Autocorrelation[j], v)
		}
		near("Q", r.Whiteness[i].Q, ch.Q)
		near("p", r.Whiteness[i].P, ch.P)
		if known {
			near("expected std", r.Innovations[i].StdExpected, math.Sqrt(c.S[i][i]))
		}
	}
	if known {
		near("NIS", r.NISMean, s.NISMean)
		near("NIS low", r.NISLow, s.NISBounds[0])
		near("NIS high", r.NISHigh, s.NISBounds[1])
	}
}

func squares(std []float64) *mat.SymDense {
	q := mat.NewSymDense(len(std), nil)
	for i, s := range std {
		q.SetSym(i, i, s*s)
	}
	return q
}
