package plants

import (
	"errors"
	"fmt"
	"math"

	"polewright/estimator"
)

// maxDesign bounds the states of a design model.
const maxDesign = 200

// Options of a design model. The zero value is the file as it stands.
type Options struct {
	// Period in s: nil is the file's, 0 drops it, else it replaces the file's.
	Period *float64
	// Factors multiply parameters: the real plant beside its model.
	Factors map[string]float64
	// WithoutUnknowns leaves out the states for unknowns.
	WithoutUnknowns bool
	// Sensors has one entry per sensor of the file, true for those in use; nil
	// means as enabled in the file.
	Sensors []bool
}

// Model builds the design model. Its states are the plant's own, then those of
// lags (inputs', then sensors'), of whole-sample delays and of unknowns. A
// continuous plant with a period is sampled exactly.
//
// A lag takes up its signal: xl' = (signal − xl)/lag. An unknown on an input acts
// where that input enters the plant, behind delay and lag; an unknown on a sensor
// is added to what its lag gives. In a discrete plant the signal of a lag counts
// as held over each sample. K acts on the plant's states and, for cancelled
// inputs, on their offsets.
//
// The error is an *Error where the plant or the options are to blame, else one of
// the estimator's.
func (p *Plant) Model(o Options) (*estimator.Model, error) {
	m, err := p.model(o)
	if bad, ok := errors.AsType[*Error](err); ok && bad.File == "" {
		bad.File = p.file
	}
	return m, err
}

func (p *Plant) model(o Options) (*estimator.Model, error) {
	period, bad := p.period(o.Period)
	if bad != nil {
		return nil, bad
	}
	values, bad := p.values(o.Factors)
	if bad != nil {
		return nil, bad
	}
	used, bad := p.sensorsInUse(o.Sensors)
	if bad != nil {
		return nil, bad
	}
	b := assembly{p: p, used: used, period: period, discrete: !p.Continuous, withoutUnknowns: o.WithoutUnknowns}
	if bad := b.fits(); bad != nil {
		return nil, bad
	}
	if bad := b.augment(values); bad != nil {
		return nil, bad
	}
	if p.Continuous && period > 0 {
		if err := b.sample(); err != nil {
			return nil, err
		}
	}
	b.delay()
	b.order()
	return b.model()
}

// period applies the wish for another sample period.
func (p *Plant) period(wish *float64) (float64, *Error) {
	if wish == nil {
		return p.Period, nil
	}
	t := *wish
	switch {
	case t != 0 && !(t >= minPeriod && t <= maxPeriod):
		return 0, &Error{Where: "period", Wrong: fmt.Sprintf("%g s", t), Expected: "expected 0 or " + periodExpected}
	case !p.Continuous && t != p.Period:
		return 0, &Error{Where: "period", Wrong: fmt.Sprintf("%g s for a discrete plant of %g s", t, p.Period), Expected: "expected no other period"}
	}
	return t, nil
}

func (p *Plant) values(factors map[string]float64) (map[string]float64, *Error) {
	values := make(map[string]float64, len(p.Parameters))
	for _, q := range p.Parameters {
		values[q.Name] = q.Value
	}
	for _, name := range sortedKeysOf(factors) {
		v, ok := values[name]
		if !ok {
			return nil, &Error{Where: "parameter factors", Wrong: "unknown parameter " + quoted(name), Expected: expectedNames(p.Parameters, func(q Parameter) string { return q.Name })}
		}
		if f := factors[name]; math.IsNaN(f) || math.IsInf(f, 0) {
			return nil, &Error{Where: where("parameter factors", name), Wrong: fmt.Sprint(f), Expected: "expected a finite number"}
		}
		values[name] = v * factors[name]
	}
	return values, nil
}

func (p *Plant) sensorsInUse(wish []bool) ([]int, *Error) {
	if wish != nil && len(wish) != len(p.Sensors) {
		return nil, &Error{Where: "sensors", Wrong: fmt.Sprintf("a choice of %d", len(wish)), Expected: fmt.Sprintf("expected %d entries", len(p.Sensors))}
	}
	var used []int
	for i, s := range p.Sensors {
		if wish == nil && s.Enabled || wish != nil && wish[i] {
			used = append(used, i)
		}
	}
	if used == nil {
		return nil, &Error{Where: "sensors", Wrong: "none is enabled", Expected: "expected at least one"}
	}
	return used, nil
}
