package plants_test

import (
	"fmt"
	"math"
	"testing"

	"polewright/plants"
)

// TestSampleNoise is the table of what noise figures mean, by file and wish.
func TestSampleNoise(t *testing.T) {
	const step = 0.12 * 0.12 / 12 // variance of the quantisation
	for _, c := range []struct {
		name, time, sensor string
		period             float64
		quantised          bool
		want               float64
	}{
		{"density, no period", free, "noise_density = 0.4", 0, false, 0.4},
		{"density, no period, resolution", free, "noise_density = 0.4\nresolution = 0.12", 0, false, 0.4},
		{"density, period given", free, "noise_density = 0.4", 0.5, false, 0.8},
		{"density with period", stepped, "noise_density = 0.4", 0.5, false, 0.8},
		{"density with resolution", stepped, "noise_density = 0.4\nresolution = 0.12", 0.5, false, 0.8 + step},
		{"std", stepped, "noise_std = 0.2", 0.5, false, 0.04},
		{"std with resolution", stepped, "noise_std = 0.2\nresolution = 0.12", 0.5, false, 0.04 + step},
		{"std that includes it", stepped, "noise_std = 0.2\nresolution = 0.12\nnoise_includes_resolution = true", 0.5, false, 0.04},
		{"std, quantised afterwards", stepped, "noise_std = 0.2\nresolution = 0.12", 0.5, true, 0.04},
		{"std that includes it, quantised afterwards", stepped, "noise_std = 0.2\nresolution = 0.12\nnoise_includes_resolution = true", 0.5, true, 0.04 - step},
		{"never below zero", stepped, "noise_std = 0.01\nresolution = 0.12\nnoise_includes_resolution = true", 0.5, true, 0},
		{"std, period dropped", stepped, "noise_std = 0.2", 0, false, 0.02},
		{"std and resolution, period dropped", stepped, "noise_std = 0.2\nresolution = 0.12", 0, false, (0.04 + step) * 0.5},
		{"std, other period", stepped, "noise_std = 0.2", 0.1, false, 0.04},
		{"density, period dropped", stepped, "noise_density = 0.4", 0, false, 0.4},
		{"resolution alone", stepped, "resolution = 0.12", 0.5, false, step},
		{"nothing", stepped, "", 0.5, false, 0},
	} {
		t.Run(c.name, func(t *testing.T) {
			p := parse(t, "t.toml", tank(c.time, "", c.sensor, ""))
			if got := p.SampleNoise(c.period, c.quantised).At(0, 0); math.Abs(got-c.want) > 1e-15 {
				t.Errorf("got %g, want %g", got, c.want)
			}
		})
	}
}

// TestSensorCovariance replaces the sensors' own figures; the part of the sensors
// in use reaches the model.
func TestSensorCovariance(t *testing.T) {
	const text = `format = 1
[model]
time = "continuous"
period_s = 0.5
A = [[-1]]
C = [[1], [2]]
[[sensors]]
noise_std = 3.0
resolution = 1.0
[[sensors]]
[process_noise]
density = [1]
covariance = [[4]]
[sensor_noise]
covariance = [["4*1", 1], [1, 2]]
`
	p := parse(t, "t.toml", text)
	same(t, "R", model(t, p, plants.Options{}).R, [][]float64{{4, 1}, {1, 2}})
	same(t, "R", model(t, p, plants.Options{Sensors: []bool{false, true}}).R, [][]float64{{2}})
	m := model(t, p, plants.Options{Period: period(0)})
	same(t, "R without a period", m.R, [][]float64{{2, 0.5}, {0.5, 1}})
	same(t, "Q", m.Q, [][]float64{{4}})
}

// TestDiscreteStd squares the standard deviations per step.
func TestDiscreteStd(t *testing.T) {
	p := parse(t, "t.toml", "format = 1\n[model]\ntime = \"discrete\"\nperiod_s = 2\nA = [[0.5, 0], [0, 0.5]]\nC = [[1, 1]]\n[process_noise]\nstd = [0.5, 3]")
	m := model(t, p, plants.Options{})
	same(t, "Q", m.Q, [][]float64{{0.25, 0}, {0, 9}})
	if got := fmt.Sprint(m.Period, m.B == nil, m.K == nil); got != "2 true true" {
		t.Error(got)
	}
}

// TestArithmetic evaluates entries by way of A.
func TestArithmetic(t *testing.T) {
	for text, want := range map[string]float64{
		"-2^2": -4, "2^3^2": 512, "2**3": 8, "2^-1": 0.5, "1/4": 0.25, "7/2*2": 7, "-b": -3, "count*b": 15,
		"sqrt(4) + exp(0) - log(1) + abs(-2)": 5, "cos(pi) + sin(0) + tan(0)": -1, "1e3": 1000, "(b - 1)*(b + 1)": 8,
		"--1": 1, "((((((((((((((((((((b))))))))))))))))))))": 3,
	} {
		p := parse(t, "t.toml", "format = 1\n[parameters]\nb = { value = 3 }\ncount = { value = 5 }\n[model]\ntime = \"continuous\"\nA = [[\""+text+"\"]]\nC = [[1]]")
		if got := model(t, p, plants.Options{}).A.At(0, 0); math.Abs(got-want) > 1e-12 {
			t.Errorf("%s = %g, want %g", text, got, want)
		}
	}
}
