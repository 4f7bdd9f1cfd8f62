package scenarios

import (
	"encoding/json"
	"math"
	"os"
	"testing"

	"gonum.org/v1/gonum/mat"

	"polewright/estimator"
)

type traceCase struct {
	Name       string
	A, B, C, D [][]float64
	L, Lf      [][]float64
	Xhat0      []float64 `json:"xhat0"`
	U, Y       [][]float64
	Prediction traceForm `json:"prediction_form"`
	Current    traceForm `json:"current_form"`
	Tolerance  float64
}

type traceForm struct {
	Predicted  [][]float64 `json:"xhat_pred"`
	Filtered   [][]float64 `json:"xhat_filt"`
	Innovation [][]float64 `json:"innovation"`
}

func dense(rows [][]float64) *mat.Dense {
	m := mat.NewDense(len(rows), len(rows[0]), nil)
	for i, r := range rows {
		m.SetRow(i, r)
	}
	return m
}

// testdata/traces.json comes with its source: recursions over listed sequences,
// made apart from this package; each case carries its tolerance, relative to the
// largest value of the signal.
func TestEstimateFollowsReferenceTraces(t *testing.T) {
	data, err := os.ReadFile("testdata/traces.json")
	if err != nil {
		t.Fatal(err)
	}
	var file struct{ Cases []traceCase }
	if err := json.Unmarshal(data, &file); err != nil {
		t.Fatal(err)
	}
	if len(file.Cases) != 4 {
		t.Fatalf("%d cases", len(file.Cases))
	}
	for _, c := range file.Cases {
		for _, form := range []estimator.Form{estimator.Prediction, estimator.Current} {
			if worst := c.replay(form); worst > c.Tolerance {
				t.Errorf("%s, form %d: off by %.2g of the signal, tolerance %.2g", c.Name, form, worst, c.Tolerance)
			}
		}
	}
}

// replay returns the worst deviation relative to the largest value.
func (c *traceCase) replay(form estimator.Form) float64 {
	m := &estimator.Model{Period: 1, A: dense(c.A), B: dense(c.B), C: dense(c.C), D: dense(c.D)}
	n, inputs, p := m.Dims()
	s := newEstimate(m)
	want := c.Prediction
	if form == estimator.Current {
		want = c.Current
		s.takeCurrent(dense(c.Lf))
	} else {
		s.takePrediction(dense(c.L))
	}
	cd := newFlat(p, n+inputs)
	cd.put(0, 0, m.C)
	cd.put(0, n, m.D)
	var expect packed
	expect.pack(cd)
	v, next := make([]float64, n+inputs+p), make([]float64, n+inputs+p)
	copy(v, c.Xhat0)
	worst, e := 0.0, v[n+inputs:]
	note := func(have []float64, all [][]float64, k int) {
		largest := 0.0
		for _, row := range all {
			for _, v := range row {
				largest = math.Max(largest, math.Abs(v))
			}
		}
		for i, v := range all[k] {
			worst = math.Max(worst, math.Abs(have[i]-v)/largest)
		}
	}
	for k := range c.Y {
		note(v, want.Predicted, k)
		copy(v[n:], c.U[k])
		expect.mulAdd(e, v, make([]float64, p))
		for i := range e {
			e[i] = c.Y[k][i] - e[i]
		}
		note(e, want.Innovation, k)
		if form == estimator.Current {
			s.correct(v)
			note(v, want.Filtered, k)
		}
		s.advance(next, v)
		copy(v, next[:n])
	}
	note(v, want.Predicted, len(c.Y))
	return worst
}
