package plants_test

import (
	"fmt"
	"math"
	"strings"
	"testing"

	"gonum.org/v1/gonum/mat"
	"pgregory.net/rapid"

	"polewright/plants"
)

// chained is a discrete plant whose signals pass lags and delays, written both as
// a file and as numbers to run step by step.
type chained struct {
	a, b, c, d           [][]float64
	inputDelay, outDelay []int
	inputLag, outLag     []float64 // over the period of 1 s; 0 without
	offset               []float64 // on each input, behind lag and delay
}

func drawChained(t *rapid.T) chained {
	entries := func(label string, rows, cols int) [][]float64 {
		m := make([][]float64, rows)
		for i := range m {
			m[i] = rapid.SliceOfN(rapid.Float64Range(-0.6, 0.6), cols, cols).Draw(t, label)
		}
		return m
	}
	size := rapid.IntRange(1, 3)
	n, m, p := size.Draw(t, "n"), size.Draw(t, "m"), size.Draw(t, "p")
	delay, lag := rapid.IntRange(0, 3), rapid.SampledFrom([]float64{0, 0.5, 2})
	return chained{
		a: entries("A", n, n), b: entries("B", n, m), c: entries("C", p, n), d: entries("D", p, m),
		inputDelay: rapid.SliceOfN(delay, m, m).Draw(t, "input delays"), outDelay: rapid.SliceOfN(delay, p, p).Draw(t, "sensor delays"),
		inputLag: rapid.SliceOfN(lag, m, m).Draw(t, "input lags"), outLag: rapid.SliceOfN(lag, p, p).Draw(t, "sensor lags"),
		offset: rapid.SliceOfN(rapid.Float64Range(-1, 1), m, m).Draw(t, "offsets"),
	}
}

func (s chained) text() string {
	var b strings.Builder
	b.WriteString("format = 1\n[model]\ntime = \"discrete\"\nperiod_s = 1\n")
	for _, m := range []struct {
		name string
		rows [][]float64
	}{{"A", s.a}, {"B", s.b}, {"C", s.c}, {"D", s.d}} {
		rows := make([]string, len(m.rows))
		for i, row := range m.rows {
			numbers := make([]string, len(row))
			for j, v := range row {
				numbers[j] = fmt.Sprintf("%.17e", v)
			}
			rows[i] = "[" + strings.Join(numbers, ", ") + "]"
		}
		fmt.Fprintf(&b, "%s = [%s]\n", m.name, strings.Join(rows, ", "))
	}
	for j := range s.inputDelay {
		fmt.Fprintf(&b, "[[inputs]]\ndelay_samples = %d\nlag_s = %g\n", s.inputDelay[j], s.inputLag[j])
		fmt.Fprintf(&b, "[[unknowns]]\nkind = \"input-offset\"\non = \"u%d\"\ndrift = 1\n", j+1)
	}
	for i := range s.outDelay {
		fmt.Fprintf(&b, "[[sensors]]\ndelay_samples = %d\nlag_s = %g\n", s.outDelay[i], s.outLag[i])
	}
	return b.String()
}

// chain is a first-order lag and a queue in a signal's way; next takes the signal
// of this step and gives what comes out in this step.
type chain struct {
	lag, state float64
	delayFirst bool // an input: the queue before the lag
	queue      []float64
}

func (c *chain) next(v float64) float64 {
	if c.delayFirst {
		return c.lagged(c.queued(v))
	}
	return c.queued(c.lagged(v))
}

func (c *chain) queued(v float64) float64 {
	c.queue = append(c.queue, v)
	out := c.queue[0]
	c.queue = c.queue[1:]
	return out
}

func (c *chain) lagged(v float64) float64 {
	if c.lag == 0 {
		return v
	}
	out := c.state
	e := math.Exp(-1 / c.lag)
	c.state = e*c.state + (1-e)*v
	return out
}

// TestChainsAgree runs the design model beside plain lags and queues: with the same
// inputs from rest, the sensors agree in every step.
func TestChainsAgree(t *testing.T) {
	rapid.Check(t, func(t *rapid.T) {
		s := drawChained(t)
		p, err := plants.Parse("p.toml", []byte(s.text()))
		if err != nil {
			t.Fatal(err)
		}
		m, err := p.Model(plants.Options{})
		if err != nil {
			t.Fatal(err)
		}
		n, inputs, sensors := m.Dims()
		x := mat.NewVecDense(n, nil)
		for j, v := range s.offset {
			x.SetVec(n-inputs+j, v) // unknowns come last
		}
		in, out := make([]chain, inputs), make([]chain, sensors)
		for j := range in {
			in[j] = chain{lag: s.inputLag[j], delayFirst: true, queue: make([]float64, s.inputDelay[j])}
		}
		for i := range out {
			out[i] = chain{lag: s.outLag[i], queue: make([]float64, s.outDelay[i])}
		}
		state := make([]float64, len(s.a))
		for k := range 12 {
			u := mat.NewVecDense(inputs, nil)
			acting := make([]float64, inputs)
			for j := range inputs {
				u.SetVec(j, math.Sin(float64(k*(j+1))+0.3))
				acting[j] = in[j].next(u.AtVec(j)) + s.offset[j]
			}
			var y, du, next, bu mat.VecDense
			y.MulVec(m.C, x)
			du.MulVec(m.D, u)
			y.AddVec(&y, &du)
			for i := range sensors {
				want := out[i].next(dot(s.c[i], state) + dot(s.d[i], acting))
				if got := y.AtVec(i); math.Abs(got-want) > 1e-12*(1+math.Abs(want)) {
					t.Fatalf("step %d, sensor %d: %v, want %v", k, i+1, got, want)
				}
			}
			next.MulVec(m.A, x)
			bu.MulVec(m.B, u)
			x.AddVec(&next, &bu)
			after := make([]float64, len(state))
			for i := range after {
				after[i] = dot(s.a[i], state) + dot(s.b[i], acting)
			}
			state = after
		}
	})
}

func dot(a, b []float64) float64 {
	sum := 0.0
	for i := range a {
		sum += a[i] * b[i]
	}
	return sum
}
