package screen_test

import (
	"errors"
	"fmt"
	"io/fs"
	"maps"
	"math"
	"math/cmplx"
	"slices"
	"strings"
	"testing"
	"time"

	tea "github.com/charmbracelet/bubbletea"

	"polewright/estimator"
	"polewright/estimator/poles"
	"polewright/ui/desk"
	"polewright/ui/screen"
)

var (
	errExist = fmt.Errorf("there is such a file: %w", fs.ErrExist)
	errTest  = errors.New("no such pattern")
)

func near(a, b complex128) bool { return cmplx.Abs(a-b) < 1e-9 }

func (r *rig) wantPoles(want ...complex128) {
	r.t.Helper()
	got := r.work().Poles
	if len(got) != len(want) {
		r.t.Fatalf("%d poles, expected %d", len(got), len(want))
	}
	for i := range got {
		if !near(got[i], want[i]) {
			r.t.Errorf("pole %d at %v, expected %v", i, got[i], want[i])
		}
	}
}

func (r *rig) wantShown(text string) {
	r.t.Helper()
	if !strings.Contains(r.m.View(), text) {
		r.t.Errorf("%q is not on the screen:\n%s", text, r.m.View())
	}
}

func TestMoveAsksForTheMovedPoles(t *testing.T) {
	r := start(t)
	before := len(r.asked)
	r.press("tab", "left")
	if len(r.asked) != before+1 {
		t.Fatalf("%d requests for one move", len(r.asked)-before)
	}
	q := r.last()
	if len(q.Poles) != 3 || q.Poles[2] == z(-12) || real(q.Poles[2]) >= real(z(-12)) {
		t.Errorf("asked for %v", q.Poles)
	}
	if q.From == nil || q.Gain != nil {
		t.Error("a move must continue from the design shown")
	}
	if q.Gen <= r.asked[before-1].Gen {
		t.Error("the number of the request did not grow")
	}
}

func TestSeveralLettersAreSeveralKeys(t *testing.T) {
	one, many := start(t), start(t)
	one.press("h", "h", "k")
	many.press("hhk")
	many.wantPoles(one.work().Poles...)
}

func TestHeldKeyIsOneUndoStep(t *testing.T) {
	r := start(t)
	r.press("left")
	r.clock = r.clock.Add(500 * time.Millisecond) // the keyboard's first delay
	r.hold("left", 20)
	r.press("u")
	r.wantPoles(z(-8+6i), z(-8-6i), z(-12))
	r.press("U")
	if near(r.work().Poles[0], z(-8+6i)) {
		t.Error("redo did nothing")
	}
	r.press("left") // a new step, a second later
	r.press("u", "u")
	r.wantPoles(z(-8+6i), z(-8-6i), z(-12))
}

// A key held until the pair parts on the axis does not lift the two poles again.
func TestHeldKeyStopsOnTheAxis(t *testing.T) {
	r := start(t)
	r.hold("down", 60)
	r.wantShown("pole 1 of 3")
	r.clock = r.clock.Add(time.Second)
	r.hold("down", 1)
	r.wantShown("pair 1 of 2")
}

func TestUndoUsesTheStoredGain(t *testing.T) {
	r := start(t)
	stored := r.work().Gain
	r.press("left")
	r.reply(desk.Traced)
	r.press("u")
	if r.last().Gain != stored {
		t.Error("undo placed the poles anew")
	}
	if r.work().Gain != stored {
		t.Error("the stored gain is not what is in hand")
	}
}

func TestTypedPlace(t *testing.T) {
	r := start(t)
	r.press("z") // the plant is continuous: the s-plane was shown; now z
	r.press("z", "=")
	r.press("-", "5", "+-", "2", "i", "enter")
	r.wantPoles(z(-5+2i), z(-5-2i), z(-12))
	r.press("=", "-", "7", "enter")
	r.wantShown("a pair is held")
	r.press("esc")
	r.timeout()
	r.press("tab", "=", "10@1", "enter")
	r.wantShown("no other real pole")
}

