package screen_test

import (
	"regexp"
	"strconv"
	"strings"
	"testing"
	"time"

	tea "github.com/charmbracelet/bubbletea"

	"polewright/ui/desk"
	"polewright/ui/screen"
	"polewright/ui/wire"
)

var erased = regexp.MustCompile("\x1b\\[([0-9]+)X\x1b\\[([0-9]+)C")

// A shortened frame leaves the same cells.
func TestShortenedFramesShowTheSame(t *testing.T) {
	long := start(t, colour)
	short := start(t, colour, func(c *screen.Config) { c.KeepBlanks = false })
	for _, k := range []string{"left", "tab", "z", "?", "q"} {
		long.press(k)
		short.press(k)
		same := erased.ReplaceAllStringFunc(short.m.View(), func(s string) string {
			n := erased.FindStringSubmatch(s)
			if n[1] != n[2] {
				t.Errorf("%q erases and moves differently", s)
			}
			count, _ := strconv.Atoi(n[1])
			return strings.Repeat(" ", count)
		})
		if same != long.m.View() {
			t.Fatalf("after %s:\n%s", k, same)
		}
		if len(short.m.View()) >= len(long.m.View()) {
			t.Errorf("after %s: not shorter", k)
		}
	}
}

// changed is what a terminal gets for the lines that changed.
func changed(w *wire.Thinner, before, now string) int {
	b, n := strings.Split(before, "\n"), strings.Split(now, "\n")
	frame := "\x1b[H"
	for y := range n {
		if n[y] != b[y] {
			frame += n[y] + "\x1b[K\r"
		}
		if y < len(n)-1 {
			frame += "\n"
		}
	}
	return len(w.Thin([]byte(frame)))
}

// Over a slow link at most 900 bytes a second go out while a key is held; at rest
// the screen shows what it would have shown.
func TestCalm(t *testing.T) {
	other := start(t, seven)
	r := start(t, seven, func(c *screen.Config) { c.Calm = true })
	r.send(tea.WindowSizeMsg{Width: 120, Height: 40})
	other.send(tea.WindowSizeMsg{Width: 120, Height: 40})
	r.clock = r.clock.Add(10 * time.Second)
	before := r.m.View()
	total := 0
	var w wire.Thinner
	changed(&w, strings.Repeat("\n", 39), before)
	for range 100 { // of 30 ms
		for _, rig := range []*rig{r, other} {
			rig.hold("left", 1)
			rig.reply(desk.Traced)
		}
		now := r.m.View()
		total += changed(&w, before, now)
		before = now
	}
	if total > 900*4 {
		t.Errorf("%d bytes in 3 s", total)
	}
	if total < 900 {
		t.Errorf("only %d bytes in 3 s: the held pole should be seen to move", total)
	}
	if r.m.View() == other.m.View() {
		t.Error("nothing was held back")
	}
	r.clock = r.clock.Add(time.Second)
	time.Sleep(720 * time.Millisecond)
	r.run()
	if r.m.View() != other.m.View() {
		t.Error("at rest the screen is not complete")
	}
}
