package scenarios

import (
	"context"
	"errors"
	"fmt"
	"math"

	"gonum.org/v1/gonum/mat"

	"polewright/estimator"
	"polewright/plants"
)

// diverged is the multiple of its scale at which a value counts as lost.
const diverged = 1e12

// Runner runs one scenario for gain after gain, with the same noise each time.
// It owns the workspaces of its runs, so one Runner serves one goroutine at a
// time.
type Runner struct {
	plant  *plants.Plant
	model  *estimator.Model
	real   *truth
	closed bool
	step   float64
	seed   uint64

	n, m, p, nt int
	time        []float64
	names       names
	series      []int     // per own state of the real plant: its place in True, or after these in Others
	realOp      []float64 // per own state of the real plant
	estimateOp  []float64
	realBound   []float64 // per entry of True and Others; NaN: nothing there
	estBound    []float64
	startReal   []float64
	startEst    []float64

	forcing   forcing
	seeded    bool
	faults    faults
	sensors   []sensor
	actuators []actuator

	// Matrices of the inner loop; the columns of a D that is zero are left out.
	k      packed // m×n
	ahead  packed // nt×(nt+m): A B of the real plant
	look   packed // p×(nt+m): C D
	expect packed // p×(n+m): C D of the design
	// freeInputs and freeSensors have neither range nor resolution; the sensors
	// have no wrap and no fault either.
	freeInputs, freeSensors bool

	rows    rows
	y, want []float64 // sensors as deviations; what the estimator expects of them
	nothing []float64
	ab, cd  flat // of the real plant
	command []float64
	est     estimate
	hold    holding
}

// NewRunner prepares the runs of a scenario: p is the plant, m its design model
// (of plants.Plant.Model), truth the fuller plant that s.TruthPlant names, else
// nil.
//
// The real plant has its own parameters, lags, delays, process noise, sensors and
// actuators, but no unknowns: surprises are what the estimator does not know. A
// run has a sample at t = 0 and after each step to the duration. In continuous
// time a step is s.Step; where that is 0, a thousandth of the duration, a
// twentieth over the fastest eigenvalue of the real plant where that is less, but
// no less than a hundred-thousandth of the duration.
//
// The error is of type *plants.Error where a file is to blame.
func NewRunner(p *plants.Plant, m *estimator.Model, s *Scenario, truth *plants.Plant) (*Runner, error) {
	if p == nil || m == nil || s == nil {
		return nil, errors.New("a run needs a plant, its model and a scenario")
	}
	if err := m.Check(); err != nil {
		return nil, fmt.Errorf("the design model: %w", err)
	}
	if s.TruthPlant != "" && truth == nil {
		return nil, &plants.Error{File: s.file, Where: "truth, plant", Wrong: quoted(s.TruthPlant) + " was not read", Expected: "expected that plant"}
	}
	r := &Runner{plant: p, model: m, closed: s.Closed, seed: s.Noise.Seed}
	r.n, r.m, r.p = m.Dims()
	if r.n < len(p.States) || len(m.InputNames) != r.m || len(m.SensorNames) != r.p || r.m != len(p.Inputs) {
		return nil, errors.New("the model is not of this plant")
	}
	if s.Closed && m.K == nil {
		return nil, &plants.Error{File: s.file, Where: "loop", Wrong: "closed, for a plant without a controller", Expected: `expected "open", or [feedback] in the plant`}
	}
	var err error
	if r.step, err = stepOf(p, m, s, truth); err != nil {
		return nil, err
	}
	if r.real, err = newTruth(p, m, s, truth, r.step); err != nil {
		return nil, err
	}
	steps := int(math.Floor(s.Duration/r.step+1e-6)) + 1
	r.time = make([]float64, steps)
	for k := range r.time {
		r.time[k] = float64(k) * r.step
	}
	if err := r.start(s); err != nil {
		return nil, err
	}
	r.signals(s)
	if err := r.room(s.file); err != nil {
		return nil, err
	}
	r.matrices()
	r.force(s)
	return r, nil
}

