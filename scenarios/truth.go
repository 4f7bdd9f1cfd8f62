package scenarios

import (
	"errors"
	"fmt"
	"slices"

	"gonum.org/v1/gonum/mat"

	"polewright/estimator"
	"polewright/plants"
)

// truth is the real plant, with inputs and sensors in the design's order, as
// deviations from its own operating point:
//
//	x⁺ = A x + B u + Bs s + W z,  y = C x + D u + Ds s
//
// (continuous: x' and the noise of one step). u is the command, which passes the
// actuators' lags and delays; s is a surprise, which acts where the input enters
// the plant; z is standard normal.
type truth struct {
	plant   *plants.Plant
	model   *estimator.Model
	sensors []int // in the plant, per sensor of the design
	inputs  []int // likewise

	a, b, c, d, bs, ds *mat.Dense // b, d, bs, ds have no inputs where nil
	w                  flat
}

// newTruth builds the real plant beside a design model of plant p. step is the
// length of one step in s.
func newTruth(p *plants.Plant, m *estimator.Model, s *Scenario, fuller *plants.Plant, step float64) (*truth, error) {
	t := &truth{plant: p}
	if fuller != nil {
		t.plant = fuller
	}
	if err := t.match(m, s.file); err != nil {
		return nil, err
	}
	use := make([]bool, len(t.plant.Sensors))
	for _, i := range t.sensors {
		use[i] = true
	}
	o := plants.Options{Period: &m.Period, Factors: s.Factors, WithoutUnknowns: true, Sensors: use}
	var err error
	if t.model, err = t.plant.Model(o); err != nil {
		return nil, realPlantError(s.file, err)
	}
	if t.model.Period != m.Period {
		return nil, realPlantError(s.file, fmt.Errorf("it has a period of %g s, the design one of %g s", t.model.Period, m.Period))
	}
	bs, ds, err := t.entry(o)
	if err != nil {
		return nil, realPlantError(s.file, err)
	}
	rows := t.order(use)
	t.a = t.model.A
	t.b, t.bs = pickColumns(t.model.B, t.inputs), pickColumns(bs, t.inputs)
	t.c = pickRows(t.model.C, rows)
	t.d, t.ds = pickRows(pickColumns(t.model.D, t.inputs), rows), pickRows(pickColumns(ds, t.inputs), rows)
	return t, t.processNoise(step)
}

func realPlantError(file string, err error) error {
	if _, ok := errors.AsType[*plants.Error](err); ok {
		return fmt.Errorf("%s: the real plant: %w", file, err)
	}
	return &plants.Error{File: file, Where: "truth", Wrong: "the real plant: " + err.Error(), Expected: "expected a plant that can be simulated"}
}

// match finds the design's inputs and sensors in the real plant, by name.
func (t *truth) match(m *estimator.Model, file string) error {
	for _, name := range m.SensorNames {
		i, ok := t.plant.SensorIndex(name)
		if !ok {
			return &plants.Error{File: file, Where: "truth, plant", Wrong: "no sensor " + quoted(name), Expected: "expected the sensors of the plant by the same names"}
		}
		t.sensors = append(t.sensors, i)
	}
	for _, name := range m.InputNames {
		i, ok := t.plant.InputIndex(name)
		if !ok {
			return &plants.Error{File: file, Where: "truth, plant", Wrong: "no input " + quoted(name), Expected: "expected the inputs of the plant by the same names"}
		}
		t.inputs = append(t.inputs, i)
	}
	return nil
}

// order gives the row of the real model per sensor of the design.
func (t *truth) order(use []bool) []int {
	row := make([]int, len(use))
	next := 0
	for i, u := range use {
		row[i] = next
		if u {
			next++
		}
	}
	rows := make([]int, len(t.sensors))
	for k, i := range t.sensors {
		rows[k] = row[i]
	}
	return rows
}

// entry returns the columns by which a surprise acts: those of the plant without
// its actuators' lags and delays, spread over the states of the full model.
func (t *truth) entry(o plants.Options) (bs, ds *mat.Dense, err error) {
	bare := *t.plant
	bare.Inputs = slices.Clone(t.plant.Inputs)
	lags, registers := 0, 0
	for j := range bare.Inputs {
		u := &bare.Inputs[j]
		if u.Lag > 0 {
			lags++
		}
		registers += u.DelaySamples
		u.Lag, u.DelaySamples = 0, 0
	}
	if lags+registers == 0 || t.model.B == nil {
		return t.model.B, t.model.D, nil
	}
	direct, err := bare.Model(o)
	if err != nil {
		return nil, nil, err
	}
	// The states of the full model in its order: the plant's own, actuator
	// lags, sensor lags, registers of inputs, registers of sensors.
	n, m := direct.B.Dims()
	own := len(t.plant.States)
	full, _ := t.model.A.Dims()
	bs = mat.NewDense(full, m, nil)
	for i := range n {
		at := i
		if i >= own {
			at += lags
		}
		if direct.Roles[i] == estimator.DelayRegister {
			at += registers
		}
		bs.SetRow(at, direct.B.RawRowView(i))
	}
	return bs, direct.D, nil
}

// processNoise sets W with W·Wᵀ the covariance of what noise adds in one step.
func (t *truth) processNoise(step float64) error {
	m := t.model
	if !m.Discrete() {
		_, _, q, err := estimator.Discretise(m.A, nil, m.G, m.Q, step)
		if err != nil {
			return fmt.Errorf("the noise of one step of %g s: %w", step, err)
		}
		t.w = root(q)
		return nil
	}
	r := root(m.Q)
	if m.G == nil {
		t.w = r
		return nil
	}
	n, q := m.G.Dims()
	t.w = newFlat(n, q)
	for i := range n {
		for j := range q {
			var s float64
			for k := range q {
				s += float64(m.G.At(i, k) * r.at(k, j))
			}
			t.w.set(i, j, s)
		}
	}
	return nil
}

func pickRows(m *mat.Dense, rows []int) *mat.Dense {
	if m == nil {
		return nil
	}
	_, c := m.Dims()
	out := mat.NewDense(len(rows), c, nil)
	for i, r := range rows {
		out.SetRow(i, m.RawRowView(r))
	}
	return out
}

func pickColumns(m *mat.Dense, cols []int) *mat.Dense {
	if m == nil || len(cols) == 0 {
		return nil
	}
	r, _ := m.Dims()
	out := mat.NewDense(r, len(cols), nil)
	for i := range r {
		for j, c := range cols {
			out.Set(i, j, m.At(i, c))
		}
	}
	return out
}
