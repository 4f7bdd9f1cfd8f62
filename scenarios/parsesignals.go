package scenarios

import (
	"fmt"
	"maps"
	"math"
	"slices"

	"polewright/plants"
)

func (r *reader) drives() *plants.Error {
	for _, block := range []struct {
		key  string
		raw  []rawDrive
		into *[]Drive
	}{{"drive", r.raw.Drive, &r.s.Drives}, {"surprise", r.raw.Surprise, &r.s.Surprises}} {
		if len(block.raw) > maxBlocks {
			return wrong(block.key, fmt.Sprintf("%d of them", len(block.raw)), fmt.Sprintf("expected at most %d", maxBlocks))
		}
		for i, raw := range block.raw {
			d, bad := r.drive(fmt.Sprintf("%s %d", block.key, i+1), raw)
			if bad != nil {
				return bad
			}
			*block.into = append(*block.into, d)
		}
	}
	return nil
}

func (r *reader) drive(at string, raw rawDrive) (Drive, *plants.Error) {
	d := Drive{Input: raw.Input, Shape: Shape(raw.Shape), Until: math.Inf(1)}
	var ok bool
	if d.Index, ok = r.plant.InputIndex(raw.Input); !ok {
		return d, unknown(at+", input", "input", raw.Input, namesOf(r.plant.Inputs, func(s plants.Input) string { return s.Name }))
	}
	if raw.Shape == "file" {
		return d, wrong(at+", shape", `"file"`, "expected one of the other shapes: a session cannot hold a recorded drive yet")
	}
	shapes := []Shape{Step, Ramp, Pulse, Sine, Chirp, RandomBinary}
	if !slices.Contains(shapes, d.Shape) {
		what := quoted(raw.Shape)
		if raw.Shape == "" {
			what = "missing"
		}
		return d, wrong(at+", shape", what, `expected "step", "ramp", "pulse", "sine", "chirp" or "random-binary"`)
	}
	if raw.File != nil || raw.Column != nil {
		return d, wrong(at, "a file for "+quoted(raw.Shape), "expected a file with the shape \"file\" only")
	}
	if raw.Size == nil {
		return d, wrong(at+", size", "missing", "expected a number")
	}
	d.Size = *raw.Size
	var bad *plants.Error
	if d.At, d.Until, bad = r.span(at, "at_s", raw.At, raw.Until); bad != nil {
		return d, bad
	}
	switch {
	case d.Shape == Pulse && raw.Until == nil:
		return d, wrong(at+", until_s", "missing", "a pulse needs its end in s")
	case d.Shape == Step && raw.Until != nil:
		return d, wrong(at+", until_s", "given for a step", `expected the shape "pulse" for what ends`)
	}
	return d, r.frequencies(at, raw, &d)
}

// frequencies checks which of the two a shape takes.
func (r *reader) frequencies(at string, raw rawDrive, d *Drive) *plants.Error {
	needs := d.Shape == Sine || d.Shape == Chirp
	for _, f := range []struct {
		key     string
		have    *float64
		needed  bool
		allowed bool
		into    *float64
	}{
		{"frequency_hz", raw.Frequency, needs, needs || d.Shape == RandomBinary, &d.Frequency},
		{"to_hz", raw.To, d.Shape == Chirp, d.Shape == Chirp, &d.ToFrequency},
	} {
		place := at + ", " + f.key
		switch {
		case f.have == nil && f.needed:
			return wrong(place, "missing", fmt.Sprintf("a %s needs it, in Hz", d.Shape))
		case f.have == nil:
			continue
		case !f.allowed:
			return wrong(place, fmt.Sprintf("given for a %s", d.Shape), "expected with another shape only")
		case *f.have <= 0:
			return wrong(place, num(*f.have), "expected Hz above 0")
		}
		if t := r.plant.Period; t > 0 && *f.have > 0.5/t {
			return wrong(place, num(*f.have), fmt.Sprintf("expected at most half the sample rate, %s Hz", num(0.5/t)))
		}
		*f.into = *f.have
	}
	return nil
}

// span checks a beginning (0 where missing) and an end (+Inf where missing).
func (r *reader) span(at, key string, from, until *float64) (a, b float64, bad *plants.Error) {
	b = math.Inf(1)
	if from != nil {
		a = *from
	}
	if a < 0 || a > r.s.Duration {
		return a, b, wrong(at+", "+key, num(a), fmt.Sprintf("expected 0 to duration_s, %s", num(r.s.Duration)))
	}
	if until != nil {
		if b = *until; b <= a {
			return a, b, wrong(at+", until_s", num(b), fmt.Sprintf("expected a time after %s, %s", key, num(a)))
		}
	}
	return a, b, nil
}

