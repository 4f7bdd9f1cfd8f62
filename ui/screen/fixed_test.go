package screen_test

import (
	"testing"

	"polewright/ui/desk"
	"polewright/ui/screen"
)

// A list of all poles is taken apart: what no gain moves is shown, held, and
// refuses to move.
func TestFixedPoleRefusesToMove(t *testing.T) {
	r := newRig(t, []complex128{z(-8 + 6i), z(-8 - 6i), z(-12)})
	a := answer(r.last(), desk.Traced)
	a.Fixed, a.Movable = []complex128{z(-12)}, 2
	r.send(screen.AnswerMsg{Answer: a})
	r.wantPoles(z(-8+6i), z(-8-6i))
	r.press("tab")
	r.wantShown("no gain moves it")
	asked := len(r.asked)
	r.press("left")
	r.wantShown("this pole stays")
	r.press("=")
	r.wantShown("this pole stays")
	if len(r.asked) != asked {
		t.Error("a fixed pole was asked to move")
	}
	r.press("tab", "left")
	if len(r.last().Poles) != 2 {
		t.Errorf("asked for %v", r.last().Poles)
	}
}
