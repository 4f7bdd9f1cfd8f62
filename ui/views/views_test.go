package views_test

import (
	"math"
	"strings"
	"testing"

	"gonum.org/v1/gonum/mat"

	"polewright/estimator"
	"polewright/plants"
	"polewright/ui/canvas"
	"polewright/ui/desk"
	"polewright/ui/keys"
	"polewright/ui/plane/targets"
	"polewright/ui/readings"
	"polewright/ui/theme"
	"polewright/ui/views"
)

var plain = theme.New(theme.Options{})

func bench() *desk.Bench {
	return &desk.Bench{
		Plant: &plants.Plant{Name: "cart", States: []plants.State{{Name: "place", Unit: "m"}}},
		Model: &estimator.Model{A: mat.NewDense(1, 1, []float64{-1}), C: mat.NewDense(1, 1, []float64{1}), StateNames: []string{"place"}, SensorNames: []string{"ruler"}},
	}
}

func text(lines []string) string {
	return strings.NewReplacer("\x1b[m", "", "\x1b[0;1m", "").Replace(strings.Join(lines, "\n"))
}

func TestHelpHasEveryKeyAndTheCautions(t *testing.T) {
	for _, w := range []int{60, 80, 200} {
		lines := views.Help(w, keys.Default(), plain)
		all := text(lines)
		for _, g := range keys.Default().Groups() {
			for _, b := range g.Bindings {
				if !strings.Contains(all, b.Help().Key) {
					t.Errorf("at %d: %q is missing", w, b.Help().Key)
				}
			}
		}
		words := strings.Join(strings.Fields(all), " ")
		for _, must := range []string{"low energy", "independent limits", "actually applied", "licensed practice decide", "no gain can move"} {
			if !strings.Contains(words, must) {
				t.Errorf("at %d: nothing about %q", w, must)
			}
		}
		for _, l := range strings.Split(all, "\n") {
			if canvas.TextWidth(l) > w {
				t.Errorf("at %d: %q is too wide", w, l)
			}
		}
	}
}

func column(name string, settle float64) views.Column {
	return views.Column{Name: name, Poles: targets.Set{List: []targets.Target{{At: -2}}}, Design: &estimator.Design{
		Stable: true, Transient: estimator.Transient{Settle: settle, Peak: 1},
		Noise: estimator.Noise{Std: []float64{0.1}, OverFloor: []float64{math.NaN()}, OverFloorRMS: math.NaN()}}}
}

func TestCompareShowsTheCursorAndTheBest(t *testing.T) {
	list := []views.Column{column("A", 3), column("B", 1), column("C", 2), column("D", math.NaN()), column("E", 4)}
	first := views.Compare(80, bench(), nil, targets.S, list, 0, plain)
	last := views.Compare(80, bench(), nil, targets.S, list, 4, plain)
	if !strings.Contains(first[0], "▸ A") || strings.Contains(first[0], "D") || !strings.Contains(last[0], "▸ E") || strings.Contains(last[0], "A") {
		t.Errorf("columns:\n%s\n%s", first[0], last[0])
	}
	for _, l := range first {
		if strings.Contains(l, "settle") && !strings.Contains(l, "\x1b[0;1m             1.00") && !strings.Contains(l, "\x1b[0;1m1.00") {
			t.Errorf("the best has no weight: %q", l)
		}
	}
	if !strings.Contains(text(last), "–") {
		t.Error("an undefined figure is not shown as such")
	}
	if empty := text(views.Compare(80, bench(), nil, targets.S, nil, 0, plain)); !strings.Contains(empty, "None yet") {
		t.Error(empty)
	}
}

func TestReadingsGiveReasonsAndTheWholeGain(t *testing.T) {
	f := readings.Facts{Bench: bench(), Plane: targets.S, Cell: 0.1,
		Analysis: &estimator.Analysis{FloorReason: "the floor does not exist because of a test"},
		Design: &estimator.Design{Gain: mat.NewDense(1, 1, []float64{0.1234567890123456}), Warnings: []string{"the estimator is unstable"},
			Transient: estimator.Transient{Settle: math.NaN(), Peak: math.NaN()}, EigenvectorCondition: math.NaN(),
			SensorSets: []estimator.SensorSet{{Lost: []int{0}, Stable: false}}}}
	all := text(views.Readings(80, f, plain))
	for _, must := range []string{"0.1234567890123456", "because of a test", "the estimator is unstable", "undefined: unstable", "UNSTABLE", "ruler"} {
		if !strings.Contains(all, must) {
			t.Errorf("nothing about %q:\n%s", must, all)
		}
	}
}
