package session_test

import (
	"errors"
	"os"
	"path/filepath"
	"strings"
	"testing"

	"github.com/google/go-cmp/cmp"
	"gonum.org/v1/gonum/mat"

	"polewright/estimator"
	"polewright/plants"
	"polewright/plants/library"
	"polewright/scenarios"
	"polewright/ui/aim"
	"polewright/ui/desk"
	"polewright/ui/session"
)

// work makes a session's content on a built-in plant with two candidates.
func work(t *testing.T, name string) *desk.Work {
	t.Helper()
	text, file, ok := library.Plant(name)
	if !ok {
		t.Fatal("no such plant")
	}
	p, err := plants.Parse(file, text)
	if err != nil {
		t.Fatal(err)
	}
	sc := library.Scenarios(name)[0]
	s, err := scenarios.Parse(sc.Name, sc.Text, p)
	if err != nil {
		t.Fatal(err)
	}
	m, err := p.Model(plants.Options{})
	if err != nil {
		t.Fatal(err)
	}
	w := &desk.Work{
		Bench: &desk.Bench{Plant: p, PlantFile: file, PlantText: text, Model: m, Scenario: s, ScenarioFile: sc.Name, ScenarioText: sc.Text},
		View:  desk.View{Plane: "s", Zoom: 40, Selected: 1, Trace: 2, Shows: "innovation", Band: true},
	}
	for _, form := range []estimator.Form{estimator.Prediction, estimator.Current} {
		d, err := estimator.NewDesigner(m, estimator.Options{Form: form})
		if err != nil {
			t.Fatal(err)
		}
		list, err := aim.Start(m, d)
		if err != nil {
			t.Fatal(err)
		}
		design, err := d.Place(list, nil)
		if err != nil {
			t.Fatal(err)
		}
		w.Candidates = append(w.Candidates, desk.Candidate{Letter: string(rune('A' + len(w.Candidates))), Form: form, Poles: list, Design: design})
		w.Form, w.Poles, w.Gain, w.GainCurrent = form, list, design.Gain, design.GainCurrent
	}
	w.Current = "B"
	return w
}

func TestSaveAndReopen(t *testing.T) {
	for _, name := range []string{"lift", "balancer", "gangway"} {
		t.Run(name, func(t *testing.T) {
			w := work(t, name)
			file := filepath.Join(t.TempDir(), "work"+session.Ending)
			if err := session.Save(file, "polewright test", w, false); err != nil {
				t.Fatal(err)
			}
			if !session.Is(file) {
				t.Error("a saved session is not taken for one")
			}
			back, err := session.Load(file)
			if err != nil {
				t.Fatal(err)
			}
			if diff := cmp.Diff(w.View, back.View); diff != "" {
				t.Errorf("view: %s", diff)
			}
			if back.Current != "B" || back.Form != estimator.Current || len(back.Candidates) != 2 {
				t.Fatalf("got %+v", back)
			}
			if diff := cmp.Diff(w.Poles, back.Poles); diff != "" {
				t.Errorf("poles: %s", diff)
			}
			for i, c := range w.Candidates {
				r := back.Candidates[i]
				if !mat.Equal(c.Design.Gain, r.Design.Gain) {
					t.Errorf("%s: the gain changed", c.Letter)
				}
				if diff := cmp.Diff(c.Design.Noise.Std, r.Design.Noise.Std); diff != "" {
					t.Errorf("%s: noise: %s", c.Letter, diff)
				}
			}
			if string(back.Bench.PlantText) != string(w.Bench.PlantText) {
				t.Error("the plant's text changed")
			}
		})
	}
}

func TestSaveRefusesAnExistingFile(t *testing.T) {
	w := work(t, "lift")
	file := filepath.Join(t.TempDir(), "work"+session.Ending)
	if err := os.WriteFile(file, []byte("kept"), 0o600); err != nil {
		t.Fatal(err)
	}
	if err := session.Save(file, "polewright test", w, false); !errors.Is(err, os.ErrExist) {
		t.Errorf("got %v", err)
	}
	if got, _ := os.ReadFile(file); string(got) != "kept" {
		t.Error("the file was overwritten")
	}
	if err := session.Save(file, "polewright test", w, true); err != nil {
		t.Error(err)
	}
}

func TestBadSessions(t *testing.T) {
	w := work(t, "lift")
	dir := t.TempDir()
	good := filepath.Join(dir, "good"+session.Ending)
	if err := session.Save(good, "polewright test", w, false); err != nil {
		t.Fatal(err)
	}
	data, err := os.ReadFile(good)
	if err != nil {
		t.Fatal(err)
	}
	change := func(from, to string) string {
		if !strings.Contains(string(data), from) {
			t.Fatalf("the session holds no %q", from)
		}
		return strings.Replace(string(data), from, to, 1)
	}
	for name, c := range map[string]struct{ text, want string }{
		"newer":     {change(`"format": 1`, `"format": 2`), "format: 2 was written by a newer polewright"},
		"no format": {`{"plant": {}}`, "format: missing"},
		"no json":   {"A letter.", "line 1: not a session file"},
		"cut short": {string(data[:len(data)/2]), "not a session file"},
		"changed":   {change("Platform lift", "Platform shift"), "plant.text: does not match its sha256"},
		"form":      {change(`"form": "prediction"`, `"form": "sideways"`), `form: "sideways"; prediction or current`},
		"selected":  {change(`"selected": "B"`, `"selected": "Q"`), `selected: no candidate "Q"`},
		"trailing":  {string(data) + "{}", "not a session file"},
	} {
		t.Run(name, func(t *testing.T) {
			file := filepath.Join(dir, "bad"+session.Ending)
			if err := os.WriteFile(file, []byte(c.text), 0o600); err != nil {
				t.Fatal(err)
			}
			_, err := session.Load(file)
			if err == nil || !strings.Contains(err.Error(), c.want) {
				t.Errorf("got %v, expected %q", err, c.want)
			}
			if err != nil && strings.Contains(err.Error(), "\n") {
				t.Error("more than one line")
			}
		})
	}
}