// timeout lets the escape key act.
func (r *rig) timeout() {
	r.clock = r.clock.Add(60 * time.Millisecond)
	time.Sleep(60 * time.Millisecond)
	r.run()
}

// Places inside the unit circle that make the s-plane unstable may have been meant
// for the other plane.
func TestDoubtsAboutThePlane(t *testing.T) {
	const doubt = "were these z-plane places?"
	mapped := func(c *screen.Config) {
		c.Resolve = func(text, plane string, _ estimator.Form) ([]complex128, error) {
			spec, err := poles.Parse(text)
			if err != nil || plane == "z" {
				return spec.Poles, err
			}
			var out []complex128
			for _, v := range spec.Poles {
				out = append(out, z(v))
			}
			return out, nil
		}
	}
	for _, c := range []struct {
		keys []string
		want bool
	}{
		{[]string{"=", "0.8+-0.1i", "enter"}, true},
		{[]string{"=", "-0.8+-0.1i", "enter"}, false},
		{[]string{"=", "4+-2i", "enter"}, false},
		{[]string{"z", "=", "0.8+-0.1i", "enter"}, false},
		{[]string{"p", "0.8, 0.7, 0.9", "enter"}, true},
		{[]string{"p", "0.8, -7, -9", "enter"}, false},
		{[]string{"z", "p", "0.8, 0.7, 0.9", "enter"}, false},
	} {
		r := start(t, mapped)
		r.press(c.keys...)
		r.reply(desk.Traced)
		if got := strings.Contains(r.m.View(), doubt); got != c.want {
			t.Errorf("%v: doubt %v, expected %v\n%s", c.keys, got, c.want, strip(r.m.View()))
		}
	}
}

func TestPatternAndFloor(t *testing.T) {
	r := start(t)
	r.press("p", "slow", "enter")
	r.wantPoles(0.9, 0.92, 0.94)
	r.press("p", "nothing", "enter")
	r.wantShown("no such pattern")
	r.press("ctrl+c", "n", "f")
	r.wantPoles(analysis.Floor.Poles...)
	if r.last().Gain != analysis.Floor.Gain {
		t.Error("the floor is its own gain, not one placed at its poles")
	}
}

func TestFirstPolesComeFromTheFirstAnswer(t *testing.T) {
	r := newRig(t, nil)
	if r.last().Poles != nil || r.last().Gain != nil {
		t.Fatal("the first request should leave the choice to the background")
	}
	r.press("left")
	r.wantShown("no poles yet")
	r.reply(desk.Judged)
	r.wantPoles(analysis.Floor.Poles...)
}

func TestOldAnswersAreDropped(t *testing.T) {
	r := start(t)
	r.press("left")
	older := r.last()
	r.press("left")
	newer := r.last()
	r.send(screen.AnswerMsg{Answer: answer(newer, desk.Traced)})
	frame := r.m.View()
	r.send(screen.AnswerMsg{Answer: answer(older, desk.Traced)})
	if r.m.View() != frame {
		t.Error("an older answer changed the screen")
	}
	r.send(screen.AnswerMsg{Answer: desk.Answer{Gen: newer.Gen + 7, Design: answer(newer, desk.Judged).Design}})
	if r.m.View() != frame {
		t.Error("an answer to nothing changed the screen")
	}
}

func TestLateFiguresAreDimmedNotBlanked(t *testing.T) {
	r := start(t, colour)
	r.press("left")
	soon := r.m.View()
	r.clock = r.clock.Add(150 * time.Millisecond)
	time.Sleep(110 * time.Millisecond)
	r.run()
	late := r.m.View()
	if late == soon {
		t.Fatal("nothing was dimmed")
	}
	if strip(late) != strip(soon) {
		t.Error("dimming changed what is written")
	}
	r.reply(desk.Traced)
	if strings.Count(r.m.View(), "0.454") == 0 && r.m.View() == late {
		t.Error("the answer did not arrive")
	}
}

func TestFailedDesignKeepsTheFiguresAndSaysWhy(t *testing.T) {
	r := start(t)
	r.press("left")
	r.send(screen.AnswerMsg{Answer: desk.Answer{Gen: r.last().Gen, Err: errors.New("the poles coincide")}})
	r.wantShown("no design: the poles coincide")
	r.wantShown("settle")
}

