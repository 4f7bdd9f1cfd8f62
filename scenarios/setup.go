package scenarios

import (
	"fmt"
	"math"

	"gonum.org/v1/gonum/mat"

	"polewright/estimator"
	"polewright/plants"
)

// maxValues bounds the memory of a run.
const maxValues = 50_000_000

// start sets the states at t = 0.
func (r *Runner) start(s *Scenario) error {
	r.nt, _ = r.real.a.Dims()
	own := len(r.real.plant.States)
	r.startReal, r.startEst = make([]float64, r.nt), make([]float64, r.n)
	if s.InitialTrue != nil && len(s.InitialTrue) != own {
		return &plants.Error{File: s.file, Where: "initial, true", Wrong: entries(len(s.InitialTrue)), Expected: fmt.Sprintf("expected one per state of the real plant: %d", own)}
	}
	if s.InitialEstimate != nil && len(s.InitialEstimate) != len(r.plant.States) {
		return &plants.Error{File: s.file, Where: "initial, estimate", Wrong: entries(len(s.InitialEstimate)), Expected: fmt.Sprintf("expected one per state of the plant: %d", len(r.plant.States))}
	}
	copy(r.startReal, s.InitialTrue)
	copy(r.startEst, s.InitialEstimate)
	return nil
}

// signals sets names, operating points and bounds, and what is on the way of
// commands and readings.
func (r *Runner) signals(s *Scenario) {
	p, real := r.plant, r.real.plant
	r.names = names{
		states:    namesOf(p.States, func(s plants.State) string { return s.Name }),
		estimates: r.model.StateNames, sensors: r.model.SensorNames, inputs: r.model.InputNames,
	}
	place := positions(r.names.states)
	bounds := make([]float64, len(p.States))
	for i := range bounds {
		bounds[i] = math.NaN()
	}
	for _, x := range real.States {
		i, ok := place[x.Name]
		if !ok {
			i = len(p.States) + len(r.names.others)
			r.names.others = append(r.names.others, x.Name)
			bounds = append(bounds, 0)
		}
		r.series = append(r.series, i)
		bounds[i] = bound(x.Operating, x.Scale)
		r.realOp = append(r.realOp, x.Operating)
	}
	r.realBound = bounds
	for j, i := range r.real.inputs {
		r.actuators = append(r.actuators, newActuator(p.Inputs[j], real.Inputs[i]))
	}
	index := map[int]int{}
	for k, i := range r.real.sensors {
		own, _ := p.SensorIndex(r.model.SensorNames[k])
		index[own] = k
		r.sensors = append(r.sensors, newSensor(p.Sensors[own], real.Sensors[i]))
	}
	r.faults = newFaults(s.Faults, index, r.step, len(r.time))
	r.estimateOp = operatingPoints(p, r.model)
	for i, op := range r.estimateOp {
		scale := 1.0
		if r.model.StateScale != nil {
			scale = r.model.StateScale[i]
		}
		r.estBound = append(r.estBound, bound(op, scale))
	}
}

func bound(operating, scale float64) float64 {
	return math.Min(math.Abs(operating)+diverged*scale, math.MaxFloat64)
}

// operatingPoints gives the absolute value of each design state at zero
// deviation. Lags and delays have their signal's, unknowns zero.
func operatingPoints(p *plants.Plant, m *estimator.Model) []float64 {
	n, _, _ := m.Dims()
	op := make([]float64, 0, n)
	for _, s := range p.States {
		op = append(op, s.Operating)
	}
	var lags, registers []float64
	add := func(lag float64, delay int, operating float64) {
		if lag > 0 {
			lags = append(lags, operating)
		}
		for range delay {
			registers = append(registers, operating)
		}
	}
	for _, u := range p.Inputs {
		add(u.Lag, u.DelaySamples, u.Operating)
	}
	for _, name := range m.SensorNames {
		if i, ok := p.SensorIndex(name); ok {
			add(p.Sensors[i].Lag, p.Sensors[i].DelaySamples, p.Sensors[i].Operating)
		}
	}
	for i := len(op); i < n; i++ {
		var v float64
		if m.Roles != nil {
			switch m.Roles[i] {
			case estimator.LagState:
				v, lags = first(lags)
			case estimator.DelayRegister:
				v, registers = first(registers)
			}
		}
		op = append(op, v)
	}
	return op
}

func first(list []float64) (float64, []float64) {
	if len(list) == 0 {
		return 0, nil
	}
	return list[0], list[1:]
}

