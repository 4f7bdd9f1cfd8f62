package screen_test

import (
	"errors"
	"math"
	"strings"
	"testing"
	"time"

	tea "github.com/charmbracelet/bubbletea"
	"gonum.org/v1/gonum/mat"
	"pgregory.net/rapid"

	"polewright/estimator"
	"polewright/estimator/sweep"
	"polewright/scenarios"
	"polewright/scenarios/seek"
	"polewright/scenarios/tolerance"
	"polewright/ui/desk"
	"polewright/ui/screen"
	"polewright/ui/study"
)

// student takes the requests for studies.
type student struct{ asked []study.Request }

func (s *student) last() study.Request { return s.asked[len(s.asked)-1] }

// studied is a rig with a student behind it; its scenario has the limits.
func studied(t testing.TB, limits scenarios.Limits, opts ...option) (*rig, *student) {
	s := &student{}
	r := start(t, append([]option{func(c *screen.Config) {
		c.Study = func(q study.Request) { s.asked = append(s.asked, q) }
		scenario := *c.Work.Bench.Scenario
		scenario.Limits = limits
		bench := *c.Work.Bench
		bench.Scenario = &scenario
		c.Work.Bench = &bench
	}}, opts...)...)
	return r, s
}

func (r *rig) study(a study.Answer) { r.send(screen.StudyMsg{Answer: a}) }

// made is a design with made-up figures at three poles.
func made(settle, over float64, poles ...complex128) *estimator.Design {
	return &estimator.Design{Wanted: poles, Reached: poles, Gain: mat.NewDense(3, 1, []float64{settle, over, 1}), Stable: true,
		Transient: estimator.Transient{Settle: settle, Peak: 2},
		Noise:     estimator.Noise{Std: []float64{over, over, over}, OverFloorRMS: over}}
}

func curve(factors ...float64) []sweep.Point {
	var out []sweep.Point
	for _, k := range factors {
		p := complex(-10*k, 0)
		out = append(out, sweep.Point{Factor: k, Design: made(0.4/k, 1+k/10, z(p), z(p-1), z(p-2))})
	}
	return out
}

func number(v float64) *float64 { return &v }

func TestTradeoffIsWalkedAndTaken(t *testing.T) {
	r, s := studied(t, scenarios.Limits{Settle: number(0.3), OverFloor: number(1.3)})
	r.press("t")
	q := s.last()
	if q.Kind != study.Tradeoff || q.Design == nil {
		t.Fatalf("asked for %+v", q)
	}
	r.wantShown("on their way")
	list := curve(0.5, 1, 2)
	r.study(study.Answer{Gen: q.Gen, Kind: q.Kind, Scaling: list})
	r.wantShown("computing")
	r.study(study.Answer{Gen: q.Gen, Kind: q.Kind, Scaling: list, Family: curve(0.1, 1, 10), Done: true})
	r.wantShown("all speeds x 1 ")
	r.wantShown("over the limit: settle")
	r.press("left")
	r.wantShown("all speeds x 2 ")
	r.wantShown("0.200 s")
	before := r.work().Poles
	r.press("enter")
	r.wantPoles(list[2].Design.Wanted...)
	if got := r.last(); got.Gain != list[2].Design.Gain {
		t.Error("the gain of the point was placed anew")
	}
	r.press("u")
	r.wantPoles(before...)
}

// A view that was open when the session was saved is filled as soon as there is a
// design.
func TestOpenViewOfASessionIsStudied(t *testing.T) {
	for focus, kind := range map[string]study.Kind{"trade-off": study.Tradeoff, "stress": study.Tolerances} {
		r, s := studied(t, scenarios.Limits{}, func(c *screen.Config) { c.Work.View = desk.View{Plane: "s", Focus: focus} })
		if len(s.asked) != 1 || s.last().Kind != kind {
			t.Errorf("%s: asked for %+v", focus, s.asked)
		}
		if got := r.work().View.Focus; got != focus {
			t.Errorf("%s is kept as %s", focus, got)
		}
	}
	r, _ := studied(t, scenarios.Limits{}, func(c *screen.Config) { c.Work.View = desk.View{Plane: "s", Focus: "sensors"} })
	r.slow()
	r.wantShown("3 of 3 states seen")
}

