package plants

import (
	"fmt"
	"path/filepath"
	"slices"
	"strings"
)

// Bounds on the size of a plant.
const (
	maxStates     = 100
	maxSignals    = 30  // inputs, and sensors
	maxDelay      = 100 // samples, each
	maxParameters = 200
	maxOutputs    = 100
	maxUnknowns   = 30
)

// Bounds on a sample period in s.
const (
	minPeriod      = 1e-9
	maxPeriod      = 1e9
	periodExpected = "a period above 0 in s (1e-9 to 1e9)"
)

// Parse reads a plant file: JSON where the name ends in ".json", else TOML. The
// name appears in errors, which are of type *Error and report the first thing
// that is wrong.
func Parse(file string, data []byte) (*Plant, error) {
	var raw rawPlant
	if err := Decode(file, data, &raw); err != nil {
		return nil, err
	}
	r := reader{raw: &raw, plant: &Plant{file: file}}
	if bad := r.read(file); bad != nil {
		bad.File = file
		return nil, bad
	}
	return r.plant, nil
}

// reader checks a raw tree and fills a plant from it, one block after another.
type reader struct {
	raw   *rawPlant
	plant *Plant
	known map[string]bool // parameter names
	// Numbers of states, inputs and sensors.
	n, m, p int
}

func (r *reader) read(file string) *Error {
	raw := r.raw
	if raw.Format == nil {
		return &Error{Where: "format", Wrong: "missing", Expected: "expected format = 1"}
	}
	if *raw.Format != 1 {
		return &Error{Where: "format", Wrong: fmt.Sprint(*raw.Format), Expected: "expected 1, the only format this version reads"}
	}
	if raw.Name == "" {
		base := filepath.Base(file)
		raw.Name = strings.TrimSuffix(base, filepath.Ext(base))
	}
	for _, step := range []func() *Error{
		r.title, r.parameters, r.time, r.matrices, r.states, r.inputs, r.sensors,
		r.operatingPoint, r.outputs, r.processNoise, r.sensorNoise, r.unknowns, r.feedback, r.distinct, r.evaluable,
	} {
		if bad := step(); bad != nil {
			return bad
		}
	}
	return nil
}

func (r *reader) title() *Error {
	if bad := checkName("name", r.raw.Name); bad != nil {
		return bad
	}
	if bad := checkNote("note", r.raw.Note); bad != nil {
		return bad
	}
	r.plant.Name, r.plant.Note = r.raw.Name, r.raw.Note
	return nil
}

func (r *reader) parameters() *Error {
	r.known = map[string]bool{}
	if len(r.raw.Parameters) > maxParameters {
		return tooMany("parameters", len(r.raw.Parameters), maxParameters)
	}
	for _, name := range sortedKeysOf(r.raw.Parameters) {
		raw := r.raw.Parameters[name]
		at := where("parameters", name)
		switch {
		case !parameterName.MatchString(name) || len(name) > maxName:
			return &Error{Where: "parameters", Wrong: "the name " + quoted(name), Expected: "expected letters, digits and _, a letter first"}
		case reserved(name):
			return &Error{Where: at, Wrong: "a name that arithmetic uses itself", Expected: "expected another name"}
		case raw.Value == nil:
			return &Error{Where: at, Wrong: "no value", Expected: "expected { value = 1.0 }"}
		case raw.Tolerance < 0 || raw.Tolerance >= 1:
			return &Error{Where: where(at, "tolerance"), Wrong: fmt.Sprintf("%g", raw.Tolerance), Expected: "expected a relative tolerance from 0 to below 1"}
		}
		if bad := checkUnit(where(at, "unit"), raw.Unit); bad != nil {
			return bad
		}
		r.known[name] = true
		r.plant.Parameters = append(r.plant.Parameters, Parameter{name, raw.Unit, *raw.Value, raw.Tolerance})
	}
	return nil
}

func (r *reader) time() *Error {
	model := r.raw.Model
	if model == nil {
		return &Error{Where: "model", Wrong: "missing", Expected: "expected [model] with time, A and C"}
	}
	switch model.Time {
	case "continuous":
		r.plant.Continuous = true
	case "discrete":
		if model.Period == nil {
			return &Error{Where: "model, period_s", Wrong: "missing", Expected: "expected the sample period of a discrete plant in s"}
		}
	case "":
		return &Error{Where: "model, time", Wrong: "missing", Expected: `expected "continuous" or "discrete"`}
	default:
		return &Error{Where: "model, time", Wrong: quoted(model.Time), Expected: `expected "continuous" or "discrete"`}
	}
	if model.Period != nil {
		if t := *model.Period; t < minPeriod || t > maxPeriod {
			return &Error{Where: "model, period_s", Wrong: fmt.Sprintf("%g", t), Expected: "expected " + periodExpected}
		}
		r.plant.Period = *model.Period
	}
	return nil
}

func (r *reader) outputs() *Error {
	if len(r.raw.Outputs) > maxOutputs {
		return tooMany("outputs", len(r.raw.Outputs), maxOutputs)
	}
	for i, raw := range r.raw.Outputs {
		at := fmt.Sprintf("outputs %d", i+1)
		if bad := checkName(where(at, "name"), raw.Name); bad != nil {
			return bad
		}
		if bad := checkUnit(where(at, "unit"), raw.Unit); bad != nil {
			return bad
		}
		if len(raw.Row) != r.n {
			return &Error{Where: where(at, "row"), Wrong: count(len(raw.Row), "entry"), Expected: fmt.Sprintf("expected %d (one per state)", r.n)}
		}
		if bad := r.matrix(where(at, "row"), [][]entry{raw.Row}, 1, r.n, "one row"); bad != nil {
			return bad
		}
		row, bad := r.nominal(where(at, "row"), [][]entry{raw.Row}, 1, r.n)
		if bad != nil {
			return bad
		}
		r.plant.Outputs = append(r.plant.Outputs, Output{raw.Name, raw.Unit, row.RawRowView(0)})
	}
	return nil
}

func (r *reader) feedback() *Error {
	raw := r.raw.Feedback
	if raw == nil {
		return nil
	}
	if r.m == 0 {
		return &Error{Where: "feedback", Wrong: "a plant without inputs", Expected: "expected B in [model]"}
	}
	if raw.K == nil {
		return &Error{Where: "feedback, K", Wrong: "missing", Expected: fmt.Sprintf("expected %d×%d (%s, %s)", r.m, r.n, count(r.m, "input"), count(r.n, "state"))}
	}
	if bad := r.matrix("feedback, K", raw.K, r.m, r.n, count(r.m, "input")+", "+count(r.n, "state")); bad != nil {
		return bad
	}
	k, bad := r.nominal("feedback, K", raw.K, r.m, r.n)
	if bad != nil {
		return bad
	}
	for i, name := range raw.Cancel {
		at := fmt.Sprintf("feedback, cancel, entry %d", i+1)
		if _, ok := r.plant.InputIndex(name); !ok {
			return unknownName(at, "input", name, r.plant.Inputs, func(u Input) string { return u.Name })
		}
		if !slices.ContainsFunc(r.plant.Unknowns, func(u Unknown) bool { return u.Kind == InputOffset && u.On == name }) {
			return &Error{Where: at, Wrong: "no offset is estimated on " + quoted(name), Expected: `expected [[unknowns]] of kind "input-offset" on it`}
		}
	}
	r.plant.K, r.plant.Cancel = k, slices.Clone(raw.Cancel)
	return nil
}
