package screen_test

import (
	"slices"
	"strings"
	"testing"

	"polewright/estimator"
	"polewright/ui/desk/desktest"
	"polewright/ui/screen"
	"polewright/ui/solver"
)

// With delay registers the two forms leave different numbers of poles to choose;
// changing the form there and back simply works.
func TestFormWithDelayRegisters(t *testing.T) {
	b := desktest.Bench(t, "gangway")
	_, list, _ := desktest.Start(t, b, estimator.Options{})
	direct := solver.NewDirect(b)
	r := newRig(t, list, plain, func(c *screen.Config) { c.Work.Bench = b })
	land := func() {
		for n := 0; n < len(r.asked); { // an answer may make the screen ask again
			n = len(r.asked)
			r.send(screen.AnswerMsg{Answer: direct.Answer(t.Context(), r.last())})
		}
	}
	land()
	before := r.work()
	for i, form := range []estimator.Form{estimator.Current, estimator.Prediction, estimator.Current} {
		r.press("c")
		land()
		w := r.work()
		if view := strip(r.m.View()); strings.Contains(view, "no design") || w.Form != form {
			t.Fatalf("change %d of the form:\n%s", i+1, view)
		}
		if form == estimator.Prediction && len(w.Poles) != len(before.Poles) {
			t.Errorf("%d poles after going there and back, %d before", len(w.Poles), len(before.Poles))
		}
		if form == estimator.Current && len(w.Poles) == len(before.Poles) {
			t.Error("the forms do not differ: the test shows nothing")
		}
		d, err := estimator.NewDesigner(b.Model, estimator.Options{Form: form})
		if err != nil {
			t.Fatal(err)
		}
		if n, _ := d.Movable(); len(w.Poles) != n {
			t.Errorf("%d poles, %d can be moved", len(w.Poles), n)
		}
	}
	r.press("u", "u", "u")
	land()
	if !slices.Equal(r.work().Poles, before.Poles) || r.work().Form != before.Form {
		t.Error("undo does not lead back")
	}
}
