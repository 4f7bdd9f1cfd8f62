package plants_test

import (
	"errors"
	"fmt"
	"math"
	"slices"
	"testing"

	"gonum.org/v1/gonum/mat"

	"polewright/estimator"
	"polewright/plants"
)

func parse(t *testing.T, file, text string) *plants.Plant {
	t.Helper()
	p, err := plants.Parse(file, []byte(text))
	if err != nil {
		t.Fatal(err)
	}
	return p
}

func model(t *testing.T, p *plants.Plant, o plants.Options) *estimator.Model {
	t.Helper()
	m, err := p.Model(o)
	if err != nil {
		t.Fatal(err)
	}
	return m
}

// same compares a matrix with rows written out, to 1e-12 relative.
func same(t *testing.T, name string, got mat.Matrix, want [][]float64) {
	t.Helper()
	rows, cols := got.Dims()
	if rows != len(want) || cols != len(want[0]) {
		t.Errorf("%s is %d×%d, want %d×%d", name, rows, cols, len(want), len(want[0]))
		return
	}
	for i := range rows {
		for j := range cols {
			if g, w := got.At(i, j), want[i][j]; math.Abs(g-w) > 1e-12*math.Max(1, math.Abs(w)) || math.IsNaN(g) {
				t.Errorf("%s[%d][%d] = %v, want %v", name, i+1, j+1, g, w)
			}
		}
	}
}

func period(v float64) *float64 { return &v }

// TestBaseModel writes out the continuous design model of the base plant: the
// cart v' = −v/2 + (u + d)/2 with the offset d of its force.
func TestBaseModel(t *testing.T) {
	p := parse(t, "cart.toml", base)
	m := model(t, p, plants.Options{Period: period(0)})
	same(t, "A", m.A, [][]float64{{0, 1, 0}, {0, -0.5, 0.5}, {0, 0, 0}})
	same(t, "B", m.B, [][]float64{{0}, {0.5}, {0}})
	same(t, "C", m.C, [][]float64{{1, 0, 0}})
	same(t, "D", m.D, [][]float64{{0}})
	same(t, "G", m.G, [][]float64{{0, 0}, {1, 0}, {0, 1}})
	same(t, "Q", m.Q, [][]float64{{0.5, 0}, {0, 0.2}})
	same(t, "R", m.R, [][]float64{{1e-4 * 0.1}})
	same(t, "K", m.K, [][]float64{{3, 4, 1}})
	same(t, "outputs", m.Outputs, [][]float64{{1, 4, 0}})
	got := fmt.Sprint(m.Period, m.StateNames, m.StateScale, m.Roles, m.InputNames, m.SensorNames, m.SensorScale, m.OutputNames)
	want := fmt.Sprint(0.0, []string{"place", "speed", "force offset"}, []float64{0.1, 1, 1},
		[]estimator.Role{estimator.PlantState, estimator.PlantState, estimator.UnknownState},
		[]string{"force"}, []string{"encoder"}, []float64{1}, []string{"sum"})
	if got != want {
		t.Errorf("got  %s\nwant %s", got, want)
	}
}

// TestSampledModel holds the sampled base plant against the exact solution for
// v' = −a v + b (u + d), a = b = 1/2, over T = 0.1 s.
func TestSampledModel(t *testing.T) {
	m := model(t, parse(t, "cart.toml", base), plants.Options{})
	const T, a, b = 0.1, 0.5, 0.5
	e := math.Exp(-a * T)
	speed, place := (1-e)/a, T/a-(1-e)/(a*a) // of a held acceleration
	same(t, "A", m.A, [][]float64{{1, (1 - e) / a, b * place}, {0, e, b * speed}, {0, 0, 1}})
	same(t, "B", m.B, [][]float64{{b * place}, {b * speed}, {0}})
	same(t, "G", m.G, [][]float64{{1, 0, 0}, {0, 1, 0}, {0, 0, 1}})
	same(t, "R", m.R, [][]float64{{1e-4}})
	if m.Period != T {
		t.Errorf("period %g", m.Period)
	}
	// The offset is driven by its own noise alone; its variance grows by drift·T.
	if got := m.Q.At(2, 2); math.Abs(got-0.2*T) > 1e-14 {
		t.Errorf("offset variance per step %g, want %g", got, 0.2*T)
	}
	// ∫ e^{−2as} (0.5 + 0.2 (b/a)² (e^{as} − 1)²) ds over the step, the speed's.
	want := 0.5*(1-e*e)/(2*a) + 0.2*(b/a)*(b/a)*(T-2*(1-e)/a+(1-e*e)/(2*a))
	if got := m.Q.At(1, 1); math.Abs(got-want) > 1e-12*want {
		t.Errorf("speed variance per step %g, want %g", got, want)
	}
}

func TestOptions(t *testing.T) {
	p := parse(t, "cart.toml", base)
	m := model(t, p, plants.Options{
		Period: period(0), WithoutUnknowns: true,
		Factors: map[string]float64{"mass": 2}, Sensors: []bool{true, true},
	})
	same(t, "A", m.A, [][]float64{{0, 1}, {0, -0.25}})
	same(t, "B", m.B, [][]float64{{0}, {0.25}})
	same(t, "C", m.C, [][]float64{{1, 0}, {0, 1}})
	same(t, "R", m.R, [][]float64{{1e-5, 0}, {0, 0.02}})
	same(t, "K", m.K, [][]float64{{3, 4}})
	if m := model(t, p, plants.Options{Period: period(0.002)}); m.Period != 0.002 {
		t.Errorf("period %g, want 0.002", m.Period)
	}
}

