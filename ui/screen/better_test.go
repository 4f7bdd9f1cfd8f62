package screen_test

import (
	"testing"

	"polewright/ui/desk"
	"polewright/ui/screen"
)

// A better gain for the same poles is offered and never swapped in; g takes it, and
// undo goes back.
func TestBetterGainIsOfferedNotTaken(t *testing.T) {
	r := start(t)
	r.press("g")
	r.wantShown("no better gain is known")
	r.press("left")
	a := answer(r.last(), desk.Traced)
	better := *a.Design
	better.EigenvectorCondition = a.Design.EigenvectorCondition / 2
	asked := len(r.asked)
	a.Better = &better
	r.send(screen.AnswerMsg{Answer: a})
	r.wantShown("these poles have a better gain")
	if len(r.asked) != asked {
		t.Fatal("the offer was taken unasked")
	}
	r.press("g")
	if got := r.last(); got.Gain != better.Gain {
		t.Errorf("asked for %v", got)
	}
	r.reply(desk.Traced)
	r.press("u")
	r.press("h") // an offer belongs to its poles
	r.press("g")
	r.wantShown("no better gain is known")
}