func TestTradeoffTakesABestEstimator(t *testing.T) {
	r, s := studied(t, scenarios.Limits{})
	r.press("t")
	family := curve(0.1, 1, 10)
	for i := range family {
		family[i].Design.Wanted = nil // as of a gain found elsewhere
	}
	r.study(study.Answer{Gen: s.last().Gen, Kind: study.Tradeoff, Scaling: curve(1), Family: family, Done: true})
	r.press("tab", "l")
	r.wantShown("best for process noise x 0.1 ")
	r.press("enter")
	r.wantPoles(family[0].Design.Reached...)
	if r.last().Gain != family[0].Design.Gain {
		t.Error("not the family's own gain")
	}
}

// A view that is left stops its study; what comes late of it is not taken; and a
// design that was changed is studied anew.
func TestStudiesFollowTheDesign(t *testing.T) {
	r, s := studied(t, scenarios.Limits{})
	r.press("t")
	first := s.last()
	r.press("esc")
	r.timeout()
	if q := s.last(); q.Kind != study.None || q.Gen <= first.Gen {
		t.Fatalf("leaving asked for %+v", q)
	}
	r.press("t")
	again := s.last()
	if again.Kind != study.Tradeoff {
		t.Fatal("the study that was stopped counts as done")
	}
	r.study(study.Answer{Gen: first.Gen, Kind: study.Tradeoff, Scaling: curve(3), Done: true})
	r.wantShown("on their way")
	r.study(study.Answer{Gen: again.Gen, Kind: study.Tradeoff, Scaling: curve(1), Done: true})
	n := len(s.asked)
	r.press("t", "t")
	if len(s.asked) != n {
		t.Error("the same design is studied twice")
	}
	r.press("t", "left")
	r.reply(desk.Traced)
	r.press("t")
	if len(s.asked) != n+1 || s.last().Design == again.Design {
		t.Errorf("%d studies after the design changed", len(s.asked)-n)
	}
}

func TestTroubleOfAStudyIsSaid(t *testing.T) {
	r, s := studied(t, scenarios.Limits{})
	r.press("t")
	r.study(study.Answer{Gen: s.last().Gen, Kind: study.Tradeoff, Err: errors.New("a curve too many"), Done: true})
	r.wantShown("a curve too many")
	r.press("t", "w")
	r.study(study.Answer{Gen: s.last().Gen, Kind: study.Tolerances, Err: errors.New("no such corner"), Done: true})
	r.wantShown("no such corner")
	if n := len(s.asked); n > 3 {
		t.Errorf("%d requests: a study that failed is tried over and over", n)
	}
}

func TestSearchIsOfferedTakenAndUndone(t *testing.T) {
	r, s := studied(t, scenarios.Limits{Settle: number(0.3)})
	before := r.work().Poles
	r.press("F")
	q := s.last()
	if q.Kind != study.Fastest {
		t.Fatalf("asked for %+v", q)
	}
	best := made(0.25, 1.2, z(-20), z(-21), z(-22))
	r.study(study.Answer{Gen: q.Gen, Kind: q.Kind, Tried: 10, All: 40, Best: best})
	r.wantShown("25 %")
	r.press("left") // work goes on meanwhile
	r.press("u")
	r.study(study.Answer{Gen: q.Gen, Kind: q.Kind, Done: true, Best: best,
		Found: &seek.Result{Design: best, Met: true, Better: true, Limits: []scenarios.LimitResult{{Name: "settle_s", Met: true}}}})
	r.wantShown("found: settles in 0.25 s, 1.20 x floor, limits met")
	r.wantPoles(before...)
	r.press("enter")
	r.wantPoles(best.Wanted...)
	r.press("enter") // nothing is offered any more
	r.press("u")
	r.wantPoles(before...)
}

