package tolerance

import (
	"fmt"
	"math"
	"math/cmplx"
	"strings"

	"polewright/estimator"
	"polewright/plants"
)

const (
	// listed is how many unstable or failed cases are listed.
	listed = 10
	// rounding is the bias, over the state's scale, that is rounding alone.
	rounding = 1e-12
)

// Envelope is what a study found.
type Envelope struct {
	// Parameters have a tolerance that moves something.
	Parameters []plants.Parameter
	Cases      int
	// Exhaustive tells that every corner was a case; else Notes says what was.
	Exhaustive bool
	Discrete   bool
	// Measures have the stability first, then noise, bias and margins.
	Measures []Measure
	// Unstable counts the cases in which plant and estimator together are not
	// stable: there is no steady state and there are no margins there, and only the
	// stability measure counts them. UnstableCases are the first few, the worst first.
	Unstable        int
	NominalUnstable bool
	UnstableCases   []Case
	// Failed counts the cases that could not be judged; Failures say why for the
	// first few.
	Failed   int
	Failures []Failure
	Notes    []string
}

// Failure is a case that could not be judged.
type Failure struct {
	Case Case
	Err  error
}

// Figure says what a measure measures.
type Figure uint8

const (
	// Stability is the largest real part (1/s) or, in discrete time, the largest
	// size of an eigenvalue of plant and estimator together; below 0, or 1, is stable.
	Stability Figure = iota
	// Noise is the steady-state standard deviation of a state's error, in its unit.
	Noise
	// Bias is the size of a state's steady-state error for a constant input of the
	// input's scale, in the state's unit.
	Bias
	// PhaseMargin is in degrees.
	PhaseMargin
	// GainAbove and GainBelow are gain margins in dB, above and below 0.
	GainAbove
	GainBelow
	// DelayMargin is in s.
	DelayMargin
	// Sensitivity is the peak of the sensitivity.
	Sensitivity
)

// Measure is one figure over the cases.
type Measure struct {
	Figure      Figure
	State       int // of Noise and Bias, else −1
	Input       int // of Bias, else −1
	Name        string
	Unit        string
	LargerWorse bool
	// Nominal and Worst are NaN where the figure is not defined: nominally, or in
	// any case. An unlimited margin is +Inf, or −Inf below.
	Nominal, Worst float64
	// Case gave Worst.
	Case Case

	about string // the state of Noise
	of    func(*estimator.Mismatch) float64
}

// Stress returns the case to try the design on: that of the stability measure
// where a case is unstable, else that of the worst margin in phase with a
// controller, else that of the noise or bias that grows most against nominal.
// It is false where no case differs from the nominal plant.
func (e *Envelope) Stress() (Case, bool) {
	if len(e.Measures) == 0 {
		return Case{}, false
	}
	if e.Unstable > 0 {
		return e.Measures[0].Case, len(e.Measures[0].Case.Truth()) > 0
	}
	best, growth := Case{}, 0.0
	for _, m := range e.Measures {
		switch {
		case m.Figure == PhaseMargin && !math.IsNaN(m.Worst) && !math.IsInf(m.Worst, 0):
			return m.Case, len(m.Case.Truth()) > 0
		case m.Figure == Noise && m.Nominal > 0 && m.Worst/m.Nominal > growth:
			best, growth = m.Case, m.Worst/m.Nominal
		}
	}
	return best, len(best.Truth()) > 0
}

// note says how the cases were chosen.
func (e *Envelope) note(list []plants.Parameter, samples int) {
	k := len(list)
	switch {
	case k == 0:
		e.Notes = append(e.Notes, "no parameter has a tolerance: only the nominal plant was judged")
	case e.Exhaustive:
		e.Notes = append(e.Notes, fmt.Sprintf("all %d corners of %d parameters, and %d points inside", 1<<k, k, samples))
	default:
		e.Notes = append(e.Notes, fmt.Sprintf("%d parameters have too many corners to try all: each alone at both ends, %d corners drawn at random, and %d points inside", k, randomCorners, samples))
	}
}

