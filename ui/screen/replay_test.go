package screen_test

import (
	"context"
	"errors"
	"strings"
	"testing"

	tea "github.com/charmbracelet/bubbletea"

	"polewright/estimator"
	"polewright/scenarios"
	"polewright/ui/desk"
	"polewright/ui/desk/desktest"
	"polewright/ui/replays"
	"polewright/ui/replays/replaystest"
	"polewright/ui/screen"
	"polewright/ui/study"
)

// onLog is a rig with a log of the lift, and what a replay of it gives.
func onLog(t *testing.T, opts ...option) (*rig, *student, *replays.Outcome) {
	t.Helper()
	b := desktest.Bench(t, "lift")
	_, _, design := desktest.Start(t, b, estimator.Options{})
	log := replaystest.Log(t, b, replaystest.Made{Rows: 300, Seed: 5})
	runner, err := replays.NewRunner(b.Model)
	if err != nil {
		t.Fatal(err)
	}
	o, err := runner.Run(context.Background(), log, design)
	if err != nil {
		t.Fatal(err)
	}
	r, s := studied(t, scenarios.Limits{}, append([]option{func(c *screen.Config) { c.Log = log }}, opts...)...)
	return r, s, o
}

func (r *rig) wantNotShown(text string) {
	r.t.Helper()
	if shown := strip(r.m.View()); strings.Contains(shown, text) {
		r.t.Errorf("%q is on the screen:\n%s", text, shown)
	}
}

func TestWithoutALogThereIsNoViewOfIt(t *testing.T) {
	r, s := studied(t, scenarios.Limits{}, func(c *screen.Config) { c.Work.View = desk.View{Plane: "s", Focus: "log"} })
	r.press("d")
	r.wantShown("start with --log FILE.csv")
	if len(s.asked) != 0 || r.work().View.Focus != "" {
		t.Errorf("asked for %+v, view %q", s.asked, r.work().View.Focus)
	}
	r.send(tea.WindowSizeMsg{Width: 120, Height: 200})
	r.press("?")
	r.wantNotShown("the log of the real machine")
	with, _, _ := onLog(t)
	with.send(tea.WindowSizeMsg{Width: 120, Height: 200})
	with.press("?")
	with.wantShown("the log of the real machine")
}

// The view follows the design in hand: what is older is said to be, the newest
// request wins, and a candidate is replayed once.
func TestReplayFollowsTheDesign(t *testing.T) {
	r, s, o := onLog(t)
	r.send(tea.WindowSizeMsg{Width: 120, Height: 80})
	r.press("a", "d")
	q := s.last()
	if q.Kind != study.Replay || q.Log == nil || q.Design == nil || len(q.Rivals) != 1 || q.Rivals[0].Name != "A" {
		t.Fatalf("asked for %+v", q)
	}
	r.wantShown("computing")
	r.study(study.Answer{Gen: q.Gen, Kind: q.Kind, Replay: o})
	r.wantShown("computing candidates")
	r.wantShown("NIS mean")
	r.study(study.Answer{Gen: q.Gen, Kind: q.Kind, Replay: o, Rivals: []replays.Rival{{Name: "A", Err: errors.New("out of bounds")}}, Done: true})
	r.wantNotShown("computing")
	r.wantShown("out of bounds")
	n := len(s.asked)

	r.press("<") // inside the view
	r.reply(desk.Traced)
	r.press("<")
	r.reply(desk.Traced)
	if len(s.asked) != n+2 || s.last().Kind != study.Replay || s.last().Design == q.Design || len(s.last().Rivals) != 0 {
		t.Fatalf("%d requests, the last %+v", len(s.asked)-n, s.last())
	}
	r.wantShown("computing")
	second := s.asked[n]
	r.study(study.Answer{Gen: second.Gen, Kind: study.Replay, Err: errors.New("too late"), Done: true})
	r.wantNotShown("too late")
	r.study(study.Answer{Gen: s.last().Gen, Kind: study.Replay, Replay: o, Done: true})
	r.wantNotShown("computing")
	r.wantShown("out of bounds") // A is known still

	r.press("d")
	r.wantShown("s-plane")
	n = len(s.asked)
	r.press("d")
	if len(s.asked) != n {
		t.Error("the same design is replayed twice")
	}
	r.press("d", "left")
	r.reply(desk.Traced)
	r.press("d")
	if len(s.asked) != n+1 {
		t.Errorf("%d replays after a drag outside of the view", len(s.asked)-n)
	}
	r.press("d")
	if s.last().Kind != study.None {
		t.Errorf("leaving asked for %+v", s.last())
	}
	r.press("d")
	r.study(study.Answer{Gen: s.last().Gen, Kind: study.Replay, Err: errors.New("it grows"), Done: true})
	r.wantShown("no replay: it grows")
	r.wantNotShown("NIS mean")
	n = len(s.asked)
	r.press("d", "d")
	if len(s.asked) != n {
		t.Error("a replay that failed is tried over and over")
	}
}

func TestLogThatWasOpenIsOpenAgain(t *testing.T) {
	r, s, _ := onLog(t, func(c *screen.Config) { c.Work.View = desk.View{Plane: "s", Focus: "log"} })
	if len(s.asked) != 1 || s.last().Kind != study.Replay || r.work().View.Focus != "log" {
		t.Errorf("asked for %+v, view %q", s.asked, r.work().View.Focus)
	}
}

func TestReplayFits(t *testing.T) {
	for _, size := range [][2]int{{60, 18}, {80, 24}, {300, 100}} {
		r, s, o := onLog(t)
		r.send(tea.WindowSizeMsg{Width: size[0], Height: size[1]})
		r.press("d")
		r.study(study.Answer{Gen: s.last().Gen, Kind: study.Replay, Replay: o, Done: true})
		for range 5 {
			fits(t, r.m.View(), size[0], size[1])
			r.press(" ")
		}
	}
}
