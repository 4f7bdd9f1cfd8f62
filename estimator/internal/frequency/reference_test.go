package frequency_test

import (
	"encoding/json"
	"math"
	"os"
	"testing"

	"gonum.org/v1/gonum/blas/blas64"

	"polewright/estimator/internal/frequency"
)

type rows [][]float64

func (m rows) general() blas64.General {
	g := blas64.General{Rows: len(m), Cols: len(m[0]), Stride: len(m[0])}
	for _, r := range m {
		g.Data = append(g.Data, r...)
	}
	return g
}

func times(a, b rows) rows {
	c := make(rows, len(a))
	for i := range a {
		c[i] = make([]float64, len(b[0]))
		for l, v := range a[i] {
			for k, w := range b[l] {
				c[i][k] += v * w
			}
		}
	}
	return c
}

func minus(a, b rows) rows {
	c := make(rows, len(a))
	for i := range a {
		c[i] = make([]float64, len(a[i]))
		for k := range a[i] {
			c[i][k] = a[i][k] - b[i][k]
		}
	}
	return c
}

// readCases reads a file whose cases carry their sources.
func readCases(t *testing.T, name string, cases any) {
	t.Helper()
	text, err := os.ReadFile(name)
	if err != nil {
		t.Fatal(err)
	}
	if err := json.Unmarshal(text, cases); err != nil {
		t.Fatal(err)
	}
}

// estimatorLoop is K (sI − A + B K + L C)⁻¹ L C (sI − A)⁻¹ B.
func estimatorLoop(a, b, c, k, l rows, period float64) frequency.System {
	n := len(a)
	inner := minus(minus(a, times(l, c)), times(b, k))
	lc := times(l, c)
	sys := rows{}
	for i := range n {
		sys = append(sys, append(append([]float64{}, a[i]...), make([]float64, n)...))
	}
	for i := range n {
		sys = append(sys, append(append([]float64{}, lc[i]...), inner[i]...))
	}
	in := append(rows{}, b...)
	for range n {
		in = append(in, make([]float64, len(b[0])))
	}
	out := rows{}
	for i := range k {
		out = append(out, append(make([]float64, n), k[i]...))
	}
	return frequency.System{A: sys.general(), B: in.general(), C: out.general(), Period: period}
}

func closeTo(have, want, tol float64) bool {
	return have == want || math.Abs(have-want) <= tol*math.Abs(want)
}

func TestLoopsAgainstReference(t *testing.T) {
	var file struct {
		Cases []struct {
			Name, Domain  string
			A, B, C, K, L rows
			Up            *struct{ DB float64 } `json:"gain_margin_up"`
			Down          *struct{ DB float64 } `json:"gain_margin_down"`
			Phase         struct {
				Rad float64 `json:"phase_margin_rad"`
			} `json:"phase_margin"`
			Delay       float64 `json:"delay_margin"`
			Ms          float64
			MsFrequency *float64 `json:"Ms_frequency"`
			Tolerance   float64
		}
	}
	readCases(t, "testdata/loop.json", &file)
	var worst float64
	for _, c := range file.Cases {
		period := 0.0
		if c.Domain == "discrete" {
			period = 1 // the reference counts in samples
		}
		r, err := frequency.Margins(estimatorLoop(c.A, c.B, c.C, c.K, c.L, period))
		if err != nil {
			t.Errorf("%s: %v", c.Name, err)
			continue
		}
		up, down := math.Inf(1), math.Inf(-1)
		if c.Up != nil {
			up = c.Up.DB
		}
		if c.Down != nil {
			down = c.Down.DB
		}
		for _, f := range []struct {
			name       string
			have, want float64
		}{{"gain above", r.GainAboveDB, up}, {"gain below", r.GainBelowDB, down}, {"phase", r.PhaseDeg, c.Phase.Rad * 180 / math.Pi},
			{"delay", r.DelayS, c.Delay}, {"sensitivity", r.SensitivityPeak, c.Ms}} {
			if !closeTo(f.have, f.want, c.Tolerance) {
				t.Errorf("%s: %s %.12g, want %.12g", c.Name, f.name, f.have, f.want)
			} else if f.have != f.want {
				worst = max(worst, math.Abs(f.have/f.want-1))
			}
		}
		if c.MsFrequency != nil && !closeTo(r.SensitivityFrequency, *c.MsFrequency, 1e-4) {
			t.Errorf("%s: sensitivity peak at %v, want %v", c.Name, r.SensitivityFrequency, *c.MsFrequency)
		}
	}
	if len(file.Cases) < 12 {
		t.Errorf("only %d cases", len(file.Cases))
	}
	t.Logf("%d loops, largest relative error %.2g", len(file.Cases), worst)
}

type peakCase struct {
	State         int
	Hinf          float64
	PeakFrequency float64 `json:"peak_frequency"`
}

func TestPeaksAgainstReference(t *testing.T) {
	var file struct {
		Cases []struct {
			Name, Domain   string
			A, C, G, L     rows
			All            peakCase   `json:"all_noise_to_error"`
			Process        peakCase   `json:"process_noise_to_error"`
			Measurement    peakCase   `json:"measurement_noise_to_error"`
			ProcessOne     []peakCase `json:"process_noise_to_state"`
			MeasurementOne []peakCase `json:"measurement_noise_to_state"`
			Tolerance      float64
		}
	}
	readCases(t, "testdata/h2hinf.json", &file)
	var worst float64
	var count int
	for _, c := range file.Cases {
		n := len(c.A)
		f := minus(c.A, times(c.L, c.C))
		one := make(rows, n)
		gl, l := make(rows, n), make(rows, n)
		for i := range n {
			one[i] = make([]float64, n)
			one[i][i] = 1
			for _, v := range c.L[i] {
				l[i] = append(l[i], -v)
			}
			gl[i] = append(append([]float64{}, c.G[i]...), l[i]...)
		}
		period := 0.0
		if c.Domain == "discrete" {
			period = 1
		}
		check := func(in, out rows, want peakCase, what string) {
			v, w, err := frequency.PeakGain(frequency.System{A: f.general(), B: in.general(), C: out.general(), Period: period})
			if err != nil || !closeTo(v, want.Hinf, c.Tolerance) {
				t.Errorf("%s, %s: %.12g at %.6g, %v; want %.12g at %.6g", c.Name, what, v, w, err, want.Hinf, want.PeakFrequency)
				return
			}
			count++
			worst = max(worst, math.Abs(v/want.Hinf-1))
		}
		check(gl, one, c.All, "all noise")
		check(c.G, one, c.Process, "process noise")
		check(l, one, c.Measurement, "measurement noise")
		for _, w := range c.ProcessOne {
			check(c.G, one[w.State:w.State+1], w, "process noise to a state")
		}
		for _, w := range c.MeasurementOne {
			check(l, one[w.State:w.State+1], w, "measurement noise to a state")
		}
	}
	if len(file.Cases) < 12 {
		t.Errorf("only %d cases", len(file.Cases))
	}
	t.Logf("%d peaks, largest relative error %.2g", count, worst)
}
