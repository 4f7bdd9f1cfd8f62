package launch

import (
	"errors"
	"os"
	"path/filepath"
	"strings"
	"syscall"
	"testing"
	"time"

	tea "github.com/charmbracelet/bubbletea"

	"polewright/estimator"
	"polewright/ui/desk"
	"polewright/ui/journal"
	"polewright/ui/screen"
	"polewright/ui/session"
	"polewright/ui/solver"
)

// stand is a screen with its keeper, without a terminal.
type stand struct {
	kept
	folder string
	ask    func(desk.Request)
	last   desk.Request
}

func newStand(t *testing.T, recovered bool) *stand {
	t.Helper()
	s := &stand{folder: filepath.Join(t.TempDir(), "journal")}
	j, err := journal.Open(s.folder, "test")
	if err != nil {
		t.Fatal(err)
	}
	store := &store{program: "test"}
	s.ask = func(r desk.Request) { s.last = r }
	s.keeper = &keeper{program: "test", folder: s.folder, journal: j, mark: store.mark}
	s.Model = screen.New(screen.Config{Work: work(t, 1), Ask: func(r desk.Request) { s.ask(r) }, Save: store.save, Unsaved: recovered})
	s.keeper.latest = s.Model
	s.send(t, s.Init()())
	return s
}

// send passes a message on and answers what is asked.
func (s *stand) send(t *testing.T, msg tea.Msg) (cmd tea.Cmd) {
	t.Helper()
	next, cmd := s.Update(msg)
	s.kept = next.(kept)
	if s.last.Gen == 0 {
		return cmd
	}
	r := s.last
	s.last = desk.Request{}
	answer := solver.NewDirect(work(t, 1).Bench).Answer(t.Context(), r)
	next, _ = s.Update(screen.AnswerMsg{Answer: answer})
	s.kept = next.(kept)
	return cmd
}

func left() tea.Msg { return tea.KeyMsg{Type: tea.KeyLeft} }

func (s *stand) found(t *testing.T) *desk.Work {
	t.Helper()
	found := journal.Find(s.folder, nil)
	if len(found) != 1 {
		t.Fatalf("%d journals", len(found))
	}
	w, _, err := found[0].Work()
	if err != nil {
		t.Fatal(err)
	}
	found[0].Drop()
	return w
}

func TestKeeperKeepsWhatChanges(t *testing.T) {
	s := newStand(t, false)
	if s.Unsaved() || s.keeper.ticking {
		t.Fatal("unsaved from the start")
	}
	s.send(t, left())
	if !s.Unsaved() || !s.keeper.ticking {
		t.Fatal("a change waits for nothing")
	}
	s.send(t, keepMsg{})
	first := s.keeper.last
	s.send(t, keepMsg{})
	if first == nil || s.keeper.last != first {
		t.Error("what did not change was written again")
	}
	s.send(t, left())
	s.send(t, keepMsg{})
	if s.keeper.last == first {
		t.Error("a change was not kept")
	}
	s.send(t, left())
	s.keeper.ended = syscall.SIGHUP
	err := s.keeper.finish(nil)
	if err == nil || err.Error() != "ended by signal: hangup; the unsaved work is kept and will be offered at the next start" {
		t.Errorf("got %v", err)
	}
	want := s.Work()
	got := s.found(t)
	if len(got.Poles) == 0 || !same(&desk.Work{Poles: want.Poles, Form: estimator.Prediction}, &desk.Work{Poles: got.Poles}) {
		t.Errorf("kept %v, expected %v", got.Poles, want.Poles)
	}
}

func TestKeeperForgetsWhatIsGivenUp(t *testing.T) {
	s := newStand(t, false)
	s.send(t, left())
	s.send(t, keepMsg{})
	if err := s.keeper.finish(nil); err != nil {
		t.Error(err)
	}
	if list, _ := os.ReadDir(s.folder); len(list) != 0 {
		t.Errorf("%d files are left", len(list))
	}
}

