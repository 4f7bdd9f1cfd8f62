package scenarios

import (
	"context"
	"errors"
	"math"
	"reflect"
	"strings"
	"testing"

	"polewright/plants"
	"polewright/plants/library"
)

// contract is a scenario with every key.
const contract = `
format = 1
name = "Cold start"
duration_s = 4.0
loop = "closed"
[initial]
true     = [0.30, 0.0]
estimate = [0.0, 0.0]
[[drive]]
input = "force"
shape = "step"
at_s = 0.5
size = 300.0
[[surprise]]
input = "force"
shape = "pulse"
at_s = 2.0
until_s = 2.4
size = -120.0
[truth]
push = 1.2
[noise]
seed = 7
process = 1.5
sensor  = 0.5
[[fault]]
sensor = "ruler"
kind   = "dropout"
from_s = 3.0
until_s = 3.1
size = 0.0
[limits]
settle_s = 0.25
peak_max = 8.0
over_floor_max = 3.0
gain_max = 5e3
sensitivity_max = 2.0
phase_margin_deg = 30.0
delay_margin_s = 0.004
[limits.std]
"sum" = 0.02
"place" = 0.03
[limits.error]
"place" = 0.01
[limits.input_std]
"force" = 60.0
`

func TestParseReadsEveryKey(t *testing.T) {
	p := plantOf(t, cart)
	have, err := Parse("cold.toml", []byte(contract), p)
	if err != nil {
		t.Fatal(err)
	}
	f := func(v float64) *float64 { return &v }
	want := &Scenario{
		Name: "Cold start", Duration: 4, Closed: true, file: "cold.toml",
		InitialTrue: []float64{0.3, 0}, InitialEstimate: []float64{0, 0},
		Drives:    []Drive{{Input: "force", Shape: Step, At: 0.5, Until: math.Inf(1), Size: 300}},
		Surprises: []Drive{{Input: "force", Shape: Pulse, At: 2, Until: 2.4, Size: -120}},
		Factors:   map[string]float64{"push": 1.2},
		Noise:     Noise{Seed: 7, Process: 1.5, Sensor: 0.5},
		Faults:    []Fault{{Sensor: "ruler", Kind: Dropout, From: 3, Until: 3.1}},
		Limits: Limits{
			Settle: f(0.25), Peak: f(8), OverFloor: f(3), Gain: f(5e3), Sensitivity: f(2), PhaseMargin: f(30), DelayMargin: f(0.004),
			Std: []NamedLimit{{"place", 0.03}, {"sum", 0.02}}, Error: []NamedLimit{{"place", 0.01}}, InputStd: []NamedLimit{{"force", 60}},
		},
	}
	if !reflect.DeepEqual(have, want) {
		t.Errorf("have %+v\nwant %+v", have, want)
	}
	if !have.Limits.Any() || (&Limits{}).Any() {
		t.Error("Any is wrong")
	}
	j, err := Parse("cold.json", []byte(`{"format": 1, "duration_s": 2, "truth": {"push": 0.9}}`), p)
	if err != nil || j.Name != "cold" || j.Factors["push"] != 0.9 || j.Noise != (Noise{1, 1, 1}) || !j.Closed {
		t.Errorf("JSON: %+v, %v", j, err)
	}
}

