//go:build unix

package cli_test

import (
	"encoding/json"
	"errors"
	"os"
	"os/exec"
	"path/filepath"
	"slices"
	"strings"
	"syscall"
	"testing"
	"time"
)

// journals are the files of unsaved work in a state folder.
func journals(t *testing.T, dir string) []string {
	t.Helper()
	list, err := filepath.Glob(filepath.Join(dir, "polewright", "journal", "*.work.json"))
	if err != nil {
		t.Fatal(err)
	}
	return list
}

// wanted reads the poles in hand of a journal, whose gain may not be found yet.
func wanted(t *testing.T, file string) (list []complex128) {
	t.Helper()
	data, err := os.ReadFile(file)
	if err != nil {
		return nil // removed just now
	}
	var doc struct{ Current struct{ Poles [][2]float64 } }
	if err := json.Unmarshal(data, &doc); err != nil {
		t.Fatal(err)
	}
	for _, v := range doc.Current.Poles {
		list = append(list, complex(v[0], v[1]))
	}
	return list
}

// waitForJournal waits until unsaved work with other poles than before is kept and
// returns them.
func waitForJournal(t *testing.T, dir string, before []complex128) []complex128 {
	t.Helper()
	for range 400 {
		if list := journals(t, dir); len(list) == 1 {
			if got := wanted(t, list[0]); len(got) > 0 && !slices.Equal(got, before) {
				return got
			}
		}
		time.Sleep(25 * time.Millisecond)
	}
	t.Fatalf("no unsaved work was kept: %v", journals(t, dir))
	return nil
}

// hold keeps a key down until stop is called.
func (p *terminal) hold(key string) (stop func()) {
	done, ended := make(chan struct{}), make(chan struct{})
	go func() {
		defer close(ended)
		for {
			select {
			case <-done:
				return
			case <-time.After(30 * time.Millisecond): // as a keyboard repeats
				if _, err := p.file.WriteString(key); err != nil {
					return
				}
			}
		}
	}()
	return func() { close(done); <-ended }
}

// endsAnyhow waits for the end in whatever way and returns all that was written.
func (p *terminal) endsAnyhow() (string, error) {
	p.t.Helper()
	done := make(chan error, 1)
	go func() { done <- p.cmd.Wait() }()
	var err error
	select {
	case err = <-done:
	case <-time.After(20 * time.Second):
		p.t.Fatal("did not end")
	}
	p.mu.Lock()
	defer p.mu.Unlock()
	for !p.ends {
		p.more.Wait()
	}
	return string(p.out), err
}

// Whatever ends the program in the middle of a drag, the drag is recovered at the
// next start, once, and no file is written before the person saves.
func TestRecoverADrag(t *testing.T) {
	t.Parallel()
	program := build(t)
	for name, c := range map[string]struct {
		end    func(p *terminal) error
		dies   bool // without a word
		closed bool // the terminal is gone
	}{
		"SIGKILL": {end: func(p *terminal) error { return p.cmd.Process.Kill() }, dies: true},
		"SIGHUP":  {end: func(p *terminal) error { return p.cmd.Process.Signal(syscall.SIGHUP) }},
		"SIGTERM": {end: func(p *terminal) error { return p.cmd.Process.Signal(syscall.SIGTERM) }},
		"SIGINT":  {end: func(p *terminal) error { return p.cmd.Process.Signal(os.Interrupt) }},
		"closed":  {end: func(p *terminal) error { return p.file.Close() }, closed: true},
	} {
		t.Run(name, func(t *testing.T) {
			dir := t.TempDir()
			p := open(t, program, dir, "lift")
			p.waitFor("Platform lift")
			stop := p.hold(right)
			p.waitFor("unsaved")
			began := time.Now()
			first := waitForJournal(t, dir, nil)
			after := time.Since(began)
			second := waitForJournal(t, dir, first) // the hands never rest
			if again := time.Since(began) - after; min(after, again) > time.Second {
				t.Errorf("changes were kept after %v and %v", after, again)
			}
			if err := c.end(p); err != nil {
				t.Fatal(err)
			}
			out, err := p.endsAnyhow()
			stop()
			var exit *exec.ExitError
			if !errors.As(err, &exit) {
				t.Errorf("ended with %v", err)
			}
			if !c.dies && !c.closed {
				if exit.ExitCode() != 2 || !strings.Contains(out, "the unsaved work is kept and will be offered at the next start") {
					t.Errorf("ended with %v and %q", err, out[max(0, len(out)-300):])
				}
				restored(t, out)
			}
			list := journals(t, dir)
			if len(list) != 1 {
				t.Fatalf("%d journals", len(list))
			}
			last := wanted(t, list[0])
			if slices.Equal(last, first) {
				t.Errorf("kept %v, no later than %v", last, second)
			}

			p = open(t, program, dir, "lift")
			p.waitFor("unsaved work on Platform lift from ")
			p.press("r" + enter)
			p.waitFor("recovered; not saved yet")
			if files, _ := filepath.Glob(filepath.Join(dir, "*.json")); len(files) > 0 {
				t.Errorf("recovering wrote %v", files)
			}
			p.press("s")
			p.waitFor("save as")
			p.press(enter)
			file := filepath.Join(dir, "Platform lift.session.json")
			p.waitForFile(file)
			if got := saved(t, file); !slices.Equal(got, last) {
				t.Errorf("recovered %v, expected %v", got, last)
			}
			p.waitFor("saved Platform lift")
			p.press("q")
			p.quits()
			if list := journals(t, dir); len(list) != 0 {
				t.Errorf("%v is left", list)
			}

			p = open(t, program, dir, "lift") // it never comes twice
			p.waitFor("settle")
			p.press("q")
			if out := p.quits(); strings.Contains(out, "unsaved work") {
				t.Error("it came twice")
			}
		})
	}
}