func TestCandidates(t *testing.T) {
	r := start(t)
	r.press("a")
	r.wantShown("kept as A")
	r.press("left", "a")
	r.wantShown("as soon as")
	r.reply(desk.Judged)
	r.reply(desk.Traced)
	if w := r.work(); len(w.Candidates) != 2 || w.Candidates[1].Letter != "B" || w.Current != "B" {
		t.Fatalf("candidates %v, current %q", w.Candidates, w.Current)
	}
	gain := r.work().Candidates[0].Design.Gain
	r.press("1")
	r.wantPoles(z(-8+6i), z(-8-6i), z(-12))
	if r.last().Gain != gain || r.work().Current != "A" {
		t.Error("recall must take the stored gain")
	}
	r.press("v", "l", "x", "y")
	if w := r.work(); len(w.Candidates) != 1 || w.Candidates[0].Letter != "A" {
		t.Fatalf("after deleting B: %v", w.Candidates)
	}
	r.press("q") // leaves the view, not the program
	r.run()
	if r.quit {
		t.Error("q inside a view quit")
	}
	r.press("2")
	r.wantShown("no candidate 2")
}

// A design that is back in hand has its letter again and is not kept twice.
func TestKeptDesignHasItsLetterAgain(t *testing.T) {
	r := start(t)
	r.press("a", "left")
	r.reply(desk.Traced)
	if r.work().Current != "" {
		t.Fatal("another design has the letter")
	}
	r.press("u")
	r.wantShown("candidate A")
	r.press("a")
	r.wantShown("kept as A already")
	r.press("left", "right", "a") // reached by moving: known once its gain is there
	r.reply(desk.Judged)
	r.wantShown("kept as A already")
	r.reply(desk.Traced)
	r.wantShown("candidate A")
	if n := len(r.work().Candidates); n != 1 {
		t.Errorf("%d candidates", n)
	}
}

// The axes that an unstable design asked for go with it.
func TestAxesOfAnUnstableDesignDoNotStick(t *testing.T) {
	labels := func(r *rig) string {
		var out strings.Builder
		for _, l := range strings.Split(strip(r.m.View()), "\n") {
			if before, _, ok := strings.Cut(l, "│"); ok && strings.TrimSpace(before) != "" {
				out.WriteString(strings.TrimSpace(before) + " ")
			}
		}
		return out.String()
	}
	r := start(t)
	r.press("a", "0")
	sound := labels(r)
	if !strings.Contains(sound, "1.0") {
		t.Fatalf("the axis is not found: %q", sound)
	}
	unstable := func() {
		r.press("right")
		a := answer(r.last(), desk.Traced)
		a.Design.Stable, a.Run.Diverged = false, true
		for k := range a.Run.T {
			a.Run.Estimate[0][k] = math.Exp(float64(k) / 12)
		}
		r.send(screen.AnswerMsg{Answer: a})
		r.press("0")
		if labels(r) == sound {
			t.Fatal("the axis does not hold the unstable run")
		}
	}
	unstable()
	r.press("1")
	if got := labels(r); got != sound {
		t.Errorf("after a recall the axis is %q, expected %q", got, sound)
	}
	unstable()
	r.press("left")
	r.reply(desk.Judged)
	r.reply(desk.Traced)
	if got := labels(r); got != sound {
		t.Errorf("after a stable design the axis is %q, expected %q", got, sound)
	}
}

func TestFormIsAskedFor(t *testing.T) {
	r := start(t)
	r.press("c")
	if r.last().Form != estimator.Current || r.last().Gain != nil {
		t.Errorf("asked for %v", r.last())
	}
	r.wantShown("current form")
}

