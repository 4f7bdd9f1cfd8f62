package logs_test

import (
	"bytes"
	"context"
	"encoding/json"
	"errors"
	"math"
	"math/rand/v2"
	"strings"
	"testing"

	"gonum.org/v1/gonum/mat"

	"polewright/estimator"
	"polewright/plants"
	"polewright/scenarios/logs"
)

// currentOf gives the pair of gains of the current form.
func currentOf(m *estimator.Model, lf *mat.Dense) logs.Gain {
	var l mat.Dense
	l.Mul(m.A, lf)
	return logs.Gain{L: &l, Lf: lf}
}

// TestLossesAgainstThePlainEquations steps both forms by the equations, with lost
// sensors and missing rows.
func TestLossesAgainstThePlainEquations(t *testing.T) {
	m := tracker()
	m.D = dense([][]float64{{0.2}, {-0.1}})
	l := layoutOf(m)
	u, y, _ := simulate(m, 300, rand.New(rand.NewPCG(3, 4)))
	log := memoryOf(l, u, y)
	for _, k := range []int{5, 6, 50, 120} {
		log.samples[k].Y = []float64{nan, log.samples[k].Y[1]}
	}
	log.samples[60].Y = []float64{nan, nan}
	log.samples[80].Missing, log.samples[81].Missing = 7, 1
	rng := rand.New(rand.NewPCG(5, 6))
	lf := mat.NewDense(4, 2, nil)
	lf.Apply(func(i, j int, v float64) float64 { return 0.02 * rng.NormFloat64() }, lf)
	for i := range 2 { // strong enough on the positions to be stable
		lf.Set(2*i, i, 0.3)
		lf.Set(2*i+1, i, 2)
	}
	pair := currentOf(m, lf)
	for _, g := range []logs.Gain{{L: pair.L}, pair} {
		x := mat.NewVecDense(4, []float64{0.1, 0, -0.2, 0})
		k := 0
		replay(t, log, logs.Request{Model: m, Gain: g, Start: logs.Start{State: []float64{0.1, 0, -0.2, 0}}, Each: func(r *logs.Row) error {
			s := &log.samples[k]
			step := func(u float64, from *mat.VecDense) {
				var next mat.VecDense
				next.MulVec(m.A, from)
				next.AddScaledVec(&next, u, m.B.ColView(0))
				x = &next
			}
			for range s.Missing {
				step(log.samples[k-1].U[0], x)
			}
			var seen mat.VecDense
			seen.MulVec(m.C, x)
			seen.AddScaledVec(&seen, s.U[0], m.D.ColView(0))
			e, corrected := mat.NewVecDense(2, nil), mat.VecDenseCopyOf(x)
			for i, v := range s.Y {
				if v != v {
					if in := r.Innovation[i]; in == in {
						t.Fatalf("step %d: innovation %g of a lost sensor", k, in)
					}
					continue
				}
				e.SetVec(i, v-seen.AtVec(i))
				if d := math.Abs(e.AtVec(i) - r.Innovation[i]); d > 1e-12 {
					t.Fatalf("step %d: innovation off by %g", k, d)
				}
			}
			var change mat.VecDense
			estimate := x
			if g.Lf != nil {
				change.MulVec(g.Lf, e)
				corrected.AddVec(corrected, &change)
				estimate = corrected
			}
			for i, v := range r.Estimate {
				if d := math.Abs(v - estimate.AtVec(i)); d > 1e-12 {
					t.Fatalf("step %d, state %d: off by %g", k, i, d)
				}
			}
			step(s.U[0], corrected)
			if g.Lf == nil {
				change.MulVec(g.L, e)
				x.AddVec(x, &change)
			}
			k++
			return nil
		}})
		if k != 300 {
			t.Fatalf("%d rows", k)
		}
	}
}

