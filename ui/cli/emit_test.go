package cli_test

import (
	"crypto/sha256"
	"encoding/hex"
	"encoding/json"
	"os"
	"os/exec"
	"path/filepath"
	"strings"
	"testing"

	"polewright/estimator"
	"polewright/ui/desk"
	"polewright/ui/internal/sample"
	"polewright/ui/session"
)

type emittedDoc struct {
	Files []struct {
		Name, Path, SHA256 string
		Bytes              int
	}
	SelfTest string `json:"self_test"`
}

func emitted(t *testing.T, session, candidate, as, out string, more ...string) emittedDoc {
	t.Helper()
	text := must(t, append([]string{"emit", session, "--candidate", candidate, "--as", as, "--out", out, "--json"}, more...)...)
	var doc emittedDoc
	if err := json.Unmarshal([]byte(text), &doc); err != nil {
		t.Fatal(err)
	}
	return doc
}

func savedSession(t *testing.T, plant string, entries ...sample.Entry) string {
	t.Helper()
	file := filepath.Join(t.TempDir(), plant+".session.json")
	if err := sample.Save(file, sample.Program, plant, entries...); err != nil {
		t.Fatal(err)
	}
	return file
}

// The listing is what stands in the folder, nothing else does, and the same session
// gives the same bytes.
func TestEmittedFilesAreAsListed(t *testing.T) {
	file := savedSession(t, "lift", sample.Entry{Poles: "-18±18i, -22"})
	for as, count := range map[string]int{"c99": 2, "st": 2, "json": 1, "csv": 1} {
		a, b := t.TempDir(), t.TempDir()
		doc := emitted(t, file, "A", as, a)
		emitted(t, file, "A", as, b)
		stand, err := os.ReadDir(a)
		if err != nil {
			t.Fatal(err)
		}
		if len(doc.Files) != count || len(stand) != count {
			t.Errorf("%s: %d files listed, %d stand there, expected %d", as, len(doc.Files), len(stand), count)
		}
		for _, f := range doc.Files {
			text, err := os.ReadFile(f.Path)
			if err != nil {
				t.Fatal(err)
			}
			again, err := os.ReadFile(filepath.Join(b, f.Name))
			if err != nil {
				t.Fatal(err)
			}
			if sum := sha256.Sum256(text); hex.EncodeToString(sum[:]) != f.SHA256 || len(text) != f.Bytes || string(again) != string(text) {
				t.Errorf("%s: not as listed or not the same twice", f.Path)
			}
			if !strings.Contains(string(text), "independent limits") {
				t.Errorf("%s carries no caution", f.Path)
			}
		}
	}
}

// The printed line compiles and runs the self-test, which passes, and fails where
// the estimator was changed.
func TestEmittedCodeTestsItself(t *testing.T) {
	if _, err := exec.LookPath("gcc"); err != nil {
		if os.Getenv("POLEWRIGHT_REQUIRE_TOOLS") == "1" {
			t.Fatal("gcc is needed to check the emitted C and is not installed")
		}
		t.Skip("gcc is not installed: the emitted C is not compiled here")
	}
	current := estimator.Options{Form: estimator.Current}
	for _, c := range []struct {
		plant     string
		entry     sample.Entry
		precision string
	}{
		{"lift", sample.Entry{Poles: "-18±18i, -22"}, "double"},
		{"lift", sample.Entry{Poles: "floor", Options: current}, "float"},
		{"climber", sample.Entry{Poles: "floor"}, "q15.16"},
		{"gangway", sample.Entry{Poles: "floor", Options: current}, "double"},
	} {
		t.Run(c.plant+" "+c.precision, func(t *testing.T) {
			// A folder that a shell must have quoted.
			dir := filepath.Join(t.TempDir(), "it's $HOME")
			if err := os.Mkdir(dir, 0o700); err != nil {
				t.Fatal(err)
			}
			doc := emitted(t, savedSession(t, c.plant, c.entry), "A", "c99", dir, "--precision", c.precision)
			if out, err := exec.Command("sh", "-c", doc.SelfTest).CombinedOutput(); err != nil {
				t.Fatalf("%s: %v\n%s", doc.SelfTest, err, out)
			}
			if c.precision != "double" || c.plant != "lift" {
				return
			}
			text, err := os.ReadFile(doc.Files[0].Path)
			if err != nil {
				t.Fatal(err)
			}
			wrong := strings.Replace(string(text), "1.5", "1.50001", 1) // the operating point of the height
			if wrong == string(text) {
				t.Fatal("no operating point in the code")
			}
			if err := os.WriteFile(doc.Files[0].Path, []byte(wrong), 0o600); err != nil {
				t.Fatal(err)
			}
			if out, err := exec.Command("sh", "-c", doc.SelfTest).CombinedOutput(); err == nil {
				t.Errorf("the self-test passes with another operating point\n%s", out)
			}
		})
	}
}

// A design in continuous time cannot run on a target.
func TestEmitRefusesContinuousTime(t *testing.T) {
	dir := t.TempDir()
	text := strings.Replace(strings.ReplaceAll(carts, "noise_std", "noise_density"), "period_s = 0.01", "", 1)
	b, err := sample.Bench("carts.toml", []byte(text), "", nil)
	if err != nil {
		t.Fatal(err)
	}
	file := saveBench(t, b, sample.Entry{Poles: "-8±4i, -6±3i"})
	status, out, errs := run(t, "emit", file, "--candidate", "A", "--as", "c99", "--out", dir)
	if status != 2 || out != "" || !strings.Contains(errs, "candidate A: a design in continuous time") || strings.Count(errs, "\n") != 1 {
		t.Errorf("status %d, %q, %q", status, out, errs)
	}
	if list, err := os.ReadDir(dir); err != nil || len(list) != 0 {
		t.Errorf("%v, %v", list, err)
	}
}

func saveBench(t *testing.T, b *desk.Bench, entries ...sample.Entry) string {
	t.Helper()
	w, err := sample.Work(b, entries...)
	if err != nil {
		t.Fatal(err)
	}
	file := filepath.Join(t.TempDir(), "own.session.json")
	if err := session.Save(file, sample.Program, w, false); err != nil {
		t.Fatal(err)
	}
	return file
}
