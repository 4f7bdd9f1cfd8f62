//go:build unix

package cli_test

import (
	"fmt"
	"math/rand/v2"
	"os"
	"os/exec"
	"strings"
	"testing"
	"time"
)

// pane is the program in a real terminal emulator.
type pane struct {
	t      *testing.T
	socket string
}

func newPane(t *testing.T, width, height int, command string) *pane {
	t.Helper()
	tool(t, "tmux")
	p := &pane{t, fmt.Sprintf("polewright-%d-%d", os.Getpid(), time.Now().UnixNano())}
	p.tmux("-f", "/dev/null", "new-session", "-d", "-s", "t", "-x", fmt.Sprint(width), "-y", fmt.Sprint(height), command)
	t.Cleanup(func() { _ = exec.Command("tmux", "-L", p.socket, "kill-server").Run() })
	return p
}

func (p *pane) tmux(args ...string) string {
	p.t.Helper()
	out, err := exec.Command("tmux", append([]string{"-L", p.socket}, args...)...).CombinedOutput()
	if err != nil {
		p.t.Fatalf("tmux %v: %v\n%s", args, err, out)
	}
	return string(out)
}

// shows polls until the screen holds text, and returns the screen.
func (p *pane) shows(text string) string {
	p.t.Helper()
	var screen string
	for range 800 {
		if screen = p.tmux("capture-pane", "-p", "-t", "t"); strings.Contains(screen, text) {
			return screen
		}
		time.Sleep(25 * time.Millisecond)
	}
	p.t.Fatalf("%q did not appear:\n%s", text, screen)
	return ""
}

// Any keys, pastes and resizes leave the program alive, and the terminal as it was.
// POLEWRIGHT_LONG=1 goes on for two minutes.
func TestRandomKeysInATerminal(t *testing.T) {
	t.Parallel()
	program, dir := build(t), t.TempDir()
	p := newPane(t, 80, 24, fmt.Sprintf("cd '%s'; echo BEFORE; XDG_STATE_HOME='%s' LC_ALL=C.UTF-8 '%s' balancer; echo ENDED $?; sleep 600", dir, dir, program))
	p.shows("Balancing trolley")
	keys := strings.Fields(`Left Right Up Down S-Left S-Right S-Up S-Down h j k l H J K L Tab BTab n N = p f u U C-r c m z + - 0 , . e r v a w t x ? Escape Enter
		Space BSpace 1 2 3 9 < > PgUp PgDn Home End F1 [ O A B C D [A ~ é`)
	random := rand.New(rand.NewPCG(7, 11))
	sent := 0
	for end := time.Now().Add(length()); time.Now().Before(end); {
		var burst []string
		for range 1 + random.IntN(12) {
			burst = append(burst, keys[random.IntN(len(keys))])
		}
		p.tmux(append([]string{"send-keys", "-t", "t", "--"}, burst...)...)
		sent++
		if sent%50 == 0 && strings.Contains(p.tmux("capture-pane", "-p", "-t", "t"), "ENDED") {
			break
		}
		switch random.IntN(12) {
		case 0:
			p.tmux("resize-window", "-t", "t", "-x", fmt.Sprint(20+random.IntN(200)), "-y", fmt.Sprint(5+random.IntN(60)))
		case 1:
			p.tmux("set-buffer", "-b", "b", "q\ny\n-3+-2i\n\x1b[Aqy")
			p.tmux("paste-buffer", "-p", "-b", "b", "-t", "t")
		}
	}
	if screen := p.tmux("capture-pane", "-p", "-S", "-1000", "-t", "t"); strings.Contains(screen, "ENDED") {
		t.Fatalf("the program ended by itself:\n%s", screen)
	}
	p.tmux("resize-window", "-t", "t", "-x", "80", "-y", "24")
	for range 6 {
		p.tmux("send-keys", "-t", "t", "Escape")
		time.Sleep(100 * time.Millisecond) // an Escape is told from a sequence by the pause after it
	}
	p.shows("Balancing trolley")
	p.tmux("send-keys", "-t", "t", "q")
	time.Sleep(300 * time.Millisecond)
	p.tmux("send-keys", "-t", "t", "y")
	screen := p.shows("ENDED")
	if !strings.Contains(screen, "ENDED 0") || !strings.Contains(screen, "BEFORE") {
		t.Errorf("the terminal is not as it was:\n%s", screen)
	}
	for _, word := range []string{"panic", "goroutine", "│", "Balancing"} {
		if strings.Contains(screen, word) {
			t.Errorf("%q was left on the terminal:\n%s", word, screen)
		}
	}
}

func length() time.Duration {
	if os.Getenv("POLEWRIGHT_LONG") == "1" {
		return 2 * time.Minute
	}
	return 4 * time.Second
}
