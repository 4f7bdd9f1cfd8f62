package cli_test

import (
	"fmt"
	"os"
	"path/filepath"
	"strings"
	"testing"
)

// A log is looked at beside the design in hand, which changes while it is open.
func TestLogInATerminal(t *testing.T) {
	t.Parallel()
	program, dir := build(t), t.TempDir()
	var log strings.Builder
	log.WriteString("t,force,distance\n")
	for k := range 200 {
		fmt.Fprintf(&log, "%g,0,%g\n", float64(k)/100, 0.001*float64(k*k%7-3))
	}
	const plant = `format = 1
name = "Slider on a log"
[model]
time = "continuous"
period_s = 0.01
A = [[0, 1], [0, -2]]
B = [[0], [1]]
C = [[1, 0]]
G = [[0], [1]]
[[states]]
name = "place"
[[states]]
name = "pace"
[[inputs]]
name = "force"
[[sensors]]
name = "distance"
noise_std = 0.002
[process_noise]
density = [0.01]
`
	for name, text := range map[string]string{"slider.toml": plant, "run.csv": log.String()} {
		if err := os.WriteFile(filepath.Join(dir, name), []byte(text), 0o600); err != nil {
			t.Fatal(err)
		}
	}
	p := newPane(t, 100, 40, fmt.Sprintf("cd '%s'; XDG_STATE_HOME='%s' LC_ALL=C.UTF-8 '%s' slider.toml --log run.csv; echo ENDED $?; sleep 600", dir, dir, program))
	p.shows("Slider on a log")
	p.tmux("send-keys", "-t", "t", "d")
	before := p.shows("white at floor")
	for _, must := range []string{"log run.csv", "200 samples from 0 to 1.99 s; 180 in the statistics", "noise figures that this log suggests"} {
		if !strings.Contains(before, must) {
			t.Errorf("nothing about %q:\n%s", must, before)
		}
	}
	p.tmux("send-keys", "-t", "t", "a")
	p.shows("  A  ")
	p.tmux("send-keys", "-t", "t", "--", "<")
	p.shows("unsaved")
	p.tmux("send-keys", "-t", "t", "q")
	p.shows("s-plane")
	p.tmux("send-keys", "-t", "t", "q")
	p.shows("unsaved work")
}
