package logs_test

import (
	"context"
	"errors"
	"fmt"
	"math"
	"os"
	"strings"
	"testing"

	"polewright/estimator"
	"polewright/plants"
	"polewright/scenarios/logs"
)

const gate = `
format = 1
name = "gate"
[model]
time = "continuous"
period_s = 0.01
A = [[0, 1], [-4, -1]]
B = [[0], [1]]
C = [[1, 0], [0, 1], [1, 1]]
[operating_point]
states = [1.2, 0.5]
inputs = [4100]
sensors = [1.2, 0.5, 1.7]
[[states]]
name = "position"
unit = "m"
[[states]]
name = "speed"
[[inputs]]
name = "force"
delay_samples = 1
[[sensors]]
name = "encoder"
noise_std = 0.01
[[sensors]]
name = "tacho"
noise_std = 0.01
enabled = false
[[sensors]]
name = "gyro"
noise_std = 0.01
wrap = 6.0
[[outputs]]
name = "sum"
unit = "m"
row = [2, 1]
[process_noise]
density = [0, 1]
[[unknowns]]
kind = "input-offset"
on = "force"
drift = 1.0
`

func gateLayout(t testing.TB, o plants.Options) (*logs.Layout, *estimator.Model, error) {
	t.Helper()
	p, err := plants.Parse("gate.toml", []byte(gate))
	if err != nil {
		t.Fatal(err)
	}
	m, err := p.Model(o)
	if err != nil {
		t.Fatal(err)
	}
	l, err := logs.NewLayout(p, m)
	return l, m, err
}

func TestLayoutOfAPlant(t *testing.T) {
	l, m, err := gateLayout(t, plants.Options{})
	if err != nil {
		t.Fatal(err)
	}
	if l.Period != 0.01 || len(l.Sensors) != 2 || l.Sensors[1] != (logs.Signal{Name: "gyro", Operating: 1.7, Wrap: 6}) {
		t.Errorf("sensors %+v", l.Sensors)
	}
	if len(l.States) != len(m.StateNames) || len(l.States) < 4 || l.States[0] != (logs.Signal{Name: "position", Unit: "m", Operating: 1.2}) || l.States[3].Operating != 0 {
		t.Errorf("states %+v", l.States)
	}
	if len(l.Outputs) != 1 || math.Abs(l.Outputs[0].Operating-2.9) > 1e-15 {
		t.Errorf("outputs %+v", l.Outputs)
	}
	// The log has a disabled sensor and two references; at rest all is steady.
	var text strings.Builder
	text.WriteString("t,tacho,force,gyro,encoder,sum,position\n")
	for k := range 100 {
		fmt.Fprintf(&text, "%g,bad,4100,%g,1.2,3.0,1.1\n", float64(k)*0.01, []float64{1.7, -4.3}[k%2])
	}
	log := openText(t, l, text.String(), logs.Options{})
	n, _, p := m.Dims()
	r := replay(t, log, logs.Request{Model: m, Gain: logs.Gain{L: denseOf(n, p)}})
	if len(r.References) != 2 || r.References[0].Name != "sum" || math.Abs(float64(r.References[0].Bias)+0.1) > 1e-12 || math.Abs(float64(r.References[1].Bias)-0.1) > 1e-12 {
		t.Errorf("references %+v", r.References)
	}
	for _, in := range r.Innovations {
		if math.Abs(float64(in.Mean)) > 1e-12 || float64(in.Std) > 1e-12 {
			t.Errorf("innovation %+v at rest", in)
		}
	}
}

func TestLayoutNeedsAPeriod(t *testing.T) {
	p, err := plants.Parse("gate.toml", []byte(strings.ReplaceAll(gate, "delay_samples = 1", "")))
	if err != nil {
		t.Fatal(err)
	}
	none := 0.0
	m, err := p.Model(plants.Options{Period: &none})
	if err != nil {
		t.Fatal(err)
	}
	var bad *plants.Error
	if _, err = logs.NewLayout(p, m); !errors.As(err, &bad) || err.Error() != "log: the design has no sample period; expected period_s in the plant file, or --period" {
		t.Errorf("error %v", err)
	}
	if _, err = logs.NewLayout(p, tracker()); !errors.Is(err, estimator.ErrShape) {
		t.Errorf("error %v for the model of another plant", err)
	}
}

func TestFloorFamily(t *testing.T) {
	m := tracker()
	gains, used, err := logs.FloorFamily(context.Background(), m, []float64{0.01, 1, 100})
	if err != nil || len(gains) != 3 || len(used) != 3 {
		t.Fatalf("%d gains, %v", len(gains), err)
	}
	if !(gains[0].Settle > gains[1].Settle && gains[1].Settle > gains[2].Settle) {
		t.Errorf("settle times %g, %g, %g", gains[0].Settle, gains[1].Settle, gains[2].Settle)
	}
	if _, _, err := logs.FloorFamily(context.Background(), m, []float64{math.NaN()}); !errors.Is(err, estimator.ErrNoise) {
		t.Errorf("error %v", err)
	}
}

// The level of the Nile by a steady Kalman filter with the published variances.
func ExampleReplay() {
	p, err := plants.Parse("nile.toml", []byte(nilePlant))
	if err != nil {
		fmt.Println(err)
		return
	}
	model, err := p.Model(plants.Options{})
	if err != nil {
		fmt.Println(err)
		return
	}
	layout, err := logs.NewLayout(p, model)
	if err != nil {
		fmt.Println(err)
		return
	}
	file, err := os.Open("testdata/nile.csv")
	if err != nil {
		fmt.Println(err)
		return
	}
	defer file.Close()
	log, err := logs.Open(context.Background(), file, layout, logs.Options{
		File: "nile.csv", Names: map[string]string{"year": "t", "volume": "flow"},
	})
	if err != nil {
		fmt.Println(err)
		return
	}
	designer, err := estimator.NewDesigner(model, estimator.Options{})
	if err != nil {
		fmt.Println(err)
		return
	}
	floor, err := logs.FloorGain(model, designer.Analysis())
	if err != nil || floor == nil {
		fmt.Println("no floor", err)
		return
	}
	result, err := logs.Replay(context.Background(), log, logs.Request{
		Model: model, Gain: *floor, Floor: floor, Start: logs.Start{FirstSample: true},
	})
	if err != nil {
		fmt.Println(err)
		return
	}
	in, white := result.Innovations[0], result.Whiteness[0]
	fmt.Printf("%d years, std of the innovations %.0f, expected %.0f (%.0f to %.0f)\n", result.Samples, in.Std, in.StdExpected, in.StdLow, in.StdHigh)
	fmt.Printf("whiteness: Q = %.1f over %d lags, p = %.2f\n", white.Q, white.Lags, white.P)
	// Output:
	// 100 years, std of the innovations 140, expected 144 (123 to 164)
	// whiteness: Q = 18.7 over 20 lags, p = 0.54
}