// room refuses a run that is too large to keep.
func (r *Runner) room(file string) error {
	signals := len(r.names.states) + len(r.names.others) + r.n + 2*r.p + r.m
	if signals*len(r.time) > maxValues {
		return &plants.Error{File: file, Where: "duration_s", Wrong: fmt.Sprintf("%d samples of %d signals", len(r.time), signals), Expected: fmt.Sprintf("expected at most %d values", maxValues)}
	}
	return nil
}

// matrices lays out what the loops multiply with.
func (r *Runner) matrices() {
	t, m := r.real, r.model
	r.ab, r.cd = newFlat(r.nt, r.nt+r.m), newFlat(r.p, r.nt+r.m)
	r.ab.put(0, 0, t.a)
	r.ab.put(0, r.nt, t.b)
	r.cd.put(0, 0, t.c)
	r.cd.put(0, r.nt, t.d)
	expect := newFlat(r.p, r.n+r.m)
	expect.put(0, 0, m.C)
	expect.put(0, r.n, m.D)
	k := newFlat(r.m, r.n)
	k.put(0, 0, m.K)
	r.ahead.pack(r.ab)
	r.look.pack(r.cd.without(r.nt))
	r.expect.pack(expect.without(r.n))
	r.k.pack(k)
	r.rows = rows{
		real:      make([]float64, (chunk+1)*(r.nt+r.m)),
		estimated: make([]float64, (chunk+1)*(r.n+r.m+r.p)),
		read:      make([]float64, chunk*r.p),
	}
	r.y, r.want, r.command = make([]float64, r.p), make([]float64, r.p), make([]float64, r.m)
	r.nothing = make([]float64, max(r.p, r.m))
	r.est = newEstimate(m)
	r.freeInputs, r.freeSensors = true, len(r.faults.spans) == 0
	for i := range r.actuators {
		r.freeInputs = r.freeInputs && r.actuators[i].free()
	}
	for i := range r.sensors {
		r.freeSensors = r.freeSensors && r.sensors[i].free()
	}
}

// force collects what acts from outside.
func (r *Runner) force(s *Scenario) {
	t, m := r.real, r.model
	x := forcing{steps: len(r.time), m: r.m, nt: r.nt, p: r.p, names: m.SensorNames, held: m.Period == 0}
	for i, d := range s.Drives {
		x.drives = append(x.drives, newWave(d, fmt.Sprintf("drive %d", i+1), r.step, x.steps))
	}
	for i, d := range s.Surprises {
		x.surprises = append(x.surprises, newWave(d, fmt.Sprintf("surprise %d", i+1), r.step, x.steps))
	}
	x.bs, x.ds = newFlat(r.nt, r.m), newFlat(r.p, r.m)
	x.bs.put(0, 0, t.bs)
	x.ds.put(0, 0, t.ds)
	x.w = scaled(t.w, s.Noise.Process)
	x.columns = columnsWithNoise(x.w)
	x.process = streams(len(x.columns))
	x.v = scaled(r.sensorRoot(), s.Noise.Sensor)
	if len(columnsWithNoise(x.v)) > 0 {
		x.sensor = streams(r.p)
	}
	// Both plants count from their own operating points.
	shift := make([]float64, r.m)
	for j, i := range t.inputs {
		shift[j] = r.plant.Inputs[j].Operating - t.plant.Inputs[i].Operating
	}
	x.c0, x.g0 = make([]float64, r.nt), make([]float64, r.p)
	addMul(x.c0, subFlat(r.ab, r.nt, r.m), shift)
	addMul(x.g0, subFlat(r.cd, r.nt, r.m), shift)
	for k, i := range t.sensors {
		x.g0[k] += t.plant.Sensors[i].Operating - r.sensors[k].operating
	}
	x.allocate()
	r.forcing = x
}

func streams(count int) []*stream {
	list := make([]*stream, count)
	for i := range list {
		list[i] = new(stream)
	}
	return list
}

// sensorRoot is the root of the covariance of one sample. What the quantiser
// adds is left out: the run quantises. In continuous time the density is divided
// by the step.
func (r *Runner) sensorRoot() flat {
	full := r.real.plant.SampleNoise(r.model.Period, true)
	factor := 1.0
	if r.model.Period == 0 {
		factor = 1 / r.step
	}
	cov := mat.NewSymDense(r.p, nil)
	for i, si := range r.real.sensors {
		for j, sj := range r.real.sensors[:i+1] {
			cov.SetSym(i, j, factor*full.At(si, sj))
		}
	}
	return root(cov)
}