func TestSaveAndQuit(t *testing.T) {
	r := start(t)
	r.press("q")
	r.run()
	if !r.quit {
		t.Fatal("nothing is unsaved: q must quit")
	}
	r = start(t)
	r.press("left", "q")
	r.run()
	if r.quit {
		t.Fatal("quit with unsaved work")
	}
	r.press("n", "ctrl+s")
	r.wantShown("Test hoist.session.json")
	r.press("enter")
	r.run()
	if len(r.saved) > 0 {
		t.Fatal("saved poles before their gain was there")
	}
	r.reply(desk.Judged)
	r.run()
	if _, ok := r.saved["Test hoist.session.json"]; !ok {
		t.Fatalf("saved %v", r.saved)
	}
	r.wantShown("saved Test hoist.session.json")
	r.press("left")
	r.reply(desk.Judged)
	r.press("s")
	r.run()
	r.press("ctrl+c")
	r.run()
	if !r.quit {
		t.Error("all is saved: quit must not ask")
	}
}

// What a prompt suggests gives way to typing, and is there to be edited.
func TestTypingReplacesWhatAPromptSuggests(t *testing.T) {
	for _, c := range []struct {
		keys []string
		file string
	}{
		{[]string{"a", "b"}, "ab.session.json"},
		{[]string{"left", "right", "b", "backspace"}, "Test hoist.session.json"},
		{[]string{"home", "a"}, "aTest hoist.session.json"},
		{[]string{"backspace", "n"}, "Test hoist.session.json"},
	} {
		r := start(t)
		r.press("left")
		r.reply(desk.Judged)
		r.press("s")
		r.press(c.keys...)
		r.press("enter")
		r.run()
		if _, ok := r.saved[c.file]; !ok {
			t.Errorf("%v: saved %v, expected %s", c.keys, slices.Collect(maps.Keys(r.saved)), c.file)
		}
	}
	r := start(t)
	r.press("left")
	r.reply(desk.Judged)
	r.press("s")
	r.send(tea.KeyMsg{Type: tea.KeyRunes, Runes: []rune("pasted"), Paste: true})
	r.press("enter")
	r.run()
	if _, ok := r.saved["pasted.session.json"]; !ok {
		t.Errorf("a paste: saved %v", slices.Collect(maps.Keys(r.saved)))
	}
}

func TestSaveNeverReplacesUnasked(t *testing.T) {
	r := start(t)
	r.exist["Test hoist.session.json"] = true
	r.press("left")
	r.reply(desk.Judged)
	r.press("s", "enter")
	r.run()
	r.wantShown("exists")
	if len(r.saved) > 0 {
		t.Fatal("replaced unasked")
	}
	r.press("n", "s", "enter")
	r.run()
	r.press("r")
	r.run()
	if len(r.saved) != 1 {
		t.Error("not replaced when told to")
	}
	r.press("left", "q", "s")
	r.reply(desk.Judged)
	r.run()
	if !r.quit {
		t.Error("s at the question should save and quit")
	}
}

// A session that someone else changed is replaced only by an answer, however often
// it is saved, and a name that was asked for does not stick before it is given.
func TestSaveAsksAboutWhatSomeoneElseChanged(t *testing.T) {
	r := start(t)
	r.press("left")
	r.reply(desk.Judged)
	r.press("s", "enter")
	r.run()
	r.own = ""
	first := r.saved["Test hoist.session.json"]
	for range 2 {
		r.press("left")
		r.reply(desk.Judged)
		r.press("s")
		r.run()
		r.wantShown("changed by someone else")
		r.press("a", "esc", "s")
		r.run()
		r.wantShown("changed by someone else")
		r.press("n")
	}
	if got := r.saved["Test hoist.session.json"]; !slices.Equal(got.Poles, first.Poles) {
		t.Fatal("replaced without an answer")
	}
	r.press("s")
	r.run()
	r.press("r")
	r.run()
	r.wantShown("saved Test hoist.session.json")
	if got := r.saved["Test hoist.session.json"]; slices.Equal(got.Poles, first.Poles) {
		t.Error("not replaced when told to")
	}
}