// What follows a loss within the settle time is left out; what is left out breaks
// nothing else.
func TestLossesLeaveTheStatistics(t *testing.T) {
	m := tracker()
	l := layoutOf(m)
	u, y, _ := simulate(m, 1000, rand.New(rand.NewPCG(3, 4)))
	log := memoryOf(l, u, y)
	log.samples[10].Y = []float64{nan, 0}    // in the skipped tenth, settled before its end
	log.samples[300].Y = []float64{nan, 0}   // 300 and the 5 after
	log.samples[500].Held = true             // 500 and the 5 after
	log.samples[503].Missing = 1             // begins anew: 503 and the 5 after
	log.samples[997].Y = []float64{nan, nan} // and the rest
	g := logs.Gain{L: kalman(m, 1), Settle: 0.05}
	r := replay(t, log, logs.Request{Model: m, Gain: g})
	if want := int64(900 - 6 - 9 - 3); r.Counted != want {
		t.Errorf("%d counted, want %d", r.Counted, want)
	}
	skip := 9.5
	if r := replay(t, log, logs.Request{Model: m, Gain: g, Skip: &skip}); r.Counted != 50-3 {
		t.Errorf("%d counted with 9.5 s skipped, want %d", r.Counted, 47)
	}
	skip = 1e9
	r = replay(t, log, logs.Request{Model: m, Gain: g, Skip: &skip})
	if r.Counted != 0 || !math.IsNaN(float64(r.Innovations[0].Std)) || !strings.Contains(strings.Join(r.Warnings, " "), "No sample is left") {
		t.Errorf("with all skipped: %+v", r)
	}
}

func TestWrap(t *testing.T) {
	// A steady turn, seen by an angle sensor that starts again at every turn.
	m := &estimator.Model{
		Period: 1, A: dense([][]float64{{1, 1}, {0, 1}}), C: dense([][]float64{{1, 0}}),
		Q: mat.NewSymDense(2, []float64{0, 0, 0, 1e-8}), R: mat.NewSymDense(1, []float64{1e-6}),
	}
	l := layoutOf(m)
	l.Sensors[0].Wrap = 2 * math.Pi
	var y [][]float64
	for k := range 200 {
		y = append(y, []float64{math.Mod(0.3*float64(k), 2*math.Pi)})
	}
	last := 0.0
	replay(t, memoryOf(l, nil, y), logs.Request{
		Model: m, Gain: logs.Gain{L: dense([][]float64{{0.5}, {0.06}})}, Start: logs.Start{State: []float64{0, 0.29}},
		Each: func(r *logs.Row) error { last = r.Estimate[0]; return nil },
	})
	if want := 0.3 * 199; math.Abs(last-want) > 1e-3 {
		t.Errorf("angle %g after nine turns, want %g", last, want)
	}
}

func TestFirstSample(t *testing.T) {
	m := tracker()
	m.D = dense([][]float64{{2}, {0}})
	m.StateScale = []float64{1, 5, 1, 0.2}
	l := layoutOf(m)
	log := memoryOf(l, [][]float64{{0}, {0.5}, {0.5}}, [][]float64{{nan, nan}, {3, nan}, {4, 4}})
	var first [][]float64
	replay(t, log, logs.Request{Model: m, Gain: logs.Gain{L: mat.NewDense(4, 2, nil)}, Start: logs.Start{FirstSample: true}, Each: func(r *logs.Row) error {
		first = append(first, append([]float64(nil), r.Estimate...))
		return nil
	}})
	// Nothing is known at first; then y1 = x1 + 2 u.
	for i, want := range []float64{2, 0, 0, 0} {
		if math.Abs(first[0][i]) > 0 || math.Abs(first[1][i]-want) > 1e-12 {
			t.Errorf("state %d: %g, then %g, want %g", i, first[0][i], first[1][i], want)
		}
	}
	// One sensor on a sum: the least state by scale, 9 : 1 for scales 3 : 1.
	sum := &estimator.Model{
		Period: 1, A: dense([][]float64{{1, 0}, {0, 0.5}}), C: dense([][]float64{{1, 1}}),
		Q: mat.NewSymDense(2, nil), R: mat.NewSymDense(1, []float64{1}), StateScale: []float64{3, 1},
	}
	replay(t, memoryOf(layoutOf(sum), nil, [][]float64{{10}, {10}}), logs.Request{
		Model: sum, Gain: logs.Gain{L: mat.NewDense(2, 1, nil)}, Start: logs.Start{FirstSample: true}, Each: func(r *logs.Row) error {
			if r.Sample.T == 0 && (math.Abs(r.Estimate[0]-9) > 1e-12 || math.Abs(r.Estimate[1]-1) > 1e-12) {
				t.Errorf("start %v, want 9 and 1", r.Estimate)
			}
			return nil
		}})
}

