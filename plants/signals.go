package plants

import "fmt"

func (r *reader) states() *Error {
	blocks, bad := blockCount("states", len(r.raw.States), r.n, "state")
	if bad != nil {
		return bad
	}
	for i := range r.n {
		s := State{Name: fmt.Sprintf("x%d", i+1), Scale: 1}
		if blocks {
			raw := r.raw.States[i]
			if bad := signal(fmt.Sprintf("states %d", i+1), raw.Name, raw.Unit, raw.Scale, &s.Name, &s.Unit, &s.Scale); bad != nil {
				return bad
			}
		}
		r.plant.States = append(r.plant.States, s)
	}
	return nil
}

func (r *reader) inputs() *Error {
	blocks, bad := blockCount("inputs", len(r.raw.Inputs), r.m, "input")
	if bad != nil {
		return bad
	}
	for i := range r.m {
		s := Input{Name: fmt.Sprintf("u%d", i+1), Scale: 1}
		if blocks {
			raw := r.raw.Inputs[i]
			at := fmt.Sprintf("inputs %d", i+1)
			if bad := signal(at, raw.Name, raw.Unit, raw.Scale, &s.Name, &s.Unit, &s.Scale); bad != nil {
				return bad
			}
			s.DelaySamples, s.Lag, s.Resolution = raw.Delay, raw.Lag, raw.Resolution
			if bad := r.chain(at, raw.Delay, raw.Lag, raw.Resolution); bad != nil {
				return bad
			}
			if s.Range, bad = limits(at, raw.Range); bad != nil {
				return bad
			}
		}
		r.plant.Inputs = append(r.plant.Inputs, s)
	}
	return nil
}

func (r *reader) sensors() *Error {
	blocks, bad := blockCount("sensors", len(r.raw.Sensors), r.p, "sensor")
	if bad != nil {
		return bad
	}
	enabled := 0
	for i := range r.p {
		s := Sensor{Name: fmt.Sprintf("y%d", i+1), Scale: 1, Enabled: true}
		if blocks {
			if bad := r.sensor(fmt.Sprintf("sensors %d", i+1), r.raw.Sensors[i], &s); bad != nil {
				return bad
			}
		}
		if s.Enabled {
			enabled++
		}
		r.plant.Sensors = append(r.plant.Sensors, s)
	}
	if enabled == 0 {
		return &Error{Where: "sensors", Wrong: "none is enabled", Expected: "expected at least one"}
	}
	return nil
}

func (r *reader) sensor(at string, raw rawSensor, s *Sensor) *Error {
	if bad := signal(at, raw.Name, raw.Unit, raw.Scale, &s.Name, &s.Unit, &s.Scale); bad != nil {
		return bad
	}
	if bad := r.chain(at, raw.Delay, raw.Lag, raw.Resolution); bad != nil {
		return bad
	}
	var bad *Error
	if s.Range, bad = limits(at, raw.Range); bad != nil {
		return bad
	}
	if raw.Wrap < 0 {
		return &Error{Where: where(at, "wrap"), Wrong: fmt.Sprintf("%g", raw.Wrap), Expected: "expected 0 (none) or above"}
	}
	switch {
	case raw.NoiseStd != nil && raw.NoiseDensity != nil:
		return &Error{Where: at, Wrong: "both noise_std and noise_density", Expected: "expected one of them"}
	case raw.NoiseStd != nil && r.plant.Period == 0:
		return &Error{Where: where(at, "noise_std"), Wrong: "the noise of one sample without period_s", Expected: "expected noise_density, or period_s in [model]"}
	}
	for _, noise := range []struct {
		key   string
		value *float64
	}{{"noise_std", raw.NoiseStd}, {"noise_density", raw.NoiseDensity}} {
		if noise.value != nil && *noise.value < 0 {
			return &Error{Where: where(at, noise.key), Wrong: fmt.Sprintf("negative noise %g", *noise.value), Expected: "expected 0 or above"}
		}
	}
	s.NoiseStd, s.NoiseDensity = raw.NoiseStd, raw.NoiseDensity
	s.Resolution, s.NoiseIncludesResolution = raw.Resolution, raw.Includes
	s.Wrap, s.DelaySamples, s.Lag = raw.Wrap, raw.Delay, raw.Lag
	if raw.Enabled != nil {
		s.Enabled = *raw.Enabled
	}
	return nil
}

// chain checks what inputs and sensors have in common on the way of a signal.
func (r *reader) chain(at string, delay int, lag, resolution float64) *Error {
	switch {
	case delay < 0 || delay > maxDelay:
		return &Error{Where: where(at, "delay_samples"), Wrong: fmt.Sprint(delay), Expected: fmt.Sprintf("expected 0 to %d whole samples", maxDelay)}
	case delay > 0 && r.plant.Period == 0:
		return &Error{Where: where(at, "delay_samples"), Wrong: "a delay in samples without period_s", Expected: "expected 0, or period_s in [model]"}
	case lag < 0:
		return &Error{Where: where(at, "lag_s"), Wrong: fmt.Sprintf("%g", lag), Expected: "expected 0 (none) or above"}
	case resolution < 0:
		return &Error{Where: where(at, "resolution"), Wrong: fmt.Sprintf("%g", resolution), Expected: "expected 0 (none) or above"}
	}
	return nil
}

// signal checks name, unit and scale of a block and takes over what is given.
func signal(at string, name *string, unit string, scale *float64, intoName, intoUnit *string, intoScale *float64) *Error {
	if name != nil {
		if bad := checkName(where(at, "name"), *name); bad != nil {
			return bad
		}
		*intoName = *name
	}
	if bad := checkUnit(where(at, "unit"), unit); bad != nil {
		return bad
	}
	*intoUnit = unit
	if scale != nil {
		if bad := checkScale(where(at, "scale"), *scale); bad != nil {
			return bad
		}
		*intoScale = *scale
	}
	return nil
}

func checkScale(at string, scale float64) *Error {
	if scale <= 0 {
		return &Error{Where: at, Wrong: fmt.Sprintf("%g", scale), Expected: "expected a typical size above 0"}
	}
	return nil
}

func limits(at string, raw []float64) (*Range, *Error) {
	if raw == nil {
		return nil, nil
	}
	if len(raw) != 2 {
		return nil, &Error{Where: where(at, "range"), Wrong: count(len(raw), "entry"), Expected: "expected [low, high]"}
	}
	if raw[0] >= raw[1] {
		return nil, &Error{Where: where(at, "range"), Wrong: fmt.Sprint(raw), Expected: "expected [low, high] with low below high"}
	}
	return &Range{raw[0], raw[1]}, nil
}

func (r *reader) operatingPoint() *Error {
	raw, p := r.raw.Operating, r.plant
	for _, list := range []struct {
		key  string
		have []float64
		want int
		set  func(i int, v float64)
	}{
		{"states", raw.States, r.n, func(i int, v float64) { p.States[i].Operating = v }},
		{"inputs", raw.Inputs, r.m, func(i int, v float64) { p.Inputs[i].Operating = v }},
		{"sensors", raw.Sensors, r.p, func(i int, v float64) { p.Sensors[i].Operating = v }},
	} {
		if list.have == nil {
			continue
		}
		if len(list.have) != list.want {
			return &Error{Where: where("operating_point", list.key), Wrong: count(len(list.have), "entry"), Expected: fmt.Sprintf("expected %d", list.want)}
		}
		for i, v := range list.have {
			list.set(i, v)
		}
	}
	return nil
}
