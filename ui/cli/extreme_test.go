package cli_test

import (
	"encoding/json"
	"os"
	"path/filepath"
	"regexp"
	"strings"
	"testing"
	"time"
	"unicode"
)

// spring is a mass on a spring, seen by one sensor; a case changes its text.
const spring = `format = 1
name = "Spring"
[model]
time = "continuous"
A = [[0, 1], [-4, -0.4]]
B = [[0], [1]]
C = [[1, 0]]
[[inputs]]
name = "push"
[[sensors]]
name = "ruler"
noise_density = 0.01
[process_noise]
density = [0.0, 1.0]
[feedback]
K = [[1, 1]]
`

// edge is one malformed or extreme design as a person would give it: changes to
// the spring's file (old, new, old, new …), options, and what comes of them.
type edge struct {
	name   string
	change []string
	args   string // without spaces within an option
	status int
	says   string // in the line on stderr, or in the warnings
	blank  string // keys that are null or left out
	filled string // keys that are not
}

const (
	sampled = `time = "continuous"` // what gives way to a period
	every   = sampled + "\nperiod_s = "
	density = "noise_density = 0.01"
	std     = "noise_std = 0.1"
	noises  = "density = [0.0, 1.0]"
	plantA  = "A = [[0, 1], [-4, -0.4]]"
	plantC  = "C = [[1, 0]]"
	plantK  = "[feedback]\nK = [[1, 1]]\n"
)

// figures of a design that is stable and whose noise is defined.
const figures = "noise.std transient.settle_s gain eigenvector_condition"

