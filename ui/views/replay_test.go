package views_test

import (
	"context"
	"errors"
	"strings"
	"testing"

	"polewright/estimator"
	"polewright/ui/desk"
	"polewright/ui/desk/desktest"
	"polewright/ui/replays"
	"polewright/ui/replays/replaystest"
	"polewright/ui/theme"
	"polewright/ui/views"
)

func replayed(t *testing.T, b *desk.Bench, m replaystest.Made, letters ...string) *views.Replay {
	t.Helper()
	_, _, design := desktest.Start(t, b, estimator.Options{})
	f := &views.Replay{Log: replaystest.Log(t, b, m)}
	r, err := replays.NewRunner(b.Model)
	if err != nil {
		t.Fatal(err)
	}
	if f.Outcome, err = r.Run(context.Background(), f.Log, design); err != nil {
		t.Fatal(err)
	}
	for _, letter := range letters {
		f.Rivals = append(f.Rivals, r.Rival(context.Background(), f.Log, letter, design))
	}
	return f
}

func TestReplayFrames(t *testing.T) {
	f := replayed(t, desktest.Bench(t, "lift"), replaystest.Made{Rows: 1500, Seed: 7, References: true}, "A")
	golden(t, "replay", f.Lines)

	f = replayed(t, desktest.Bench(t, "balancer"), replaystest.Made{Rows: 1500, Seed: 7, Noise: 2, Lost: true, Most: 1000, From: 0.1}, "A")
	f.Older, f.Running = true, true
	f.Rivals = append(f.Rivals, replays.Rival{Name: "B", Err: errors.New("the estimate grows beyond all bounds")})
	golden(t, "replay-trouble", f.Lines)

	f = &views.Replay{Log: f.Log, Running: true}
	golden(t, "replay-running", f.Lines)
}

// Whatever does not exist is said, and nothing is drawn of it.
func TestReplayOfLittle(t *testing.T) {
	b := desktest.Bench(t, "lift")
	f := replayed(t, b, replaystest.Made{Rows: 30, Seed: 7})
	for _, w := range []int{60, 80, 200} {
		all := text(f.Lines(w, 15, plain))
		for _, must := range []string{"none: too few samples", "None is kept", "30 samples from 0 to"} {
			if !strings.Contains(all, must) {
				t.Errorf("nothing about %q:\n%s", must, all)
			}
		}
		if strings.Contains(all, "against the log's own column") || strings.Contains(all, "NaN") {
			t.Errorf("what is not there is shown:\n%s", all)
		}
	}
	late := 1e9
	f.Log.Skip = &late // nothing is left for the statistics
	r, err := replays.NewRunner(b.Model)
	if err != nil {
		t.Fatal(err)
	}
	_, _, design := desktest.Start(t, b, estimator.Options{})
	if f.Outcome, err = r.Run(context.Background(), f.Log, design); err != nil {
		t.Fatal(err)
	}
	if all := text(f.Lines(80, 20, plain)); !strings.Contains(all, "0 in the statistics") || strings.Contains(all, "NaN") || strings.Contains(all, "inside") {
		t.Error(all)
	}
	f = &views.Replay{Log: f.Log, Trouble: "the estimate grows beyond all bounds"}
	if all := text(f.Lines(80, 20, theme.New(theme.Options{}))); !strings.Contains(all, "beyond all bounds") || strings.Contains(all, "computing") {
		t.Error(all)
	}
}
