package plants_test

import (
	"fmt"
	"strings"
	"testing"
)

// TestRefused changes one thing of the base plant and wants the exact message.
func TestRefused(t *testing.T) {
	for _, c := range []struct{ old, replacement, want string }{
		{"format = 1", "", `format: missing; expected format = 1`},
		{"format = 1", "format = 2", `format: 2; expected 1, the only format this version reads`},
		{"format = 1", "format = 1.5", `format: the number 1.5; expected a whole number`},
		{"format = 1", `format = "1"`, `format: the text "1"; expected a whole number`},
		{"format = 1", "format = 1\nformat = 1", `line 2, column 1: key format is already defined; expected a TOML file`},
		{"format = 1", "format = 1\ncolour = 3", `colour: unknown key; expected one of format, name, note, parameters, model, operating_point, states, inputs, sensors, outputs, process_noise, sensor_noise, feedback, unknowns`},
		{"format = 1", "format = 1\n\"a\\u001b[2J\" = 3", `a\x1b[2J: unknown key; expected one of format, name, note, parameters, model, operating_point, states, inputs, sensors, outputs, process_noise, sensor_noise, feedback, unknowns`},
		{"format = 1", "format = = 1", `line 1, column 10: unexpected character U+003D '=' at start of value; expected a TOML file`},
		{`name = "Cart"`, `name = ""` + "\n" + `Name = "x"`, `Name: unknown key; expected one of format, name, note, parameters, model, operating_point, states, inputs, sensors, outputs, process_noise, sensor_noise, feedback, unknowns`},
		{`name = "Cart"`, `name = "a\u001b[31m"`, `name: control characters in "a\x1b[31m"; expected visible characters only`},
		{`name = "Cart"`, `name = "a\u202eb"`, `name: control characters in "a\u202eb"; expected visible characters only`},
		{`name = "Cart"`, `name = " Cart"`, `name: space around " Cart"; expected a name without it`},
		{`name = "Cart"`, `name = 3`, `name: the number 3; expected a text in quotes`},
		{`name = "Cart"`, `name = 1979-05-27`, `name: a date or time; expected a text in quotes`},
		{`name = "Cart"`, `name = "` + strings.Repeat("x", 61) + `"`, `name: 61 characters long; expected at most 60`},
		{`first line`, `\u0007`, `note: control characters; expected visible characters and line ends only`},
		{"value = 2.0", "value = nan", `parameters, mass, value: NaN; expected a finite number`},
		{"damp = { value = 1.0 }", "damp = { unit = \"s\" }", `parameters, damp: no value; expected { value = 1.0 }`},
		{"tolerance = 0.1", "tolerance = 1.0", `parameters, mass, tolerance: 1; expected a relative tolerance from 0 to below 1`},
		{"tolerance = 0.1", "tolerance = -0.1", `parameters, mass, tolerance: -0.1; expected a relative tolerance from 0 to below 1`},
		{"damp = {", "damp = { extra = 1,", `parameters, damp, extra: unknown key; expected one of value, unit, tolerance`},
		{"damp = { value = 1.0 }", "damp = 1.0", `parameters, damp: the number 1; expected a table`},
		{"damp = {", `"da mp" = {`, `parameters: the name "da mp"; expected letters, digits and _, a letter first`},
		{"damp = {", "sqrt = {", `parameters, sqrt: a name that arithmetic uses itself; expected another name`},
		{`"continuous"`, `"sampled"`, `model, time: "sampled"; expected "continuous" or "discrete"`},
		{`time = "continuous"`, "", `model, time: missing; expected "continuous" or "discrete"`},
		{"period_s = 0.1", "period_s = 0", `model, period_s: 0; expected a period above 0 in s (1e-9 to 1e9)`},
		{"period_s = 0.1", "period_s = -0.1", `model, period_s: -0.1; expected a period above 0 in s (1e-9 to 1e9)`},
		{"period_s = 0.1", "period_s = inf", `model, period_s: +Inf; expected a finite number`},
		{"period_s = 0.1", "period_s = 0.1\nsample = 3", `model, sample: unknown key; expected one of time, period_s, A, B, C, D, G`},
		{"A = [[0, 1], [0, \"-damp/mass\"]]\n", "", `model, A: missing or empty; expected a list of rows`},
		{`A = [[0, 1], `, `A = [[0, 1, 2], `, `model, A: 2×3; expected 2×2 (square)`},
		{`[0, "-damp/mass"]`, `[0]`, `model, A, row 2: 1 entry; expected 2×2 (square)`},
		{`[0, "-damp/mass"]`, `[0, true]`, `model, A, row 2, column 2: true; expected a number or arithmetic in quotes`},
		{`[0, "-damp/mass"]`, `[0, nan]`, `model, A, row 2, column 2: NaN; expected a finite number`},
		{`[0, "-damp/mass"]`, `3`, `model, A, row 2: the number 3; expected a list`},
		{`A = [[0, 1], [0, "-damp/mass"]]`, `A = 3`, `model, A: the number 3; expected a list`},
		{"-damp/mass", "-damping/mass", `model, A, row 2, column 2: unknown name "damping" in "-damping/mass"; expected one of [parameters] or a function: sqrt sin cos tan exp log abs pi`},
		{"-damp/mass", "-damp/0", `model, A, row 2, column 2: "-damp/0" is -Inf; expected a finite number`},
		{"-damp/mass", "sqrt(-damp)", `model, A, row 2, column 2: "sqrt(-damp)" is NaN; expected a finite number`},
		{"-damp/mass", "", `model, A, row 2, column 2: an empty text; expected a number or arithmetic`},
		{"-damp/mass", "1e308*10", `model, A, row 2, column 2: "1e308*10" is +Inf; expected a finite number`},
		{"-damp/mass", "1..1e9", `model, A, row 2, column 2: operator ".." in "1..1e9"; expected numbers, parameters, + - * / ^ ( ) and sqrt sin cos tan exp log abs pi`},
		{"-damp/mass", "repeat(mass, 1000000000)", `model, A, row 2, column 2: unknown function "repeat" in "repeat(mass, 1000000000)"; expected numbers, parameters, + - * / ^ ( ) and sqrt sin cos tan exp log abs pi`},
		{"-damp/mass", "map(1..1000000000, damp)", `model, A, row 2, column 2: unknown function "map" in "map(1..1000000000, damp)"; expected numbers, parameters, + - * / ^ ( ) and sqrt sin cos tan exp log abs pi`},
		{"-damp/mass", "mass//damp", `model, A, row 2, column 2: cannot read "mass//damp"; expected numbers, parameters, + - * / ^ ( ) and sqrt sin cos tan exp log abs pi`},
		{"-damp/mass", "[1, 2]", `model, A, row 2, column 2: cannot read "[1, 2]"; expected numbers, parameters, + - * / ^ ( ) and sqrt sin cos tan exp log abs pi`},
		{"-damp/mass", "mass.damp", `model, A, row 2, column 2: something that is no arithmetic in "mass.damp"; expected numbers, parameters, + - * / ^ ( ) and sqrt sin cos tan exp log abs pi`},
		{"-damp/mass", "mass > damp", `model, A, row 2, column 2: operator ">" in "mass > damp"; expected numbers, parameters, + - * / ^ ( ) and sqrt sin cos tan exp log abs pi`},
		{"-damp/mass", "sqrt(mass, damp)", `model, A, row 2, column 2: sqrt with 2 arguments in "sqrt(mass, damp)"; expected one argument`},
		{"-damp/mass", "sqrt", `model, A, row 2, column 2: unknown name "sqrt" in "sqrt"; expected one of [parameters] or a function: sqrt sin cos tan exp log abs pi`},
		{"-damp/mass", strings.Repeat("(", 100000) + "1" + strings.Repeat(")", 100000), `model, A, row 2, column 2: an expression of 200001 characters; expected at most 200`},
		{"B = [[0], [\"1/mass\"]]", "B = [[0], [1], [2]]", `model, B: 3×1; expected 2×1 (2 states)`},
		{"B = [[0], [\"1/mass\"]]\n", "", `model, D: 2×1; expected 2×0 (2 sensors, 0 inputs)`},
		{"C = [[1, 0], [0, 1]]", "C = [[1, 0, 0]]", `model, C: 1×3; expected 1×2 (2 states)`},
		{"C = [[1, 0], [0, 1]]", "C = [[1, 0]]", `model, D: 2×1; expected 1×1 (1 sensor, 1 input)`},
		{"C = [[1, 0], [0, 1]]", "C = []", `model, C: missing or empty; expected a list of rows`},
		{"D = [[0], [0]]", "D = [[0, 0], [0, 0]]", `model, D: 2×2; expected 2×1 (2 sensors, 1 input)`},
		{"G = [[0], [1]]", "G = [[0, 1]]", `model, G: 1×2; expected 2×2 (2 states)`},
		{"G = [[0], [1]]", "G = [[], []]", `model, G: no columns; expected one per process noise, or no G`},
		{"states = [1.0, 0.0]", "states = [1.0]", `operating_point, states: 1 entry; expected 2`},
		{"sensors = [1.0, 0.0]", "sensors = [1.0, inf]", `operating_point, sensors, entry 2: +Inf; expected a finite number`},
		{`name = "speed"`, `name = "place"`, `states 2, name: "place" is also states 1; expected a name of its own`},
		{`name = "speed"`, `name = "t"`, `states 2, name: "t" is also the time column of logs; expected a name of its own`},
		{`name = "sum"`, `name = "speed"`, `outputs 1, name: "speed" is also states 2; expected a name of its own`},
		{`name = "tacho"`, `name = "force"`, `sensors 2, name: "force" is also inputs 1; expected a name of its own`},
		{"scale = 0.1", "scale = 0.0", `states 1, scale: 0; expected a typical size above 0`},
		{`unit = "m"`, `unit = "m\u0000"`, `states 1, unit: control characters in "m\x00"; expected visible characters only`},
		{"[[states]]\nname = \"speed\"\n", "", `states: 1 block; expected 2 (one per state) or none`},
		{"[[inputs]]", "[[inputs]]\n[[inputs]]", `inputs: 2 blocks; expected 1 (one per input) or none`},
		{"[[inputs]]", "[inputs]", `inputs: a table; expected blocks [[inputs]]`},
		{"range = [-5.0, 5.0]", "range = [5.0, -5.0]", `inputs 1, range: [5 -5]; expected [low, high] with low below high`},
		{"range = [-5.0, 5.0]", "range = [" + strings.Repeat("1,", 100000) + "1]", `inputs 1, range: 100001 entries; expected [low, high]`},
		{"range = [-5.0, 5.0]", "delay_samples = -1", `inputs 1, delay_samples: -1; expected 0 to 100 whole samples`},
		{"range = [-5.0, 5.0]", "delay_samples = 101", `inputs 1, delay_samples: 101; expected 0 to 100 whole samples`},
		{"range = [-5.0, 5.0]", "delay_samples = 1.5", `inputs 1, delay_samples: the number 1.5; expected a whole number`},
		{"range = [-5.0, 5.0]", "lag_s = -1.0", `inputs 1, lag_s: -1; expected 0 (none) or above`},
		{"range = [-5.0, 5.0]", "resolution = -1.0", `inputs 1, resolution: -1; expected 0 (none) or above`},
		{"noise_std = 0.01", "noise_std = -0.01", `sensors 1, noise_std: negative noise -0.01; expected 0 or above`},
		{"noise_std = 0.01", "noise_std = 0.01\nnoise_density = 1.0", `sensors 1: both noise_std and noise_density; expected one of them`},
		{"noise_std = 0.01", "enabled = false", `sensors: none is enabled; expected at least one`},
		{"noise_std = 0.01", "noise_std = 1e400", `line 37, column 13: unable to parse float: strconv.ParseFloat: parsing "1e400": value out of range; expected a TOML file`},
		{"noise_std = 0.01", "wrap = -1.0", `sensors 1, wrap: -1; expected 0 (none) or above`},
		{"period_s = 0.1\n", "", `sensors 1, noise_std: the noise of one sample without period_s; expected noise_density, or period_s in [model]`},
		{"row = [1.0, \"2*mass\"]", "row = [1.0]", `outputs 1, row: 1 entry; expected 2 (one per state)`},
		{"row = [1.0, \"2*mass\"]", "row = [1.0, \"1/0\"]", `outputs 1, row, row 1, column 2: "1/0" is +Inf; expected a finite number`},
		{`name = "sum"`, "", `outputs 1, name: empty; expected a name`},
		{"density = [0.5]", "density = [0.5, 0.5]", `process_noise, density: 2 entries; expected one per column of G: 1`},
		{"density = [0.5]", "density = [-0.5]", `process_noise, density, entry 1: negative noise -0.5; expected 0 or above`},
		{"density = [0.5]", "std = [0.5]", `process_noise, std: a standard deviation per step for a continuous plant; expected density`},
		{"density = [0.5]", "density = [0.5]\nstd = [0.5]", `process_noise: both density and std; expected one of them`},
		{"density = [0.5]", "covariance = [[1, 0], [0, 1]]", `process_noise, covariance: 2×2; expected 1×1 (one per column of G: 1)`},
		{"density = [0.5]", "covariance = [[-1]]", `process_noise, covariance, row 1, column 1: negative noise -1; expected 0 or above`},
		{"[feedback]", "[sensor_noise]\ncovariance = [[1, 0.5], [0.4, 1]]\n[feedback]", `sensor_noise, covariance, row 1, column 2: 0.5, but 0.4 across the diagonal; expected a symmetric matrix`},
		{"[feedback]", "[sensor_noise]\ncovariance = [[1, 2], [2, 1]]\n[feedback]", `sensor_noise, covariance, row 1, column 2: 2 is more than its variances allow; expected at most 1 in size`},
		{"[feedback]", "[sensor_noise]\ncovariance = [[1]]\n[feedback]", `sensor_noise, covariance: 1×1; expected 2×2 (one per sensor)`},
		{"K = [[3, 4]]", "K = [[3, 4], [5, 6]]", `feedback, K: 2×2; expected 1×2 (1 input, 2 states)`},
		{"K = [[3, 4]]", "K = [[3, 4, 5]]", `feedback, K: 1×3; expected 1×2 (1 input, 2 states)`},
		{"K = [[3, 4]]", `K = [[3, "1/0"]]`, `feedback, K, row 1, column 2: "1/0" is +Inf; expected a finite number`},
		{"K = [[3, 4]]", "", `feedback, K: missing; expected 1×2 (1 input, 2 states)`},
		{`cancel = ["force"]`, `cancel = ["push"]`, `feedback, cancel, entry 1: unknown input "push"; expected one of "force"`},
		{`kind = "input-offset"`, `kind = "input-ramp"`, `feedback, cancel, entry 1: no offset is estimated on "force"; expected [[unknowns]] of kind "input-offset" on it`},
		{`kind = "input-offset"`, `kind = "offset"`, `unknowns 1, kind: "offset"; expected "input-offset", "sensor-offset", "input-ramp" or "input-sine"`},
		{`on = "force"`, `on = "encoder"`, `unknowns 1, on: unknown input "encoder"; expected one of "force"`},
		{`kind = "input-offset"`, `kind = "sensor-offset"`, `unknowns 1, on: unknown sensor "force"; expected one of "encoder", "tacho"`},
		{"drift = 0.2", "drift = 0.0", `unknowns 1, drift: 0; expected a density above 0`},
		{"drift = 0.2", "", `unknowns 1, drift: missing; expected a density above 0`},
		{"drift = 0.2", "drift = 0.2\nscale = -1.0", `unknowns 1, scale: -1; expected a typical size above 0`},
		{"drift = 0.2", "drift = 0.2\nfrequency_hz = 1.0", `unknowns 1, frequency_hz: given for "input-offset"; expected with "input-sine" only`},
		{"drift = 0.2", "drift = 0.2\n[[unknowns]]\nkind = \"input-sine\"\non = \"force\"\ndrift = 1.0", `unknowns 2, frequency_hz: missing; expected a frequency above 0 in Hz`},
		{"drift = 0.2", "drift = 0.2\n[[unknowns]]\nkind = \"input-sine\"\non = \"force\"\ndrift = 1.0\nfrequency_hz = 5.0", `unknowns 2, frequency_hz: 5; expected below half the sample rate, 5 Hz`},
		{"drift = 0.2", "drift = 0.2\n[[unknowns]]\nkind = \"input-offset\"\non = \"force\"\ndrift = 1.0", `unknowns 2: the same as unknowns 1; expected each unknown once`},
	} {
		t.Run("", func(t *testing.T) {
			if got := mustFail(t, "cart.toml", changed(t, c.old, c.replacement)); got != "cart.toml: "+c.want {
				t.Errorf("%.60q → %.80q\n got %s\nwant cart.toml: %s", c.old, c.replacement, got, c.want)
			}
		})
	}
}

