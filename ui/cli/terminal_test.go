//go:build unix

package cli_test

import (
	"bytes"
	"encoding/json"
	"math/cmplx"
	"os"
	"os/exec"
	"path/filepath"
	"regexp"
	"runtime"
	"slices"
	"strings"
	"sync"
	"testing"
	"time"

	"github.com/creack/pty"
)

// terminal is the built program in a pseudo-terminal of its own.
type terminal struct {
	t    *testing.T
	file *os.File
	cmd  *exec.Cmd

	mu     sync.Mutex
	out    []byte
	more   *sync.Cond
	ends   bool
	screen *emulator
	last   time.Time // when something was written
}

func build(t *testing.T) string {
	t.Helper()
	if testing.Short() {
		t.Skip("builds and drives the program")
	}
	name := filepath.Join(t.TempDir(), "polewright")
	cmd := exec.Command("go", "build", "-o", name, "polewright")
	if out, err := cmd.CombinedOutput(); err != nil {
		t.Fatalf("go build: %v\n%s", err, out)
	}
	return name
}

func open(t *testing.T, program, dir string, args ...string) *terminal {
	t.Helper()
	cmd := exec.Command(program, args...)
	cmd.Dir = dir
	cmd.Env = append(slices.DeleteFunc(os.Environ(), func(v string) bool {
		return strings.HasPrefix(v, "NO_COLOR=") || strings.HasPrefix(v, "COLORFGBG=")
	}), "TERM=xterm-256color", "LC_ALL=C.UTF-8", "XDG_STATE_HOME="+dir)
	return attach(t, cmd)
}

// attach starts a command in a pseudo-terminal of 80x24.
func attach(t *testing.T, cmd *exec.Cmd) *terminal {
	t.Helper()
	file, err := pty.StartWithSize(cmd, &pty.Winsize{Rows: 24, Cols: 80})
	if err != nil {
		t.Skipf("no pseudo-terminal on %s: %v", runtime.GOOS, err)
	}
	p := &terminal{t: t, file: file, cmd: cmd, screen: newEmulator(24, 80)}
	p.more = sync.NewCond(&p.mu)
	go p.read()
	t.Cleanup(func() {
		_ = cmd.Process.Kill()
		_ = file.Close()
	})
	return p
}

func (p *terminal) read() {
	buf := make([]byte, 1<<16)
	for {
		n, err := p.file.Read(buf)
		p.mu.Lock()
		p.out = append(p.out, buf[:n]...)
		p.screen.write(buf[:n])
		if n > 0 {
			p.last = time.Now()
		}
		p.ends = err != nil
		p.more.Broadcast()
		p.mu.Unlock()
		if err != nil {
			return
		}
	}
}

var escape = regexp.MustCompile(`\x1b\[[0-9;?]*[A-Za-z]|\x1b[()][A-Z0-9]|\x1b[=>]`)

// waitFor waits until text is on the screen.
func (p *terminal) waitFor(text string) {
	p.t.Helper()
	timer := time.AfterFunc(20*time.Second, func() {
		p.mu.Lock()
		p.ends = true
		p.more.Broadcast()
		p.mu.Unlock()
	})
	defer timer.Stop()
	p.mu.Lock()
	defer p.mu.Unlock()
	for {
		if strings.Contains(p.screen.text(), text) {
			return
		}
		if p.ends {
			p.t.Fatalf("%q did not appear; the terminal has\n%s", text, p.screen.text())
		}
		p.more.Wait()
	}
}

// resize changes the terminal's size under the program.
func (p *terminal) resize(rows, cols int) {
	p.t.Helper()
	p.mu.Lock()
	p.screen.resize(rows, cols)
	p.mu.Unlock()
	if err := pty.Setsize(p.file, &pty.Winsize{Rows: uint16(rows), Cols: uint16(cols)}); err != nil {
		p.t.Fatal(err)
	}
}

func (p *terminal) press(keys string) {
	p.t.Helper()
	if _, err := p.file.WriteString(keys); err != nil {
		p.t.Fatal(err)
	}
}

// quits waits for the end and returns all that was written.
func (p *terminal) quits() string {
	p.t.Helper()
	done := make(chan error, 1)
	go func() { done <- p.cmd.Wait() }()
	select {
	case err := <-done:
		if err != nil {
			p.t.Errorf("ended with %v", err)
		}
	case <-time.After(20 * time.Second):
		p.t.Fatal("did not quit")
	}
	p.mu.Lock()
	defer p.mu.Unlock()
	for !p.ends { // what is still on its way
		p.more.Wait()
	}
	return string(p.out)
}

