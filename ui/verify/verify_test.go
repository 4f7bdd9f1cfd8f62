package verify_test

import (
	"context"
	"crypto/sha256"
	"encoding/hex"
	"encoding/json"
	"os"
	"path/filepath"
	"strings"
	"testing"

	"polewright/estimator"
	"polewright/plants/library"
	"polewright/ui/internal/sample"
	"polewright/ui/session"
	"polewright/ui/verify"
)

// stored is a session file as a tree that a test changes by hand.
type stored struct {
	t    *testing.T
	file string
	data []byte // as saved
	tree map[string]any
}

func store(t *testing.T, plant string, entries ...sample.Entry) *stored {
	t.Helper()
	s := &stored{t: t, file: filepath.Join(t.TempDir(), "work"+session.Ending)}
	if err := sample.Save(s.file, sample.Program, plant, entries...); err != nil {
		t.Fatal(err)
	}
	data, err := os.ReadFile(s.file)
	if err != nil {
		t.Fatal(err)
	}
	s.data = data
	return s.again(t)
}

// again is the file as it was saved, for another test to change.
func (s *stored) again(t *testing.T) *stored {
	t.Helper()
	n := &stored{t: t, file: s.file, data: s.data}
	if err := json.Unmarshal(s.data, &n.tree); err != nil {
		t.Fatal(err)
	}
	return n
}

func (s *stored) candidate(i int) map[string]any {
	return s.tree["candidates"].([]any)[i].(map[string]any)
}

// text changes the text of the plant or the scenario and makes its sum fit.
func (s *stored) text(what, from, to string) {
	s.t.Helper()
	held := s.tree[what].(map[string]any)
	old := held["text"].(string)
	if !strings.Contains(old, from) {
		s.t.Fatalf("the %s holds no %q", what, from)
	}
	changed := strings.Replace(old, from, to, 1)
	sum := sha256.Sum256([]byte(changed))
	held["text"], held["sha256"] = changed, hex.EncodeToString(sum[:])
}

func (s *stored) check() *verify.Report {
	s.t.Helper()
	data, err := json.Marshal(s.tree)
	if err != nil {
		s.t.Fatal(err)
	}
	if err := os.WriteFile(s.file, data, 0o600); err != nil {
		s.t.Fatal(err)
	}
	k, err := session.LoadKept(s.file)
	if err != nil {
		s.t.Fatal(err)
	}
	r, err := verify.Check(context.Background(), k, sample.Program)
	if err != nil {
		s.t.Fatal(err)
	}
	return r
}

// keys lists what differs in candidate i.
func keys(r *verify.Report, i int) string {
	var out []string
	for _, d := range r.Candidates[i].Differences {
		out = append(out, d.Key)
	}
	return strings.Join(out, " ")
}

var (
	current = estimator.Options{Form: estimator.Current}
	quiet   = estimator.Options{Method: estimator.LeastNoise}
)

// Whatever the program saves, it finds as it saved it.
func TestEveryBuiltInPlantIsTheSame(t *testing.T) {
	for _, name := range library.Names() {
		t.Run(name, func(t *testing.T) {
			entries := []sample.Entry{{}, {Options: quiet}}
			if b, err := sample.BuiltIn(name); err == nil && b.Model.Discrete() {
				entries = append(entries, sample.Entry{Options: current})
			}
			r := store(t, name, entries...).check()
			for i, c := range r.Candidates {
				if len(c.Differences) > 0 {
					t.Errorf("%s: %+v", c.Name, c.Differences)
				}
				if c.Compared < 50 {
					t.Errorf("%s: only %d figures compared", c.Name, c.Compared)
				}
				if c.OK != c.LimitsMet {
					t.Errorf("candidate %d: ok %v, limits met %v", i, c.OK, c.LimitsMet)
				}
			}
			if !r.InHand.OK || !r.InHand.Checked {
				t.Errorf("in hand: %+v", r.InHand)
			}
		})
	}
}

func number(t *testing.T, v any) float64 {
	t.Helper()
	f, ok := v.(float64)
	if !ok {
		t.Fatalf("%v is no number", v)
	}
	return f
}

