package cli

import (
	"github.com/spf13/cobra"

	"polewright/ui/aim"
	"polewright/ui/desk"
	"polewright/ui/launch"
	"polewright/ui/lines"
	"polewright/ui/session"
	"polewright/ui/solver"
)

// talk is the line dialogue in place of the screen. A script's input ends where it
// ends: what it did not save is lost, and the exit status says so.
func talk(cmd *cobra.Command, w *desk.Work, known session.Sum) error {
	save, err := launch.Saver("polewright "+Version, *w, known)
	if err != nil {
		return err
	}
	c := lines.Config{
		Work:    *w,
		Save:    save,
		Resolve: aim.Resolver(w.Bench.Model),
		In:      cmd.InOrStdin(),
		Out:     cmd.OutOrStdout(),
	}
	if _, _, ok := launch.IsTerminal(c.In, c.Out); ok {
		c.Prompt = "> "
	}
	direct := solver.NewDirect(w.Bench)
	c.Answer = func(r desk.Request) desk.Answer { return direct.Answer(cmd.Context(), r) }
	unsaved, err := lines.Run(c)
	if err == nil && unsaved {
		cmd.PrintErrln("polewright: the input ended with unsaved work, which is lost")
	}
	return err
}