func TestKeeperForgetsWhatIsSaved(t *testing.T) {
	t.Chdir(t.TempDir())
	s := newStand(t, false)
	s.send(t, left())
	s.send(t, keepMsg{})
	s.send(t, tea.KeyMsg{Type: tea.KeyCtrlS})
	cmd := s.send(t, tea.KeyMsg{Type: tea.KeyEnter})
	deliver(t, s, cmd)
	if s.Unsaved() {
		t.Fatal("not saved")
	}
	if err := s.keeper.journal.Flush(); err != nil {
		t.Error(err)
	}
	if left, _ := filepath.Glob(filepath.Join(s.folder, "*.work.json")); len(left) != 0 {
		t.Errorf("%v is left", left)
	}
	s.keeper.ended = syscall.SIGTERM
	if err := s.keeper.finish(nil); err == nil || !strings.HasSuffix(err.Error(), "; everything was saved") {
		t.Errorf("got %v", err)
	}
}

// deliver runs a command and passes on what it brings, ticks apart.
func deliver(t *testing.T, s *stand, cmd tea.Cmd) {
	t.Helper()
	if cmd == nil {
		return
	}
	done := make(chan tea.Msg, 1)
	go func() { done <- cmd() }()
	select {
	case msg := <-done:
		if batch, ok := msg.(tea.BatchMsg); ok {
			for _, c := range batch {
				deliver(t, s, c)
			}
			return
		}
		s.send(t, msg)
	case <-time.After(2 * time.Second):
		t.Fatal("a command hangs")
	}
}

func TestKeeperOutlivesAFault(t *testing.T) {
	s := newStand(t, false)
	s.send(t, left())
	s.ask = func(desk.Request) { panic("a wheel\x1b came off") }
	before := s.Work()
	cmd := s.send(t, left())
	if cmd == nil || cmd() != tea.Quit() {
		t.Error("the program goes on")
	}
	err := s.keeper.finish(nil)
	if err == nil || !strings.Contains(err.Error(), "the unsaved work is kept") {
		t.Fatalf("got %v", err)
	}
	reports, _ := filepath.Glob(filepath.Join(s.folder, "*.fault.txt"))
	if len(reports) != 1 || !strings.Contains(err.Error(), "described in "+reports[0]) {
		t.Fatalf("%v: %v", reports, err)
	}
	text, _ := os.ReadFile(reports[0])
	if !strings.Contains(string(text), "came off") || !strings.Contains(string(text), "keeper_test.go") {
		t.Errorf("the report says %q", text)
	}
	if got := s.found(t); len(got.Poles) == 0 || got.Poles[0] != before.Poles[0] {
		t.Errorf("kept %v, expected %v", got.Poles, before.Poles)
	}
}

func TestKeeperWithoutAJournal(t *testing.T) {
	s := newStand(t, false)
	_ = s.keeper.journal.Close(false)
	s.keeper.journal = nil
	s.send(t, left())
	if err := s.keeper.finish(tea.ErrProgramKilled); err == nil || err.Error() != "interrupted; what was not saved is lost" {
		t.Errorf("got %v", err)
	}
}

func TestKeeperSaysWhatItCouldNotKeep(t *testing.T) {
	s := newStand(t, false)
	s.send(t, left())
	if err := os.RemoveAll(s.folder); err != nil {
		t.Fatal(err)
	}
	err := s.keeper.finish(errors.New("read /dev/stdin: input/output error"))
	if err == nil || !strings.HasPrefix(err.Error(), "the terminal failed: ") || !strings.Contains(err.Error(), "could not be kept: ") {
		t.Errorf("got %v", err)
	}
}

// Recovered work that was neither changed nor saved is not taken for saved.
func TestKeeperHoldsRecoveredWork(t *testing.T) {
	folder := t.TempDir()
	leave(t, folder, work(t, 0.9), session.Mark{})
	got, _ := offered(t, folder, "r\n", Options{Any: true, Program: "test"})
	if got == nil {
		t.Fatal("nothing was recovered")
	}
	s := newStand(t, true)
	_ = s.keeper.journal.Close(false)
	s.keeper.journal, s.keeper.recovered, s.folder = got.journal, true, folder
	s.send(t, tea.KeyMsg{Type: tea.KeyTab})
	s.keeper.ended = syscall.SIGHUP
	if err := s.keeper.finish(nil); err == nil || !strings.Contains(err.Error(), "is kept") {
		t.Errorf("got %v", err)
	}
	s.found(t)
}