// measures lists the figures of a study without their values.
func (s Study) measures(m *estimator.Model) []Measure {
	figure := Measure{State: -1, Input: -1, LargerWorse: true}
	var list []Measure
	add := func(change func(q *Measure)) {
		q := figure
		change(&q)
		list = append(list, q)
	}
	add(func(q *Measure) {
		q.Figure, q.Name, q.Unit = Stability, "largest real part", "1/s"
		if m.Discrete() {
			q.Name, q.Unit = "largest pole radius", ""
		}
		q.of = func(r *estimator.Mismatch) float64 { return edge(r.Poles, m.Discrete()) }
	})
	names := s.states(m)
	for i, state := range names {
		if state.carried {
			continue
		}
		add(func(q *Measure) {
			q.Figure, q.State, q.Name, q.Unit = Noise, i, "noise of "+state.name, state.unit
			q.about = state.name
			q.of = func(r *estimator.Mismatch) float64 {
				if r.Std == nil {
					return math.NaN()
				}
				return r.Std[i]
			}
		})
	}
	for j, u := range s.Plant.Inputs {
		for i, state := range names {
			if state.carried {
				continue
			}
			add(func(q *Measure) {
				q.Figure, q.State, q.Input, q.Unit = Bias, i, j, state.unit
				q.Name = fmt.Sprintf("bias of %s for %s on %s", state.name, strings.TrimSpace(fmt.Sprintf("%.4g %s", u.Scale, u.Unit)), u.Name)
				q.of = func(r *estimator.Mismatch) float64 {
					if r.Bias == nil {
						return math.NaN()
					}
					v := math.Abs(r.Bias.At(i, j)) * u.Scale
					if v <= rounding*state.scale {
						return 0
					}
					return v
				}
			})
		}
	}
	if m.K == nil || m.B == nil {
		return list
	}
	for _, l := range margins {
		add(func(q *Measure) {
			q.Figure, q.Name, q.Unit, q.LargerWorse = l.figure, l.name, l.unit, l.larger
			q.of = func(r *estimator.Mismatch) float64 {
				if r.Loop == nil {
					return math.NaN()
				}
				return l.of(r.Loop)
			}
		})
	}
	return list
}

var margins = []struct {
	figure     Figure
	name, unit string
	larger     bool
	of         func(*estimator.Loop) float64
}{
	{PhaseMargin, "phase margin", "deg", false, func(l *estimator.Loop) float64 { return l.PhaseMargin }},
	{GainAbove, "gain margin above", "dB", false, func(l *estimator.Loop) float64 { return l.GainMarginAbove }},
	{GainBelow, "gain margin below", "dB", true, func(l *estimator.Loop) float64 { return l.GainMarginBelow }},
	{DelayMargin, "delay margin", "s", false, func(l *estimator.Loop) float64 { return l.DelayMargin }},
	{Sensitivity, "sensitivity peak", "", true, func(l *estimator.Loop) float64 { return l.SensitivityPeak }},
}

// state is a state of the design model that is no unknown.
type state struct {
	name, unit string
	scale      float64
	carried    bool // by a lag or a delay: it repeats another signal
}

func (s Study) states(m *estimator.Model) []state {
	var out []state
	for i, name := range m.StateNames {
		role := m.Roles[i]
		if role == estimator.UnknownState {
			continue
		}
		q := state{name: name, scale: 1, carried: role != estimator.PlantState}
		if m.StateScale != nil {
			q.scale = m.StateScale[i]
		}
		if i < len(s.Plant.States) {
			q.unit = s.Plant.States[i].Unit
		}
		out = append(out, q)
	}
	return out
}

// edge is how far out the outermost eigenvalue lies.
func edge(poles []complex128, discrete bool) float64 {
	worst := math.Inf(-1)
	for _, v := range poles {
		at := real(v)
		if discrete {
			at = cmplx.Abs(v)
		}
		worst = max(worst, at)
	}
	return worst
}

// collect fills the envelope from the outcomes in the order of the cases, so that
// the first of equally bad cases is named.
func (e *Envelope) collect(all []Case, results []outcome, list []Measure) {
	var unstable ranking
	for k, r := range results {
		if r.err != nil {
			if e.Failed++; len(e.Failures) < listed {
				e.Failures = append(e.Failures, Failure{all[k], r.err})
			}
			continue
		}
		if !r.mismatch.Stable {
			e.Unstable++
			e.NominalUnstable = e.NominalUnstable || k == 0
			unstable.add(edge(r.mismatch.Poles, e.Discrete), all[k])
		}
	}
	e.UnstableCases = unstable.cases
	for _, m := range list {
		m.Nominal, m.Worst = m.of(results[0].mismatch), math.NaN()
		for k, r := range results {
			if r.err != nil {
				continue
			}
			if v := m.of(r.mismatch); m.worse(v) {
				m.Worst, m.Case = v, all[k]
			}
		}
		e.Measures = append(e.Measures, m)
	}
}

// worse tells whether v is worse than the worst so far.
func (m *Measure) worse(v float64) bool {
	switch {
	case math.IsNaN(v):
		return false
	case math.IsNaN(m.Worst):
		return true
	case m.LargerWorse:
		return v > m.Worst
	}
	return v < m.Worst
}

// ranking keeps the cases with the largest values, the largest first.
type ranking struct {
	values []float64
	cases  []Case
}

func (r *ranking) add(v float64, c Case) {
	at := len(r.values)
	for at > 0 && v > r.values[at-1] {
		at--
	}
	if at >= listed {
		return
	}
	r.values = append(r.values[:at], append([]float64{v}, r.values[at:]...)...)
	r.cases = append(r.cases[:at], append([]Case{c}, r.cases[at:]...)...)
	if len(r.values) > listed {
		r.values, r.cases = r.values[:listed], r.cases[:listed]
	}
}
