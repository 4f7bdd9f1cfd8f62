package cli_test

import (
	"os"
	"testing"

	"github.com/rogpeppe/go-internal/testscript"

	"polewright/ui/cli"
)

func TestMain(m *testing.M) {
	testscript.Main(m, map[string]func(){
		"polewright": func() { os.Exit(cli.Run(os.Args[1:], os.Stdin, os.Stdout, os.Stderr)) },
	})
}

func TestStories(t *testing.T) {
	testscript.Run(t, testscript.Params{
		Dir:                 "testdata/script",
		RequireExplicitExec: true,
		Cmds: map[string]func(*testscript.TestScript, bool, []string){
			"status": status, "saved": savedCmd, "change": changeCmd,
			"blob": blobCmd, "longline": longLineCmd, "leftovers": leftoversCmd, "provenance": provenanceCmd,
		},
	})
}

// status runs polewright and holds its exit status: status 2 design x.toml. Its
// output can be matched by stdout and stderr as after exec.
func status(ts *testscript.TestScript, neg bool, args []string) {
	if neg || len(args) < 2 {
		ts.Fatalf("usage: status CODE ARGS...")
	}
	err := ts.Exec("polewright", args[1:]...)
	code := "0"
	if err != nil {
		code = "?"
		if e, ok := err.(interface{ ExitCode() int }); ok {
			code = string(rune('0' + e.ExitCode()))
		}
	}
	if code != args[0] {
		ts.Fatalf("exit status %s, expected %s\nstderr: %s", code, args[0], ts.ReadFile("stderr"))
	}
}
