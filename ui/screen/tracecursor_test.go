package screen_test

import (
	"slices"
	"strings"
	"testing"

	tea "github.com/charmbracelet/bubbletea"

	"polewright/scenarios"
	"polewright/ui/desk"
	"polewright/ui/screen"
)

// The time cursor has the arrows while it is there, and nothing else.
func TestTimeCursor(t *testing.T) {
	r := start(t, plain, func(c *screen.Config) {
		s := *c.Work.Bench.Scenario
		s.Surprises = []scenarios.Drive{{Input: "winch", Shape: "step", At: 0.5, Until: 0.9}}
		b := *c.Work.Bench
		b.Scenario = &s
		c.Work.Bench = &b
	})
	r.send(tea.WindowSizeMsg{Width: 120, Height: 36})
	before := r.work().Poles
	r.press("T", "b")
	view := strip(r.m.View())
	if !strings.Contains(view, "1.000 s") || !strings.Contains(view, "!winch step") {
		t.Errorf("no time or no surprise:\n%s", view)
	}
	r.press("h", "left", "H", "k")
	if !slices.Equal(r.work().Poles, before) {
		t.Error("an arrow moved a pole")
	}
	if now := strip(r.m.View()); strings.Contains(now, "1.000 s") {
		t.Errorf("the cursor stayed:\n%s", now)
	}
	compareGolden(t, "120x36-cursor", r.m.View())
	for range 200 {
		r.press("L")
	}
	if now := strip(r.m.View()); !strings.Contains(now, "2.000 s") {
		t.Errorf("the cursor does not reach the end:\n%s", now)
	}
	r.press(">") // other keys do what they do
	r.reply(desk.Traced)
	if slices.Equal(r.work().Poles, before) {
		t.Error("other keys are dead")
	}
	r.press("esc", "h")
	if strings.Contains(strip(r.m.View()), "2.000 s") || slices.Equal(r.work().Poles, before) {
		t.Error("Esc did not leave the traces")
	}
}
