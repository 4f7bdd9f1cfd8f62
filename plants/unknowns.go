package plants

import "fmt"

func (r *reader) unknowns() *Error {
	if len(r.raw.Unknowns) > maxUnknowns {
		return tooMany("unknowns", len(r.raw.Unknowns), maxUnknowns)
	}
	for i, raw := range r.raw.Unknowns {
		at := fmt.Sprintf("unknowns %d", i+1)
		u, bad := r.unknown(at, raw)
		if bad != nil {
			return bad
		}
		for k, other := range r.plant.Unknowns {
			if other.Kind == u.Kind && other.On == u.On && other.Frequency == u.Frequency {
				return &Error{Where: at, Wrong: fmt.Sprintf("the same as unknowns %d", k+1), Expected: "expected each unknown once"}
			}
		}
		r.plant.Unknowns = append(r.plant.Unknowns, u)
	}
	return nil
}

func (r *reader) unknown(at string, raw rawUnknown) (Unknown, *Error) {
	u := Unknown{Kind: Kind(raw.Kind), On: raw.On, Scale: 1}
	var ok bool
	switch u.Kind {
	case InputOffset, InputRamp, InputSine:
		if u.Index, ok = r.plant.InputIndex(raw.On); !ok {
			return u, unknownName(where(at, "on"), "input", raw.On, r.plant.Inputs, func(s Input) string { return s.Name })
		}
	case SensorOffset:
		if u.Index, ok = r.plant.SensorIndex(raw.On); !ok {
			return u, unknownName(where(at, "on"), "sensor", raw.On, r.plant.Sensors, func(s Sensor) string { return s.Name })
		}
	default:
		return u, &Error{Where: where(at, "kind"), Wrong: quoted(raw.Kind), Expected: `expected "input-offset", "sensor-offset", "input-ramp" or "input-sine"`}
	}
	var bad *Error
	if u.Drift, bad = positive(where(at, "drift"), raw.Drift, "a density above 0"); bad != nil {
		return u, bad
	}
	if raw.Scale != nil {
		if bad := checkScale(where(at, "scale"), *raw.Scale); bad != nil {
			return u, bad
		}
		u.Scale = *raw.Scale
	}
	switch {
	case u.Kind == InputSine:
		if u.Frequency, bad = positive(where(at, "frequency_hz"), raw.Frequency, "a frequency above 0 in Hz"); bad != nil {
			return u, bad
		}
		return u, belowHalfRate(at, u.Frequency, r.plant.Period)
	case raw.Frequency != nil:
		return u, &Error{Where: where(at, "frequency_hz"), Wrong: "given for " + quoted(raw.Kind), Expected: `expected with "input-sine" only`}
	}
	return u, nil
}

func positive(at string, value *float64, what string) (float64, *Error) {
	if value == nil {
		return 0, &Error{Where: at, Wrong: "missing", Expected: "expected " + what}
	}
	if *value <= 0 {
		return 0, &Error{Where: at, Wrong: fmt.Sprintf("%g", *value), Expected: "expected " + what}
	}
	return *value, nil
}

// belowHalfRate refuses a sine that the samples cannot tell from a slower one.
// Without a period (0) any frequency will do.
func belowHalfRate(at string, hz, period float64) *Error {
	if period > 0 && hz >= 0.5/period {
		return &Error{Where: where(at, "frequency_hz"), Wrong: fmt.Sprintf("%g", hz), Expected: fmt.Sprintf("expected below half the sample rate, %g Hz", 0.5/period)}
	}
	return nil
}
