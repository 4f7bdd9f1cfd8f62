package replays_test

import (
	"bytes"
	"context"
	"errors"
	"fmt"
	"math"
	"testing"

	"polewright/estimator"
	"polewright/scenarios/logs"
	"polewright/ui/desk"
	"polewright/ui/desk/desktest"
	"polewright/ui/replays"
	"polewright/ui/replays/replaystest"
)

// recorded is a made-up log of the lift with so many rows, its fifth sample lost and
// one reading that stands out.
func recorded(t *testing.T, b *desk.Bench, rows, spike, most int, from float64) (*replays.Log, error) {
	t.Helper()
	l, err := logs.NewLayout(b.Plant, b.Model)
	if err != nil {
		t.Fatal(err)
	}
	var text bytes.Buffer
	text.WriteString("t")
	for _, list := range [][]logs.Signal{l.Inputs, l.Sensors} {
		for _, s := range list {
			fmt.Fprintf(&text, ",%s", s.Name)
		}
	}
	text.WriteString("\n")
	for k := range rows {
		fmt.Fprintf(&text, "%.9g", float64(k)*l.Period)
		for _, s := range l.Inputs {
			fmt.Fprintf(&text, ",%.9g", s.Operating)
		}
		for _, s := range l.Sensors {
			v := s.Operating + 1e-4*math.Sin(float64(k*k))
			if k == spike {
				v += 0.5
			}
			if k == 4 {
				text.WriteString(",")
				continue
			}
			fmt.Fprintf(&text, ",%.9g", v)
		}
		text.WriteString("\n")
	}
	log, err := logs.Open(context.Background(), bytes.NewReader(text.Bytes()), l, logs.Options{File: "made.csv"})
	if err != nil {
		t.Fatal(err)
	}
	return replays.Load(context.Background(), log, from, most)
}

// The window says what it is of; what is shown of it is what a replay of the whole
// gives, and no spike is lost between the bins of a trace.
func TestOutcomeIsTheReplayOfTheWindow(t *testing.T) {
	b := desktest.Bench(t, "lift")
	_, _, d := desktest.Start(t, b, estimator.Options{})
	log, err := recorded(t, b, 5000, 3000, 4000, 0)
	if err != nil {
		t.Fatal(err)
	}
	if log.Whole != 5000 || log.Record.Survey().Samples != 4000 || log.File != "made.csv" {
		t.Errorf("%d of %d samples of %s", log.Record.Survey().Samples, log.Whole, log.File)
	}
	r, err := replays.NewRunner(b.Model)
	if err != nil {
		t.Fatal(err)
	}
	o, err := r.Run(context.Background(), log, d)
	if err != nil {
		t.Fatal(err)
	}
	var largest float64
	want, err := logs.Replay(context.Background(), log.Record, logs.Request{Model: b.Model, Gain: logs.GainOf(d), Each: func(row *logs.Row) error {
		if e := math.Abs(row.Innovation[0]); e > largest {
			largest = e
		}
		return nil
	}})
	if err != nil {
		t.Fatal(err)
	}
	if have := o.Result.Innovations[0].Std; have != want.Innovations[0].Std || len(o.Result.Whiteness) != 1 {
		t.Errorf("std %v, want %v; whiteness %v", have, want.Innovations[0].Std, o.Result.Whiteness)
	}
	seen, at := 0.0, -1
	for k, v := range o.Traces[0] {
		if math.Abs(v) > seen {
			seen, at = math.Abs(v), k
		}
	}
	if seen != largest || at != 3000*len(o.Traces[0])/4000 {
		t.Errorf("largest %g in bin %d of %d, want %g", seen, at, len(o.Traces[0]), largest)
	}
	rival := r.Rival(context.Background(), log, "A", d)
	if rival.Err != nil || rival.Name != "A" || rival.Result.NISMean != o.Result.NISMean {
		t.Errorf("the same design as a rival: %+v", rival)
	}
	if rival = r.Rival(context.Background(), log, "B", nil); !errors.Is(rival.Err, estimator.ErrShape) {
		t.Errorf("no design as a rival: %v", rival.Err)
	}
}

