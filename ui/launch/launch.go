// Package launch joins the screen, the background solver, the session file and
// the terminal.
package launch

import (
	"context"
	"errors"
	"fmt"
	"io"
	"io/fs"
	"os"
	"sync"

	tea "github.com/charmbracelet/bubbletea"

	"polewright/estimator"
	"polewright/estimator/poles"
	"polewright/ui/aim"
	"polewright/ui/desk"
	"polewright/ui/screen"
	"polewright/ui/session"
	"polewright/ui/solver"
	"polewright/ui/theme"
)

// Options of a screen.
type Options struct {
	Work    desk.Work
	Program string // name and version, for session files
	Theme   theme.Options
	Calm    bool
	In, Out *os.File // the terminal
}

// Run shows the screen until the person quits and returns where the work was
// saved, empty where it was not. The terminal is restored in any case.
func Run(ctx context.Context, o Options) (saved string, err error) {
	var program *tea.Program
	ready := make(chan struct{})
	work := solver.New(o.Work.Bench, func(a desk.Answer) {
		<-ready
		program.Send(screen.AnswerMsg{Answer: a})
	})
	defer work.Close()
	store := &store{program: o.Program, known: o.Work.File}
	program = tea.NewProgram(screen.New(screen.Config{
		Work:    o.Work,
		Ask:     work.Ask,
		Save:    store.save,
		Resolve: (&resolver{bench: o.Work.Bench}).resolve,
		Theme:   o.Theme,
		Calm:    o.Calm,
	}), tea.WithAltScreen(), tea.WithContext(ctx), tea.WithInput(o.In), tea.WithOutput(o.Out))
	close(ready)
	_, err = program.Run()
	if errors.Is(err, tea.ErrProgramKilled) && ctx.Err() != nil {
		err = errors.New("interrupted; what was not saved is lost")
	}
	return store.last, err
}

// store saves sessions for the screen.
type store struct {
	program string
	mu      sync.Mutex
	known   string // file that this session was read from or saved to
	last    string
}

func (s *store) save(file string, w desk.Work, replace bool) error {
	s.mu.Lock()
	defer s.mu.Unlock()
	if err := session.Save(file, s.program, &w, replace || file == s.known); err != nil {
		var path *fs.PathError
		if errors.As(err, &path) && !errors.Is(err, fs.ErrExist) {
			return fmt.Errorf("%s: %w", file, path.Err)
		}
		return err
	}
	s.known, s.last = file, file
	return nil
}

// resolver reads pole lists and patterns with designers of its own, so that the
// prompt never waits for the solver.
type resolver struct {
	bench     *desk.Bench
	designers [2]*estimator.Designer // by form
}

func (r *resolver) resolve(text, plane string, form estimator.Form) ([]complex128, error) {
	if int(form) >= len(r.designers) {
		return nil, errors.New("unknown form")
	}
	spec, err := poles.Parse(text)
	if err != nil {
		return nil, err
	}
	if r.designers[form] == nil {
		d, err := estimator.NewDesigner(r.bench.Model, estimator.Options{Form: form})
		if err != nil {
			return nil, err
		}
		r.designers[form] = d
	}
	return aim.Own(spec, plane, r.bench.Model, r.designers[form])
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