func (r *reader) faults() *plants.Error {
	if n := len(r.raw.Fault); n > maxBlocks {
		return wrong("fault", fmt.Sprintf("%d of them", n), fmt.Sprintf("expected at most %d", maxBlocks))
	}
	for i, raw := range r.raw.Fault {
		at := fmt.Sprintf("fault %d", i+1)
		f := Fault{Sensor: raw.Sensor, Kind: FaultKind(raw.Kind)}
		var ok bool
		if f.Index, ok = r.plant.SensorIndex(raw.Sensor); !ok {
			return unknown(at+", sensor", "sensor", raw.Sensor, namesOf(r.plant.Sensors, func(s plants.Sensor) string { return s.Name }))
		}
		sized := f.Kind == Offset || f.Kind == Spike
		if !sized && f.Kind != Dropout && f.Kind != Freeze {
			what := quoted(raw.Kind)
			if raw.Kind == "" {
				what = "missing"
			}
			return wrong(at+", kind", what, `expected "dropout", "freeze", "offset" or "spike"`)
		}
		if sized && raw.Size == nil {
			return wrong(at+", size", "missing", fmt.Sprintf("expected a number for %s", f.Kind))
		}
		if raw.Size != nil {
			if !sized && *raw.Size != 0 {
				return wrong(at+", size", num(*raw.Size), fmt.Sprintf("a %s has no size", f.Kind))
			}
			f.Size = *raw.Size
		}
		var bad *plants.Error
		if f.From, f.Until, bad = r.span(at, "from_s", raw.From, raw.Until); bad != nil {
			return bad
		}
		r.s.Faults = append(r.s.Faults, f)
	}
	return nil
}

func (r *reader) limits() *plants.Error {
	raw, l := r.raw.Limits, &r.s.Limits
	for _, v := range []struct {
		key  string
		have *float64
		into **float64
	}{
		{"settle_s", raw.Settle, &l.Settle}, {"peak_max", raw.Peak, &l.Peak},
		{"over_floor_max", raw.OverFloor, &l.OverFloor}, {"gain_max", raw.Gain, &l.Gain},
		{"sensitivity_max", raw.Sensitivity, &l.Sensitivity},
		{"phase_margin_deg", raw.Phase, &l.PhaseMargin}, {"delay_margin_s", raw.Delay, &l.DelayMargin},
	} {
		if v.have == nil {
			continue
		}
		if *v.have <= 0 {
			return wrong("limits, "+v.key, num(*v.have), "expected a limit above 0")
		}
		*v.into = v.have
	}
	if r.plant.K == nil {
		for _, v := range []struct {
			key   string
			given bool
		}{
			{"sensitivity_max", l.Sensitivity != nil}, {"phase_margin_deg", l.PhaseMargin != nil},
			{"delay_margin_s", l.DelayMargin != nil}, {"input_std", len(raw.InputStd) > 0},
		} {
			if v.given {
				return wrong("limits, "+v.key, "a limit on the loop of a plant without a controller", "expected [feedback] in the plant")
			}
		}
	}
	return r.namedLimits()
}

func (r *reader) namedLimits() *plants.Error {
	raw, l, p := r.raw.Limits, &r.s.Limits, r.plant
	judged := append(namesOf(p.States, func(s plants.State) string { return s.Name }), namesOf(p.Outputs, func(s plants.Output) string { return s.Name })...)
	estimated := slices.Clone(judged)
	if m, err := p.Model(plants.Options{}); err == nil && len(m.StateNames) > len(p.States) {
		estimated = append(estimated, m.StateNames[len(p.States):]...)
	}
	for _, table := range []struct {
		key, kind string
		have      map[string]float64
		known     []string
		into      *[]NamedLimit
	}{
		{"std", "state or output", raw.Std, estimated, &l.Std},
		{"error", "state or output", raw.Error, judged, &l.Error},
		{"input_std", "input", raw.InputStd, namesOf(p.Inputs, func(s plants.Input) string { return s.Name }), &l.InputStd},
	} {
		at := positions(table.known)
		for _, name := range sortedKeys(table.have) {
			place := fmt.Sprintf("limits, %s", table.key)
			if _, ok := at[name]; !ok {
				return unknown(place, table.kind, name, table.known)
			}
			if v := table.have[name]; v <= 0 {
				return wrong(place+", "+name, num(v), "expected a limit above 0")
			}
			*table.into = append(*table.into, NamedLimit{name, table.have[name]})
		}
		slices.SortFunc(*table.into, func(a, b NamedLimit) int { return at[a.Name] - at[b.Name] })
	}
	return nil
}

func sortedKeys[V any](m map[string]V) []string { return slices.Sorted(maps.Keys(m)) }
