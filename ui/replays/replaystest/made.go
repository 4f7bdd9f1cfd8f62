// Package replaystest makes up logs of built-in plants, for tests.
package replaystest

import (
	"bytes"
	"context"
	"fmt"
	"math"
	"math/rand/v2"
	"testing"

	"gonum.org/v1/gonum/mat"

	"polewright/estimator"
	"polewright/scenarios/logs"
	"polewright/ui/desk"
	"polewright/ui/replays"
)

// Made is a made-up log: the bench's own model, from zero deviation, its inputs at
// rest.
type Made struct {
	Rows  int
	Seed  uint64
	Noise float64 // times the sensors' own; 0 stands for 1
	// References adds a column per state and output.
	References bool
	// Lost leaves the first sensor's fields of the rows 40 to 44 empty.
	Lost bool
	// Most and From choose the window; Most 0 takes all.
	Most int
	From float64
}

// Log makes it up.
func Log(t testing.TB, b *desk.Bench, m Made) *replays.Log {
	t.Helper()
	l, err := logs.NewLayout(b.Plant, b.Model)
	if err != nil {
		t.Fatal(err)
	}
	log, err := logs.Open(context.Background(), bytes.NewReader(m.text(b.Model, l)), l, logs.Options{File: "made.csv"})
	if err != nil {
		t.Fatal(err)
	}
	if m.Most == 0 {
		m.Most = replays.Most
	}
	out, err := replays.Load(context.Background(), log, m.From, m.Most)
	if err != nil {
		t.Fatal(err)
	}
	return out
}

func (m *Made) text(model *estimator.Model, l *logs.Layout) []byte {
	if m.Noise == 0 {
		m.Noise = 1
	}
	n, _, p := model.Dims()
	random := rand.New(rand.NewPCG(m.Seed, 1))
	q, r := root(model.Q), root(model.R)
	x, next, y := mat.NewVecDense(n, nil), mat.NewVecDense(n, nil), mat.NewVecDense(p, nil)
	noise := func(factor *mat.Dense, scale float64, to *mat.VecDense) {
		size := to.Len()
		v := mat.NewVecDense(size, nil)
		for i := range size {
			v.SetVec(i, scale*random.NormFloat64())
		}
		var w mat.VecDense
		w.MulVec(factor, v)
		to.AddVec(to, &w)
	}
	var b bytes.Buffer
	b.WriteString("t")
	head := func(list []logs.Signal) {
		for _, s := range list {
			fmt.Fprintf(&b, ",%q", s.Name)
		}
	}
	head(l.Inputs)
	head(l.Sensors)
	if m.References {
		head(l.States)
		head(l.Outputs)
	}
	for k := range m.Rows {
		fmt.Fprintf(&b, "\n%.9g", float64(k)*l.Period)
		for _, s := range l.Inputs {
			fmt.Fprintf(&b, ",%.12g", s.Operating)
		}
		y.MulVec(model.C, x)
		noise(r, m.Noise, y)
		for i, s := range l.Sensors {
			if m.Lost && i == 0 && k >= 40 && k < 45 {
				b.WriteString(",")
				continue
			}
			fmt.Fprintf(&b, ",%.12g", s.Operating+y.AtVec(i))
		}
		for i, s := range l.States {
			if m.References {
				fmt.Fprintf(&b, ",%.12g", s.Operating+x.AtVec(i))
			}
		}
		for i, s := range l.Outputs {
			if m.References {
				fmt.Fprintf(&b, ",%.12g", s.Operating+mat.Dot(model.Outputs.RowView(i), x))
			}
		}
		next.MulVec(model.A, x)
		noise(q, 1, next)
		x, next = next, x
	}
	b.WriteString("\n")
	return b.Bytes()
}

// root is a factor with root·rootᵀ = s.
func root(s *mat.SymDense) *mat.Dense {
	var eig mat.EigenSym
	n := s.SymmetricDim()
	out := mat.NewDense(n, n, nil)
	if !eig.Factorize(s, true) {
		return out
	}
	var v mat.Dense
	eig.VectorsTo(&v)
	for j, lambda := range eig.Values(nil) {
		scale := 0.0
		if lambda > 0 {
			scale = math.Sqrt(lambda)
		}
		for i := range n {
			out.Set(i, j, scale*v.At(i, j))
		}
	}
	return out
}