func TestOptionsRefused(t *testing.T) {
	discrete := parse(t, "d.toml", "format = 1\n[model]\ntime = \"discrete\"\nperiod_s = 0.5\nA = [[0.5]]\nC = [[1]]")
	delayed := parse(t, "cart.toml", changed(t, "noise_std = 0.01", "delay_samples = 1"))
	long := parse(t, "cart.toml", changed(t, "noise_std = 0.01", "delay_samples = 100"))
	loud := parse(t, "n.toml", "format = 1\n[model]\ntime = \"discrete\"\nperiod_s = 0.5\nA = [[0.5]]\nC = [[1]]\n[process_noise]\nstd = [1e200]")
	cart := parse(t, "cart.toml", base)
	sine := parse(t, "cart.toml", base+"\n[[unknowns]]\nkind = \"input-sine\"\non = \"force\"\ndrift = 1.0\nfrequency_hz = 4.0")
	large := parse(t, "l.toml", `format = 1
[model]
time = "discrete"
period_s = 1
A = [[0.5]]
C = [[1], [1]]
[[sensors]]
delay_samples = 100
[[sensors]]
delay_samples = 100
`)
	for _, c := range []struct {
		p    *plants.Plant
		o    plants.Options
		want string
	}{
		{cart, plants.Options{Period: period(-1)}, "cart.toml: period: -1 s; expected 0 or a period above 0 in s (1e-9 to 1e9)"},
		{cart, plants.Options{Period: period(math.NaN())}, "cart.toml: period: NaN s; expected 0 or a period above 0 in s (1e-9 to 1e9)"},
		{cart, plants.Options{Period: period(math.Inf(1))}, "cart.toml: period: +Inf s; expected 0 or a period above 0 in s (1e-9 to 1e9)"},
		{discrete, plants.Options{Period: period(0)}, "d.toml: period: 0 s for a discrete plant of 0.5 s; expected no other period"},
		{delayed, plants.Options{Period: period(0)}, "cart.toml: sensors 1, delay_samples: a delay in samples without a sample period; expected a period above 0"},
		{sine, plants.Options{Period: period(0.2)}, "cart.toml: unknowns 2, frequency_hz: 4; expected below half the sample rate, 2.5 Hz"},
		{loud, plants.Options{}, "n.toml: model: Q: not a finite number; expected numbers that a computer can hold"},
		{large, plants.Options{}, "l.toml: model: 201 states with lags, delays and unknowns; expected at most 200"},
		{cart, plants.Options{Factors: map[string]float64{"weight": 2}}, `cart.toml: parameter factors: unknown parameter "weight"; expected one of "damp", "mass"`},
		{cart, plants.Options{Factors: map[string]float64{"mass": math.NaN()}}, "cart.toml: parameter factors, mass: NaN; expected a finite number"},
		{cart, plants.Options{Factors: map[string]float64{"mass": 0}}, `cart.toml: model, A, row 2, column 2: "-damp/mass" is -Inf; expected a finite number`},
		{cart, plants.Options{Sensors: []bool{true}}, "cart.toml: sensors: a choice of 1; expected 2 entries"},
		{cart, plants.Options{Sensors: []bool{false, false}}, "cart.toml: sensors: none is enabled; expected at least one"},
	} {
		_, err := c.p.Model(c.o)
		var e *plants.Error
		if !errors.As(err, &e) || err.Error() != c.want {
			t.Errorf("got  %v\nwant %s", err, c.want)
		}
	}
	if m := model(t, long, plants.Options{}); len(m.StateNames) != 103 {
		t.Errorf("%d states, want 103", len(m.StateNames))
	}
}

// TestJSON reads the same plant from both notations.
func TestJSON(t *testing.T) {
	const text = `{"format": 1, "name": "Cart", "note": "first line\nsecond",
"parameters": {"mass": {"value": 2.0, "unit": "kg", "tolerance": 0.1}, "damp": {"value": 1}},
"model": {"time": "continuous", "period_s": 0.1, "A": [[0, 1], [0, "-damp/mass"]], "B": [[0], ["1/mass"]],
  "C": [[1, 0], [0, 1]], "D": [[0], [0]], "G": [[0], [1]]},
"operating_point": {"states": [1, 0], "inputs": [3], "sensors": [1, 0]},
"states": [{"name": "place", "unit": "m", "scale": 0.1}, {"name": "speed"}],
"inputs": [{"name": "force", "unit": "N", "range": [-5, 5]}],
"sensors": [{"name": "encoder", "noise_std": 0.01}, {"name": "tacho", "noise_density": 0.02, "enabled": false}],
"outputs": [{"name": "sum", "row": [1, "2*mass"]}],
"process_noise": {"density": [0.5]},
"feedback": {"K": [[3, 4]], "cancel": ["force"]},
"unknowns": [{"kind": "input-offset", "on": "force", "drift": 0.2}]}`
	a, b := parse(t, "cart.toml", base), parse(t, "cart.JSON", text)
	if x, y := fmt.Sprint(a.Name, a.Note, a.Parameters, a.States, a.Outputs, a.Unknowns), fmt.Sprint(b.Name, b.Note, b.Parameters, b.States, b.Outputs, b.Unknowns); x != y {
		t.Errorf("TOML %s\nJSON %s", x, y)
	}
	x, y := model(t, a, plants.Options{}), model(t, b, plants.Options{})
	for _, pair := range [][2]mat.Matrix{{x.A, y.A}, {x.B, y.B}, {x.C, y.C}, {x.D, y.D}, {x.G, y.G}, {x.Q, y.Q}, {x.R, y.R}, {x.K, y.K}, {x.Outputs, y.Outputs}} {
		if !mat.Equal(pair[0], pair[1]) {
			t.Errorf("%v differs from %v", pair[0], pair[1])
		}
	}
	if !slices.Equal(x.StateNames, y.StateNames) {
		t.Errorf("%v, %v", x.StateNames, y.StateNames)
	}
}
