package scenarios

import (
	"context"
	"math"
	"testing"

	"gonum.org/v1/gonum/mat"

	"polewright/estimator"
	"polewright/plants"
)

// cart is a discrete plant with everything that a run treats in its own way but
// lags and delays.
const cart = `
format = 1
name = "Cart"
[parameters]
push = { value = 0.5, unit = "m/N" }
[model]
time = "discrete"
period_s = 0.1
A = [[1, 0.1], [0, 0.9]]
B = [["push*0.1"], ["push"]]
C = [[1, 0], [0, 1]]
[operating_point]
states = [10.0, 1.0]
inputs = [3.0]
sensors = [10.0, 1.0]
[[states]]
name = "place"
unit = "m"
scale = 0.5
[[states]]
name = "speed"
unit = "m/s"
[[inputs]]
name = "force"
unit = "N"
[[sensors]]
name = "ruler"
unit = "m"
noise_std = 0.01
[[sensors]]
name = "tacho"
unit = "m/s"
noise_std = 0.02
[[outputs]]
name = "sum"
row = [1.0, 1.0]
[process_noise]
std = [0.001, 0.01]
[feedback]
K = [[0.3, 0.4]]
`

var cartGain = mat.NewDense(2, 2, []float64{0.4, 0.05, 0.05, 0.3})

func plantOf(t testing.TB, text string) *plants.Plant {
	t.Helper()
	p, err := plants.Parse("cart.toml", []byte(text))
	if err != nil {
		t.Fatal(err)
	}
	return p
}

func modelOf(t testing.TB, p *plants.Plant) *estimator.Model {
	t.Helper()
	m, err := p.Model(plants.Options{})
	if err != nil {
		t.Fatal(err)
	}
	return m
}

func scenarioOf(t testing.TB, p *plants.Plant, text string) *Scenario {
	t.Helper()
	s, err := Parse("s.toml", []byte("format = 1\n"+text), p)
	if err != nil {
		t.Fatal(err)
	}
	return s
}

func runOf(t testing.TB, p *plants.Plant, s *Scenario, g Gain) *Run {
	t.Helper()
	r, err := NewRunner(p, modelOf(t, p), s, nil)
	if err != nil {
		t.Fatal(err)
	}
	run, err := r.Run(context.Background(), g)
	if err != nil {
		t.Fatal(err)
	}
	return run
}

func near(t *testing.T, what string, have, want, tolerance float64) {
	t.Helper()
	if !(math.Abs(have-want) <= tolerance) {
		t.Errorf("%s: %v, want %v", what, have, want)
	}
}
