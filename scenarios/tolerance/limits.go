package tolerance

import (
	"math"

	"polewright/scenarios"
)

// Judge holds the worst figures against those limits of a scenario that they are
// about: sensitivity, phase and delay margin, and the noise of states. A limit on
// the noise of an output, on the start-up or on a run is not among them. Where a
// case is unstable the values are NaN and no limit is met.
func (e *Envelope) Judge(l *scenarios.Limits) []scenarios.LimitResult {
	if l == nil {
		return nil
	}
	var list []scenarios.LimitResult
	add := func(name string, limit float64, atLeast bool, is func(m *Measure) bool) {
		for i := range e.Measures {
			m := &e.Measures[i]
			if !is(m) {
				continue
			}
			value := m.Worst
			if e.Unstable > 0 {
				value = math.NaN()
			}
			list = append(list, scenarios.LimitResult{Name: name, Value: value, Limit: limit, AtLeast: atLeast,
				Met: scenarios.Within(value, limit, atLeast), Unit: m.Unit})
			return
		}
	}
	for _, v := range []struct {
		limit   *float64
		name    string
		figure  Figure
		atLeast bool
	}{
		{l.Sensitivity, "sensitivity_max", Sensitivity, false},
		{l.PhaseMargin, "phase_margin_deg", PhaseMargin, true},
		{l.DelayMargin, "delay_margin_s", DelayMargin, true},
	} {
		if v.limit != nil {
			add(v.name, *v.limit, v.atLeast, func(m *Measure) bool { return m.Figure == v.figure })
		}
	}
	for _, v := range l.Std {
		add("std "+v.Name, v.Limit, false, func(m *Measure) bool { return m.Figure == Noise && m.about == v.Name })
	}
	return list
}
