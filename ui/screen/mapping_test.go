package screen_test

import (
	"fmt"
	"math"
	"math/cmplx"
	"os"
	"path/filepath"
	"regexp"
	"strconv"
	"strings"
	"testing"
	"time"

	tea "github.com/charmbracelet/bubbletea"
	"github.com/google/go-cmp/cmp"

	"polewright/estimator"
	"polewright/ui/desk"
	"polewright/ui/desk/desktest"
	"polewright/ui/screen"
	"polewright/ui/solver"
	"polewright/ui/survey"
)

// mapped lets a rig take requests for maps.
type mapped struct {
	*rig
	maps []survey.Request
}

func startMapped(t testing.TB, opts ...option) *mapped {
	r := &mapped{}
	r.rig = start(t, append(opts, func(c *screen.Config) {
		c.Map = func(q survey.Request) { r.maps = append(r.maps, q) }
	})...)
	return r
}

// due lets the time pass after which a map is asked for; it returns the newest
// request, empty where none came.
func (r *mapped) due() survey.Request {
	n := len(r.maps)
	r.clock = r.clock.Add(time.Second)
	r.send(screen.MapTick)
	if len(r.maps) == n {
		return survey.Request{}
	}
	return r.maps[len(r.maps)-1]
}

// chart makes up a map: noise grows with the distance from -8±6i, and beyond
// 22 rad/s a limit breaks.
func chart(q survey.Request, done bool) screen.MapMsg {
	a := survey.Answer{Gen: q.Gen, Limits: []string{"settle_s", "peak_max"}, Done: done}
	for _, own := range q.Cells {
		s := survey.Spot{Known: done, Seen: true, OverFloor: math.NaN(), Broken: -1}
		if at := cmplx.Log(own) * 100; cmplx.IsNaN(own) {
			s.Seen = false
		} else if real(at) < 0 {
			s.OverFloor = 1 + cmplx.Abs(at-(-8+6i))/8
			if cmplx.Abs(at) > 22 {
				s.Broken = 1
			}
		}
		a.Spots = append(a.Spots, s)
	}
	return screen.MapMsg{Answer: a}
}

func TestMapFrames(t *testing.T) {
	for _, size := range []struct{ w, h int }{{80, 24}, {120, 36}, {200, 50}} {
		for look, opt := range map[string]option{"plain": plain, "colour": colour, "ascii": seven} {
			name := fmt.Sprintf("%dx%d-map-%s", size.w, size.h, look)
			t.Run(name, func(t *testing.T) {
				r := startMapped(t, opt)
				r.send(tea.WindowSizeMsg{Width: size.w, Height: size.h})
				if look == "ascii" {
					r.press("M") // off at first
				}
				r.send(chart(r.due(), true))
				r.press("right", "right") // the map stays while its own pole moves
				r.reply(desk.Traced)
				got := r.m.View()
				fits(t, got, size.w, size.h)
				compareGolden(t, name, got)
			})
		}
	}
	t.Run("80x24-map-real", func(t *testing.T) {
		r := startMapped(t, plain)
		r.press("tab")
		r.send(chart(r.due(), true))
		compareGolden(t, "80x24-map-real", r.m.View())
	})
}

func compareGolden(t *testing.T, name, got string) {
	t.Helper()
	file := filepath.Join("testdata", name+".golden")
	visible := strings.ReplaceAll(got, "\x1b", "^") + "\n"
	if *update {
		if err := os.WriteFile(file, []byte(visible), 0o644); err != nil {
			t.Fatal(err)
		}
	}
	want, err := os.ReadFile(file)
	if err != nil {
		t.Fatal(err)
	}
	if diff := cmp.Diff(string(want), visible); diff != "" {
		t.Error(diff)
	}
}

func shaded(r *mapped) bool { return strings.Contains(r.m.View(), "░") }

// A map is shown as long as it fits what is in hand, and no longer.
func TestMapIsNeverStale(t *testing.T) {
	for _, c := range []struct {
		key   string
		stays bool
	}{
		{"left", true}, {"up", true}, {".", true}, {"e", true}, {"u", true},
		{"tab", false}, {"z", false}, {"+", false}, {"-", false}, {">", false}, {"f", false}, {"c", false}, {"M", false},
	} {
		t.Run(c.key, func(t *testing.T) {
			r := startMapped(t, plain)
			first := r.due()
			r.send(chart(first, false))
			if !shaded(r) {
				t.Fatal("a coarse map is not shown")
			}
			r.press(c.key)
			if shaded(r) != c.stays {
				t.Errorf("after %s the map is shown: %v", c.key, shaded(r))
			}
			if last := r.maps[len(r.maps)-1]; len(last.Cells) != 0 {
				t.Error("the key did not stop the work on the map")
			}
			if !c.stays {
				if r.send(chart(first, true)); shaded(r) {
					t.Error("a late answer about what was in hand before is shown")
				}
			}
			if c.key == "M" {
				if q := r.due(); len(q.Cells) != 0 {
					t.Error("a map was asked for though it is off")
				}
				return
			}
			if changed := len(r.asked) > 1; changed && r.due().Cells != nil {
				t.Error("a map was asked for before the design in hand is known")
			}
			r.reply(desk.Traced)
			q := r.due()
			if len(q.Cells) == 0 || q.Gen == first.Gen {
				t.Fatal("no map was asked for once the hands rested")
			}
			if known := len(q.Known) > 0; known != c.stays {
				t.Errorf("what is known already is used again: %v", known)
			}
			r.send(chart(q, true))
			if !shaded(r) {
				t.Error("the new map is not shown")
			}
		})
	}
}