func TestParseRefuses(t *testing.T) {
	p := plantOf(t, cart)
	const head = "format = 1\nduration_s = 4\n"
	drive := func(rest string) string { return head + "[[drive]]\n" + rest }
	fault := func(rest string) string { return head + "[[fault]]\n" + rest }
	force := "input = \"force\"\n"
	ruler := "sensor = \"ruler\"\n"
	for _, c := range []struct{ text, want string }{
		{"", "s.toml: format: missing; expected format = 1"},
		{"format = 2", "s.toml: format: 2; expected 1, the only format this version reads"},
		{"format = 1\nname = \" \"\n", "s.toml: name: empty; expected a name"},
		{"format = 1\nname = \"a\\u0007\"\n", `s.toml: name: control characters in "a\a"; expected visible characters only`},
		{"format = 1", "s.toml: duration_s: missing; expected the length of the run in s"},
		{"format = 1\nduration_s = -1", "s.toml: duration_s: -1; expected seconds above 0"},
		{"format = 1\nduration_s = 1e9", "s.toml: duration_s: 1e+09 s in steps of 0.1 s; expected at most 2000000 steps"},
		{head + "step_s = 0.1", "s.toml: step_s: given for a discrete plant; a discrete plant runs at its own period"},
		{head + "loop = \"half\"", `s.toml: loop: "half"; expected "closed" or "open"`},
		{head + "[initial]\ntrue = [1]", "s.toml: initial, true: 1 entry; expected one per state of the plant: 2"},
		{head + "[initial]\nestimate = [1, 2, 3]", "s.toml: initial, estimate: 3 entries; expected one per state of the plant: 2"},
		{head + "[truth]\npush = 0", "s.toml: truth, push: 0; expected a factor between 1e-6 and 1e6 in size"},
		{head + "[truth]\npush = 1.2\nplant = \"x.toml\"", "s.toml: truth, push: a factor beside a plant file; expected one of them"},
		{head + "[truth]\nplant = \"\"", `s.toml: truth, plant: ""; expected the name of a plant file`},
		{drive("shape = \"step\""), `s.toml: drive 1, input: missing; expected one of "force"`},
		{drive("input = \"forcf\""), `s.toml: drive 1, input: unknown input "forcf"; expected one of "force"`},
		{drive(force), `s.toml: drive 1, shape: missing; expected "step", "ramp", "pulse", "sine", "chirp" or "random-binary"`},
		{drive(force + "shape = \"jump\""), `s.toml: drive 1, shape: "jump"; expected "step", "ramp", "pulse", "sine", "chirp" or "random-binary"`},
		{drive(force + "shape = \"file\"\nfile = \"log.csv\"\ncolumn = \"u\""), `s.toml: drive 1, shape: "file"; expected one of the other shapes: a session cannot hold a recorded drive yet`},
		{drive(force + "shape = \"step\"\nsize = 1\nfile = \"log.csv\""), `s.toml: drive 1: a file for "step"; expected a file with the shape "file" only`},
		{drive(force + "shape = \"step\""), "s.toml: drive 1, size: missing; expected a number"},
		{drive(force + "shape = \"step\"\nsize = 1\nat_s = 5"), "s.toml: drive 1, at_s: 5; expected 0 to duration_s, 4"},
		{drive(force + "shape = \"step\"\nsize = 1\nuntil_s = 2"), `s.toml: drive 1, until_s: given for a step; expected the shape "pulse" for what ends`},
		{drive(force + "shape = \"pulse\"\nsize = 1\nat_s = 2"), "s.toml: drive 1, until_s: missing; a pulse needs its end in s"},
		{drive(force + "shape = \"pulse\"\nsize = 1\nat_s = 2\nuntil_s = 2"), "s.toml: drive 1, until_s: 2; expected a time after at_s, 2"},
		{drive(force + "shape = \"sine\"\nsize = 1"), "s.toml: drive 1, frequency_hz: missing; a sine needs it, in Hz"},
		{drive(force + "shape = \"sine\"\nsize = 1\nfrequency_hz = -1"), "s.toml: drive 1, frequency_hz: -1; expected Hz above 0"},
		{drive(force + "shape = \"sine\"\nsize = 1\nfrequency_hz = 6"), "s.toml: drive 1, frequency_hz: 6; expected at most half the sample rate, 5 Hz"},
		{drive(force + "shape = \"sine\"\nsize = 1\nfrequency_hz = 1\nto_hz = 2"), "s.toml: drive 1, to_hz: given for a sine; expected with another shape only"},
		{drive(force + "shape = \"chirp\"\nsize = 1\nfrequency_hz = 1"), "s.toml: drive 1, to_hz: missing; a chirp needs it, in Hz"},
		{drive(force + "shape = \"step\"\nsize = inf"), "s.toml: drive 1, size: +Inf; expected a finite number"},
		{fault("sensor = \"rule\""), `s.toml: fault 1, sensor: unknown sensor "rule"; expected one of "ruler", "tacho"`},
		{fault(ruler), `s.toml: fault 1, kind: missing; expected "dropout", "freeze", "offset" or "spike"`},
		{fault(ruler + "kind = \"lost\""), `s.toml: fault 1, kind: "lost"; expected "dropout", "freeze", "offset" or "spike"`},
		{fault(ruler + "kind = \"spike\""), "s.toml: fault 1, size: missing; expected a number for spike"},
		{fault(ruler + "kind = \"freeze\"\nsize = 1"), "s.toml: fault 1, size: 1; a freeze has no size"},
		{fault(ruler + "kind = \"freeze\"\nfrom_s = 1\nuntil_s = 0.5"), "s.toml: fault 1, until_s: 0.5; expected a time after from_s, 1"},
		{head + "[noise]\nseed = -1", "s.toml: noise, seed: -1; expected a whole number from 0 on"},
		{head + "[noise]\nprocess = -1", "s.toml: noise, process: -1; expected a factor from 0 to 1e6"},
		{head + "[limits]\nsettle_s = 0", "s.toml: limits, settle_s: 0; expected a limit above 0"},
		{head + "[limits.std]\nplaces = 1", `s.toml: limits, std: unknown state or output "places"; expected one of "place", "speed", "sum"`},
		{head + "[limits.error]\nforce = 1", `s.toml: limits, error: unknown state or output "force"; expected one of "place", "speed", "sum"`},
		{head + "[limits.input_std]\nplace = 1", `s.toml: limits, input_std: unknown input "place"; expected one of "force"`},
		{head + "[limits.std]\nplace = -1", "s.toml: limits, std, place: -1; expected a limit above 0"},
	} {
		_, err := Parse("s.toml", []byte(c.text), p)
		if err == nil {
			t.Errorf("accepted:\n%s", c.text)
			continue
		}
		if err.Error() != c.want {
			t.Errorf("have %s\nwant %s", err, c.want)
		}
		if _, ok := errors.AsType[*plants.Error](err); !ok {
			t.Errorf("%T", err)
		}
	}
	for _, text := range []string{head + "[truth]\nmass = 1.2", head + "speed = 1", head + "[noise]\nseed = 1.5"} {
		if _, err := Parse("s.toml", []byte(text), p); err == nil || strings.Contains(err.Error(), "\n") {
			t.Errorf("%q: %v", text, err)
		}
	}
	many := head + strings.Repeat("[[fault]]\nsensor = \"ruler\"\nkind = \"freeze\"\n", 101)
	if _, err := Parse("s.toml", []byte(many), p); err == nil || err.Error() != "s.toml: fault: 101 of them; expected at most 100" {
		t.Error(err)
	}
	bare := plantOf(t, cart[:strings.Index(cart, "[feedback]")])
	for text, want := range map[string]string{
		head + "loop = \"closed\"":                 `s.toml: loop: closed, for a plant without a controller; expected "open", or [feedback] in the plant`,
		head + "[limits]\nphase_margin_deg = 30":   "s.toml: limits, phase_margin_deg: a limit on the loop of a plant without a controller; expected [feedback] in the plant",
		head + "[limits.input_std]\n\"force\" = 1": "s.toml: limits, input_std: a limit on the loop of a plant without a controller; expected [feedback] in the plant",
	} {
		if _, err := Parse("s.toml", []byte(text), bare); err == nil || err.Error() != want {
			t.Errorf("have %v\nwant %s", err, want)
		}
	}
}

