package emit_test

import (
	"os"
	"os/exec"
	"path/filepath"
	"strings"
	"testing"

	"polewright/estimator"
	"polewright/estimator/emit"
)

// strict are the flags that every emitted file must compile under.
var strict = []string{"-std=c99", "-O2", "-Wall", "-Wextra", "-Wpedantic", "-Wconversion", "-Werror"}

// compiler returns the path of a C compiler or skips; with
// POLEWRIGHT_REQUIRE_TOOLS=1 a missing one fails.
func compiler(t testing.TB, name string) string {
	t.Helper()
	path, err := exec.LookPath(name)
	if err == nil {
		return path
	}
	if os.Getenv("POLEWRIGHT_REQUIRE_TOOLS") == "1" && name == "gcc" {
		t.Fatalf("%s is needed to check the emitted C and is not installed", name)
	}
	t.Skipf("%s is not installed: the emitted C is not compiled here", name)
	return ""
}

// write puts emitted files into a folder and returns the path of each.
func write(t testing.TB, dir string, files []emit.File) []string {
	t.Helper()
	var paths []string
	for _, f := range files {
		path := filepath.Join(dir, f.Name)
		if err := os.WriteFile(path, f.Text, 0o644); err != nil {
			t.Fatal(err)
		}
		paths = append(paths, path)
	}
	return paths
}

func build(t testing.TB, cc, out string, args ...string) {
	t.Helper()
	all := append(append([]string{}, strict...), "-o", out)
	if text, err := exec.Command(cc, append(all, args...)...).CombinedOutput(); err != nil {
		t.Fatalf("%s %s: %v\n%s", cc, strings.Join(args, " "), err, text)
	}
}

// shapes are the designs whose code is compiled and run.
func shapes() []shape {
	var list []shape
	for n := 1; n <= 8; n++ {
		s := shape{n: n, m: n % 3, p: 1 + n%2, wrap: n%3 == 1, ranges: n%2 == 0, through: n%3 == 2}
		s.form = estimator.Form(n / 2 % 2)
		list = append(list, s)
		s.arithmetic = emit.Float
		s.form = 1 - s.form
		list = append(list, s)
	}
	return append(list,
		shape{n: 4, m: 2, p: 2, unknowns: 2},
		shape{n: 3, m: 1, p: 1, unknowns: 1, form: estimator.Current, arithmetic: emit.Float, through: true},
		shape{n: 4, m: 2, p: 2, arithmetic: emit.Fixed, wrap: true, ranges: true, through: true},
		shape{n: 3, m: 1, p: 2, form: estimator.Current, arithmetic: emit.Fixed, wrap: true, ranges: true},
		shape{n: 1, m: 0, p: 1, arithmetic: emit.Fixed}, // compiled with clang too
		shape{n: 2, m: 1, p: 1, unknowns: 1, form: estimator.Current, arithmetic: emit.Fixed, through: true})
}

// compileHostile checks the syntax of emitted C where gcc is present.
func compileHostile(t *testing.T, files []emit.File) {
	t.Helper()
	path, err := exec.LookPath("gcc")
	if err != nil {
		return
	}
	dir := t.TempDir()
	paths := write(t, dir, files)
	args := append(append([]string{}, strict...), "-Wcomment", "-trigraphs", "-fsyntax-only", paths[1])
	if out, err := exec.Command(path, args...).CombinedOutput(); err != nil {
		t.Errorf("%s: %v\n%s", paths[1], err, out)
	}
}
