package scenarios

import (
	"context"
	"errors"
	"math"
	"strings"
	"testing"

	"gonum.org/v1/gonum/mat"

	"polewright/estimator"
	"polewright/plants"
)

// shaft is a continuous plant with a lag and a delay on both of its ends.
const shaft = `
format = 1
name = "Shaft"
[parameters]
inertia = { value = 2.0 }
[model]
time = "continuous"
period_s = 0.01
A = [[0, 1], [-25, "-1/inertia"]]
B = [[0], ["1/inertia"]]
C = [[1, 0]]
[operating_point]
states = [1.0, 0.0]
inputs = [50.0]
sensors = [1.0]
[[states]]
name = "angle"
[[states]]
name = "rate"
[[inputs]]
name = "torque"
delay_samples = 3
lag_s = 0.02
[[sensors]]
name = "encoder"
noise_std = 0.001
delay_samples = 2
lag_s = 0.03
[process_noise]
density = [1e-6, 1e-4]
[[unknowns]]
kind = "input-offset"
on = "torque"
drift = 10.0
`

// stableGain is some gain that makes A − L C stable, by some steps of the
// Kalman recursion.
func stableGain(t *testing.T, m *estimator.Model) *mat.Dense {
	t.Helper()
	n, _, p := m.Dims()
	q := mat.NewDense(n, n, nil)
	q.Mul(m.Q, m.G.T())
	q.Mul(m.G, q)
	cov := mat.DenseCopyOf(q)
	var l mat.Dense
	for range 2000 {
		var pc, s, inv, apc, next mat.Dense
		pc.Mul(cov, m.C.T())
		s.Mul(m.C, &pc)
		s.Add(&s, m.R)
		if err := inv.Inverse(&s); err != nil {
			t.Fatal(err)
		}
		apc.Mul(m.A, &pc)
		l.Reset()
		l.Mul(&apc, &inv)
		next.Mul(m.A, cov)
		cov.Mul(&next, m.A.T())
		next.Mul(&l, apc.T())
		cov.Sub(cov, &next)
		cov.Add(cov, q)
		next.Copy(cov.T()) // an unstable plant lets the skew part grow
		cov.Add(cov, &next)
		cov.Scale(0.5, cov)
	}
	if rows, cols := l.Dims(); rows != n || cols != p {
		t.Fatal("shape")
	}
	return &l
}

func TestNominalPlantIsPredictedWithoutError(t *testing.T) {
	p := plantOf(t, shaft)
	l := stableGain(t, modelOf(t, p))
	s := scenarioOf(t, p, `
duration_s = 3
drive = [{ input = "torque", shape = "pulse", at_s = 0.1, until_s = 1, size = 20 }]
`+quiet)
	run := runOf(t, p, s, Gain{L: l})
	moved := 0.0
	for k := range run.T {
		near(t, "innovation", run.Innovations[0][k], 0, 1e-12)
		moved = math.Max(moved, math.Abs(run.True[0][k]-1))
	}
	if moved < 0.1 {
		t.Errorf("the shaft moved by %g only", moved)
	}
	// The command needs three samples of delay and one step.
	near(t, "rate at 0.13 s", run.True[1][13], 0, 0)
	if run.True[1][14] <= 0 {
		t.Error("no movement at 0.14 s")
	}
	if e := run.EstimateNames; e[2] != "torque lag" {
		t.Fatalf("states %v", e)
	}
	near(t, "lag of the torque, absolute", run.Estimate[2][0], 50, 0)
}

// A surprise acts where the input enters the plant, at once, and an unknown
// offset finds it.
func TestSurpriseActsBehindLagAndDelay(t *testing.T) {
	p := plantOf(t, shaft)
	l := stableGain(t, modelOf(t, p))
	s := scenarioOf(t, p, `
duration_s = 100
surprise = [{ input = "torque", shape = "step", at_s = 0.5, size = 8 }]
`+quiet)
	run := runOf(t, p, s, Gain{L: l})
	if run.True[1][50] != 0 || run.True[1][51] <= 0 {
		t.Errorf("rates around 0.5 s: %g, %g", run.True[1][50], run.True[1][51])
	}
	offset := -1
	for i, name := range run.EstimateNames {
		if name == "torque offset" {
			offset = i
		}
	}
	last := len(run.T) - 1
	near(t, "offset found", run.Estimate[offset][last], 8, 1e-6)
	near(t, "angle at rest", run.True[0][last], 1+8/2.0/25, 1e-5)
	near(t, "angle estimate", run.Estimate[0][last], run.True[0][last], 1e-6)
}