// Whatever the parser accepts can be run, or is refused with an error.
func FuzzParse(f *testing.F) {
	p := plantOf(f, cart)
	m := modelOf(f, p)
	f.Add(contract)
	f.Add("format = 1\nduration_s = 0.01")
	f.Add("format = 1\nduration_s = 3\ndrive = [{ input = \"force\", shape = \"chirp\", size = 1e300, frequency_hz = 1, to_hz = 2, at_s = 3 }]")
	f.Add("format = 1\nduration_s = 3\n[truth]\nplant = \"a.toml\"\n[initial]\ntrue = [1, 2, 3]")
	f.Add("format = 1\nduration_s = 3\nfault = [{ sensor = \"tacho\", kind = \"spike\", size = -1e308, from_s = 3 }]")
	f.Add("format = 1\nduration_s = 1e300")
	f.Add("format = 1\nduration_s = 3\ninitial = " + strings.Repeat("[", 500))
	for _, name := range library.Names() {
		for _, file := range library.Scenarios(name) {
			f.Add(string(file.Text))
		}
	}
	f.Fuzz(func(t *testing.T, text string) {
		s, err := Parse("s.toml", []byte(text), p)
		if err != nil {
			if strings.ContainsAny(err.Error(), "\n\x1b") {
				t.Errorf("error %q", err)
			}
			return
		}
		if s.Duration > 100 {
			return
		}
		r, err := NewRunner(p, m, s, nil)
		if err != nil {
			return
		}
		run, err := r.Run(context.Background(), Gain{L: cartGain})
		if err != nil {
			t.Fatal(err)
		}
		for _, list := range run.Estimate {
			if !finite(list) {
				t.Error("an infinite estimate")
			}
		}
	})
}

func TestDefaultRuns(t *testing.T) {
	p := plantOf(t, cart)
	s := Default(p)
	run := runOf(t, p, s, Gain{L: cartGain})
	if len(run.T) != 201 || s.Limits.Any() || !s.Closed {
		t.Errorf("%d samples, limits %v, closed %v", len(run.T), s.Limits.Any(), s.Closed)
	}
	near(t, "initial error", run.True[0][0]-run.Estimate[0][0], 0.5, 1e-14)
	near(t, "initial error", run.True[1][0]-run.Estimate[1][0], 1, 1e-14)
}