// TestRefusedWhole has texts that are wrong as a whole: too large, too deep, not
// what the ending says.
func TestRefusedWhole(t *testing.T) {
	const model = "[model]\ntime = \"continuous\"\n"
	row := "[" + strings.Repeat("0,", 100) + "0]"
	square := "[" + strings.Repeat(row+",", 100) + row + "]"
	for _, c := range []struct{ file, text, want string }{
		{"p.toml", "", `p.toml: format: missing; expected format = 1`},
		{"p.toml", "format = 1", `p.toml: model: missing; expected [model] with time, A and C`},
		{"p.toml", "\xff\xfe", `p.toml: not UTF-8 text; expected a text file in UTF-8`},
		{"p.toml", "format = 1\n#" + strings.Repeat("x", 1<<20), `p.toml: 1048588 bytes long; expected at most 1048576`},
		{"p.toml", "format = 1\n" + model + "C = [[1]]\nA = " + square, `p.toml: model, A: 101 of them; expected at most 100`},
		{"p.toml", "format = 1\n" + model + "C = [" + strings.Repeat("[1],", 31) + "]\nA = [[1]]", `p.toml: model, C: 31 of them; expected at most 30`},
		{"p.toml", "format = 1\n" + model + "C = [[1]]\nA = [[1]]\nB = [" + row + "]", `p.toml: model, B: 101 of them; expected at most 30`},
		{"p.toml", "format = 1\n" + model + "C = [[1]]\nA = [[1]]\nG = [" + row + "]", `p.toml: model, G: 101 of them; expected at most 100`},
		{"p.toml", "format = 1\n" + model + "C = [[1]]\nA = [[1]]\n" + strings.Repeat("[[outputs]]\n", 101), `p.toml: outputs: 101 of them; expected at most 100`},
		{"p.toml", "format = 1\n" + model + "C = [[1]]\nA = [[1]]\n" + strings.Repeat("[[unknowns]]\n", 31), `p.toml: unknowns: 31 of them; expected at most 30`},
		{"p.toml", "format = 1\n" + model + "C = [[1]]\nA = [[1]]\n[feedback]\nK = [[1]]", `p.toml: feedback: a plant without inputs; expected B in [model]`},
		{"p.toml", "format = 1\n" + model + "C = [[1]]\nA = [[1]]\n[[sensors]]\nenabled = false", `p.toml: sensors: none is enabled; expected at least one`},
		{"p.toml", "format = 1\n[model]\ntime = \"discrete\"\nC = [[1]]\nA = [[1]]", `p.toml: model, period_s: missing; expected the sample period of a discrete plant in s`},
		{"p.toml", "format = 1\n[model]\ntime = \"discrete\"\nperiod_s = 1\nC = [[1]]\nA = [[1]]\n[process_noise]\ndensity = [1]", `p.toml: process_noise, density: a density for a discrete plant; expected std, per step`},
		{"p.toml", "a = " + strings.Repeat("[", 1<<19), `p.toml: line 1, column 10005: arrays and inline tables are nested more than the maximum of 10000 levels deep; expected a TOML file`},
		{"p.toml", strings.Repeat("a.", 1<<18) + "a = 1", `p.toml: a: unknown key; expected one of format, name, note, parameters, model, operating_point, states, inputs, sensors, outputs, process_noise, sensor_noise, feedback, unknowns`},
		{"p.toml", strings.Repeat("k", 1<<19) + " = 1", `p.toml: kkkkkkkkkkkkkkkkkkkkkkkkkkkkkkkkkkkkkkkkkkkkkkkkkkkkkkkkk...: unknown key; expected one of format, name, note, parameters, model, operating_point, states, inputs, sensors, outputs, process_noise, sensor_noise, feedback, unknowns`},
		{"p.toml", "[parameters]\n" + strings.Repeat("k", 1<<19) + " = { value = true }", `p.toml: parameters, kkkkkkkkkkkkkkkkkkkkkkkkkkkkkkkkkkkkkkkkkkkkkkkkkkkkkkkkk..., value: true; expected a number`},
		{"p.json", "", `p.json: line 1: ends too early; expected a JSON file`},
		{"p.json", "[]", `p.json: a list; expected a table`},
		{"p.json", "format = 1", `p.json: line 1: invalid character 'o' in literal false (expecting 'a'); expected a JSON file`},
		{"p.json", `{"format": 1,`, `p.json: line 1: ends too early; expected a JSON file`},
		{"p.json", "{\"format\": 1,\n\"format\": 1}", `p.json: line 2: the key "format" appears twice; expected a JSON file`},
		{"p.json", `{"format": 1} {}`, `p.json: line 1: text after the end of the object; expected a JSON file`},
		{"p.json", `{"format": 1e999}`, `p.json: line 1: the number "1e999" is out of range; expected a JSON file`},
		{"p.json", `{"format": null}`, `p.json: format: nothing; expected a whole number`},
		{"p.json", `{"format": 1, "model": {"time": "continuous", "A": [[1]], "C": [[NaN]]}}`, `p.json: line 1: invalid character 'N' looking for beginning of value; expected a JSON file`},
		{"p.json", `{"name": ` + strings.Repeat("[", 1<<19), `p.json: line 1: more than 32 brackets within each other; expected a JSON file`},
		{"p.json", strings.Repeat(`{"a":`, 1<<17), `p.json: line 1: more than 32 brackets within each other; expected a JSON file`},
		{"a\x1bb.toml", "[model]", `a\x1bb.toml: format: missing; expected format = 1`},
	} {
		t.Run("", func(t *testing.T) {
			if got := mustFail(t, c.file, c.text); got != c.want {
				t.Errorf("%s %.80q\n got %s\nwant %s", c.file, c.text, got, c.want)
			}
		})
	}
}

// TestManyParameters needs names of their own.
func TestManyParameters(t *testing.T) {
	var b strings.Builder
	b.WriteString("format = 1\n[parameters]\n")
	for i := range 201 {
		fmt.Fprintf(&b, "p%d = { value = 1 }\n", i)
	}
	if got, want := mustFail(t, "p.toml", b.String()), "p.toml: parameters: 201 of them; expected at most 200"; got != want {
		t.Errorf("got %s, want %s", got, want)
	}
}
