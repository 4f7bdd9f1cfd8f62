// Package cli holds the commands of polewright. It takes its arguments and
// streams and returns an exit status, so that tests need no process.
package cli

import (
	"context"
	"errors"
	"fmt"
	"io"
	"os"
	"os/signal"
	"strings"
	"unicode"

	"github.com/spf13/cobra"

	"polewright/estimator"
	"polewright/plants"
	"polewright/ui/measures"
)

// Version is what --version prints.
const Version = "0.1.0"

// Exit statuses of every command.
const (
	statusDone = 0
	statusNo   = 1 // the answer is no: a limit is not met, poles cannot be placed
	statusBad  = 2 // bad usage or bad input
)

// noError is an answer of no: exit status 1.
type noError struct{ err error }

func (e *noError) Error() string { return e.err.Error() }
func (e *noError) Unwrap() error { return e.err }

// errLimits says that the design was printed and breaks a limit; the printed
// limits name it.
var errLimits = errors.New("a limit is not met")

// Run executes one command and returns its exit status.
func Run(args []string, stdin io.Reader, stdout, stderr io.Writer) int {
	ctx, stop := signal.NotifyContext(context.Background(), os.Interrupt)
	defer stop()
	root := newRoot()
	root.SetArgs(args)
	root.SetIn(stdin)
	root.SetOut(stdout)
	root.SetErr(stderr)
	err := root.ExecuteContext(ctx)
	if err == nil {
		return statusDone
	}
	fmt.Fprintln(stderr, "polewright: "+oneLine(err))
	var no *noError
	var fixed *estimator.FixedModesError
	if errors.As(err, &no) || errors.As(err, &fixed) && len(fixed.Fixed) > 0 {
		return statusNo
	}
	return statusBad
}

// oneLine keeps the message of an error on one line and free of what a terminal
// could take for a command: control characters, invisible ones, those that turn the
// writing direction.
func oneLine(err error) string {
	text := strings.Map(func(r rune) rune {
		if !unicode.IsPrint(r) {
			return ' '
		}
		return r
	}, err.Error())
	return strings.TrimSpace(text)
}

func newRoot() *cobra.Command {
	var open screenOptions
	root := &cobra.Command{
		Use:   "polewright [PLANT|SESSION]",
		Short: "Tune the poles of a state estimator by feel",
		Long: `Polewright opens a plant (its matrices, sensors and noise) and lets you drag the
poles of its state estimator over the complex plane. Gain, noise, start-up
transient, loop margins and simulated traces follow as you drag.

Without a file it opens a built-in, invented plant. 'polewright library' lists
the others. With a session file it goes on where you left off.

` + measures.Caution,
		Version:       Version,
		Args:          oneFile,
		SilenceErrors: true,
		SilenceUsage:  true,
		RunE: func(cmd *cobra.Command, args []string) error {
			return openScreen(cmd, open, args)
		},
	}
	open.register(root)
	root.SetVersionTemplate("polewright {{.Version}}\n")
	root.AddCommand(newDesign(), newModes(), newSimulate(), newStress(), newVerify(), newReplay(), newEmit(), newReport(), newLibrary())
	return root
}

// oneFile takes a plant or a session, or nothing; a word before it was meant for a
// command.
func oneFile(cmd *cobra.Command, args []string) error {
	if len(args) < 2 {
		return nil
	}
	text := "one plant or session, or a command that 'polewright --help' lists"
	cmd.SuggestionsMinimumDistance = 2
	if near := cmd.SuggestionsFor(args[0]); len(near) > 0 {
		text = strings.Join(near, " or ")
	}
	return &plants.Error{Where: "command", Wrong: fmt.Sprintf("no command %q", args[0]), Expected: expecting(text)}
}

// fileError turns what reading a file gives into the one-line form.
func fileError(file, what string, err error) error {
	var path *os.PathError
	wrong := err.Error()
	switch {
	case errors.Is(err, os.ErrNotExist):
		wrong = "no such file"
	case errors.As(err, &path):
		wrong = path.Err.Error()
	}
	var content *plants.Error
	if errors.As(err, &content) {
		return content
	}
	return &plants.Error{File: file, Where: "file", Wrong: wrong, Expected: expecting(what)}
}