func TestReferenceAndWriter(t *testing.T) {
	m := tracker()
	l := layoutOf(m)
	l.States[0] = logs.Signal{Name: "arm, left", Operating: 100}
	l.Sensors[0].Operating = 100
	var text strings.Builder
	text.WriteString("t,u1,y1,y2,x2,\"arm, left\"\n")
	u, y, x := simulate(m, 400, rand.New(rand.NewPCG(8, 9)))
	for k := range y {
		row, _ := json.Marshal([]float64{float64(k) * 0.01, u[k][0], 100 + y[k][0], y[k][1], x[k][1] + 0.5, 100 + x[k][0]})
		text.WriteString(strings.Trim(string(row), "[]") + "\n")
	}
	log := openText(t, l, text.String(), logs.Options{})
	var out bytes.Buffer
	w, err := logs.NewWriter(&out, l)
	if err != nil {
		t.Fatal(err)
	}
	var kept [][]float64
	r := replay(t, log, logs.Request{Model: m, Gain: logs.Gain{L: kalman(m, 1)}, Each: func(r *logs.Row) error {
		kept = append(kept, append(append([]float64{r.Sample.T}, r.Estimate...), r.Innovation...))
		return w.Row(r)
	}})
	if err := w.Flush(); err != nil {
		t.Fatal(err)
	}
	if len(r.References) != 2 || r.References[0].Name != "x2" || r.References[1].Name != "arm, left" {
		t.Fatalf("references %+v", r.References)
	}
	for i, state := range []int{1, 0} {
		bias, square, n := 0.0, 0.0, 0.0
		for k := 40; k < 400; k++ {
			want := x[k][state]
			if state == 1 {
				want += 0.5
			} else {
				want += 100
			}
			d := kept[k][1+state] - want
			bias, square, n = bias+d, square+d*d, n+1
		}
		c := r.References[i]
		if c.Count != 360 || math.Abs(float64(c.Bias)-bias/n) > 1e-12 || math.Abs(float64(c.RMS)-math.Sqrt(square/n)) > 1e-12 {
			t.Errorf("reference %+v, want %g and %g", c, bias/n, math.Sqrt(square/n))
		}
	}
	if b := float64(r.References[0].Bias); math.Abs(b+0.5) > 0.1 {
		t.Errorf("bias %g, estimate − reference is about −0.5", b)
	}
	lines := strings.Split(out.String(), "\n")
	if want := `t,"arm, left",x2,x3,x4,y1 innovation,y2 innovation`; lines[0] != want {
		t.Errorf("header %s, want %s", lines[0], want)
	}
	for k, row := range kept {
		var back []float64
		if err := json.Unmarshal([]byte("["+lines[k+1]+"]"), &back); err != nil {
			t.Fatal(err)
		}
		for i := range row {
			if back[i] != row[i] {
				t.Fatalf("row %d reads back as %v, was %v", k, back, row)
			}
		}
	}
}

func TestRefusals(t *testing.T) {
	m := tracker()
	l := layoutOf(m)
	u, y, _ := simulate(m, 50, rand.New(rand.NewPCG(8, 9)))
	log := memoryOf(l, u, y)
	good := logs.Gain{L: mat.NewDense(4, 2, nil)}
	bad := mat.NewDense(4, 2, []float64{math.NaN(), 0, 0, 0, 0, 0, 0, 0})
	negative := -1.0
	for _, c := range []struct {
		name string
		q    logs.Request
		want string
	}{
		{"no model", logs.Request{Gain: good}, "no model to replay: sizes do not fit"},
		{"no gain", logs.Request{Model: m}, "no gain to replay: sizes do not fit"},
		{"shape", logs.Request{Model: m, Gain: logs.Gain{L: mat.NewDense(2, 2, nil)}}, "the gain is 2×2, expected 4×2: sizes do not fit"},
		{"not finite", logs.Request{Model: m, Gain: logs.Gain{L: good.L, Lf: bad}}, "the gain: not a finite number"},
		{"floor", logs.Request{Model: m, Gain: good, Floor: &logs.Gain{L: bad}}, "the floor: the gain: not a finite number"},
		{"skip", logs.Request{Model: m, Gain: good, Skip: &negative}, "skip: -1 s; expected 0 or above"},
		{"start", logs.Request{Model: m, Gain: good, Start: logs.Start{State: []float64{1}}}, "start: 1 number; expected one per state: 4"},
		{"start not finite", logs.Request{Model: m, Gain: good, Start: logs.Start{State: []float64{0, 0, math.Inf(1), 0}}}, "start: +Inf for state 3; expected finite numbers"},
		{"two starts", logs.Request{Model: m, Gain: good, Start: logs.Start{State: []float64{0, 0, 0, 0}, FirstSample: true}}, "start: both a state and the first sample; expected one of them"},
	} {
		if _, err := logs.Replay(context.Background(), log, c.q); err == nil || err.Error() != c.want {
			t.Errorf("%s: %v, want %s", c.name, err, c.want)
		}
	}
	stop := errors.New("enough")
	if _, err := logs.Replay(context.Background(), log, logs.Request{Model: m, Gain: good, Each: func(*logs.Row) error { return stop }}); !errors.Is(err, stop) {
		t.Errorf("error %v", err)
	}
}