func edges() []edge {
	in100ms := []string{sampled, every + "0.1", density, std}
	plus := func(list []string, more ...string) []string { return append(append([]string(nil), list...), more...) }
	return []edge{
		// what the sensors see
		{name: "unobservable", change: []string{plantA, "A = [[-1, 0], [0, -2]]"}, args: "--poles -3,-4", status: 1, says: "-2"},
		{name: "unobservable and left alone", change: []string{plantA, "A = [[-1, 0], [0, -2]]"}, args: "--poles -3,-2", filled: figures},
		{name: "an unstable mode unseen", change: []string{plantA, "A = [[-1, 0], [0, 2]]"}, args: "--poles -3", status: 1, says: "no gain can help"},
		{name: "an integrator unseen", change: []string{plantA, "A = [[-1, 0], [0, 0]]"}, args: "--poles -3", status: 1, says: "no gain can help"},
		{name: "a sensor that sees nothing", change: []string{plantC, "C = [[0, 0]]"}, args: "--poles -3,-4", status: 1, says: "-0.2"},
		{name: "a mode hardly seen", change: []string{plantA, "A = [[-1, 0], [0, -2]]", plantC, "C = [[1, 1e-6]]"}, args: "--poles -3,-4", filled: figures},
		{name: "one state", change: []string{plantA, "A = [[1]]", "B = [[0], [1]]", "B = [[1]]", plantC, "C = [[2]]", noises, "density = [1.0]", "K = [[1, 1]]", "K = [[3]]"}, args: "--poles -4", filled: figures},
		{name: "no states", change: []string{plantA, "A = []"}, args: "--poles -4", status: 2, says: "model, A: missing or empty"},
		{name: "no sensors", change: []string{plantC, "C = []"}, args: "--poles -4", status: 2, says: "model, C: missing or empty"},

		// the poles
		{name: "all poles equal", args: "--poles -5x2", says: "fewer eigenvectors", filled: "noise.std transient.settle_s gain", blank: "eigenvector_condition"},
		{name: "a defective plant", change: []string{plantA, "A = [[-1, 1], [0, -1]]"}, args: "--poles -5,-6", filled: figures},
		{name: "the plant's own poles", change: []string{plantA, "A = [[-1, 0], [1, -2]]", plantC, "C = [[0, 1]]"}, args: "--poles -1,-2", filled: figures},
		{name: "unstable poles", args: "--poles 1,2", says: "unstable", blank: "noise.std transient.settle_s loop.phase_margin_deg"},
		{name: "poles on the limit", args: "--poles 2i,-2i", says: "unstable", blank: "noise.std"},
		{name: "very fast", args: "--poles -1e6,-2e6", filled: figures},
		{name: "very slow", args: "--poles -1e-6,-2e-6", says: "reached only", filled: figures},
		{name: "beyond numbers", args: "--poles -1e150,-2e150", status: 2, says: "too large"},
		{name: "a power too much", args: "--poles -1e400,-2", status: 2, says: "1e400"},
		{name: "no number", args: "--poles NaN,-2", status: 2, says: "NaN"},
		{name: "infinite", args: "--poles -Inf,-2", status: 2, says: "Inf"},
		{name: "half a pair", args: "--poles -4+3i,-6", status: 2, says: "-4+3i"},
		{name: "too many", args: "--poles -1,-2,-3", status: 2, says: "3 poles"},
		{name: "none", args: "--poles ,", status: 2, says: "--poles"},
		{name: "a million of one", args: "--poles -8x1000000", status: 2, says: "1000000"},
		{name: "a pattern without a speed", args: "--poles bessel@0", status: 2, says: "bessel"},
		{name: "a pattern of infinite speed", args: "--poles butterworth@1e999", status: 2, says: "butterworth"},
		{name: "deadbeat", change: in100ms, args: "--poles 0,0 --plane z", says: "fewer eigenvectors", filled: "noise.std transient.settle_s gain", blank: "eigenvector_condition"},
		{name: "at the sampling limit", change: in100ms, args: "--poles -0.5,0.2 --plane z", says: "sampling limit", filled: figures},
		{name: "faster than the samples tell", change: in100ms, args: "--poles -4+100i,-4-100i", status: 2, says: "period"},
		{name: "the current form without a period", args: "--poles -5,-6 --form current", status: 2, says: "sample period"},
		{name: "a period of 1000 s", change: []string{sampled, every + "1000", density, std}, args: "--poles 0.5,0.4 --plane z", status: 1, says: "modes"},
		{name: "a period of 1 ns", change: []string{sampled, every + "1e-9", density, std}, args: "--poles -5,-6", filled: "gain"},

		// noise
		{name: "no sensor noise", change: []string{density, "noise_density = 0"}, args: "--poles -5,-6", says: "no noise at all", filled: figures, blank: "noise.floor_std noise.over_floor_rms"},
		{name: "no floor to go to", change: []string{density, "noise_density = 0"}, args: "--poles floor", status: 2, says: "no best linear estimator"},
		{name: "no process noise", change: []string{noises, "density = [0.0, 0.0]"}, args: "--poles -5,-6", says: "no process noise", filled: figures},
		{name: "no noise at all", change: []string{noises, "density = [0.0, 0.0]", density, "noise_density = 0"}, args: "--poles -5,-6", says: "no process noise", filled: figures},
		{name: "a floor on the limit", change: []string{noises, "density = [0.0, 0.0]", plantA, "A = [[0, 1], [0, 0]]"}, args: "--poles -5,-6", says: "no best linear estimator", filled: figures, blank: "noise.over_floor_rms"},
		{name: "enormous noise", change: []string{density, "noise_density = 1e80"}, args: "--poles -5,-6", filled: figures},
		{name: "noise beyond numbers", change: []string{density, "noise_density = 1e300"}, args: "--poles -5,-6", status: 2, says: "1e+300"},
		{name: "infinite noise", change: []string{density, "noise_density = inf"}, args: "--poles -5,-6", status: 2, says: "+Inf"},
		{name: "negative noise", change: []string{density, "noise_density = -1"}, args: "--poles -5,-6", status: 2, says: "negative noise"},
		{name: "tiny noise", change: []string{density, "noise_density = 1e-80", noises, "density = [0.0, 1e-80]"}, args: "--poles -5,-6", filled: figures},
		{name: "a variance that underflows", change: plus(in100ms, std, "noise_std = 1e-170"), args: "--poles -5,-6", filled: "noise.std gain"},

		// numbers
		{name: "NaN in A", change: []string{plantA, "A = [[0, nan], [-4, -0.4]]"}, args: "--poles -5,-6", status: 2, says: "model, A, row 1, column 2: NaN"},
		{name: "A of 1e150", change: []string{plantA, "A = [[0, 1], [-1e150, -0.4]]"}, args: "--poles -5,-6", status: 2, says: "1e+150"},
		{name: "C of 1e200", change: []string{plantC, "C = [[1e200, 0]]"}, args: "--poles -5,-6", status: 2, says: "1e+200"},
		{name: "a tower of powers", change: []string{plantA, `A = [[0, 1], ["-9^9^9^9", -0.4]]`}, args: "--poles -5,-6", status: 2, says: "-Inf"},
		{name: "zero over zero", change: []string{plantA, `A = [[0, 1], ["0/0", -0.4]]`}, args: "--poles -5,-6", status: 2, says: "NaN"},
		{name: "units of 1e-9 and 1e9", change: []string{plantA, "A = [[0, 1e-18], [-4e18, -0.4]]", "[[inputs]]", "[[states]]\nname = \"far\"\nscale = 1e-9\n[[states]]\nname = \"wide\"\nscale = 1e9\n[[inputs]]", plantK, ""}, args: "--poles -5,-6", filled: figures},
		{name: "the same without scales", change: []string{plantA, "A = [[0, 1e-18], [-4e18, -0.4]]", plantK, ""}, args: "--poles -5,-6", status: 1, says: "scale"},
		{name: "a singular A in current form", change: []string{sampled, "time = \"discrete\"\nperiod_s = 0.1", plantA, "A = [[0, 0], [1, 0.5]]", plantC, "C = [[0, 1]]", density, std, noises, "std = [0.0, 1.0]", plantK, ""}, args: "--poles 0.3 --form current", filled: "gain gain_current noise.std"},

		// the control loop and gains found elsewhere
		{name: "a controller that destabilises", change: []string{"K = [[1, 1]]", "K = [[-10, -10]]"}, args: "--poles -5,-6", says: "control loop is unstable", filled: figures, blank: "loop.phase_margin_deg loop.input_std"},
		{name: "a controller that does nothing", change: []string{"K = [[1, 1]]", "K = [[0, 0]]"}, args: "--poles -5,-6", filled: figures, blank: "loop.phase_margin_deg"},
		{name: "a gain that destabilises", args: "--use-gain [[-3],[0]]", says: "unstable", blank: "noise.std"},
		{name: "a gain of zero", args: "--use-gain [[0],[0]]", filled: figures},
		{name: "a gain of 1e90", args: "--use-gain [[1e90],[1e90]]", says: "no steady state that can be computed", blank: "noise.std"},
		{name: "a gain of 1e150", args: "--use-gain [[1e150],[0]]", status: 2, says: "1e+150"},
		{name: "a gain beyond numbers", args: "--use-gain [[1e999],[0]]", status: 2, says: "--use-gain"},
		{name: "a gain of another shape", args: "--use-gain [[1,2]]", status: 2, says: "2 x 1"},
		{name: "a gain of words", args: `--use-gain [["x"],[0]]`, status: 2, says: "--use-gain"},
	}
}

