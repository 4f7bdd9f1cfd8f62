package scenarios

import (
	"fmt"
	"math"
	"path/filepath"
	"slices"
	"strconv"
	"strings"
	"unicode"
	"unicode/utf8"

	"polewright/plants"
)

// Bounds on a scenario.
const (
	maxSteps  = 2_000_000 // of one run
	maxBlocks = 100       // drives, surprises, faults, each
	maxName   = 60        // characters
	maxStates = 200       // entries of an initial state
)

// Parse reads a scenario file (JSON where the name ends in ".json", else TOML)
// for a plant. The name appears in errors, which are of type *plants.Error and
// report the first thing that is wrong.
//
// With a fuller plant in [truth], the length of initial.true is checked by
// NewRunner, which has that plant.
func Parse(file string, data []byte, p *plants.Plant) (*Scenario, error) {
	if p == nil {
		return nil, wrong("plant", "missing", "a scenario is read for a plant")
	}
	raw, truth, err := decode(file, data, p)
	if err != nil {
		return nil, err
	}
	r := reader{raw: raw, truth: truth, plant: p, s: &Scenario{file: file}}
	if bad := r.read(file); bad != nil {
		bad.File = file
		return nil, bad
	}
	return r.s, nil
}

// reader checks a raw tree and fills a scenario from it, block after block.
type reader struct {
	raw   *rawScenario
	truth rawTruth
	plant *plants.Plant
	s     *Scenario
}

func (r *reader) read(file string) *plants.Error {
	raw := r.raw
	if raw.Format == nil {
		return wrong("format", "missing", "expected format = 1")
	}
	if *raw.Format != 1 {
		return wrong("format", fmt.Sprint(*raw.Format), "expected 1, the only format this version reads")
	}
	if raw.Name == "" {
		base := filepath.Base(file)
		raw.Name = strings.TrimSuffix(base, filepath.Ext(base))
	}
	for _, step := range []func() *plants.Error{
		r.title, r.time, r.loop, r.realPlant, r.initial, r.drives, r.noise, r.faults, r.limits,
	} {
		if bad := step(); bad != nil {
			return bad
		}
	}
	return nil
}

func (r *reader) title() *plants.Error {
	name := r.raw.Name
	switch {
	case strings.TrimSpace(name) == "":
		return wrong("name", "empty", "expected a name")
	case strings.ContainsFunc(name, unprintable):
		return wrong("name", "control characters in "+quoted(name), "expected visible characters only")
	case utf8.RuneCountInString(name) > maxName:
		return wrong("name", fmt.Sprintf("%d characters long", utf8.RuneCountInString(name)), fmt.Sprintf("expected at most %d", maxName))
	}
	r.s.Name = strings.TrimSpace(name)
	return nil
}

func unprintable(c rune) bool { return !unicode.IsPrint(c) }

func (r *reader) time() *plants.Error {
	raw, p := r.raw, r.plant
	if raw.Duration == nil {
		return wrong("duration_s", "missing", "expected the length of the run in s")
	}
	if *raw.Duration <= 0 {
		return wrong("duration_s", num(*raw.Duration), "expected seconds above 0")
	}
	r.s.Duration = *raw.Duration
	step := p.Period
	if raw.Step != nil {
		if !p.Continuous {
			return wrong("step_s", "given for a discrete plant", "a discrete plant runs at its own period")
		}
		if *raw.Step <= 0 || *raw.Step > r.s.Duration {
			return wrong("step_s", num(*raw.Step), "expected seconds above 0, at most duration_s")
		}
		r.s.Step = *raw.Step
		if step == 0 {
			step = r.s.Step
		}
	}
	if step > 0 && r.s.Duration/step > maxSteps {
		return wrong("duration_s", fmt.Sprintf("%s s in steps of %s s", num(r.s.Duration), num(step)), fmt.Sprintf("expected at most %d steps", maxSteps))
	}
	return nil
}

func (r *reader) loop() *plants.Error {
	r.s.Closed = r.plant.K != nil
	if r.raw.Loop == nil {
		return nil
	}
	switch *r.raw.Loop {
	case "open":
		r.s.Closed = false
	case "closed":
		if r.plant.K == nil {
			return wrong("loop", "closed, for a plant without a controller", `expected "open", or [feedback] in the plant`)
		}
	default:
		return wrong("loop", quoted(*r.raw.Loop), `expected "closed" or "open"`)
	}
	return nil
}