func restored(t *testing.T, out string) {
	t.Helper()
	for _, pair := range [][2]string{{"\x1b[?1049h", "\x1b[?1049l"}, {"\x1b[?25l", "\x1b[?25h"}} {
		if strings.LastIndex(out, pair[1]) < strings.LastIndex(out, pair[0]) {
			t.Errorf("the terminal was not restored: %q after %q", pair[0], pair[1])
		}
	}
}

// Recovered work is unsaved: leaving asks, a second crash keeps it, and given up it
// is gone.
func TestRecoveredWorkIsUnsaved(t *testing.T) {
	t.Parallel()
	program, dir := build(t), t.TempDir()
	p := open(t, program, dir, "lift")
	p.waitFor("Platform lift")
	p.press(right)
	waitForJournal(t, dir, nil)
	for range 2 {
		if err := p.cmd.Process.Kill(); err != nil {
			t.Fatal(err)
		}
		_, _ = p.endsAnyhow()
		p = open(t, program, dir) // nothing named
		p.waitFor("unsaved work on Platform lift from ")
		p.press("r" + enter)
		p.waitFor("recovered; not saved yet")
	}
	p.press("q")
	p.waitFor("quit with unsaved work?")
	p.press("y")
	p.quits()
	if list := journals(t, dir); len(list) != 0 {
		t.Errorf("%v is left", list)
	}
}

// Two programs on one session: the one that saves second asks.
func TestTwoProgramsOnOneSession(t *testing.T) {
	t.Parallel()
	program, dir := build(t), t.TempDir()
	file := filepath.Join(dir, "Platform lift.session.json")
	p := open(t, program, dir, "lift")
	p.waitFor("Platform lift")
	p.press(right + "s")
	p.waitFor("save as")
	p.press(enter)
	p.waitForFile(file)
	start := saved(t, file)

	q := open(t, program, dir, file)
	q.waitFor("Platform lift")
	q.press(right + right + "s")
	q.waitForChange(file, start)
	theirs := saved(t, file)

	p.press(shiftRight + "s")
	p.waitFor("was changed by someone else")
	if got := saved(t, file); !slices.Equal(got, theirs) {
		t.Error("the second save won silently")
	}
	p.press("r")
	p.waitForChange(file, theirs)
	p.press("q")
	p.quits()
	q.press(right + "s")
	q.waitFor("was changed by someone else")
	q.press("n" + "qy")
	q.quits()
}

// Where nothing can be kept, the screen says so and works all the same.
func TestWithoutAStateFolder(t *testing.T) {
	t.Parallel()
	program, dir := build(t), t.TempDir()
	if err := os.WriteFile(filepath.Join(dir, "polewright"), nil, 0o600); err != nil { // in the folder's place
		t.Fatal(err)
	}
	p := open(t, program, dir, "lift")
	p.waitFor("cannot be kept against a crash")
	p.press("q")
	p.quits()
}
