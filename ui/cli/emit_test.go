package cli_test

import (
	"crypto/sha256"
	"encoding/hex"
	"encoding/json"
	"fmt"
	"math"
	"os"
	"os/exec"
	"path/filepath"
	"strconv"
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
	needGCC(t)
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

// The emitted code over a log gives what replay writes for that log: what is judged
// is what runs.
func TestEmittedCodeReplaysALog(t *testing.T) {
	needGCC(t)
	const steps = 400
	var log, samples strings.Builder
	log.WriteString("t,force command,draw-wire encoder\n")
	for k := range steps {
		u := 3100 + 200*math.Sin(0.05*float64(k))
		y := strconv.FormatFloat(1.5+0.04*math.Cos(0.03*float64(k)), 'g', -1, 64)
		if k%50 > 45 {
			y = "NaN"
		}
		fmt.Fprintf(&log, "%.2f,%v,%s\n", 0.01*float64(k), u, y)
		fmt.Fprintf(&samples, "%v %s\n", u, y)
	}
	file := savedSession(t, "lift", sample.Entry{Poles: "-18±18i, -22"}, sample.Entry{Poles: "floor", Options: estimator.Options{Form: estimator.Current}})
	for candidate, later := range map[string]int{"A": 1, "B": 0} { // prediction form speaks of the next sample
		dir := t.TempDir()
		out := filepath.Join(dir, "out.csv")
		must(t, "replay", file, "--candidate", candidate, "--log", write(t, dir, "log.csv", log.String()), "--out", out)
		want := table(t, out)
		doc := emitted(t, file, candidate, "c99", dir)
		prefix := strings.TrimSuffix(doc.Files[0].Name, ".h")
		driver := write(t, dir, "driver.c", strings.ReplaceAll(`#include <stdio.h>
#include "PRE.h"
int main(void)
{
    PRE_estimator s;
    double u, y;
    PRE_init(&s);
    while (scanf("%lf %lf", &u, &y) == 2) {
        PRE_step(&s, &u, &y, 0);
        printf("%.17g %.17g %.17g %.17g\n", s.estimate[0], s.estimate[1], s.estimate[2], s.innovation[0]);
    }
    return 0;
}
`, "PRE", prefix))
		program := filepath.Join(dir, "driver")
		if text, err := exec.Command("gcc", "-std=c99", "-Wall", "-Wextra", "-Werror", "-o", program, driver).CombinedOutput(); err != nil {
			t.Fatalf("%v\n%s", err, text)
		}
		run := exec.Command(program)
		run.Stdin = strings.NewReader(samples.String())
		text, err := run.Output()
		if err != nil {
			t.Fatal(err)
		}
		lines := strings.Split(strings.TrimSpace(string(text)), "\n")
		if len(lines) != steps {
			t.Fatalf("%d lines", len(lines))
		}
		for k, line := range lines {
			var have [4]float64
			if _, err := fmt.Sscan(line, &have[0], &have[1], &have[2], &have[3]); err != nil {
				t.Fatal(err)
			}
			for i, name := range []string{"height", "climb speed", "cable force", "draw-wire encoder innovation"} {
				row := k
				if i < 3 {
					row += later
				}
				if row == steps {
					continue
				}
				v := want[name][row]
				if v != v { // a lost sample's
					v = 0
				}
				if !(math.Abs(have[i]-v) <= 1e-12*math.Max(1, math.Abs(v))) {
					t.Fatalf("candidate %s, step %d, %s: %v, replayed %v", candidate, k, name, have[i], v)
				}
			}
		}
	}
}

func needGCC(t *testing.T) {
	t.Helper()
	if _, err := exec.LookPath("gcc"); err != nil {
		if os.Getenv("POLEWRIGHT_REQUIRE_TOOLS") == "1" {
			t.Fatal("gcc is needed to check the emitted C and is not installed")
		}
		t.Skip("gcc is not installed: the emitted C is not compiled here")
	}
}
