package scenarios

import (
	"math"
	"slices"

	"polewright/estimator"
	"polewright/plants"
)

// LimitResult is one limit and how a design meets it.
type LimitResult struct {
	// Name is the key in the file, followed by the state, output or input it is
	// about: "settle_s", "std gate speed".
	Name string
	// Value is NaN where it is not defined; such a limit is not met. A margin
	// without end is +Inf.
	Value, Limit float64
	// AtLeast tells that Value must not be below Limit, else not above.
	AtLeast bool
	Met     bool
	Unit    string
}

// Judge holds a design against every limit, in the order of the contract: the
// single ones, std, error, input_std. The limits on the largest error belong to
// a run; without one (nil) they are left out.
func (s *Scenario) Judge(d *estimator.Design, m *estimator.Model, p *plants.Plant, run *Run) []LimitResult {
	if d == nil || m == nil || p == nil {
		return nil
	}
	var list []LimitResult
	add := func(name, unit string, value, limit float64, atLeast bool) {
		met := Within(value, limit, atLeast)
		list = append(list, LimitResult{name, value, limit, atLeast, met, unit})
	}
	sensitivity, phase, delay := math.NaN(), math.NaN(), math.NaN()
	if d.Loop != nil && d.Loop.Stable {
		sensitivity, phase, delay = d.Loop.SensitivityPeak, d.Loop.PhaseMargin, d.Loop.DelayMargin
	}
	l := &s.Limits
	for _, v := range []struct {
		limit      *float64
		name, unit string
		value      float64
		atLeast    bool
	}{
		{l.Settle, "settle_s", "s", d.Transient.Settle, false},
		{l.Peak, "peak_max", "", d.Transient.Peak, false},
		{l.OverFloor, "over_floor_max", "", d.Noise.OverFloorRMS, false},
		{l.Gain, "gain_max", "", d.GainNorm, false},
		{l.Sensitivity, "sensitivity_max", "", sensitivity, false},
		{l.PhaseMargin, "phase_margin_deg", "deg", phase, true},
		{l.DelayMargin, "delay_margin_s", "s", delay, true},
	} {
		if v.limit != nil {
			add(v.name, v.unit, v.value, *v.limit, v.atLeast)
		}
	}
	for _, v := range l.Std {
		add("std "+v.Name, unitOf(p, v.Name), stdOf(d, m, v.Name), v.Limit, false)
	}
	if run != nil {
		for _, v := range l.Error {
			add("error "+v.Name, unitOf(p, v.Name), run.largestError(p, v.Name, d.Transient.Settle), v.Limit, false)
		}
	}
	for _, v := range l.InputStd {
		value, unit := math.NaN(), ""
		if i := slices.Index(m.InputNames, v.Name); i >= 0 && d.Loop != nil && d.Loop.Stable && i < len(d.Loop.InputStd) {
			value = d.Loop.InputStd[i]
		}
		if i, ok := p.InputIndex(v.Name); ok {
			unit = p.Inputs[i].Unit
		}
		add("input_std "+v.Name, unit, value, v.Limit, false)
	}
	return list
}

// Within reports whether a value keeps a limit. What differs by rounding alone is
// equal: 35 samples of 0.01 s are not more than 0.35 s. An undefined value keeps
// none.
func Within(value, limit float64, atLeast bool) bool {
	slack := 1e-12 * math.Abs(limit)
	if atLeast {
		return value >= limit-slack
	}
	return value <= limit+slack
}

func stdOf(d *estimator.Design, m *estimator.Model, name string) float64 {
	if i := slices.Index(m.StateNames, name); i >= 0 && i < len(d.Noise.Std) {
		return d.Noise.Std[i]
	}
	if i := slices.Index(m.OutputNames, name); i >= 0 && i < len(d.Noise.Outputs) {
		return d.Noise.Outputs[i].Std
	}
	return math.NaN()
}

func unitOf(p *plants.Plant, name string) string {
	if i, ok := p.StateIndex(name); ok {
		return p.States[i].Unit
	}
	if i, ok := p.OutputIndex(name); ok {
		return p.Outputs[i].Unit
	}
	return ""
}

// largestError is the largest |true − estimate| of a state or output from settle
// (s) on: NaN where the design does not settle within the run, where the run
// diverged, or where the real plant has no such state.
func (run *Run) largestError(p *plants.Plant, name string, settle float64) float64 {
	if run.Diverged || math.IsNaN(settle) {
		return math.NaN()
	}
	row := make([]float64, len(p.States))
	if i, ok := p.StateIndex(name); ok {
		row[i] = 1
	} else if i, ok := p.OutputIndex(name); ok {
		copy(row, p.Outputs[i].Row)
	}
	if len(run.True) != len(row) || len(run.Estimate) < len(row) {
		return math.NaN()
	}
	largest, seen := 0.0, false
	for k, t := range run.T {
		if t < settle {
			continue
		}
		var e float64
		for i, c := range row {
			if c != 0 {
				e += c * (run.True[i][k] - run.Estimate[i][k])
			}
		}
		if math.IsNaN(e) {
			return math.NaN()
		}
		largest, seen = math.Max(largest, math.Abs(e)), true
	}
	if !seen {
		return math.NaN()
	}
	return largest
}
