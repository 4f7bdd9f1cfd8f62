package views_test

import (
	"fmt"
	"slices"
	"strings"
	"testing"

	"polewright/estimator"
	"polewright/scenarios/tolerance"
	"polewright/ui/desk/desktest"
	"polewright/ui/plane/targets"
	"polewright/ui/theme"
	"polewright/ui/views"
)

// narrow is the least width of a screen.
const narrow = 60

// Where not all sensors fit, the title leaves room for which are in sight.
func TestNoiseSharesOnANarrowScreen(t *testing.T) {
	b := desktest.Bench(t, "balancer")
	_, _, design := desktest.Start(t, b, estimator.Options{})
	f := views.Sensors{Bench: b, Plane: targets.S, Design: design, Plugged: []bool{true, true}}
	text := strings.Join(f.Lines(narrow, theme.New(theme.Options{})), "\n")
	if !strings.Contains(text, "where its noise comes from, std  ") || !strings.Contains(text, "1 to 1 of 2 sensors") {
		t.Errorf("%s", text)
	}
}

// A comparison says that there are more columns, and on which side.
func TestComparisonSaysWhatIsOutOfSight(t *testing.T) {
	b := desktest.Bench(t, "lift")
	_, _, design := desktest.Start(t, b, estimator.Options{})
	var list []views.Column
	for i := range 5 {
		list = append(list, views.Column{Name: fmt.Sprint("design ", i+1), Design: design})
	}
	for cursor, want := range map[int]string{0: "1 to 2 of 5 ▸", 2: "◂ 2 to 3 of 5 ▸", 4: "◂ 4 to 5 of 5 "} {
		lines := views.Compare(narrow, b, nil, targets.S, list, cursor, theme.New(theme.Options{}))
		if !strings.Contains(lines[0], want) || !strings.Contains(lines[0], fmt.Sprint("▸ design ", cursor+1)) {
			t.Errorf("cursor %d: %q, expected %q", cursor, lines[0], want)
		}
	}
	if lines := views.Compare(narrow, b, nil, targets.S, list[:2], 0, theme.New(theme.Options{})); !strings.Contains(lines[0], "candidates") {
		t.Errorf("all in sight: %q", lines[0])
	}
}

// A long case takes several rows, it is not cut.
func TestHardestCaseIsWhole(t *testing.T) {
	f := views.Stress{Envelope: &tolerance.Envelope{}, Truth: "damping −30 %, drive +10 %, mass of the load +10 %, stiffness −20 %"}
	text := strings.Join(f.Lines(narrow, theme.New(theme.Options{})), "\n")
	for _, part := range []string{"traces run on", "damping -30%", "stiffness -20%"} {
		if !strings.Contains(text, part) {
			t.Errorf("%q is missing:\n%s", part, text)
		}
	}
}

// Where the last column is too narrow for a case, it stands below its figure, on
// one row.
func TestCasesOfANarrowScreenStandBelow(t *testing.T) {
	f := views.Stress{Envelope: envelope(t, desktest.Bench(t, "lift")), Controlled: true}
	lines := f.Lines(narrow, theme.New(theme.Options{}))
	k := slices.IndexFunc(lines, func(l string) bool { return strings.Contains(l, "phase margin") })
	if k < 0 || !slices.ContainsFunc(lines, func(l string) bool { return strings.HasPrefix(l, "    damp -30%, drive ") }) {
		t.Errorf("%s", strings.Join(lines, "\n"))
	}
}

// A mode that is a state's own, as that of an offset, is named after it, also where
// it shares its place with others.
func TestModesOfUnknownsHaveNames(t *testing.T) {
	for plant, want := range map[string]string{"climber": "modes of height, accelerometer offset", "gangway": "mode of valve force offset"} {
		b := desktest.Bench(t, plant)
		f := views.Sensors{Bench: b, Plane: targets.S, Plugged: make([]bool, len(b.Model.SensorNames)), All: views.See(b, estimator.Prediction, b.Plant.Enabled())}
		for i := range f.Plugged {
			f.Plugged[i] = true
		}
		for _, w := range []int{80, 120} {
			lines := f.Lines(w, theme.New(theme.Options{}))
			k := slices.IndexFunc(lines, func(l string) bool { return strings.Contains(l, "0.00, 2 times") })
			if k < 0 {
				t.Fatalf("%s: no such modes:\n%s", plant, strings.Join(lines, "\n"))
			}
			said := strings.Join(strings.Fields(strings.Join(lines[k+1:min(k+4, len(lines))], " ")), " ")
			if !strings.Contains(said, want) {
				t.Errorf("%s, %d wide: %q, expected %q", plant, w, said, want)
			}
		}
	}
}
