package session_test

import (
	"bytes"
	"encoding/json"
	"fmt"
	"os"
	"path/filepath"
	"strings"
	"testing"
	"time"
	"unicode"

	"polewright/ui/session"
)

// FuzzLoad holds that no content of a session file, whole or damaged, panics,
// answers in more than a line, or brings to the screen what a terminal could take
// for a command.
func FuzzLoad(f *testing.F) {
	w, err := session.Load(golden)
	if err != nil {
		f.Fatal(err)
	}
	good, err := session.EncodeDraft("fuzz", w, &session.Mark{File: "/x/y.session.json", Plant: "x"})
	if err != nil {
		f.Fatal(err)
	}
	var small bytes.Buffer
	if err := json.Compact(&small, good); err != nil {
		f.Fatal(err)
	}
	f.Add(small.Bytes())
	f.Add(small.Bytes()[:small.Len()/2])
	for _, text := range []string{``, `{}`, `[]`, `null`, `{"format":1}`, `{"format":2}`, `{"format":1e999}`, `{"format":"1"}`,
		`{"format":1,"plant":{"file":"../../x","sha256":"","text":""}}`, strings.Repeat(`[`, 20000),
		`{"format":1,"candidates":[{"poles":[[1,2,3],[null]]}],"current":{"gain":[[1],[1,2]]}}`} {
		f.Add([]byte(text))
	}
	f.Fuzz(func(t *testing.T, data []byte) {
		if m := session.DraftMark(data); m != nil {
			tame(t, "title", session.Printable(m.Plant, 60))
		}
		began := time.Now()
		w, err := session.Decode("fuzz.session.json", data)
		if d := time.Since(began); d > 10*time.Second {
			t.Fatalf("decoding took %v", d)
		}
		if err != nil {
			tame(t, "error", err.Error())
			return
		}
		for _, s := range []string{w.Bench.PlantFile, w.Bench.ScenarioFile, w.Bench.TruthFile, w.Current, w.View.Plane, w.View.Focus, w.View.Shows} {
			tame(t, "text", s)
		}
		for _, c := range w.Candidates {
			tame(t, "letter", c.Letter)
			tame(t, "note", c.Note)
		}
		// what opens can be kept and opens again
		again, err := session.EncodeDraft("fuzz", w, nil)
		if err != nil {
			t.Fatal(err)
		}
		if _, err := session.Decode("again.session.json", again); err != nil {
			t.Fatalf("opened, kept, and then: %v", err)
		}
	})
}

func tame(t *testing.T, what, s string) {
	t.Helper()
	for _, r := range s {
		if !unicode.IsPrint(r) {
			t.Fatalf("%s %q has %U", what, s, r)
		}
	}
	if len(s) > 2000 {
		t.Fatalf("%s of %d bytes", what, len(s))
	}
}

// A session whose every name is an attack shows nothing of it.
func TestHostileNames(t *testing.T) {
	const attack = "\x1b]0;x\x07\u202eevil\u2066\u009b2J\r\n\x00" // title, overrides, C1, ends of line
	for given, want := range map[string]string{
		"../../../etc/passwd":                  "passwd.toml",
		`..\..\boot.toml`:                      "boot.toml",
		"-rf.toml":                             "rf.toml",
		".profile.toml":                        "profile.toml",
		"":                                     "unnamed.toml",
		"...":                                  "unnamed.toml",
		attack + ".toml":                       "]0;xevil2J.toml",
		strings.Repeat("long", 1000) + ".toml": strings.Repeat("long", 30) + ".toml",
		"plant.toml\x1b[2J":                    "plant.toml",
		"Aufzug \u00fcber \u4e8c Stockwerke.toml": "Aufzug \u00fcber \u4e8c Stockwerke.toml",
	} {
		w := work(t, "lift")
		w.Bench.PlantFile, w.Bench.ScenarioFile = given, given
		w.Candidates[0].Note = attack
		w.Candidates[0].Letter, w.Current = "A"+attack, "A"+attack
		w.View.Focus, w.View.Plane, w.View.Shows = attack, attack, attack
		data, err := session.Encode("polewright test", w)
		if err != nil {
			t.Fatal(err)
		}
		file := filepath.Join(t.TempDir(), "hostile"+session.Ending)
		if err := os.WriteFile(file, data, 0o600); err != nil {
			t.Fatal(err)
		}
		back, err := session.Load(file)
		if err != nil {
			t.Fatalf("%q: %v", given, err)
		}
		if back.Bench.PlantFile != want || given != "" && back.Bench.ScenarioFile != want {
			t.Errorf("%q became %q and %q, expected %q", given, back.Bench.PlantFile, back.Bench.ScenarioFile, want)
		}
		for _, s := range []string{back.Candidates[0].Letter, back.Candidates[0].Note, back.Current, back.View.Focus, back.View.Plane, back.View.Shows} {
			tame(t, "text", s)
		}
		if back.Current != back.Candidates[0].Letter {
			t.Errorf("selected %q is no longer candidate %q", back.Current, back.Candidates[0].Letter)
		}
	}
}

func TestBounds(t *testing.T) {
	data, err := os.ReadFile(golden)
	if err != nil {
		t.Fatal(err)
	}
	var doc map[string]any
	for name, c := range map[string]struct {
		change func()
		want   string
	}{
		"candidates": {func() {
			list := doc["candidates"].([]any)
			for i := range 101 {
				c := map[string]any{}
				for k, v := range list[0].(map[string]any) {
					c[k] = v
				}
				c["name"] = fmt.Sprint("N", i)
				list = append(list, c)
			}
			doc["candidates"] = list
		}, "candidates: 103 of them; at most 100"},
		"poles": {func() {
			doc["current"].(map[string]any)["poles"] = make([][2]float64, 5000)
		}, "current, poles: 5000 of them; at most 1000"},
		"text": {func() {
			doc["plant"].(map[string]any)["text"] = strings.Repeat("#", 2<<20)
		}, "plant.text: 2097152 bytes; at most 1048576"},
		"gain": {func() {
			doc["current"].(map[string]any)["gain"] = make([][1]float64, 3000)
		}, "the gain is 3000×1"},
		"no gain": {func() {
			doc["candidates"].([]any)[0].(map[string]any)["gain"] = nil
			doc["candidates"].([]any)[0].(map[string]any)["gain_current"] = nil
		}, "candidates 1, gain: missing"},
		"huge exponent": {func() {
			doc["period_s"] = json.RawMessage("1e999")
		}, "cannot unmarshal number 1e999"},
	} {
		t.Run(name, func(t *testing.T) {
			doc = nil
			if err := json.Unmarshal(data, &doc); err != nil {
				t.Fatal(err)
			}
			c.change()
			bad, err := json.Marshal(doc)
			if err != nil {
				t.Fatal(err)
			}
			_, err = session.Decode("bad.session.json", bad)
			if err == nil || !strings.Contains(err.Error(), c.want) || strings.Contains(err.Error(), "\n") {
				t.Errorf("got %v, expected %q", err, c.want)
			}
		})
	}

	// a file that is too large is not read to its end
	file := filepath.Join(t.TempDir(), "huge"+session.Ending)
	if err := os.WriteFile(file, nil, 0o600); err != nil {
		t.Fatal(err)
	}
	if err := os.Truncate(file, 1<<40); err != nil {
		t.Skip(err)
	}
	if _, err := session.Load(file); err == nil || !strings.Contains(err.Error(), "larger than") {
		t.Errorf("got %v", err)
	}
}
