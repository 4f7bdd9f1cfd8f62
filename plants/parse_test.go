package plants_test

import (
	"errors"
	"fmt"
	"strings"
	"testing"

	"polewright/plants"
)

// base is a plant that uses every block but [sensor_noise].
const base = `format = 1
name = "Cart"
note = "first line\nsecond"

[parameters]
mass = { value = 2.0, unit = "kg", tolerance = 0.1 }
damp = { value = 1.0 }

[model]
time = "continuous"
period_s = 0.1
A = [[0, 1], [0, "-damp/mass"]]
B = [[0], ["1/mass"]]
C = [[1, 0], [0, 1]]
D = [[0], [0]]
G = [[0], [1]]

[operating_point]
states = [1.0, 0.0]
inputs = [3.0]
sensors = [1.0, 0.0]

[[states]]
name = "place"
unit = "m"
scale = 0.1
[[states]]
name = "speed"

[[inputs]]
name = "force"
unit = "N"
range = [-5.0, 5.0]

[[sensors]]
name = "encoder"
noise_std = 0.01
[[sensors]]
name = "tacho"
noise_density = 0.02
enabled = false

[[outputs]]
name = "sum"
row = [1.0, "2*mass"]

[process_noise]
density = [0.5]

[feedback]
K = [[3, 4]]
cancel = ["force"]

[[unknowns]]
kind = "input-offset"
on = "force"
drift = 0.2
`

// changed replaces a piece of base that is there once.
func changed(t *testing.T, old, replacement string) string {
	t.Helper()
	if strings.Count(base, old) != 1 {
		t.Fatalf("%q is %d times in the base plant", old, strings.Count(base, old))
	}
	return strings.Replace(base, old, replacement, 1)
}

func TestBaseParses(t *testing.T) {
	p, err := plants.Parse("cart.toml", []byte(base))
	if err != nil {
		t.Fatal(err)
	}
	if p.Name != "Cart" || p.Note != "first line\nsecond" || !p.Continuous || p.Period != 0.1 {
		t.Errorf("got %q, %q, %v, %g", p.Name, p.Note, p.Continuous, p.Period)
	}
	if got := fmt.Sprint(p.Parameters); got != "[{damp  1 0} {mass kg 2 0.1}]" {
		t.Errorf("parameters %s", got)
	}
	if got := fmt.Sprint(p.States); got != "[{place m 0.1 1} {speed  1 0}]" {
		t.Errorf("states %s", got)
	}
	if got := fmt.Sprint(p.Enabled()); got != "[true false]" {
		t.Errorf("enabled %s", got)
	}
	if got := fmt.Sprint(p.Outputs); got != "[{sum  [1 4]}]" {
		t.Errorf("outputs %s", got)
	}
	if i, ok := p.SensorIndex("tacho"); i != 1 || !ok {
		t.Errorf("tacho at %d, %v", i, ok)
	}
	if _, ok := p.InputIndex("tacho"); ok {
		t.Error("an input called tacho")
	}
}

func TestDefaultNames(t *testing.T) {
	p, err := plants.Parse("some/where/tank.toml", []byte(`format = 1
[model]
time = "continuous"
A = [[-1, 0], [0, -2]]
B = [[1, 0, 1], [0, 1, 1]]
C = [[1, 1]]
`))
	if err != nil {
		t.Fatal(err)
	}
	got := fmt.Sprint(p.Name, p.States[1].Name, p.Inputs[2].Name, p.Sensors[0].Name, p.States[0].Scale, p.Sensors[0].Enabled)
	if want := fmt.Sprint("tank", "x2", "u3", "y1", 1.0, true); got != want {
		t.Errorf("got %s, want %s", got, want)
	}
}

// mustFail parses a text that is wrong and returns the message, which has to be
// one line of type *Error that names the file.
func mustFail(t *testing.T, file, text string) string {
	t.Helper()
	_, err := plants.Parse(file, []byte(text))
	if err == nil {
		t.Fatal("accepted")
	}
	var e *plants.Error
	if !errors.As(err, &e) || e.File != file {
		t.Fatalf("%T without the file: %v", err, err)
	}
	if strings.ContainsAny(err.Error(), "\n\r\x1b") || len(err.Error()) > 400 {
		t.Errorf("not one short line: %.500q", err.Error())
	}
	return err.Error()
}