func TestSearchIsStopped(t *testing.T) {
	r, s := studied(t, scenarios.Limits{Settle: number(0.3)})
	r.press("F")
	q := s.last()
	r.press("esc")
	r.timeout()
	if s.last().Kind != study.None {
		t.Fatal("the search goes on")
	}
	r.study(study.Answer{Gen: q.Gen, Kind: q.Kind, Done: true, Found: &seek.Result{Design: made(0.1, 1, z(-1), z(-2), z(-3)), Better: true}})
	if strings.Contains(r.m.View(), "found:") {
		t.Error("a search that was stopped makes an offer")
	}
}

func TestSearchForTheQuietestAsksHowFast(t *testing.T) {
	r, s := studied(t, scenarios.Limits{Settle: number(0.35)})
	r.press("Q")
	r.wantShown("settle within, s: ")
	r.press("0", ".", "5", "enter") // typed in place of what is suggested
	if q := s.last(); q.Kind != study.Quietest || q.SettleMax != 0.5 {
		t.Errorf("asked for %+v", q)
	}
	r.press("Q", "right", "x", "enter")
	r.wantShown("a settle time in seconds")
	r.press("backspace", "enter")
	if q := s.last(); q.Kind != study.Quietest || q.SettleMax != 0.35 {
		t.Errorf("asked for %+v", q)
	}
	r.study(study.Answer{Gen: s.last().Gen, Kind: study.Quietest, Done: true,
		Found: &seek.Result{Design: made(0.5, 1.01, z(-1), z(-2), z(-3)), Better: true, Limits: []scenarios.LimitResult{{Name: "settle_s"}, {Name: "over_floor_max"}, {Name: "std gate speed"}}}})
	r.wantShown("still over: settle, over floor")
	r.press("Q", "enter")
	r.study(study.Answer{Gen: s.last().Gen, Kind: study.Quietest, Done: true, Found: &seek.Result{Design: made(0.5, 1, z(-1), z(-2), z(-3))}})
	r.wantShown("nothing better")
}

func TestSearchWithoutLimitsIsRefused(t *testing.T) {
	r, s := studied(t, scenarios.Limits{})
	r.press("F")
	if len(s.asked) != 0 {
		t.Error("faster without end is sought")
	}
	r.wantShown("no limits")
}

// stressed opens the worst case of a plant whose rope may be softer.
func stressed(t testing.TB) (*rig, *student) {
	r, s := studied(t, scenarios.Limits{})
	r.press("w")
	q := s.last()
	if q.Kind != study.Tolerances {
		t.Fatalf("asked for %+v", q)
	}
	r.study(study.Answer{Gen: q.Gen, Kind: q.Kind, Tried: 3, All: 12})
	r.wantShown("3 of 12")
	worst := tolerance.Case{Kind: tolerance.Corner, Names: []string{"rope"}, Factors: []float64{0.7}}
	r.study(study.Answer{Gen: q.Gen, Kind: q.Kind, Done: true, Envelope: &tolerance.Envelope{Cases: 12, Measures: []tolerance.Measure{
		{Figure: tolerance.PhaseMargin, State: -1, Input: -1, Name: "phase margin", Unit: "deg", Nominal: 50, Worst: 41, Case: worst}}}})
	r.wantShown("rope -30%")
	return r, s
}

func TestTracesRunOnTheHardestCaseAndBack(t *testing.T) {
	r, s := stressed(t)
	poles, studies := r.work().Poles, len(s.asked)
	r.press("enter")
	if q := r.last(); q.Truth["rope"] != 0.7 || q.Gain == nil {
		t.Fatalf("asked for %+v", q)
	}
	r.wantPoles(poles...)
	r.reply(desk.Traced)
	if len(s.asked) != studies {
		t.Error("the same design is studied again")
	}
	r.press("w", "left")
	if r.last().Truth["rope"] != 0.7 {
		t.Error("a move goes back to the scenario's own plant")
	}
	r.wantShown("real plant: rope -30%")
	r.reply(desk.Traced)
	r.press("a")
	if n := len(r.work().Candidates); n != 0 {
		t.Error("a candidate is kept with figures of another real plant")
	}
	r.wantShown("harder real plant")
	r.press("w", "enter", "w")
	if r.last().Truth != nil {
		t.Error("still on the hardest case")
	}
	// What undo brings back was run on the hardest case: it is run anew.
	r.reply(desk.Traced)
	n := len(r.asked)
	r.press("u")
	if len(r.asked) != n+1 || r.last().Truth != nil {
		t.Error("not asked anew")
	}
	if strings.Contains(r.m.View(), "real plant:") {
		t.Error("the header still has the hardest case")
	}
}

