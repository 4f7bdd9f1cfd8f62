package scenarios

import (
	"context"
	"encoding/json"
	"fmt"
	"math"
	"testing"

	"gonum.org/v1/gonum/mat"

	"polewright/estimator"
	"polewright/plants"
)

// oscillators is a discrete plant of n states (even) with two sensors and one
// input: damped rotations, each pushing the next.
func oscillators(t testing.TB, n int) (*plants.Plant, Gain) {
	a, b, g := mat.NewDense(n, n, nil), mat.NewDense(n, 1, nil), mat.NewDense(n, 2, nil)
	for i := 0; i < n; i += 2 {
		s, c := math.Sincos(0.1 + 0.05*float64(i))
		a.Set(i, i, 0.97*c)
		a.Set(i, i+1, 0.97*s)
		a.Set(i+1, i, -0.97*s)
		a.Set(i+1, i+1, 0.97*c)
		if i > 0 {
			a.Set(i, i-1, 0.01)
		}
		b.Set(i, 0, 0.1)
		g.Set(i, 0, 0.1)
		g.Set(i+1, 1, 0.1)
	}
	c := mat.NewDense(2, n, nil)
	c.Set(0, 0, 1)
	c.Set(1, n-1, 1)
	tree := map[string]any{
		"format": 1, "name": "Oscillators",
		"model":    map[string]any{"time": "discrete", "period_s": 0.01, "A": rowsOf(a), "B": rowsOf(b), "C": rowsOf(c)},
		"sensors":  []any{map[string]any{"name": "s1", "noise_std": 0.01}, map[string]any{"name": "s2", "noise_std": 0.02}},
		"feedback": map[string]any{"K": [][]float64{make([]float64, n)}},
	}
	std := make([]float64, n)
	for i := range std {
		std[i] = 0.01
	}
	tree["process_noise"] = map[string]any{"std": std}
	text, err := json.Marshal(tree)
	if err != nil {
		t.Fatal(err)
	}
	p, err := plants.Parse("oscillators.json", text)
	if err != nil {
		t.Fatal(err)
	}
	return p, Gain{L: g, Lf: g}
}

func rowsOf(m *mat.Dense) [][]float64 {
	r, _ := m.Dims()
	rows := make([][]float64, r)
	for i := range rows {
		rows[i] = m.RawRowView(i)
	}
	return rows
}

func benchmarkRunner(t testing.TB, n int, steps float64) (*Runner, Gain) {
	p, g := oscillators(t, n)
	m := modelOf(t, p)
	s := Default(p)
	s.Duration = (steps - 1) * p.Period
	r, err := NewRunner(p, m, s, nil)
	if err != nil {
		t.Fatal(err)
	}
	if r.Samples() != int(steps) {
		t.Fatalf("%d samples", r.Samples())
	}
	return r, g
}

var sink *Run

func BenchmarkRun(b *testing.B) {
	for _, n := range []int{4, 6, 10, 20, 50} {
		for _, form := range []estimator.Form{estimator.Prediction, estimator.Current} {
			name := fmt.Sprintf("n=%d/prediction", n)
			if form == estimator.Current {
				name = fmt.Sprintf("n=%d/current", n)
			}
			b.Run(name, func(b *testing.B) {
				r, g := benchmarkRunner(b, n, 2000)
				g.Form = form
				sink = new(Run)
				b.ReportAllocs()
				for b.Loop() {
					if err := r.RunInto(context.Background(), g, sink); err != nil {
						b.Fatal(err)
					}
				}
			})
		}
	}
	b.Run("n=4/seeds", func(b *testing.B) {
		r, g := benchmarkRunner(b, 4, 2000)
		sink = new(Run)
		b.ReportAllocs()
		seed := uint64(0)
		for b.Loop() {
			seed++
			r.Reseed(seed)
			if err := r.RunInto(context.Background(), g, sink); err != nil {
				b.Fatal(err)
			}
		}
	})
	b.Run("n=4/kept", func(b *testing.B) {
		r, g := benchmarkRunner(b, 4, 2000)
		b.ReportAllocs()
		for b.Loop() {
			var err error
			if sink, err = r.Run(context.Background(), g); err != nil {
				b.Fatal(err)
			}
		}
	})
}

func BenchmarkNormal(b *testing.B) {
	var s stream
	z := normalTable()
	var sum float64
	for b.Loop() {
		sum += s.normal(z)
	}
	_ = sum
}

func TestRunDoesNotAllocate(t *testing.T) {
	for _, form := range []estimator.Form{estimator.Prediction, estimator.Current} {
		r, g := benchmarkRunner(t, 4, 500)
		g.Form = form
		var run Run
		ctx := context.Background()
		if err := r.RunInto(ctx, g, &run); err != nil || run.Diverged {
			t.Fatalf("%v, diverged %v", err, run.Diverged)
		}
		if count := testing.AllocsPerRun(20, func() {
			if err := r.RunInto(ctx, g, &run); err != nil {
				t.Error(err)
			}
		}); count != 0 {
			t.Errorf("form %d: %g allocations per run", form, count)
		}
	}
}