func (r *reader) realPlant() *plants.Error {
	if t := r.truth.plant; t != nil {
		switch {
		case strings.TrimSpace(*t) == "" || strings.ContainsFunc(*t, unprintable) || len(*t) > 1000:
			return wrong("truth, plant", quoted(*t), "expected the name of a plant file")
		}
		r.s.TruthPlant = *t
	}
	for _, q := range r.plant.Parameters {
		f := r.truth.factors[q.Name]
		if f == nil {
			continue
		}
		at := "truth, " + q.Name
		if r.s.TruthPlant != "" {
			return wrong(at, "a factor beside a plant file", "expected one of them")
		}
		if *f == 0 || math.Abs(*f) > 1e6 || math.Abs(*f) < 1e-6 {
			return wrong(at, num(*f), "expected a factor between 1e-6 and 1e6 in size")
		}
		if r.s.Factors == nil {
			r.s.Factors = map[string]float64{}
		}
		r.s.Factors[q.Name] = *f
	}
	return nil
}

func (r *reader) initial() *plants.Error {
	raw, n := r.raw.Initial, len(r.plant.States)
	if raw.True != nil && r.s.TruthPlant == "" && len(raw.True) != n || len(raw.True) > maxStates {
		return wrong("initial, true", entries(len(raw.True)), fmt.Sprintf("expected one per state of the plant: %d", n))
	}
	if raw.Estimate != nil && len(raw.Estimate) != n {
		return wrong("initial, estimate", entries(len(raw.Estimate)), fmt.Sprintf("expected one per state of the plant: %d", n))
	}
	r.s.InitialTrue, r.s.InitialEstimate = raw.True, raw.Estimate
	return nil
}

func (r *reader) noise() *plants.Error {
	raw := r.raw.Noise
	r.s.Noise = Noise{Seed: 1, Process: 1, Sensor: 1}
	if raw.Seed != nil {
		if *raw.Seed < 0 {
			return wrong("noise, seed", fmt.Sprint(*raw.Seed), "expected a whole number from 0 on")
		}
		r.s.Noise.Seed = uint64(*raw.Seed)
	}
	for _, f := range []struct {
		key  string
		have *float64
		into *float64
	}{{"process", raw.Process, &r.s.Noise.Process}, {"sensor", raw.Sensor, &r.s.Noise.Sensor}} {
		if f.have == nil {
			continue
		}
		if *f.have < 0 || *f.have > 1e6 {
			return wrong("noise, "+f.key, num(*f.have), "expected a factor from 0 to 1e6")
		}
		*f.into = *f.have
	}
	return nil
}

func wrong(at, what, expected string) *plants.Error {
	return &plants.Error{Where: at, Wrong: what, Expected: expected}
}

func unknown(at, kind, name string, known []string) *plants.Error {
	if name == "" {
		return wrong(at, "missing", oneOf(known))
	}
	return wrong(at, fmt.Sprintf("unknown %s %s", kind, quoted(name)), oneOf(known))
}

func oneOf(names []string) string {
	if len(names) == 0 {
		return "there is none"
	}
	var b strings.Builder
	for i, n := range names {
		if i == 6 {
			b.WriteString(", ...")
			break
		}
		if i > 0 {
			b.WriteString(", ")
		}
		b.WriteString(quoted(n))
	}
	return "expected one of " + b.String()
}

func quoted(s string) string {
	if r := []rune(s); len(r) > maxName {
		s = string(r[:maxName-3]) + "..."
	}
	return strconv.Quote(s)
}

func num(v float64) string { return strconv.FormatFloat(v, 'g', -1, 64) }

func entries(n int) string {
	if n == 1 {
		return "1 entry"
	}
	return fmt.Sprintf("%d entries", n)
}

func namesOf[T any](list []T, of func(T) string) []string {
	names := make([]string, len(list))
	for i, item := range list {
		names[i] = of(item)
	}
	return names
}

// positions maps names to where they stand in a list.
func positions(names []string) map[string]int {
	at := make(map[string]int, len(names))
	for i, n := range names {
		if !slices.Contains(names[:i], n) {
			at[n] = i
		}
	}
	return at
}