// Every hand that changes a session is found out, at the figure that it touched.
func TestChangesAreFound(t *testing.T) {
	type hand struct {
		name   string
		change func(t *testing.T, s *stored)
		want   string // a key among the differences of the first candidate
	}
	figure := func(group, key string, factor float64) func(*testing.T, *stored) {
		return func(t *testing.T, s *stored) {
			m := s.candidate(0)["measures"].(map[string]any)
			if group != "" {
				m = m[group].(map[string]any)
			}
			m[key] = number(t, m[key]) * factor
		}
	}
	entry := func(group, key string) func(*testing.T, *stored) {
		return func(t *testing.T, s *stored) {
			list := s.candidate(0)["measures"].(map[string]any)[group].(map[string]any)[key].([]any)
			list[0] = number(t, list[0]) * 1.000001
		}
	}
	saved := store(t, "lift", sample.Entry{Poles: "-18±18i, -22"}, sample.Entry{Poles: "-9±4i, -14"})
	for _, h := range []hand{
		{"a gain entry", func(t *testing.T, s *stored) {
			row := s.candidate(0)["gain"].([]any)[0].([]any)
			row[0] = number(t, row[0]) * (1 + 1e-12)
		}, "gain"},
		{"a gain entry by much", func(t *testing.T, s *stored) {
			row := s.candidate(0)["gain"].([]any)[1].([]any)
			row[0] = number(t, row[0]) * 1.5
		}, "noise.std"},
		{"gain norm", figure("", "gain_norm", 1.00001), "gain_norm"},
		{"condition", figure("", "eigenvector_condition", 0.999), "eigenvector_condition"},
		{"settle", figure("transient", "settle_s", 0.99), "transient.settle_s"},
		{"peak", figure("transient", "peak", 1.0001), "transient.peak"},
		{"over floor", figure("noise", "over_floor_rms", 0.9999), "noise.over_floor_rms"},
		{"std", entry("noise", "std"), "noise.std"},
		{"floor", entry("noise", "floor_std"), "noise.floor_std"},
		{"rounding", figure("rounding", "float32_pole_shift", 0.5), "rounding.float32_pole_shift"},
		{"phase margin", figure("loop", "phase_margin_deg", 1.001), "loop.phase_margin_deg"},
		{"sensitivity", figure("loop", "sensitivity_peak", 0.999), "loop.sensitivity_peak"},
		{"delay in samples", func(t *testing.T, s *stored) {
			l := s.candidate(0)["measures"].(map[string]any)["loop"].(map[string]any)
			l["delay_margin_samples"] = number(t, l["delay_margin_samples"]) + 1
		}, "loop.delay_margin_samples"},
		{"an eigenvalue", func(t *testing.T, s *stored) {
			z := s.candidate(0)["measures"].(map[string]any)["poles"].(map[string]any)["eigenvalues"].([]any)[0].([]any)
			z[0] = number(t, z[0]) + 1e-6
		}, "poles.eigenvalues"},
		{"a mode", func(t *testing.T, s *stored) {
			m := s.candidate(0)["measures"].(map[string]any)["observability"].(map[string]any)["modes"].([]any)[0].(map[string]any)
			m["observable"] = false
		}, "observability.modes.observable"},
		{"a wanted pole", func(t *testing.T, s *stored) {
			z := s.candidate(0)["poles"].([]any)[0].([]any)
			z[0] = number(t, z[0]) * 0.999
		}, "poles.wanted"},
		{"an unstable design called stable", func(t *testing.T, s *stored) {
			s.candidate(0)["measures"].(map[string]any)["stable"] = false
		}, "stable"},
		{"a figure taken out", func(t *testing.T, s *stored) {
			delete(s.candidate(0)["measures"].(map[string]any), "gain_norm")
		}, "gain_norm"},
		{"all figures taken out", func(t *testing.T, s *stored) { delete(s.candidate(0), "measures") }, "measures"},
		{"a figure made undefined", func(t *testing.T, s *stored) {
			s.candidate(0)["measures"].(map[string]any)["transient"].(map[string]any)["settle_s"] = nil
		}, "transient.settle_s"},
		{"a limit's value", func(t *testing.T, s *stored) {
			l := s.candidate(0)["measures"].(map[string]any)["limits"].([]any)[0].(map[string]any)
			l["value"] = number(t, l["value"]) * 0.5
		}, "limits.value"},
		{"a limit taken out", func(t *testing.T, s *stored) {
			m := s.candidate(0)["measures"].(map[string]any)
			m["limits"] = m["limits"].([]any)[1:]
		}, "limits"},
		{"two gains swapped", func(t *testing.T, s *stored) {
			a, b := s.candidate(0), s.candidate(1)
			a["gain"], b["gain"] = b["gain"], a["gain"]
			a["gain_current"], b["gain_current"] = b["gain_current"], a["gain_current"]
		}, "gain"},
		{"figures of two candidates swapped", func(t *testing.T, s *stored) {
			a, b := s.candidate(0), s.candidate(1)
			a["measures"], b["measures"] = b["measures"], a["measures"]
		}, "gain"},
		{"a row of the gain taken out", func(t *testing.T, s *stored) {
			s.candidate(0)["gain"] = s.candidate(0)["gain"].([]any)[1:]
			s.candidate(0)["gain_current"] = nil
		}, "gain"},
		{"a wanted pole taken out", func(t *testing.T, s *stored) {
			s.candidate(0)["poles"] = s.candidate(0)["poles"].([]any)[2:]
		}, "poles"},
		{"another form", func(t *testing.T, s *stored) { s.candidate(0)["form"] = "current" }, "form"},
		{"the current gain alone", func(t *testing.T, s *stored) {
			row := s.candidate(0)["gain_current"].([]any)[0].([]any)
			row[0] = number(t, row[0]) * 1.5
		}, "gain_current"},
		{"the plant's text, with its sum", func(t *testing.T, s *stored) { s.text("plant", "noise_std", "noise_std = 0.02 #") }, "noise.std"},
		{"the plant's name, with its sum", func(t *testing.T, s *stored) { s.text("plant", "Platform lift", "Platform shift") }, "plant.name"},
		{"a limit in the scenario's text, with its sum", func(t *testing.T, s *stored) {
			s.text("scenario", "settle_s", "settle_s = 7.0 #")
		}, "limits.limit"},
		{"the period", func(t *testing.T, s *stored) { s.tree["period_s"] = number(t, s.tree["period_s"]) * 2 }, "model.A"},
	} {
		t.Run(h.name, func(t *testing.T) {
			s := saved.again(t)
			h.change(t, s)
			r := s.check()
			if r.OK || r.Verdict() == nil || r.Candidates[0].OK {
				t.Fatal("not found out")
			}
			if got := " " + keys(r, 0) + " "; !strings.Contains(got, " "+h.want+" ") {
				t.Errorf("differences in%s, expected %s among them", got, h.want)
			}
		})
	}
}