func TestUnpluggingASensor(t *testing.T) {
	r := start(t)
	r.press("i")
	r.slow()
	r.wantShown("3 of 3 states seen")
	r.press("enter")
	r.wantShown("one sensor has to stay")
	r.press("i")
	r.wantShown("s-plane")
}

// slow runs the waiting commands until they are done.
func (r *rig) slow() {
	r.patience = 400 * time.Millisecond // also where others use the machine
	defer func() { r.patience = 0 }()
	for range 20 {
		if r.run(); len(r.cmds) == 0 {
			return
		}
	}
}

func TestViewsOfResearchFit(t *testing.T) {
	for _, size := range [][2]int{{60, 18}, {80, 24}, {300, 100}} {
		r, s := studied(t, scenarios.Limits{Settle: number(0.3), OverFloor: number(math.Inf(1))})
		r.send(tea.WindowSizeMsg{Width: size[0], Height: size[1]})
		for _, k := range []string{"t", "i", "w", "?"} {
			r.press(k)
			if k == "t" {
				r.study(study.Answer{Gen: s.last().Gen, Kind: study.Tradeoff, Scaling: curve(0.2, 1, 4), Family: curve(0.01, 1, 1e3), Done: true})
			}
			if k == "i" {
				r.slow()
			}
			fits(t, r.m.View(), size[0], size[1])
			r.press("q")
		}
	}
}

// Whatever is typed while studies come in, early, late and in pieces, the screen
// stands, fits, and holds three poles.
func TestAnyKeysWithStudies(t *testing.T) {
	names := []string{"t", "i", "w", "F", "Q", "tab", "left", "right", "shift+left", "enter", "esc", "u", "U", "a", "1", "v", "x", "y", "q", "r", "?", "=", "c", "z", " ", "j"}
	worst := tolerance.Case{Kind: tolerance.Corner, Names: []string{"rope"}, Factors: []float64{0.7}}
	rapid.Check(t, func(t *rapid.T) {
		r, s := studied(bare{t: t}, scenarios.Limits{Settle: number(0.3)})
		w, h := rapid.SampledFrom([]int{60, 80, 121}).Draw(t, "w"), rapid.SampledFrom([]int{18, 24, 37}).Draw(t, "h")
		r.send(tea.WindowSizeMsg{Width: w, Height: h})
		for range rapid.IntRange(1, 30).Draw(t, "n") {
			r.press(rapid.SampledFrom(names).Draw(t, "key"))
			if k := rapid.IntRange(0, 3).Draw(t, "reply"); k < 2 {
				r.reply(desk.Stage(k))
			}
			if len(s.asked) > 0 && rapid.Bool().Draw(t, "study") {
				q := s.asked[rapid.IntRange(max(len(s.asked)-2, 0), len(s.asked)-1).Draw(t, "which")]
				a := study.Answer{Gen: q.Gen, Kind: q.Kind, Done: rapid.Bool().Draw(t, "done"), Tried: 1, All: 2}
				if rapid.Bool().Draw(t, "any") {
					best := made(0.2, 1.1, z(-20+3i), z(-20-3i), z(-22))
					a.Scaling, a.Best = curve(0.5, 1, 2), best
					a.Found = &seek.Result{Design: best, Better: true}
					a.Envelope = &tolerance.Envelope{Cases: 3, Measures: []tolerance.Measure{{Name: "noise of height", Figure: tolerance.Noise, Nominal: 1, Worst: 2, Case: worst}}}
				}
				r.study(a)
			}
			fits(t, r.m.View(), w, h)
			if n := len(r.work().Poles); n != 3 {
				t.Fatalf("%d poles", n)
			}
		}
	})
}
