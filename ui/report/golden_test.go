package report_test

import (
	"flag"
	"os"
	"path/filepath"
	"regexp"
	"testing"

	"github.com/google/go-cmp/cmp"

	"polewright/ui/internal/sample"
)

var update = flag.Bool("update", false, "write the golden files")

// What rounding alone decides, and what stands for it, is left out: the gains'
// last digits, errors of the order of rounding, the sum of the session file.
var masks = []struct {
	find *regexp.Regexp
	with string
}{
	{svg, "(figure)"},
	{regexp.MustCompile(`(session saved by \| polewright test \|) [0-9a-f]{64}`), "$1 (sum)"},
	{regexp.MustCompile(`[0-9.]+e-(0[89]|1[0-9])`), "(tiny)"},
	{regexp.MustCompile(`(-?\d+\.\d{4})\d{6,}`), "$1..."},
}

// The page in words: what stands where, with its figures.
func TestGolden(t *testing.T) {
	k := kept(t, "lift", sample.Entry{Poles: "-18±18i, -22", Note: "first try"}, sample.Entry{Poles: "-9±4i, -14", Options: current})
	got := document(t, k).Markdown()
	for _, m := range masks {
		got = m.find.ReplaceAll(got, []byte(m.with))
	}
	file := filepath.Join("testdata", "lift.md")
	if *update {
		if err := os.WriteFile(file, got, 0o644); err != nil {
			t.Fatal(err)
		}
	}
	want, err := os.ReadFile(file)
	if err != nil {
		t.Fatal(err)
	}
	if diff := cmp.Diff(string(want), string(got)); diff != "" {
		t.Errorf("(-want +got) %s", diff)
	}
}