// What the estimate is held against comes in absolute values, each pair from one
// row: their differences over all rows of a short log give the bias that the
// statistics have.
func TestFollowedIsTheReference(t *testing.T) {
	for _, name := range []string{"lift", "pan-drive", "kiln"} {
		b := desktest.Bench(t, name)
		_, _, d := desktest.Start(t, b, estimator.Options{})
		log := replaystest.Log(t, b, replaystest.Made{Rows: 200, Seed: 3, References: true})
		none := 0.0
		log.Skip = &none
		r, err := replays.NewRunner(b.Model)
		if err != nil {
			t.Fatal(err)
		}
		o, err := r.Run(context.Background(), log, d)
		if err != nil {
			t.Fatal(err)
		}
		l := log.Record.Layout()
		if len(o.Followed) != len(l.States)+len(l.Outputs) {
			t.Fatalf("%s: %d traces of %d states and %d outputs", name, len(o.Followed), len(l.States), len(l.Outputs))
		}
		for i, c := range o.Result.References {
			f, sum := o.Followed[i], 0.0
			for k := range f[0] {
				sum += f[1][k] - f[0][k]
			}
			want, rms := float64(c.Bias), float64(c.RMS)
			if have := sum / float64(len(f[0])); !(math.Abs(have-want) <= 1e-9*rms+1e-12*math.Abs(f[0][0])) {
				t.Errorf("%s, %s: bias %g, want %g", name, c.Name, have, want)
			}
			list, ref := l.States, log.Record.Survey().References[i]
			if ref.Output {
				list = l.Outputs
			}
			zero := list[ref.Index].Operating
			if !(math.Abs(f[0][0]-zero) <= 1e-9*math.Abs(zero)) {
				t.Errorf("%s, %s starts at %g, want %g", name, c.Name, f[0][0], zero)
			}
		}
	}
}

// BenchmarkRun is a whole window of the largest size, as after each key.
func BenchmarkRun(b *testing.B) {
	bench := desktest.Bench(b, "lift")
	_, _, d := desktest.Start(b, bench, estimator.Options{})
	log := replaystest.Log(b, bench, replaystest.Made{Rows: replays.Most, Seed: 3})
	r, err := replays.NewRunner(bench.Model)
	if err != nil {
		b.Fatal(err)
	}
	for b.Loop() {
		if _, err := r.Run(context.Background(), log, d); err != nil {
			b.Fatal(err)
		}
	}
}

// A short log has a bin for every sample, and none where one was lost.
func TestShortLogsHaveABinPerSample(t *testing.T) {
	b := desktest.Bench(t, "lift")
	_, _, d := desktest.Start(t, b, estimator.Options{})
	log, err := recorded(t, b, 50, -1, replays.Most, 0)
	if err != nil {
		t.Fatal(err)
	}
	r, err := replays.NewRunner(b.Model)
	if err != nil {
		t.Fatal(err)
	}
	o, err := r.Run(context.Background(), log, d)
	if err != nil {
		t.Fatal(err)
	}
	if len(o.Traces[0]) != 50 {
		t.Fatalf("%d bins", len(o.Traces[0]))
	}
	for k, v := range o.Traces[0] {
		if math.IsNaN(v) != (k == 4) {
			t.Errorf("bin %d: %v", k, v)
		}
	}
}

// A log goes with the plant and the period that it was read for.
func TestFits(t *testing.T) {
	b, other := desktest.Bench(t, "lift"), desktest.Bench(t, "balancer")
	log := replaystest.Log(t, b, replaystest.Made{Rows: 20, Seed: 1})
	again := desktest.Bench(t, "lift")
	if !log.Fits(again.Plant, again.Model) {
		t.Error("the same plant, read again, does not fit")
	}
	if log.Fits(other.Plant, other.Model) {
		t.Error("another plant fits")
	}
	again.Model.Period *= 2
	if log.Fits(again.Plant, again.Model) {
		t.Error("another period fits")
	}
}

func TestWindows(t *testing.T) {
	b := desktest.Bench(t, "lift")
	log, err := recorded(t, b, 100, -1, 10, 0.5)
	if err != nil {
		t.Fatal(err)
	}
	if v := log.Record.Survey(); v.Start != 0.5 || v.Samples != 10 {
		t.Errorf("%d samples from %g s", v.Samples, v.Start)
	}
	if _, err = recorded(t, b, 100, -1, 10, 1e6); !errors.Is(err, replays.ErrEmpty) {
		t.Errorf("a window behind the end: %v", err)
	}
	_, _, d := desktest.Start(t, b, estimator.Options{})
	r, err := replays.NewRunner(b.Model)
	if err != nil {
		t.Fatal(err)
	}
	ctx, cancel := context.WithCancel(context.Background())
	cancel()
	if _, err := r.Run(ctx, log, d); !errors.Is(err, context.Canceled) {
		t.Errorf("a cancelled replay: %v", err)
	}
}