func TestTruthFactorMovesTheRealPlant(t *testing.T) {
	p := plantOf(t, shaft)
	l := stableGain(t, modelOf(t, p))
	s := scenarioOf(t, p, `
duration_s = 100
drive = [{ input = "torque", shape = "step", size = 10 }]
truth = { inertia = 2.0 }
`+quiet)
	run := runOf(t, p, s, Gain{L: l})
	last := len(run.T) - 1
	near(t, "angle at rest", run.True[0][last], 1+10/4.0/25, 1e-5)
}

// A fuller plant with its own operating point and more states.
func TestFullerPlant(t *testing.T) {
	p := plantOf(t, shaft)
	l := stableGain(t, modelOf(t, p))
	fuller := strings.Replace(shaft, `A = [[0, 1], [-25, "-1/inertia"]]`, `A = [[0, 1, 0], [-25, "-1/inertia", 0], [0, 0, -4]]`, 1)
	fuller = strings.Replace(fuller, `B = [[0], ["1/inertia"]]`, `B = [[0], ["1/inertia"], [4]]`, 1)
	fuller = strings.Replace(fuller, "C = [[1, 0]]", "C = [[1, 0, 0]]", 1)
	fuller = strings.Replace(fuller, "states = [1.0, 0.0]\ninputs = [50.0]\nsensors = [1.0]", "states = [0.0, 0.0, 7.0]\ninputs = [0.0]\nsensors = [0.0]", 1)
	fuller = strings.Replace(fuller, `name = "rate"`, "name = \"rate\"\n[[states]]\nname = \"heat\"", 1)
	fuller = strings.Replace(fuller, "density = [1e-6, 1e-4]", "density = [0, 0, 0]", 1)
	full := plantOf(t, fuller)
	s := scenarioOf(t, p, "duration_s = 100\ntruth = { plant = \"full.toml\" }\ninitial = { true = [1, 0, 0] }\n"+quiet)
	if s.TruthPlant != "full.toml" {
		t.Fatalf("plant %q", s.TruthPlant)
	}
	m := modelOf(t, p)
	if _, err := NewRunner(p, m, s, nil); err == nil || !strings.Contains(err.Error(), `"full.toml" was not read`) {
		t.Errorf("error %v", err)
	}
	r, err := NewRunner(p, m, s, full)
	if err != nil {
		t.Fatal(err)
	}
	run, err := r.Run(context.Background(), Gain{L: l})
	if err != nil {
		t.Fatal(err)
	}
	// 50 N m hold the full shaft at 50/2/25 = 1 rad.
	last := len(run.T) - 1
	near(t, "torque", run.Inputs[0][0], 50, 0)
	near(t, "angle at rest", run.True[0][last], 1, 1e-6)
	near(t, "heat at rest", run.Others[0][last], 7+50, 1e-6)
	if len(run.OtherNames) != 1 || run.OtherNames[0] != "heat" {
		t.Errorf("others %v", run.OtherNames)
	}
	for _, c := range []struct{ text, want string }{
		{strings.ReplaceAll(fuller, `"encoder"`, `"coder"`), `s.toml: truth, plant: no sensor "encoder"; expected the sensors of the plant by the same names`},
		{strings.ReplaceAll(fuller, `"torque"`, `"twist"`), `s.toml: truth, plant: no input "torque"; expected the inputs of the plant by the same names`},
	} {
		_, err := NewRunner(p, m, s, plantOf(t, c.text))
		if err == nil || err.Error() != c.want {
			t.Errorf("have %v\nwant %s", err, c.want)
		}
		if _, ok := errors.AsType[*plants.Error](err); !ok {
			t.Errorf("%T", err)
		}
	}
	short := *s
	short.InitialTrue = []float64{1, 0}
	if _, err := NewRunner(p, m, &short, full); err == nil || err.Error() != "s.toml: initial, true: 2 entries; expected one per state of the real plant: 3" {
		t.Error(err)
	}
}
