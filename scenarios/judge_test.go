package scenarios

import (
	"bytes"
	"encoding/csv"
	"math"
	"strconv"
	"testing"

	"polewright/estimator"
)

func TestJudge(t *testing.T) {
	p := plantOf(t, cart)
	m := modelOf(t, p)
	s, err := Parse("cold.toml", []byte(contract), p)
	if err != nil {
		t.Fatal(err)
	}
	run := &Run{
		T:        []float64{0, 0.2, 0.4},
		True:     [][]float64{{9, 2, 3}, {0, 0, 0}},
		Estimate: [][]float64{{0, 0, 2.9921875}, {0, 0, 0}},
	}
	good := &estimator.Design{
		GainNorm: 5e3, Transient: estimator.Transient{Settle: 0.25, Peak: 8.5},
		Noise: estimator.Noise{Std: []float64{0.01, 1}, OverFloorRMS: math.NaN(), Outputs: []estimator.OutputNoise{{Std: 0.03}}},
		Loop:  &estimator.Loop{Stable: true, SensitivityPeak: 1.9, PhaseMargin: 29, DelayMargin: math.Inf(1), InputStd: []float64{59}},
	}
	nan := math.NaN()
	want := []LimitResult{
		{"settle_s", 0.25, 0.25, false, true, "s"},
		{"peak_max", 8.5, 8, false, false, ""},
		{"over_floor_max", nan, 3, false, false, ""},
		{"gain_max", 5e3, 5e3, false, true, ""},
		{"sensitivity_max", 1.9, 2, false, true, ""},
		{"phase_margin_deg", 29, 30, true, false, "deg"},
		{"delay_margin_s", math.Inf(1), 0.004, true, true, "s"},
		{"std place", 0.01, 0.03, false, true, "m"},
		{"std sum", 0.03, 0.02, false, false, ""},
		{"error place", 0.0078125, 0.01, false, true, "m"},
		{"input_std force", 59, 60, false, true, "N"},
	}
	compareLimits(t, "good", s.Judge(good, m, p, run), want)

	if have := s.Judge(good, m, p, nil); len(have) != len(want)-1 || have[9].Name != "input_std force" {
		t.Errorf("without a run: %v", have)
	}

	// An unstable design, and a loop that is not stable: no figure, nothing met
	// but the gain.
	for i := range want {
		if want[i].Name != "gain_max" {
			want[i].Value, want[i].Met = nan, false
		}
	}
	bad := &estimator.Design{GainNorm: 5e3, Transient: estimator.Transient{Settle: nan, Peak: nan}, Loop: &estimator.Loop{}}
	bad.Noise.OverFloorRMS = nan
	compareLimits(t, "unstable", s.Judge(bad, m, p, run), want)
	bad.Loop = nil
	compareLimits(t, "no loop", s.Judge(bad, m, p, run), want)

	for what, change := range map[string]func(*Run, *estimator.Design){
		"a diverged run":               func(r *Run, _ *estimator.Design) { r.Diverged = true },
		"a run that ends before":       func(_ *Run, d *estimator.Design) { d.Transient.Settle = 0.5 },
		"a state the real plant lacks": func(r *Run, _ *estimator.Design) { r.True = [][]float64{{nan, nan, nan}, {0, 0, 0}} },
	} {
		r, d := *run, *good
		change(&r, &d)
		if v := s.Judge(&d, m, p, &r)[9]; !math.IsNaN(v.Value) || v.Met {
			t.Errorf("%s: error %g met %v", what, v.Value, v.Met)
		}
	}
}

func compareLimits(t *testing.T, what string, have, want []LimitResult) {
	t.Helper()
	if len(have) != len(want) {
		t.Fatalf("%s: %d limits, want %d", what, len(have), len(want))
	}
	for i, h := range have {
		w := want[i]
		if math.IsNaN(h.Value) && math.IsNaN(w.Value) {
			h.Value, w.Value = 0, 0
		}
		if h != w {
			t.Errorf("%s: have %+v\nwant %+v", what, h, w)
		}
	}
}

func TestCSVReadsBackExactly(t *testing.T) {
	p := plantOf(t, cart)
	s := scenarioOf(t, p, "duration_s = 30")
	run := runOf(t, p, s, Gain{L: cartGain})
	run.Estimate[0][3] = math.NaN()
	run.EstimateNames = []string{`place, "left"`, "speed"}
	var out bytes.Buffer
	if err := WriteCSV(&out, run, p); err != nil {
		t.Fatal(err)
	}
	rows, err := csv.NewReader(&out).ReadAll()
	if err != nil {
		t.Fatal(err)
	}
	header := []string{"t", "true place", "true speed", `place, "left"`, "speed", "ruler innovation", "tacho innovation"}
	columns := [][]float64{run.T, run.True[0], run.True[1], run.Estimate[0], run.Estimate[1], run.Innovations[0], run.Innovations[1]}
	if len(rows) != len(run.T)+1 {
		t.Fatalf("%d rows", len(rows))
	}
	for j, name := range header {
		if rows[0][j] != name {
			t.Errorf("column %q, want %q", rows[0][j], name)
		}
		for k, want := range columns[j] {
			text := rows[k+1][j]
			if math.IsNaN(want) {
				if text != "" {
					t.Errorf("undefined value written as %q", text)
				}
				continue
			}
			if v, err := strconv.ParseFloat(text, 64); err != nil || v != want {
				t.Errorf("%s, row %d: %q, want %v", name, k, text, want)
			}
		}
	}
	if err := WriteCSV(&out, nil, p); err == nil {
		t.Error("no error for no run")
	}
}
