package cli_test

import (
	"os"
	"strings"

	"github.com/rogpeppe/go-internal/testscript"

	"polewright/estimator"
	"polewright/ui/cli"
	"polewright/ui/internal/sample"
)

// savedCmd writes a session of a built-in plant with a candidate per list of poles,
// A, B ...: saved FILE PLANT LIST...
func savedCmd(ts *testscript.TestScript, neg bool, args []string) {
	if neg || len(args) < 3 {
		ts.Fatalf("usage: saved FILE PLANT LIST...")
	}
	var entries []sample.Entry
	for _, list := range args[2:] {
		e := sample.Entry{}
		e.Poles, _ = strings.CutSuffix(list, ", current")
		if e.Poles != list {
			e.Options = estimator.Options{Form: estimator.Current}
		}
		entries = append(entries, e)
	}
	ts.Check(sample.Save(ts.MkAbs(args[0]), "polewright "+cli.Version, args[1], entries...))
}

// changeCmd replaces the first of some text in a file: change FILE OLD NEW
func changeCmd(ts *testscript.TestScript, neg bool, args []string) {
	if neg || len(args) != 3 {
		ts.Fatalf("usage: change FILE OLD NEW")
	}
	old := ts.ReadFile(args[0])
	if !strings.Contains(old, args[1]) {
		ts.Fatalf("%s holds no %q", args[0], args[1])
	}
	ts.Check(os.WriteFile(ts.MkAbs(args[0]), []byte(strings.Replace(old, args[1], args[2], 1)), 0o600))
}
