package plants_test

import (
	"fmt"
	"math"
	"testing"

	"gonum.org/v1/gonum/mat"

	"polewright/plants"
)

// tank is x' = −2x + 3u, y = 5x + 7u, with room for what hangs on u and y.
func tank(time, input, sensor, rest string) string {
	return fmt.Sprintf(`format = 1
[model]
time = %s
A = [[-2]]
B = [[3]]
C = [[5]]
D = [[7]]
[process_noise]
covariance = [[11]]
[[inputs]]
name = "u"
scale = 2.0
%s
[[sensors]]
name = "y"
scale = 4.0
%s
%s
`, time, input, sensor, rest)
}

const (
	free    = `"continuous"`
	stepped = "\"discrete\"\nperiod_s = 0.5"
)

func TestLags(t *testing.T) {
	m := model(t, parse(t, "t.toml", tank(free, "lag_s = 0.1", "lag_s = 0.2", "")), plants.Options{})
	// x' = −2x + 3v, v' = 10(u − v), s' = 5(5x + 7v − s), y = s
	same(t, "A", m.A, [][]float64{{-2, 3, 0}, {0, -10, 0}, {25, 35, -5}})
	same(t, "B", m.B, [][]float64{{0}, {10}, {0}})
	same(t, "C", m.C, [][]float64{{0, 0, 1}})
	same(t, "D", m.D, [][]float64{{0}})
	same(t, "G", m.G, [][]float64{{1}, {0}, {0}})
	if got := fmt.Sprint(m.StateNames, m.StateScale, m.Roles); got != "[x1 u lag y lag] [1 2 4] [0 1 1]" {
		t.Error(got)
	}
	// Discrete: v⁺ = e v + (1 − e) u with the signal held over the sample.
	m = model(t, parse(t, "t.toml", tank(stepped, "lag_s = 0.25", "lag_s = 0.5", "")), plants.Options{})
	e, f := math.Exp(-2), math.Exp(-1)
	same(t, "A", m.A, [][]float64{{-2, 3, 0}, {0, e, 0}, {5 * (1 - f), 7 * (1 - f), f}})
	same(t, "B", m.B, [][]float64{{0}, {1 - e}, {0}})
	same(t, "C", m.C, [][]float64{{0, 0, 1}})
}

func TestDelays(t *testing.T) {
	m := model(t, parse(t, "t.toml", tank(stepped, "delay_samples = 2", "delay_samples = 1", "")), plants.Options{})
	// x⁺ = −2x + 3r2, r1⁺ = u, r2⁺ = r1, s⁺ = 5x + 7r2, y = s
	same(t, "A", m.A, [][]float64{{-2, 0, 3, 0}, {0, 0, 0, 0}, {0, 1, 0, 0}, {5, 0, 7, 0}})
	same(t, "B", m.B, [][]float64{{0}, {1}, {0}, {0}})
	same(t, "C", m.C, [][]float64{{0, 0, 0, 1}})
	same(t, "D", m.D, [][]float64{{0}})
	same(t, "G", m.G, [][]float64{{1}, {0}, {0}, {0}})
	same(t, "Q", m.Q, [][]float64{{11}})
	if got := fmt.Sprint(m.StateNames, m.StateScale, m.Roles); got != "[x1 u delay 1 u delay 2 y delay 1] [1 2 2 4] [0 2 2 2]" {
		t.Error(got)
	}
	// Without an input's delay, D goes into the sensor's register.
	m = model(t, parse(t, "t.toml", tank(stepped, "", "delay_samples = 1", "")), plants.Options{})
	same(t, "A", m.A, [][]float64{{-2, 0}, {5, 0}})
	same(t, "B", m.B, [][]float64{{3}, {7}})
	same(t, "C", m.C, [][]float64{{0, 1}})
	same(t, "D", m.D, [][]float64{{0}})
}