func TestUnstable(t *testing.T) {
	m := tracker()
	l := layoutOf(m)
	u, y, _ := simulate(m, 5000, rand.New(rand.NewPCG(8, 9)))
	wild := logs.Gain{L: mat.NewDense(4, 2, []float64{-5, 0, 0, 0, 0, -5, 0, 0})}
	var bad *plants.Error
	if _, err := logs.Replay(context.Background(), memoryOf(l, u, y), logs.Request{Model: m, Gain: wild}); !errors.As(err, &bad) || !strings.Contains(err.Error(), "the estimate grows beyond all bounds") {
		t.Errorf("error %v", err)
	}
	// A short log ends before that: the figures stand, what they should be does not.
	r := replay(t, memoryOf(l, u[:100], y[:100]), logs.Request{Model: m, Gain: wild})
	text, err := json.Marshal(r)
	if err != nil || !strings.Contains(string(text), `"std_expected":null`) || !strings.Contains(string(text), `"nis_mean":null`) {
		t.Errorf("%v %s", err, text)
	}
	if len(r.Warnings) == 0 {
		t.Error("no warning")
	}
}

// The JSON has the keys that scripts rely on.
func TestResultKeys(t *testing.T) {
	m := tracker()
	u, y, _ := simulate(m, 500, rand.New(rand.NewPCG(8, 9)))
	g := logs.Gain{L: kalman(m, 1)}
	text, err := json.Marshal(replay(t, memoryOf(layoutOf(m), u, y), logs.Request{Model: m, Gain: g, Floor: &g}))
	if err != nil {
		t.Fatal(err)
	}
	var tree map[string]any
	if err := json.Unmarshal(text, &tree); err != nil {
		t.Fatal(err)
	}
	for _, key := range []string{"samples", "lost", "period_s", "period_jitter", "innovations", "whiteness", "nis_mean", "nis_low", "nis_high", "reference"} {
		if tree[key] == nil {
			t.Errorf("no %s", key)
		}
	}
	in, white := tree["innovations"].([]any), tree["whiteness"].([]any)
	if len(in) != 2 || len(white) != 2 {
		t.Fatalf("%d and %d sensors", len(in), len(white))
	}
	for _, key := range []string{"mean", "std", "std_expected", "autocorrelation", "autocorrelation_expected"} {
		if in[0].(map[string]any)[key] == nil {
			t.Errorf("no %s", key)
		}
	}
	for _, key := range []string{"lags", "q", "p", "effect_size"} {
		if white[0].(map[string]any)[key] == nil {
			t.Errorf("no %s", key)
		}
	}
	if n := len(in[0].(map[string]any)["autocorrelation"].([]any)); n != 20 {
		t.Errorf("%d lags", n)
	}
}

func TestReadingAllocatesNothingPerRow(t *testing.T) {
	m := tracker()
	l := layoutOf(m)
	u, y, _ := simulate(m, 8000, rand.New(rand.NewPCG(8, 9)))
	g := logs.Gain{L: kalman(m, 1)}
	count := func(steps int) float64 {
		text := csvOf(u[:steps], y[:steps], 17)
		return testing.AllocsPerRun(3, func() {
			log, err := logs.Open(context.Background(), bytes.NewReader(text), l, logs.Options{InputLag: 1})
			if err != nil {
				t.Fatal(err)
			}
			replay(t, log, logs.Request{Model: m, Gain: g, Floor: &g})
		})
	}
	if few, many := count(4000), count(8000); many > few+20 { // the collector adds some
		t.Errorf("%g allocations for 8000 rows, %g for 4000", many, few)
	}
}

func TestReplayAllocatesNothingPerSample(t *testing.T) {
	m := tracker()
	l := layoutOf(m)
	u, y, _ := simulate(m, 4000, rand.New(rand.NewPCG(8, 9)))
	g := logs.Gain{L: kalman(m, 1)}
	count := func(steps int) float64 {
		log := memoryOf(l, u[:steps], y[:steps])
		return testing.AllocsPerRun(5, func() { replay(t, log, logs.Request{Model: m, Gain: g, Floor: &g}) })
	}
	if few, many := count(1000), count(4000); many > few+20 {
		t.Errorf("%g allocations for 4000 samples, %g for 1000", many, few)
	}
}