// saved reads the wanted poles of a session file.
func saved(t *testing.T, file string) []complex128 {
	t.Helper()
	data, err := os.ReadFile(file)
	if err != nil {
		t.Fatal(err)
	}
	var doc struct {
		Current struct {
			Poles [][2]float64
			Gain  [][]float64
		}
	}
	if err := json.Unmarshal(data, &doc); err != nil {
		t.Fatal(err)
	}
	if len(doc.Current.Gain) == 0 {
		t.Error("no gain was saved")
	}
	var list []complex128
	for _, v := range doc.Current.Poles {
		list = append(list, complex(v[0], v[1]))
	}
	return list
}

const right, shiftRight, enter, ctrlS = "\x1b[C", "\x1b[1;2C", "\r", "\x13"

// The main job in a real pseudo-terminal: drag, type, undo, save, reopen.
func TestDragTypeUndoSaveReopen(t *testing.T) {
	t.Parallel()
	program, dir := build(t), t.TempDir()
	file := filepath.Join(dir, "Platform lift.session.json")

	began := time.Now()
	p := open(t, program, dir, "lift")
	p.waitFor("Platform lift")
	if d := time.Since(began); d > 4*time.Second {
		t.Errorf("the first frame took %v: does the start ask the terminal something?", d)
	}
	p.press(right + right + shiftRight) // drag the pair
	p.waitFor("unsaved")
	p.press(ctrlS)
	p.waitFor("session.json")
	p.press(enter)
	p.waitForFile(file)
	dragged := saved(t, file)

	p.press("=" + "-9±4i" + enter) // type the pair's place
	p.waitFor("-9.0")
	p.press("s")
	p.waitForChange(file, dragged)
	typed := saved(t, file)
	if !near(typed, cexp(-9, 4)) {
		t.Errorf("typed -9±4i at 0.01 s, saved %v", typed)
	}

	p.press("u" + "s") // and take it back
	p.waitForChange(file, typed)
	if undone := saved(t, file); !slices.Equal(undone, dragged) {
		t.Errorf("undo gave %v, expected %v", undone, dragged)
	}
	p.press("q")
	out := p.quits()
	if !strings.HasSuffix(strings.TrimSpace(escape.ReplaceAllString(out, "")), "session.json") {
		t.Errorf("the end does not say where the work is: %q", out[max(0, len(out)-200):])
	}
	if strings.Contains(out, "\x1b]11;?") || strings.Contains(out, "\x1b]10;?") {
		t.Error("the terminal was asked for its colours")
	}
	for _, pair := range [][2]string{{"\x1b[?1049h", "\x1b[?1049l"}, {"\x1b[?25l", "\x1b[?25h"}} {
		if strings.LastIndex(out, pair[1]) < strings.LastIndex(out, pair[0]) {
			t.Errorf("the terminal was not restored: %q after %q", pair[0], pair[1])
		}
	}

	p = open(t, program, dir, file) // go on where it was left
	p.waitFor("of 3 broken")
	p.press(right + "s")
	p.waitForChange(file, dragged)
	p.press("q")
	p.quits()
}

func (p *terminal) waitForFile(file string) {
	p.t.Helper()
	for range 400 {
		if data, err := os.ReadFile(file); err == nil && json.Valid(bytes.TrimSpace(data)) {
			return
		}
		time.Sleep(25 * time.Millisecond)
	}
	p.t.Fatalf("%s was not saved", file)
}

func (p *terminal) waitForChange(file string, before []complex128) {
	p.t.Helper()
	for range 400 {
		if !slices.Equal(saved(p.t, file), before) {
			return
		}
		time.Sleep(25 * time.Millisecond)
	}
	p.mu.Lock()
	defer p.mu.Unlock()
	p.t.Fatalf("%s did not change from %v; the terminal has\n%s", file, before, p.screen.text())
}

// cexp is exp(0.01·(re + im i)).
func cexp(re, im float64) complex128 { return cmplx.Exp(complex(re, im) * 0.01) }

func near(list []complex128, want complex128) bool {
	return slices.ContainsFunc(list, func(v complex128) bool { return cmplx.Abs(v-want) < 1e-9 })
}