func TestUnknowns(t *testing.T) {
	const offset = "[[unknowns]]\nkind = \"input-offset\"\non = \"u\"\ndrift = 0.3\nscale = 6.0\n"
	const bias = "[[unknowns]]\nkind = \"sensor-offset\"\non = \"y\"\ndrift = 0.4\n"
	const ramp = "[[unknowns]]\nkind = \"input-ramp\"\non = \"u\"\ndrift = 0.3\n"
	const sine = "[[unknowns]]\nkind = \"input-sine\"\non = \"u\"\ndrift = 0.3\nfrequency_hz = 0.25\n"
	w := math.Pi / 2 // rad/s of 0.25 Hz
	s, c := math.Sincos(w * 0.5)
	for _, x := range []struct {
		name, time, unknowns string
		a, c, g              [][]float64
		q                    []float64
		names                string
	}{
		{"offsets", free, offset + bias,
			[][]float64{{-2, 3, 0}, {0, 0, 0}, {0, 0, 0}}, [][]float64{{5, 7, 1}},
			[][]float64{{1, 0, 0}, {0, 1, 0}, {0, 0, 1}}, []float64{11, 0.3, 0.4}, "[x1 u offset y offset]"},
		{"offsets, discrete", stepped, offset + bias,
			[][]float64{{-2, 3, 0}, {0, 1, 0}, {0, 0, 1}}, [][]float64{{5, 7, 1}},
			[][]float64{{1, 0, 0}, {0, 1, 0}, {0, 0, 1}}, []float64{11, 0.15, 0.2}, "[x1 u offset y offset]"},
		{"ramp", free, ramp,
			[][]float64{{-2, 3, 0}, {0, 0, 1}, {0, 0, 0}}, [][]float64{{5, 7, 0}},
			[][]float64{{1, 0}, {0, 0}, {0, 1}}, []float64{11, 0.3}, "[x1 u ramp u ramp slope]"},
		{"ramp, discrete", stepped, ramp,
			[][]float64{{-2, 3, 0}, {0, 1, 0.5}, {0, 0, 1}}, [][]float64{{5, 7, 0}},
			[][]float64{{1, 0}, {0, 0}, {0, 1}}, []float64{11, 0.15}, "[x1 u ramp u ramp slope]"},
		{"sine", free, sine,
			[][]float64{{-2, 3, 0}, {0, 0, w}, {0, -w, 0}}, [][]float64{{5, 7, 0}},
			[][]float64{{1, 0, 0}, {0, 1, 0}, {0, 0, 1}}, []float64{11, 0.3, 0.3}, "[x1 u sine 0.25 Hz u sine 0.25 Hz quadrature]"},
		{"sine, discrete", stepped, sine,
			[][]float64{{-2, 3, 0}, {0, c, s}, {0, -s, c}}, [][]float64{{5, 7, 0}},
			[][]float64{{1, 0, 0}, {0, 1, 0}, {0, 0, 1}}, []float64{11, 0.15, 0.15}, "[x1 u sine 0.25 Hz u sine 0.25 Hz quadrature]"},
	} {
		t.Run(x.name, func(t *testing.T) {
			m := model(t, parse(t, "t.toml", tank(x.time, "", "", x.unknowns)), plants.Options{})
			same(t, "A", m.A, x.a)
			same(t, "C", m.C, x.c)
			same(t, "G", m.G, x.g)
			q := mat.NewDense(len(x.q), len(x.q), nil)
			for i, v := range x.q {
				q.Set(i, i, v)
			}
			if !mat.EqualApprox(m.Q, q, 1e-15) {
				t.Errorf("Q = %v, want diagonal %v", m.Q, x.q)
			}
			if _, inputs := m.B.Dims(); inputs != 1 || m.B.At(0, 0) != 3 || m.B.At(1, 0) != 0 {
				t.Errorf("B = %v", m.B)
			}
			if got := fmt.Sprint(m.StateNames); got != x.names {
				t.Errorf("%s, want %s", got, x.names)
			}
		})
	}
}

// TestEverythingAtOnce checks the order of the states, lags, delays, unknowns, and
// that an unknown acts behind lag and delay.
func TestEverythingAtOnce(t *testing.T) {
	text := tank(stepped, "lag_s = 0.25\ndelay_samples = 1", "delay_samples = 1",
		"[[unknowns]]\nkind = \"input-offset\"\non = \"u\"\ndrift = 0.3\n[feedback]\nK = [[9]]\ncancel = [\"u\"]\n[[outputs]]\nname = \"u offset\"\nrow = [1]")
	m := model(t, parse(t, "t.toml", text), plants.Options{})
	e := math.Exp(-2)
	// x, lag v, input register r, sensor register s, offset d:
	// x⁺ = −2x + 3(v + d), v⁺ = e v + (1 − e) r, r⁺ = u, s⁺ = 5x + 7(v + d), y = s
	same(t, "A", m.A, [][]float64{
		{-2, 3, 0, 0, 3}, {0, e, 1 - e, 0, 0}, {0, 0, 0, 0, 0}, {5, 7, 0, 0, 7}, {0, 0, 0, 0, 1},
	})
	same(t, "B", m.B, [][]float64{{0}, {0}, {1}, {0}, {0}})
	same(t, "C", m.C, [][]float64{{0, 0, 0, 1, 0}})
	same(t, "K", m.K, [][]float64{{9, 0, 0, 0, 1}})
	same(t, "G", m.G, [][]float64{{1, 0}, {0, 0}, {0, 0}, {0, 0}, {0, 1}})
	same(t, "outputs", m.Outputs, [][]float64{{1, 0, 0, 0, 0}})
	// The output took the name that the offset would have.
	if got := fmt.Sprint(m.StateNames, m.Roles); got != "[x1 u lag u delay 1 y delay 1 u offset 2] [0 1 2 2 3]" {
		t.Error(got)
	}
	// The same, sampled: G is the identity and Q keeps to its states.
	text = tank(free+"\nperiod_s = 0.5", "delay_samples = 1", "", "[[unknowns]]\nkind = \"input-offset\"\non = \"u\"\ndrift = 0.3")
	m = model(t, parse(t, "t.toml", text), plants.Options{})
	a := math.Exp(-1)
	b := 3 * (1 - a) / 2
	same(t, "A", m.A, [][]float64{{a, b, b}, {0, 0, 0}, {0, 0, 1}})
	same(t, "G", m.G, [][]float64{{1, 0, 0}, {0, 1, 0}, {0, 0, 1}})
	if m.Q.At(1, 1) != 0 || m.Q.At(0, 1) != 0 || math.Abs(m.Q.At(2, 2)-0.15) > 1e-15 || !(m.Q.At(0, 2) > 0) {
		t.Errorf("Q = %v", mat.Formatted(m.Q))
	}
}