func TestTextThatDoesNotMatchItsSum(t *testing.T) {
	s := store(t, "lift", sample.Entry{})
	held := s.tree["plant"].(map[string]any)
	held["text"] = held["text"].(string) + "\n# a remark\n"
	r := s.check()
	if r.OK || r.Texts[0].Matches || len(r.Candidates[0].Differences) > 0 {
		t.Errorf("got %+v", r.Texts)
	}
	if err := r.Verdict(); err == nil || !strings.Contains(err.Error(), "plant.text: does not match its sha256") {
		t.Errorf("got %v", err)
	}
}

// The design in hand has no figures: its gain is held against the selected
// candidate, else against its poles.
func TestDesignInHand(t *testing.T) {
	spoil := func(t *testing.T, s *stored) {
		s.tree["current"].(map[string]any)["gain_current"] = nil
		row := s.tree["current"].(map[string]any)["gain"].([]any)[0].([]any)
		row[0] = number(t, row[0]) * 1.02
	}
	s := store(t, "lift", sample.Entry{})
	spoil(t, s)
	if r := s.check(); r.OK || r.InHand.OK || !r.Candidates[0].OK && r.Candidates[0].LimitsMet {
		t.Errorf("selected: %+v", r.InHand)
	}
	s = store(t, "lift", sample.Entry{})
	s.tree["selected"] = ""
	if r := s.check(); !r.InHand.OK {
		t.Errorf("as saved: %+v", r.InHand)
	}
	spoil(t, s)
	if r := s.check(); r.OK || r.InHand.OK || r.InHand.Differences[0].Key != "poles" {
		t.Errorf("not selected: %+v", r.InHand)
	}
}

// A deadbeat design has eigenvalues that rounding scatters: they are held to what
// they are worth, its noise to nine digits all the same.
func TestToleranceFollowsConditioning(t *testing.T) {
	s := store(t, "lift", sample.Entry{Poles: "-15x3"})
	eigenvalues := s.candidate(0)["measures"].(map[string]any)["poles"].(map[string]any)["eigenvalues"].([]any)
	z := eigenvalues[0].([]any)
	z[0] = number(t, z[0]) + 1e-7 // a triple eigenvalue scatters by ε^(1/3), 6e-6
	if r := s.check(); strings.Contains(keys(r, 0), "poles.eigenvalues") {
		t.Errorf("a triple eigenvalue is held too tightly: %+v", r.Candidates[0].Differences)
	}
	std := s.candidate(0)["measures"].(map[string]any)["noise"].(map[string]any)["std"].([]any)
	std[1] = number(t, std[1]) * (1 + 1e-7)
	if r := s.check(); !strings.Contains(keys(r, 0), "noise.std") {
		t.Errorf("the noise is not held: %+v", r.Candidates[0].Differences)
	}
}

// Figures that another version did not know are not missed.
func TestOtherVersion(t *testing.T) {
	s := store(t, "lift", sample.Entry{Poles: "-18±18i, -22"})
	s.tree["program"] = "polewright 0.0.1"
	delete(s.candidate(0)["measures"].(map[string]any), "rounding")
	s.candidate(0)["measures"].(map[string]any)["a later figure"] = 3.0
	if r := s.check(); len(r.Candidates[0].Differences) > 0 {
		t.Errorf("got %+v", r.Candidates[0].Differences)
	}
}