// text is the plant file of the case.
func (c *edge) text(t *testing.T) string {
	t.Helper()
	text := spring
	for i := 0; i < len(c.change); i += 2 {
		if !strings.Contains(text, c.change[i]) {
			t.Fatalf("no %q in the file", c.change[i])
		}
		text = strings.Replace(text, c.change[i], c.change[i+1], 1)
	}
	return text
}

// notNumbers are words that a number turns into where nobody looked.
var notNumbers = regexp.MustCompile(`(?i)\b(nan|[-+]?inf(inity)?)\b`)

// Each design at the edge ends in a figure or in an honest reason, as JSON and in
// print, with the exit status that says which.
func TestDesignsAtTheEdge(t *testing.T) {
	list := edges()
	if len(list) < 40 {
		t.Errorf("only %d cases", len(list))
	}
	for _, c := range list {
		t.Run(c.name, func(t *testing.T) {
			file := filepath.Join(t.TempDir(), "spring.toml")
			if err := os.WriteFile(file, []byte(c.text(t)), 0o600); err != nil {
				t.Fatal(err)
			}
			args := append([]string{"design", file}, strings.Fields(c.args)...)
			began := time.Now()
			status, printed, errs := run(t, args...)
			statusJSON, out, errsJSON := run(t, append(args, "--json")...)
			if d := time.Since(began); d > 5*time.Second {
				t.Errorf("took %v", d)
			}
			if status != c.status || statusJSON != c.status || errs != errsJSON {
				t.Fatalf("status %d, as JSON %d, expected %d\n%s%s", status, statusJSON, c.status, errs, errsJSON)
			}
			if c.status != 0 {
				c.refused(t, printed+out, errs)
				return
			}
			c.judged(t, printed, out)
		})
	}
}

// refused holds that there is one line, and that line the reason.
func (c *edge) refused(t *testing.T, out, errs string) {
	t.Helper()
	if out != "" {
		t.Errorf("a refused design prints %q", out)
	}
	if strings.Count(errs, "\n") != 1 || !strings.HasPrefix(errs, "polewright: ") || !strings.Contains(errs, c.says) {
		t.Errorf("the line is %q, expected something about %q", errs, c.says)
	}
	if strings.Contains(errs, "panic") || strings.ContainsFunc(strings.TrimSuffix(errs, "\n"), unicode.IsControl) {
		t.Errorf("%q", errs)
	}
}

// judged holds that figures are there or null, and that a null has its reason.
func (c *edge) judged(t *testing.T, printed, out string) {
	t.Helper()
	var doc map[string]any
	if err := json.Unmarshal([]byte(out), &doc); err != nil {
		t.Fatalf("no JSON: %v", err)
	}
	for _, text := range []string{printed, out} {
		if word := notNumbers.FindString(text); word != "" {
			t.Errorf("%q is printed in\n%s", word, text)
		}
	}
	for key := range strings.FieldsSeq(c.filled) {
		if v, _ := at(doc, key); v == nil {
			t.Errorf("%s is not there", key)
		}
	}
	for key := range strings.FieldsSeq(c.blank) {
		if v, _ := at(doc, key); v != nil {
			t.Errorf("%s is %v", key, v)
		}
	}
	warnings, _ := json.Marshal(doc["warnings"])
	if !strings.Contains(string(warnings), c.says) {
		t.Errorf("the warnings are %s, expected something about %q", warnings, c.says)
	}
	if c.says != "" && !strings.Contains(printed, c.says) {
		t.Errorf("%q is not in print:\n%s", c.says, printed)
	}
}