// stepOf returns the length of one step in s.
func stepOf(p *plants.Plant, m *estimator.Model, s *Scenario, truth *plants.Plant) (float64, error) {
	step := m.Period
	if step == 0 {
		step = s.Step
	}
	if step == 0 {
		step = s.Duration / 1000
		real := p
		if truth != nil {
			real = truth
		}
		if rm, err := real.Model(plants.Options{Period: &m.Period, Factors: s.Factors, WithoutUnknowns: true}); err == nil {
			if _, fast := rates(rm.A); fast > 0 {
				step = math.Max(math.Min(step, 1/(20*fast)), s.Duration/1e5)
			}
		}
	}
	if ratio := s.Duration / step; !(ratio > 0 && ratio <= maxSteps) {
		return 0, &plants.Error{File: s.file, Where: "duration_s", Wrong: fmt.Sprintf("%s s in steps of %s s", num(s.Duration), num(step)), Expected: fmt.Sprintf("expected at most %d steps", maxSteps)}
	}
	return step, nil
}

// Step returns the length of one step in s.
func (r *Runner) Step() float64 { return r.step }

// Samples returns the number of samples of a full run.
func (r *Runner) Samples() int { return len(r.time) }

// Reseed gives the runs that follow the noise of another seed.
func (r *Runner) Reseed(seed uint64) { r.seed, r.seeded = seed, false }

// Run simulates the real plant and the estimator with a gain. It fails where the
// gain does not fit the model and where ctx ends; a run that diverges is an
// answer.
func (r *Runner) Run(ctx context.Context, g Gain) (*Run, error) {
	run := new(Run)
	if err := r.RunInto(ctx, g, run); err != nil {
		return nil, err
	}
	return run, nil
}

// RunInto is Run into the memory of a run that is no longer needed. After an
// error its content has no meaning.
func (r *Runner) RunInto(ctx context.Context, g Gain, run *Run) error {
	if err := r.takeGain(g); err != nil {
		return err
	}
	if !r.seeded || !r.forcing.keep {
		r.forcing.seed(r.seed)
		r.seeded = true
	}
	run.lay(&r.names, r.time, g.Form)
	for i := range r.names.states {
		if math.IsNaN(r.realBound[i]) {
			for k := range run.True[i] {
				run.True[i][k] = math.NaN()
			}
		}
	}
	r.begin()
	for k := 0; k < len(r.time); k += chunk {
		if err := ctx.Err(); err != nil {
			return err
		}
		count := min(chunk, len(r.time)-k)
		w := r.forcing.next(k, count)
		if !r.steps(run, w, k, count, g.Form) {
			run.cut(run.beyond(k, k+count, r.realBound, r.estBound))
			run.Diverged = true
			return nil
		}
	}
	return nil
}

// steps runs one chunk and writes it down. It reports whether all values are
// within their bounds.
func (r *Runner) steps(run *Run, w window, k, count int, form estimator.Form) bool {
	switch {
	case r.model.Period == 0:
		r.continuous(w, k, count)
	case form == estimator.Current:
		r.current(w, k, count)
	default:
		r.prediction(w, k, count)
	}
	return r.write(run, k, count)
}

// begin writes the states at t = 0 into the first row.
func (r *Runner) begin() {
	x, v := r.row(0)
	clear(x)
	clear(v)
	copy(x, r.startReal)
	copy(v, r.startEst)
}

// takeGain checks a gain and sets up the estimator for it.
func (r *Runner) takeGain(g Gain) error {
	check := func(name string, l *mat.Dense) error {
		if l == nil {
			return fmt.Errorf("a run without %s: %w", name, estimator.ErrShape)
		}
		if rows, cols := l.Dims(); rows != r.n || cols != r.p {
			return fmt.Errorf("%s is %d×%d, not %d×%d: %w", name, rows, cols, r.n, r.p, estimator.ErrShape)
		}
		for i := range r.n {
			if !finite(l.RawRowView(i)) {
				return fmt.Errorf("%s: %w", name, estimator.ErrNotFinite)
			}
		}
		return nil
	}
	switch {
	case g.Form > estimator.Current:
		return fmt.Errorf("form %d: %w", g.Form, estimator.ErrMethod)
	case g.Form == estimator.Current && r.model.Period == 0:
		return fmt.Errorf("the current form in continuous time: %w", estimator.ErrMethod)
	case g.Form == estimator.Current:
		if err := check("Lf", g.Lf); err != nil {
			return err
		}
		r.est.takeCurrent(g.Lf)
		return nil
	}
	if err := check("L", g.L); err != nil {
		return err
	}
	if r.model.Period == 0 {
		return r.hold.take(r, g.L)
	}
	r.est.takePrediction(g.L)
	return nil
}