// Where a file cannot be written, the work stays and another name is offered.
func TestSaveElsewhereAfterTrouble(t *testing.T) {
	r := start(t)
	r.press("left")
	r.reply(desk.Judged)
	r.press("s", "enter")
	r.run()
	r.broken = errTest
	r.press("left")
	r.reply(desk.Judged)
	r.press("s")
	r.run()
	r.wantShown("not saved; a another name")
	r.press("a")
	r.broken = nil
	r.wantShown("save as:")
	r.press("enter") // the name that is suggested is its own
	r.run()
	r.wantShown("saved Test hoist.session.json")
}

func TestPasteOutsideAPromptDoesNothing(t *testing.T) {
	r := start(t)
	frame := r.m.View()
	r.send(tea.KeyMsg{Type: tea.KeyRunes, Runes: []rune("hhhhq"), Paste: true})
	if r.m.View() != frame {
		t.Error("a paste was taken for keys")
	}
	r.press("=")
	r.send(tea.KeyMsg{Type: tea.KeyRunes, Runes: []rune("-5±2i\x1b\n"), Paste: true})
	r.press("enter")
	r.wantPoles(z(-5+2i), z(-5-2i), z(-12))
}

func TestTinyAndUnknownSizes(t *testing.T) {
	r := start(t)
	r.send(tea.WindowSizeMsg{Width: 59, Height: 30})
	if v := r.m.View(); !strings.Contains(v, "at least") || strings.Contains(v, "\n") {
		t.Errorf("too small: %q", v)
	}
	for w := 1; w < 30; w += 7 {
		r.send(tea.WindowSizeMsg{Width: w, Height: 3})
	}
	r.send(tea.WindowSizeMsg{})
	if n := strings.Count(r.m.View(), "\n") + 1; n != 24 {
		t.Errorf("%d lines for an unknown size, expected 24", n)
	}
}

func TestMethodNeedsAChoice(t *testing.T) {
	r := start(t)
	asked := len(r.asked)
	r.press("m")
	r.wantShown("no choice of gain")
	if len(r.asked) != asked {
		t.Error("asked for nothing new")
	}
	two := strings.Replace(hoist, "C = [[1, 0, 0]]", "C = [[1, 0, 0], [0, 0, 1]]", 1)
	two = strings.Replace(two, "[process_noise]", "[[sensors]]\nname = \"load cell\"\nnoise_std = 0.1\n[process_noise]", 1)
	r = start(t, func(c *screen.Config) { c.Work.Bench = bench(t, two) })
	r.wantShown("robust gain")
	r.press("m")
	if q := r.last(); q.Method != estimator.LeastNoise || q.From != nil || q.Gain != nil {
		t.Errorf("asked for %v", q)
	}
	r.press("u")
	if r.last().Method != estimator.Robust {
		t.Error("undo kept the method")
	}
}

func TestWorkBringsTheScreenBack(t *testing.T) {
	r := start(t)
	r.press("tab", ".", "z", "+", "a", "left", "b", "e", "r")
	w := r.work()
	w.Bench = bench(t, hoist)
	again := newRig(t, nil, func(c *screen.Config) { c.Work = w })
	got := again.work()
	if got.View != w.View || w.View.Focus != "readings" || w.View.Plane != "z" || w.View.Zoom == 0 || w.View.Selected != 1 || w.View.Trace != 1 || w.View.Shows != "error" || !w.View.Band {
		t.Errorf("view %v, expected %v", got.View, w.View)
	}
	again.wantPoles(w.Poles...)
	if len(got.Candidates) != 1 || again.m.(screen.Model).Unsaved() {
		t.Error("candidates lost, or unsaved at once")
	}
}

func TestUndoHasNoEnd(t *testing.T) {
	r := start(t)
	for i := range 300 {
		r.press([]string{"left", "up", "right"}[i%3])
		r.reply(desk.Traced)
	}
	for range 300 {
		r.press("u")
	}
	r.wantPoles(z(-8+6i), z(-8-6i), z(-12))
	r.press("u")
	r.wantShown("nothing to undo")
	for range 300 {
		r.press("U")
	}
	r.press("U")
	r.wantShown("nothing to redo")
	if near(r.work().Poles[0], z(-8+6i)) {
		t.Error("redo did not come back")
	}
}
