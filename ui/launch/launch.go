// Package launch joins the screen, the background solver, the session file and
// the terminal.
package launch

import (
	"context"
	"io"
	"os"
	"path/filepath"
	"time"

	"github.com/aymanbagabas/go-osc52/v2"
	tea "github.com/charmbracelet/bubbletea"
	"gonum.org/v1/gonum/mat"

	"polewright/ui/aim"
	"polewright/ui/desk"
	"polewright/ui/journal"
	"polewright/ui/replays"
	"polewright/ui/screen"
	"polewright/ui/session"
	"polewright/ui/solver"
	"polewright/ui/study"
	"polewright/ui/survey"
	"polewright/ui/theme"
	"polewright/ui/wire"
)

// Options of a screen.
type Options struct {
	Work    desk.Work
	Known   session.Sum // of the session file that Work was read from
	Any     bool        // nothing was named: offer whatever work was left unsaved
	Program string      // name and version, for session files
	Theme   theme.Options
	Calm    bool
	Log     *replays.Log // of the real machine, read for Work.Bench; nil without
	In, Out *os.File     // the terminal
}

// Left is what a person has in hand after leaving the screen.
type Left struct {
	Saved string     // where the work was saved; empty where it was not
	Gain  *mat.Dense // of the design in hand, prediction form; nil for none
}

// Run shows the screen until the person quits and returns what is left. Work that was left unsaved is offered first. The
// terminal is restored in any case; where a signal or a fault ends the screen, the
// unsaved work stays in the journal and the error says so.
func Run(ctx context.Context, o Options) (Left, error) {
	folder := journal.Folder()
	found, err := offer(ctx, &o, folder, time.Now())
	if err != nil {
		return Left{}, err
	}
	keeper, message := &keeper{program: o.Program, folder: folder}, ""
	if found != nil {
		o.Work, o.Known, keeper.journal, keeper.recovered = *found.work, found.sum, found.journal, true
		message = "recovered; not saved yet"
		if o.Log != nil && !o.Log.Fits(o.Work.Bench.Plant, o.Work.Bench.Model) {
			o.Log, message = nil, "recovered; not saved yet; the log was read for another plant and is left out"
		}
	} else if keeper.journal, err = journal.Open(folder, o.Program); err != nil {
		message = "unsaved work cannot be kept against a crash: " + err.Error()
	}
	store, err := newStore(&o)
	if err != nil {
		return Left{}, err
	}
	keeper.mark = store.mark
	err = keeper.finish(show(ctx, &o, keeper, store, message))
	return Left{store.where(), keeper.latest.Work().Gain}, err
}

// show runs the screen and the background.
func show(ctx context.Context, o *Options, keeper *keeper, store *store, message string) error {
	var program *tea.Program
	ready := make(chan struct{})
	work := solver.New(o.Work.Bench, func(a desk.Answer) {
		<-ready
		program.Send(screen.AnswerMsg{Answer: a})
	})
	defer work.Close()
	student := study.New(o.Work.Bench, func(a study.Answer) {
		<-ready
		program.Send(screen.StudyMsg{Answer: a})
	})
	defer student.Close()
	surveyor := survey.New(o.Work.Bench, func(a survey.Answer) {
		<-ready
		program.Send(screen.MapMsg{Answer: a})
	})
	defer surveyor.Close()
	terminal := wire.New(o.Out)
	first := screen.New(screen.Config{
		Work:    o.Work,
		Ask:     work.Ask,
		Map:     surveyor.Ask,
		Study:   student.Ask,
		Log:     o.Log,
		Save:    store.save,
		Copy:    func(text string) error { return terminal.Pass(osc52.New(text).String()) },
		Resolve: aim.Resolver(o.Work.Bench.Model),
		Theme:   o.Theme,
		Calm:    o.Calm,
		Message: message,
		Unsaved: keeper.recovered,
	})
	keeper.latest = first
	program = tea.NewProgram(kept{first, keeper},
		tea.WithAltScreen(), tea.WithContext(ctx), tea.WithInput(keyboard{o.In}), tea.WithOutput(terminal), tea.WithoutSignalHandler())
	close(ready)
	defer keeper.guard(program)()
	_, err := program.Run()
	return err
}

func newStore(o *Options) (*store, error) {
	s := &store{program: o.Program}
	if o.Work.File == "" {
		return s, nil
	}
	path, err := filepath.Abs(o.Work.File)
	s.own = content{path, o.Known}
	return s, err
}

// IsTerminal reports whether both streams are files that a screen can be shown
// on.
func IsTerminal(in io.Reader, out io.Writer) (*os.File, *os.File, bool) {
	i, ok1 := in.(*os.File)
	o, ok2 := out.(*os.File)
	if !ok1 || !ok2 {
		return nil, nil, false
	}
	for _, f := range []*os.File{i, o} {
		if info, err := f.Stat(); err != nil || info.Mode()&os.ModeCharDevice == 0 {
			return nil, nil, false
		}
	}
	return i, o, true
}
