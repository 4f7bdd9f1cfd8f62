package seek_test

import (
	"context"
	"errors"
	"math"
	"testing"

	"polewright/estimator"
	"polewright/plants"
	"polewright/plants/library"
	"polewright/scenarios"
	"polewright/scenarios/seek"
)

const tracker = `
format = 1
name = "Integrator"
[model]
time = "continuous"
A = [[0]]
C = [[1]]
[[sensors]]
noise_density = 0.25
[process_noise]
density = [4.0]
`

// problem is x' = w, y = x + v: with the gain l, settling takes ln 50 / l and the
// noise over the floor is √((4 + l²/4)/(2 l)), 1 at l = 4.
func problem(t *testing.T, limits string, pole complex128) seek.Problem {
	t.Helper()
	p, err := plants.Parse("tracker.toml", []byte(tracker))
	if err != nil {
		t.Fatal(err)
	}
	s, err := scenarios.Parse("s.toml", []byte("format = 1\nname = \"s\"\nduration_s = 1.0\nstep_s = 0.01\n[limits]\n"+limits), p)
	if err != nil {
		t.Fatal(err)
	}
	m, err := p.Model(plants.Options{})
	if err != nil {
		t.Fatal(err)
	}
	d, err := estimator.NewDesigner(m, estimator.Options{})
	if err != nil {
		t.Fatal(err)
	}
	start, err := d.Place([]complex128{pole}, nil)
	if err != nil {
		t.Fatal(err)
	}
	return seek.Problem{Plant: p, Model: m, Scenario: s, Start: start}
}

// At the limit 1.25, (4 + l²/4)/(2 l) = 1.5625: l² − 12.5 l + 16 = 0, l = 11.04…
func TestFastestWithinANoiseLimitByHand(t *testing.T) {
	got, err := seek.Run(context.Background(), problem(t, "over_floor_max = 1.25", -4), nil)
	if err != nil {
		t.Fatal(err)
	}
	want := (12.5 + math.Sqrt(12.5*12.5-64)) / 2
	if l := got.Design.Gain.At(0, 0); math.Abs(l-want) > 2e-3*want {
		t.Errorf("gain %g, expected %g", l, want)
	}
	if !got.Met || !got.Better {
		t.Errorf("got %+v", got)
	}
}

// Within ln 50/8 s the quietest gain is 8, right at the bound.
func TestQuietestWithinASettleTimeByHand(t *testing.T) {
	p := problem(t, "", -20)
	p.Goal, p.SettleMax = seek.Quietest, math.Log(50)/8
	got, err := seek.Run(context.Background(), p, nil)
	if err != nil {
		t.Fatal(err)
	}
	if l := got.Design.Gain.At(0, 0); math.Abs(l-8) > 0.02 || !got.Met {
		t.Errorf("gain %g, expected 8; limits met: %v", l, got.Met)
	}
}

func TestWhatCannotBeMetIsSaid(t *testing.T) {
	got, err := seek.Run(context.Background(), problem(t, "over_floor_max = 0.9", -4), nil)
	if err != nil {
		t.Fatal(err)
	}
	if got.Met {
		t.Error("nothing is quieter than the floor")
	}
}

func TestCancelKeepsTheBest(t *testing.T) {
	ctx, cancel := context.WithCancel(context.Background())
	tries := 0
	got, err := seek.Run(ctx, problem(t, "over_floor_max = 1.25", -4), func(done, most int, best *estimator.Design) {
		if tries = done; done == 20 {
			cancel()
		}
	})
	if !errors.Is(err, context.Canceled) || got == nil || got.Design == nil {
		t.Fatalf("got %v, %v", got, err)
	}
	if tries > 25 {
		t.Errorf("%d tries after cancelling at 20", tries)
	}
}

func TestBadProblems(t *testing.T) {
	p := problem(t, "", -4)
	p.Goal = seek.Quietest
	if _, err := seek.Run(context.Background(), p, nil); !errors.Is(err, seek.ErrSettle) {
		t.Errorf("got %v", err)
	}
	p.Start = nil
	if _, err := seek.Run(context.Background(), p, nil); !errors.Is(err, seek.ErrStart) {
		t.Errorf("got %v", err)
	}
}

// On the built-in plants with one sensor the limits can be met, and are.
func TestBuiltInLimitsAreMet(t *testing.T) {
	if testing.Short() {
		t.Skip("searches on whole plants")
	}
	for _, name := range []string{"lift", "web", "pan-drive"} {
		t.Run(name, func(t *testing.T) {
			text, file, _ := library.Plant(name)
			p, err := plants.Parse(file, text)
			if err != nil {
				t.Fatal(err)
			}
			f := library.Scenarios(name)[0]
			s, err := scenarios.Parse(f.Name, f.Text, p)
			if err != nil {
				t.Fatal(err)
			}
			m, err := p.Model(plants.Options{})
			if err != nil {
				t.Fatal(err)
			}
			d, err := estimator.NewDesigner(m, estimator.Options{})
			if err != nil {
				t.Fatal(err)
			}
			start, err := d.Place(d.Analysis().Floor.Poles, nil)
			if err != nil {
				t.Fatal(err)
			}
			got, err := seek.Run(context.Background(), seek.Problem{Plant: p, Model: m, Scenario: s, Start: start}, nil)
			if err != nil {
				t.Fatal(err)
			}
			if !got.Met || !(got.Design.Transient.Settle < start.Transient.Settle) {
				t.Errorf("settles in %g s (start %g) with %+v", got.Design.Transient.Settle, start.Transient.Settle, got.Limits)
			}
			t.Logf("%d tries: settles in %g s instead of %g", got.Tries, got.Design.Transient.Settle, start.Transient.Settle)
		})
	}
}
