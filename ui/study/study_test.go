package study_test

import (
	"testing"
	"time"

	"polewright/estimator"
	"polewright/ui/desk"
	"polewright/ui/desk/desktest"
	"polewright/ui/replays/replaystest"
	"polewright/ui/study"
)

func bench(t *testing.T, name string) (*desk.Bench, *estimator.Design) {
	t.Helper()
	b := desktest.Bench(t, name)
	_, _, design := desktest.Start(t, b, estimator.Options{})
	return b, design
}

// wait returns the last answer of a generation.
func wait(t *testing.T, answers <-chan study.Answer, gen uint64) study.Answer {
	t.Helper()
	for {
		select {
		case a := <-answers:
			if a.Gen == gen && a.Done {
				if a.Err != nil {
					t.Fatal(a.Err)
				}
				return a
			}
		case <-time.After(60 * time.Second):
			t.Fatal("no answer")
		}
	}
}

func TestEveryStudyEnds(t *testing.T) {
	b, design := bench(t, "lift")
	answers := make(chan study.Answer, 1000)
	s := study.New(b, func(a study.Answer) { answers <- a })
	defer s.Close()

	s.Ask(study.Request{Gen: 1, Kind: study.Tradeoff, Design: design})
	a := wait(t, answers, 1)
	if len(a.Scaling) == 0 || len(a.Family) == 0 {
		t.Error("a curve is missing")
	}
	for _, p := range a.Family { // nothing is quieter than the floor
		if p.Design != nil && p.OverFloor() < 1-1e-9 {
			t.Errorf("%g over the floor", p.OverFloor())
		}
	}
	s.Ask(study.Request{Gen: 2, Kind: study.Tolerances, Design: design})
	if a = wait(t, answers, 2); a.Envelope == nil || a.Envelope.Cases < 2 {
		t.Errorf("got %+v", a.Envelope)
	}
	s.Ask(study.Request{Gen: 3, Kind: study.Fastest, Design: design})
	if a = wait(t, answers, 3); a.Found == nil || !a.Found.Met {
		t.Errorf("got %+v", a.Found)
	}
	s.Ask(study.Request{Gen: 4, Kind: study.Quietest, Design: design, SettleMax: 0.35})
	if a = wait(t, answers, 4); a.Found == nil || !a.Found.Met {
		t.Errorf("got %+v", a.Found)
	}
}

// A replay answers for the design in hand before the rivals are done, and ends
// with all of them in order.
func TestReplayOfALog(t *testing.T) {
	b, design := bench(t, "lift")
	log := replaystest.Log(t, b, replaystest.Made{Rows: 400, Seed: 1})
	answers := make(chan study.Answer, 1000)
	s := study.New(b, func(a study.Answer) { answers <- a })
	defer s.Close()
	rivals := []study.Rival{{Name: "A", Design: design}, {Name: "B"}, {Name: "C", Design: design}}
	s.Ask(study.Request{Gen: 1, Kind: study.Replay, Design: design, Log: log, Rivals: rivals})
	first := <-answers
	if first.Done || first.Replay == nil || len(first.Rivals) != 0 {
		t.Errorf("first %+v", first)
	}
	a := wait(t, answers, 1)
	if a.Replay == nil || len(a.Rivals) != 3 {
		t.Fatalf("got %+v", a)
	}
	for i, r := range a.Rivals {
		if r.Name != rivals[i].Name || (r.Err == nil) != (rivals[i].Design != nil) {
			t.Errorf("rival %d: %+v", i, r)
		}
	}
	if have, want := a.Rivals[2].Result.NISMean, a.Replay.Result.NISMean; have != want {
		t.Errorf("the same design: NIS %v and %v", have, want)
	}
	s.Ask(study.Request{Gen: 2, Kind: study.Replay, Design: design})
	if a := <-answers; a.Gen != 2 || !a.Done || a.Err == nil {
		t.Errorf("without a log: %+v", a)
	}
}

func TestNoneStopsASearch(t *testing.T) {
	b, design := bench(t, "balancer")
	answers := make(chan study.Answer, 1000)
	s := study.New(b, func(a study.Answer) { answers <- a })
	s.Ask(study.Request{Gen: 1, Kind: study.Fastest, Design: design})
	s.Ask(study.Request{Gen: 2, Kind: study.None})
	s.Ask(study.Request{Gen: 3, Kind: study.Quietest, Design: design}) // without a settle time
	for {
		select {
		case a := <-answers:
			if a.Gen == 1 && a.Done {
				t.Fatal("the search went on to its end")
			}
			if a.Gen == 3 {
				if a.Err == nil {
					t.Error("quietest without a settle time was taken")
				}
				s.Close()
				return
			}
		case <-time.After(60 * time.Second):
			t.Fatal("no answer")
		}
	}
}
