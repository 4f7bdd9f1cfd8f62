package logs

import (
	"fmt"
	"math"

	"gonum.org/v1/gonum/mat"

	"polewright/estimator"
	"polewright/plants"
)

// Start is the estimate before the first sample. The zero value is zero deviation.
type Start struct {
	// State is a deviation per state of the model, or of the plant alone, the
	// others then being zero; nil is zeros.
	State []float64
	// FirstSample solves for the first sensors instead: among all states that give
	// what they show, the least in the user's scaling.
	FirstSample bool
}

// Check fails where the start does not fit the model.
func (s Start) Check(m *estimator.Model) error {
	_, err := s.vector(m)
	return err
}

// vector checks a given start.
func (s Start) vector(m *estimator.Model) ([]float64, error) {
	n, _, _ := m.Dims()
	own := n
	for i, r := range m.Roles {
		if r != estimator.PlantState {
			own = i
			break
		}
	}
	x := make([]float64, n)
	switch {
	case s.State == nil:
		return x, nil
	case s.FirstSample:
		return nil, &plants.Error{Where: "start", Wrong: "both a state and the first sample", Expected: "expected one of them"}
	case len(s.State) != n && len(s.State) != own:
		numbers := fmt.Sprintf("%d numbers", len(s.State))
		if len(s.State) == 1 {
			numbers = "1 number"
		}
		return nil, &plants.Error{Where: "start", Wrong: numbers, Expected: fmt.Sprintf("expected one per state: %d", own)}
	}
	for i, v := range s.State {
		if math.IsNaN(v) || math.IsInf(v, 0) {
			return nil, &plants.Error{Where: "start", Wrong: fmt.Sprintf("%g for state %d", v, i+1), Expected: "expected finite numbers"}
		}
		x[i] = v
	}
	return x, nil
}

// fromSensors is the least state, measured by the states' scales, with
// C x = y − D u in the sensors that are not lost, least squares where they
// contradict each other. It reports false where all are lost.
func fromSensors(m *estimator.Model, l *Layout, u, y []float64) ([]float64, bool) {
	n, inputs, p := m.Dims()
	scale := func(list []float64, i int) float64 {
		if list == nil {
			return 1
		}
		return list[i]
	}
	var rows []int
	for i := range p {
		if !math.IsNaN(y[i]) {
			rows = append(rows, i)
		}
	}
	if len(rows) == 0 {
		return nil, false
	}
	c, b := mat.NewDense(len(rows), n, nil), mat.NewVecDense(len(rows), nil)
	for k, i := range rows {
		size := scale(m.SensorScale, i)
		v := y[i]
		if m.D != nil {
			for j := range inputs {
				v -= m.D.At(i, j) * u[j]
			}
		}
		if w := l.Sensors[i].Wrap; w > 0 {
			v = math.Remainder(v, w)
		}
		b.SetVec(k, v/size)
		for j := range n {
			c.Set(k, j, m.C.At(i, j)*scale(m.StateScale, j)/size)
		}
	}
	x := make([]float64, n)
	var svd mat.SVD
	if !svd.Factorize(c, mat.SVDThin) {
		return x, true
	}
	if rank := svd.Rank(1e-10); rank > 0 {
		var z mat.VecDense
		svd.SolveVecTo(&z, b, rank)
		for j := range n {
			x[j] = z.AtVec(j) * scale(m.StateScale, j)
		}
	}
	return x, true
}
