package logs_test

import (
	"bytes"
	"context"
	"io"
	"math"
	"math/rand/v2"
	"testing"

	"gonum.org/v1/gonum/mat"

	"polewright/estimator"
	"polewright/scenarios/logs"
)

func dense(rows [][]float64) *mat.Dense {
	d := mat.NewDense(len(rows), len(rows[0]), nil)
	for i, r := range rows {
		d.SetRow(i, r)
	}
	return d
}

// layoutOf names the signals x1.., u1.., y1.. with operating points at zero.
func layoutOf(m *estimator.Model) *logs.Layout {
	n, inputs, p := m.Dims()
	named := func(letter string, k int) []logs.Signal {
		list := make([]logs.Signal, k)
		for i := range list {
			list[i].Name = letter + string(rune('1'+i))
		}
		return list
	}
	return &logs.Layout{Period: m.Period, States: named("x", n), Inputs: named("u", inputs), Sensors: named("y", p)}
}

// memory is a recording made by a test.
type memory struct {
	layout  *logs.Layout
	survey  logs.Survey
	samples []logs.Sample
}

func (m *memory) Layout() *logs.Layout          { return m.layout }
func (m *memory) Survey() *logs.Survey          { return &m.survey }
func (m *memory) Samples() (logs.Source, error) { return &memorySource{list: m.samples}, nil }

type memorySource struct {
	list []logs.Sample
	k    int
}

func (s *memorySource) Next() (*logs.Sample, error) {
	if s.k == len(s.list) {
		return nil, io.EOF
	}
	s.k++
	return &s.list[s.k-1], nil
}

func memoryOf(l *logs.Layout, u, y [][]float64) *memory {
	m := &memory{layout: l}
	for k := range y {
		s := logs.Sample{T: float64(k) * l.Period, Y: y[k], Line: k + 2}
		if u != nil {
			s.U = u[k]
		}
		m.samples = append(m.samples, s)
	}
	m.survey = logs.Survey{
		Rows: int64(len(y)), Samples: int64(len(y)), Lost: make([]int64, len(l.Sensors)),
		End: float64(len(y)-1) * l.Period, Period: l.Period,
	}
	return m
}

// tracker is a plant of four states and two sensors with one input: two coupled
// axes, each a position and a speed.
func tracker() *estimator.Model {
	const h = 0.01
	return &estimator.Model{
		Period: h,
		A: dense([][]float64{
			{1, h, 0, 0},
			{-0.02, 0.98, 0.01, 0},
			{0, 0, 1, h},
			{0.01, 0, -0.03, 0.97},
		}),
		B: dense([][]float64{{0}, {h}, {0}, {h / 2}}),
		C: dense([][]float64{{1, 0, 0, 0}, {0, 0, 1, 0}}),
		G: dense([][]float64{{0, 0}, {1, 0}, {0, 0}, {0, 1}}),
		Q: mat.NewSymDense(2, []float64{4e-4, 1e-4, 1e-4, 9e-4}),
		R: mat.NewSymDense(2, []float64{1e-4, 2e-5, 2e-5, 4e-4}),
	}
}

// kalman iterates the Riccati recursion until it stands still.
func kalman(m *estimator.Model, processFactor float64) *mat.Dense {
	n, _, p := m.Dims()
	w := mat.NewDense(n, n, nil)
	if m.G == nil {
		w.Copy(m.Q)
	} else {
		var gq mat.Dense
		gq.Mul(m.G, m.Q)
		w.Mul(&gq, m.G.T())
	}
	w.Scale(processFactor, w)
	cov, l := mat.DenseCopyOf(w), mat.NewDense(n, p, nil)
	for range 3000 {
		var pct, s, inv, apct, ap, next, ls mat.Dense
		pct.Mul(cov, m.C.T())
		s.Mul(m.C, &pct)
		s.Add(&s, m.R)
		if inv.Inverse(&s) != nil {
			panic("singular")
		}
		apct.Mul(m.A, &pct)
		l.Mul(&apct, &inv)
		ap.Mul(m.A, cov)
		next.Mul(&ap, m.A.T())
		ls.Mul(l, apct.T())
		next.Sub(&next, &ls)
		next.Add(&next, w)
		cov.Copy(&next)
		for i := range n {
			for j := range i {
				v := (cov.At(i, j) + cov.At(j, i)) / 2
				cov.Set(i, j, v)
				cov.Set(j, i, v)
			}
		}
	}
	return l
}

// simulate runs an exact model: x⁺ = A x + B u + G w, y = C x + v.
func simulate(m *estimator.Model, steps int, rng *rand.Rand) (u, y, x [][]float64) {
	n, inputs, p := m.Dims()
	q := n
	if m.G != nil {
		_, q = m.G.Dims()
	}
	var rq, rr mat.Cholesky
	if !rq.Factorize(m.Q) || !rr.Factorize(m.R) {
		panic("noise is singular")
	}
	var lq, lr mat.TriDense
	rq.LTo(&lq)
	rr.LTo(&lr)
	state := make([]float64, n)
	gauss := func(l *mat.TriDense, k int) []float64 {
		z, out := make([]float64, k), make([]float64, k)
		for i := range z {
			z[i] = rng.NormFloat64()
			for j := range i + 1 {
				out[i] += l.At(i, j) * z[j]
			}
		}
		return out
	}
	for k := range steps {
		uk, yk := make([]float64, inputs), gauss(&lr, p)
		for i := range uk {
			uk[i] = math.Sin(0.03 * float64(k))
		}
		for i := range yk {
			for j := range n {
				yk[i] += m.C.At(i, j) * state[j]
			}
		}
		u, y, x = append(u, uk), append(y, yk), append(x, append([]float64(nil), state...))
		w, next := gauss(&lq, q), make([]float64, n)
		for i := range n {
			for j := range n {
				next[i] += m.A.At(i, j) * state[j]
			}
			for j := range inputs {
				next[i] += m.B.At(i, j) * uk[j]
			}
			for j := range q {
				if m.G == nil {
					next[i] += w[i]
					break
				}
				next[i] += m.G.At(i, j) * w[j]
			}
		}
		state = next
	}
	return u, y, x
}

func openText(t testing.TB, l *logs.Layout, text string, o logs.Options) *logs.Log {
	t.Helper()
	log, err := logs.Open(context.Background(), bytes.NewReader([]byte(text)), l, o)
	if err != nil {
		t.Fatal(err)
	}
	return log
}

func replay(t testing.TB, log logs.Recording, q logs.Request) *logs.Result {
	t.Helper()
	r, err := logs.Replay(context.Background(), log, q)
	if err != nil {
		t.Fatal(err)
	}
	return r
}

// denseOf is a matrix of zeros.
func denseOf(rows, cols int) *mat.Dense { return mat.NewDense(rows, cols, nil) }
