package survey_test

import (
	"math"
	"math/cmplx"
	"testing"
	"time"

	"polewright/estimator"
	"polewright/ui/desk"
	"polewright/ui/desk/desktest"
	"polewright/ui/survey"
)

// request maps the first pair of the start design over the left half plane.
func request(t testing.TB, b *desk.Bench, width, height int) (survey.Request, *estimator.Designer) {
	t.Helper()
	d, list, from := desktest.Start(t, b, estimator.Options{})
	r := survey.Request{Gen: 1, Pair: true, Width: width, Height: height, From: from}
	held := -1
	for i, v := range list {
		if held < 0 && imag(v) > 0 {
			held = i
		}
	}
	for i, v := range list {
		if i != held && v != cmplx.Conj(list[held]) {
			r.Others = append(r.Others, v)
		}
	}
	for y := range height {
		for x := range width {
			s := complex(-40*float64(x+1)/float64(width), 30*float64(height-1-y)/float64(height))
			r.Cells = append(r.Cells, cmplx.Exp(s*complex(b.Model.Period, 0)))
		}
	}
	r.Cells[0] = cmplx.NaN()
	return r, d
}

// What the map promises is what landing there gives.
func TestTheMapKeepsItsPromise(t *testing.T) {
	for _, name := range []string{"lift", "pan-drive", "balancer"} { // without and with limits on margins, one sensor and two
		t.Run(name, func(t *testing.T) { keepsItsPromise(t, desktest.Bench(t, name)) })
	}
}

func keepsItsPromise(t *testing.T, b *desk.Bench) {
	r, d := request(t, b, 12, 6)
	answers := make(chan survey.Answer, 100)
	s := survey.New(b, func(a survey.Answer) { answers <- a })
	defer s.Close()
	s.Ask(r)
	var last survey.Answer
	stages := 0
	for !last.Done {
		select {
		case last = <-answers:
			stages++
		case <-time.After(20 * time.Second):
			t.Fatal("no map")
		}
		if last.Err != nil {
			t.Fatal(last.Err)
		}
	}
	if stages < 3 {
		t.Errorf("%d stages: the map should come coarse first", stages)
	}
	broken := 0
	for i, spot := range last.Spots {
		if !spot.Known {
			t.Fatalf("cell %d was never looked at", i)
		}
		if i == 0 {
			if spot.Seen {
				t.Error("a place that is none was mapped")
			}
			continue
		}
		list := append(append([]complex128(nil), r.Others...), r.Cells[i], cmplx.Conj(r.Cells[i]))
		got, err := d.Place(list, r.From)
		if err != nil {
			t.Fatal(err)
		}
		if math.Abs(got.Noise.OverFloorRMS-spot.OverFloor) > 1e-9*spot.OverFloor {
			t.Errorf("cell %d promises %g, landing gives %g", i, spot.OverFloor, got.Noise.OverFloorRMS)
		}
		first := -1
		for k, l := range b.Scenario.Judge(got, b.Model, b.Plant, nil) {
			if !l.Met {
				first = k
				if last.Limits[k] != l.Name {
					t.Errorf("limit %d is %s, not %s", k, l.Name, last.Limits[k])
				}
				break
			}
		}
		if first != spot.Broken {
			t.Errorf("cell %d breaks limit %d, landing breaks %d", i, spot.Broken, first)
		}
		if first >= 0 {
			broken++
		}
	}
	if broken == 0 || broken == len(last.Spots) {
		t.Errorf("%d of %d cells break a limit: the test shows nothing", broken, len(last.Spots))
	}
}

func TestNewestMapWins(t *testing.T) {
	b := desktest.Bench(t, "balancer")
	r, _ := request(t, b, 40, 20)
	answers := make(chan survey.Answer, 10000)
	s := survey.New(b, func(a survey.Answer) { answers <- a })
	defer s.Close()
	for gen := uint64(1); gen <= 200; gen++ {
		r.Gen = gen
		s.Ask(r)
	}
	newest := uint64(0)
	for {
		select {
		case a := <-answers:
			if a.Gen < newest {
				t.Fatalf("map %d came after %d", a.Gen, newest)
			}
			newest = a.Gen
			if a.Gen == 200 && a.Done {
				return
			}
		case <-time.After(30 * time.Second):
			t.Fatal("no map")
		}
	}
}

func TestNoGrid(t *testing.T) {
	answers := make(chan survey.Answer, 1)
	s := survey.New(desktest.Bench(t, "lift"), func(a survey.Answer) { answers <- a })
	defer s.Close()
	s.Ask(survey.Request{Width: 3, Height: 2, Cells: make([]complex128, 5)})
	if a := <-answers; a.Err == nil {
		t.Error("five cells were taken for three by two")
	}
}

// BenchmarkMap is a map of 1,200 cells.
func BenchmarkMap(b *testing.B) {
	for _, name := range []string{"lift", "pan-drive", "balancer"} {
		b.Run(name, func(b *testing.B) {
			place := desktest.Bench(b, name)
			r, _ := request(b, place, 60, 20)
			done := make(chan struct{}, 1)
			s := survey.New(place, func(a survey.Answer) {
				if a.Done {
					done <- struct{}{}
				}
			})
			defer s.Close()
			for b.Loop() {
				s.Ask(r)
				<-done
			}
		})
	}
}
