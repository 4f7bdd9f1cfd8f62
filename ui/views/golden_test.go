package views_test

import (
	"context"
	"errors"
	"flag"
	"os"
	"path/filepath"
	"strings"
	"testing"

	"github.com/charmbracelet/x/ansi"
	"github.com/google/go-cmp/cmp"

	"polewright/estimator"
	"polewright/estimator/sweep"
	"polewright/plants"
	"polewright/scenarios/tolerance"
	"polewright/ui/desk"
	"polewright/ui/desk/desktest"
	"polewright/ui/plane/targets"
	"polewright/ui/theme"
	"polewright/ui/views"
)

var update = flag.Bool("update", false, "write the golden views anew")

// looks are the sizes and themes in which each view is kept.
var looks = []struct {
	name string
	w, h int
	opt  theme.Options
}{
	{"80x24", 80, 24, theme.Options{}},
	{"120x36", 120, 36, theme.Options{}},
	{"200x50", 200, 50, theme.Options{}},
	{"80x24-colour", 80, 24, theme.Options{Depth: theme.Many, Dark: true}},
	{"80x24-ascii", 80, 24, theme.Options{ASCII: true}},
}

// golden holds a view in every look against its file. draw gets the room of the
// screen's body.
func golden(t *testing.T, name string, draw func(w, h int, th *theme.Theme) []string) {
	t.Helper()
	for _, l := range looks {
		lines := draw(l.w, l.h-3, theme.New(l.opt))
		for i, line := range lines {
			if n := ansi.StringWidth(line); n > l.w {
				t.Errorf("%s %s: line %d is %d cells wide", name, l.name, i+1, n)
			}
			if l.opt.ASCII && strings.ContainsFunc(line, func(r rune) bool { return r > '~' }) {
				t.Errorf("%s %s: %q is not ASCII", name, l.name, line)
			}
			if l.opt.ASCII && strings.Contains(line, "?") {
				t.Errorf("%s %s: a character has no ASCII form: %q", name, l.name, line)
			}
			if l.opt.Depth == theme.NoColour && strings.Contains(line, "\x1b[3") {
				t.Errorf("%s %s: colour without colours", name, l.name)
			}
		}
		got := strings.ReplaceAll(strings.Join(lines, "\n"), "\x1b", "^") + "\n"
		file := filepath.Join("testdata", name+"-"+l.name+".golden")
		if *update {
			if err := os.WriteFile(file, []byte(got), 0o644); err != nil {
				t.Fatal(err)
			}
		}
		want, err := os.ReadFile(file)
		if err != nil {
			t.Fatal(err)
		}
		if diff := cmp.Diff(string(want), got); diff != "" {
			t.Errorf("%s %s:\n%s", name, l.name, diff)
		}
	}
}

func tradeoff(t *testing.T, b *desk.Bench) *views.Tradeoff {
	t.Helper()
	d, _, design := desktest.Start(t, b, estimator.Options{})
	ctx := context.Background()
	scaling, err := sweep.Speeds(ctx, d, design, b.Model.Period, sweep.Factors(4, 33))
	if err != nil {
		t.Fatal(err)
	}
	family, err := sweep.Floors(ctx, b.Model, estimator.Options{}, sweep.Factors(1e4, 25))
	if err != nil {
		t.Fatal(err)
	}
	return &views.Tradeoff{Scaling: scaling, Family: family, Design: design, Settle: b.Scenario.Limits.Settle, Over: b.Scenario.Limits.OverFloor}
}

func TestTradeoffFrames(t *testing.T) {
	f := tradeoff(t, desktest.Bench(t, "lift"))
	f.At = views.Along(f.Scaling, views.Unchanged(f.Scaling), 1)
	fast := f.Scaling[len(f.Scaling)-9]
	f.Kept = []views.Kept{{Letter: "A", Design: fast.Design}}
	golden(t, "tradeoff", f.Lines)

	f.Curve, f.At = views.Floors, 16
	golden(t, "tradeoff-best", f.Lines)

	empty := views.Tradeoff{Running: true}
	golden(t, "tradeoff-empty", empty.Lines)
}

func TestSensorsFrames(t *testing.T) {
	b := desktest.Bench(t, "balancer")
	_, _, design := desktest.Start(t, b, estimator.Options{})
	f := views.Sensors{Bench: b, Plane: targets.S, Design: design, Plugged: []bool{true, true}}
	f.All = views.See(b, estimator.Prediction, b.Plant.Enabled())
	draw := func(w, _ int, th *theme.Theme) []string { return f.Lines(w, th) }
	golden(t, "sensors", draw)

	f.Plugged, f.Cursor = []bool{true, false}, 1
	f.Rest = views.See(b, estimator.Prediction, f.Plugged)
	golden(t, "sensors-unplugged", draw)

	f.Plugged, f.Cursor = []bool{false, true}, 0
	f.Rest = views.See(b, estimator.Prediction, f.Plugged)
	golden(t, "sensors-blind", draw)
}

func TestSensorsOfModesThatNobodySees(t *testing.T) {
	b := desktest.Bench(t, "twin-drum")
	_, _, design := desktest.Start(t, b, estimator.Options{})
	f := views.Sensors{Bench: b, Plane: targets.S, Design: design, Plugged: []bool{true}, All: views.See(b, estimator.Prediction, b.Plant.Enabled())}
	golden(t, "sensors-fixed", func(w, _ int, th *theme.Theme) []string { return f.Lines(w, th) })
}

func envelope(t *testing.T, b *desk.Bench) *tolerance.Envelope {
	t.Helper()
	_, _, design := desktest.Start(t, b, estimator.Options{})
	e, err := tolerance.Study{Plant: b.Plant, Options: plants.Options{Period: &b.Model.Period}, Design: design, Seed: 1, Samples: -1}.Run(context.Background(), nil)
	if err != nil {
		t.Fatal(err)
	}
	return e
}

func TestStressFrames(t *testing.T) {
	b := desktest.Bench(t, "pan-drive")
	f := views.Stress{Envelope: envelope(t, b), Controlled: true}
	draw := func(w, _ int, th *theme.Theme) []string { return f.Lines(w, th) }
	golden(t, "stress", draw)

	f.Truth = "dish −30 %, shaft +10 %"
	f.Envelope.Unstable, f.Envelope.UnstableCases = 2, []tolerance.Case{f.Envelope.Measures[0].Case}
	f.Envelope.Failed, f.Envelope.Failures = 1, []tolerance.Failure{{Case: f.Envelope.Measures[0].Case, Err: errors.New("no number")}}
	golden(t, "stress-trouble", draw)

	f = views.Stress{Tried: 51, All: 205}
	golden(t, "stress-running", draw)
}
