package launch

import (
	"errors"
	"fmt"
	"os"
	"os/signal"
	"runtime"
	"runtime/debug"
	"slices"
	"sync"
	"syscall"
	"time"

	tea "github.com/charmbracelet/bubbletea"

	"polewright/ui/desk"
	"polewright/ui/journal"
	"polewright/ui/screen"
	"polewright/ui/session"
)

// keepAfter is how long a change waits for the journal, so that a held key does
// not write at every step.
const keepAfter = 300 * time.Millisecond

// keeper sees to it that unsaved work is in the journal within a second, also
// while the hands never rest.
type keeper struct {
	program string           // name and version
	folder  string           // of journals and reports
	journal *journal.Journal // nil where there is none
	mark    func() session.Mark
	// recovered work is in the journal from the start.
	recovered bool

	mu      sync.Mutex
	latest  screen.Model
	last    *desk.Work // what was handed to the journal; nil where it has nothing
	ended   os.Signal  // that ended the program
	failed  string     // why a fault did; empty without one
	ticking bool
}

// kept is the screen with a keeper beside it.
type kept struct {
	screen.Model
	keeper *keeper
}

type keepMsg struct{}

// Update passes everything on to the screen and looks at what came of it. A fault in
// the screen ends the program in order, with the state before it kept.
func (k kept) Update(msg tea.Msg) (model tea.Model, cmd tea.Cmd) {
	defer func() {
		if r := recover(); r != nil {
			k.keeper.fault(r, debug.Stack())
			model, cmd = k, tea.Quit
		}
	}()
	if _, ok := msg.(keepMsg); ok {
		k.keeper.tick()
		return k, nil
	}
	next, more := k.Model.Update(msg)
	m, ok := next.(screen.Model)
	if !ok {
		return next, more
	}
	k.Model = m
	return k, tea.Batch(more, k.keeper.see(m))
}

// see notes the newest state of the screen and starts the one tick that keeps it.
func (k *keeper) see(m screen.Model) tea.Cmd {
	k.mu.Lock()
	defer k.mu.Unlock()
	k.latest = m
	if k.journal == nil {
		return nil
	}
	if !k.latest.Unsaved() {
		if k.last != nil || k.recovered {
			k.last, k.recovered = nil, false
			k.journal.Saved()
		}
		return nil
	}
	if k.ticking {
		return nil
	}
	k.ticking = true
	return tea.Tick(keepAfter, func(time.Time) tea.Msg { return keepMsg{} })
}

func (k *keeper) tick() {
	k.mu.Lock()
	defer k.mu.Unlock()
	k.ticking = false
	k.keep()
}

// keep hands unsaved work to the journal where it changed.
func (k *keeper) keep() {
	if k.journal == nil || !k.latest.Unsaved() {
		return
	}
	w := k.latest.Work()
	if k.last == nil || !same(k.last, &w) {
		k.last = &w
		k.journal.Keep(w, k.mark())
	}
}

// same reports that two works differ in nothing that would be missed.
func same(a, b *desk.Work) bool {
	return a.Form == b.Form && a.Method == b.Method && a.Gain == b.Gain && a.Current == b.Current && a.File == b.File &&
		slices.Equal(a.Poles, b.Poles) &&
		slices.EqualFunc(a.Candidates, b.Candidates, func(x, y desk.Candidate) bool {
			return x.Letter == y.Letter && x.Note == y.Note && x.Design == y.Design
		})
}

// guard ends the program at signals, after the work is kept: the terminal that
// sent one may be gone, so nothing that waits for it comes first.
func (k *keeper) guard(program *tea.Program) (stop func()) {
	signals := make(chan os.Signal, 4)
	signal.Notify(signals, syscall.SIGHUP, syscall.SIGTERM, syscall.SIGQUIT)
	done := make(chan struct{})
	go func() {
		select {
		case s := <-signals:
			k.mu.Lock()
			k.ended = s
			k.keep()
			k.mu.Unlock()
			if k.journal != nil {
				_ = k.journal.Flush() // its error is told at the end
			}
			program.Kill()
		case <-done:
		}
	}()
	return func() {
		signal.Stop(signals)
		close(done)
	}
}

// fault writes a report of what went wrong.
func (k *keeper) fault(what any, stack []byte) {
	k.mu.Lock()
	defer k.mu.Unlock()
	if k.failed != "" {
		return
	}
	k.failed = fmt.Sprintf("ended by a fault in the program, %v", what)
	text := fmt.Sprintf("%s, %s %s/%s\n%v\n\n%s", k.program, runtime.Version(), runtime.GOOS, runtime.GOARCH, what, stack)
	if path, err := journal.Report(k.folder, []byte(text), time.Now()); err == nil {
		k.failed = "ended by a fault in the program, described in " + path
	}
}

// finish decides what becomes of the journal when the screen is gone, and says what
// ended it where that was not the person, who gives up what is unsaved.
func (k *keeper) finish(runErr error) error {
	k.mu.Lock()
	defer k.mu.Unlock()
	if runErr == nil && k.ended == nil && k.failed == "" {
		if k.journal == nil {
			return nil
		}
		return k.journal.Close(false)
	}
	why := "ended"
	switch {
	case k.failed != "":
		why = k.failed
	case k.ended != nil:
		why = "ended by signal: " + k.ended.String()
	case errors.Is(runErr, tea.ErrProgramPanic):
		why = "ended by a fault in the program"
	case errors.Is(runErr, tea.ErrProgramKilled):
		why = "interrupted"
	case runErr != nil:
		why = "the terminal failed: " + runErr.Error()
	}
	if !k.latest.Unsaved() {
		if k.journal != nil {
			_ = k.journal.Close(false)
		}
		return errors.New(why + "; everything was saved")
	}
	if k.journal == nil {
		return errors.New(why + "; what was not saved is lost")
	}
	k.keep()
	if err := k.journal.Close(true); err != nil {
		return fmt.Errorf("%s; what was not saved could not be kept: %w", why, err)
	}
	return errors.New(why + "; the unsaved work is kept and will be offered at the next start")
}