// While keys come, no map is asked for.
func TestMapWaitsForTheHands(t *testing.T) {
	r := startMapped(t, plain)
	for range 50 {
		r.hold(">", 1)
		r.reply(desk.Traced)
		r.send(screen.MapTick)
	}
	if len(r.maps) > 0 {
		t.Errorf("%d requests while a key was held", len(r.maps))
	}
	if q := r.due(); len(q.Cells) == 0 {
		t.Error("none after it")
	}
}

func TestMapCanBeSwitchedOff(t *testing.T) {
	r := startMapped(t, plain)
	r.press("M")
	if !r.work().View.MapOff {
		t.Error("a session does not remember it")
	}
	r.press("M")
	if r.work().View.MapOff {
		t.Error("it stays off")
	}
	off := startMapped(t, func(c *screen.Config) { c.Work.View.MapOff = true })
	if q := off.due(); len(q.Cells) != 0 {
		t.Error("a session with the map off asks for one")
	}
}

// In 7 bits the marks of a map bury the plane: it waits to be asked for, which
// says nothing about the next terminal.
func TestMapWaitsInSevenBits(t *testing.T) {
	r := startMapped(t, seven)
	if q := r.due(); len(q.Cells) != 0 || r.work().View.MapOff {
		t.Error("a map was asked for, or the session keeps that there is none")
	}
	r.press("M")
	if q := r.due(); len(q.Cells) == 0 {
		t.Error("no map after M")
	}
	r.press("M")
	if !r.work().View.MapOff {
		t.Error("a session does not remember that it was switched off")
	}
}

var (
	promised = regexp.MustCompile(`here: noise ([0-9.]+) x floor`)
	landed   = regexp.MustCompile(`all together +([0-9.]+)`)
	limit    = regexp.MustCompile(`limit broken: (.*?)(  |\n|$)`)
)

// What the map says of the cell under the held pole is what landing there gives.
func TestMapPromisesWhatLandingGives(t *testing.T) {
	for _, name := range []string{"lift", "balancer"} {
		t.Run(name, func(t *testing.T) { landsAsPromised(t, desktest.Bench(t, name)) })
	}
}

func landsAsPromised(t *testing.T, b *desk.Bench) {
	_, list, _ := desktest.Start(t, b, estimator.Options{})
	direct := solver.NewDirect(b)
	r := &mapped{}
	r.rig = newRig(t, list, plain, func(c *screen.Config) {
		c.Work.Bench = b
		c.Map = func(q survey.Request) { r.maps = append(r.maps, q) }
	})
	answers := make(chan survey.Answer, 100)
	s := survey.New(b, func(a survey.Answer) { answers <- a })
	defer s.Close()
	remade := 0
	land := func() {
		r.send(screen.AnswerMsg{Answer: direct.Answer(t.Context(), r.last())})
		q := r.due()
		if q.Cells == nil {
			return
		}
		remade++
		s.Ask(q)
		for a := range answers {
			r.send(screen.MapMsg{Answer: a})
			if a.Done {
				break
			}
		}
	}
	r.send(tea.WindowSizeMsg{Width: 120, Height: 44})
	land()
	seen := map[string]bool{}
	for i, k := range strings.Fields("left left up left up right down down down left right right right right up up up up right right left left left left left left left left left") {
		r.press(k)
		land()
		view := strip(r.m.View())
		p, l := promised.FindStringSubmatch(view), landed.FindStringSubmatch(view)
		if p == nil || l == nil {
			t.Fatalf("step %d: no promise or no figure:\n%s", i, view)
		}
		said, _ := strconv.ParseFloat(p[1], 64)
		if is, _ := strconv.ParseFloat(l[1], 64); math.Abs(said-is) > 0.002*is+0.011 {
			t.Errorf("step %d: the map promised %s, landing gave %s", i, p[1], l[1])
		}
		seen[p[1]] = true
		if m := limit.FindStringSubmatch(view); m != nil && !regexp.MustCompile(m[1]+"(,| ).*(OVER|UNDER)").MatchString(view) {
			t.Errorf("step %d: the map says that %q breaks, the readings do not:\n%s", i, m[1], view)
		}
	}
	if len(seen) < 5 {
		t.Errorf("only %d different figures: the test shows nothing", len(seen))
	}
	if _, _, sensors := b.Model.Dims(); sensors == 1 && remade > 1 {
		t.Errorf("the map was made %d times while its own pole moved", remade)
	}
	t.Logf("made %d times", remade)
}

// BenchmarkShaded is a key on a shaded plane.
func BenchmarkShaded(b *testing.B) {
	r := startMapped(b, colour)
	r.send(tea.WindowSizeMsg{Width: 120, Height: 40})
	r.send(chart(r.due(), true))
	b.ReportAllocs()
	for i := 0; b.Loop(); i++ {
		r.send(keyMsg([]string{"left", "right"}[i%2]))
		sink = r.m.View()
		r.asked, r.cmds = r.asked[len(r.asked)-1:], nil
	}
}
