package report

import (
	"context"
	"errors"
	"fmt"
	"slices"
	"strings"

	"polewright/estimator"
	"polewright/plants"
	"polewright/scenarios"
	"polewright/ui/desk"
	"polewright/ui/measures"
	"polewright/ui/session"
)

// Options of a report.
type Options struct {
	// Program is the name and version of the one that writes it.
	Program string
	// Candidates are the names of those shown, in this order; nil is all.
	Candidates []string
}

// shown is one candidate with everything that is told of it.
type shown struct {
	name, note string
	design     *estimator.Design
	limits     []scenarios.LimitResult
	diverged   bool    // the scenario's run
	traces     []trace // of that run, per state of the plant
	last       float64 // s, its end
	doc        *measures.Document
	designer   *estimator.Designer
}

// maker holds what the parts of a report share.
type maker struct {
	Document
	kept  *session.Kept
	bench *desk.Bench
	list  []*shown
	units []string // per state of the design model
}

// Make judges the candidates of a session by their stored gains, runs the scenario
// and writes the report. A session that keeps no candidate is shown with the design
// in hand. The error is a *plants.Error where the session or the options are to
// blame.
func Make(ctx context.Context, k *session.Kept, o Options) (*Document, error) {
	for _, t := range k.Texts {
		if !t.Matches {
			return nil, &plants.Error{Where: t.What + ".text", Wrong: "does not match its sha256", Expected: "the text as it was saved"}
		}
	}
	picked, err := pick(k, o.Candidates)
	if err != nil {
		return nil, err
	}
	b := k.Bench
	m := &maker{kept: k, bench: b, units: stateUnits(b)}
	runner, err := scenarios.NewRunner(b.Plant, b.Model, b.Scenario, b.Truth)
	if err != nil {
		return nil, err
	}
	designers := map[estimator.Options]*estimator.Designer{}
	run := new(scenarios.Run) // one memory for all runs
	for i := range picked {
		s, err := judge(ctx, b, runner, run, designers, &picked[i])
		if err != nil {
			return nil, err
		}
		m.list = append(m.list, s)
	}
	m.title()
	m.comparison()
	m.tradeOff(ctx)
	m.plant()
	if err := m.sensing(); err != nil {
		return nil, err
	}
	for _, s := range m.list {
		m.candidate(s)
	}
	m.provenance(o.Program)
	return &m.Document, ctx.Err()
}

func pick(k *session.Kept, names []string) ([]session.KeptDesign, error) {
	if names == nil {
		if len(k.Designs) > 0 {
			return k.Designs, nil
		}
		d := k.InHand
		d.Name = "in hand"
		if d.Gain == nil && d.GainCurrent == nil {
			return nil, &plants.Error{Where: "candidates", Wrong: "this session keeps none, and the design in hand has no gain yet", Expected: "a candidate"}
		}
		return []session.KeptDesign{d}, nil
	}
	var out []session.KeptDesign
	for _, name := range names {
		i := slices.IndexFunc(k.Designs, func(d session.KeptDesign) bool { return d.Name == name })
		if i < 0 {
			return nil, &plants.Error{Where: "--candidate", Wrong: fmt.Sprintf("no candidate %q", name), Expected: known(k)}
		}
		if !slices.ContainsFunc(out, func(d session.KeptDesign) bool { return d.Name == name }) {
			out = append(out, k.Designs[i])
		}
	}
	return out, nil
}

func known(k *session.Kept) string {
	if len(k.Designs) == 0 {
		return "none: this session keeps no candidate"
	}
	var names []string
	for _, d := range k.Designs {
		names = append(names, d.Name)
	}
	return "one of " + strings.Join(names, ", ")
}

func judge(ctx context.Context, b *desk.Bench, runner *scenarios.Runner, run *scenarios.Run, designers map[estimator.Options]*estimator.Designer, k *session.KeptDesign) (*shown, error) {
	d := designers[k.Kind]
	if d == nil {
		var err error
		if d, err = estimator.NewDesigner(b.Model, k.Kind); err != nil {
			return nil, err
		}
		designers[k.Kind] = d
	}
	bad := func(err error) error {
		return &plants.Error{Where: "candidate " + k.Name, Wrong: err.Error(), Expected: "the gain that was saved"}
	}
	design, err := d.Judge(estimator.Given{L: k.Gain, Lf: k.GainCurrent, Wanted: k.Wanted})
	if err != nil {
		return nil, bad(err)
	}
	if err := runner.RunInto(ctx, scenarios.Gain{L: design.Gain, Lf: design.GainCurrent, Form: design.Form}, run); err != nil {
		if ctx.Err() != nil {
			return nil, errors.New("interrupted")
		}
		return nil, bad(err)
	}
	s := &shown{name: k.Name, note: k.Note, design: design, diverged: run.Diverged, designer: d}
	s.traces, s.last = thinned(run, len(b.Plant.States))
	s.limits = b.Scenario.Judge(design, b.Model, b.Plant, run)
	s.doc = measures.Build(b.Plant.Name, b.Model, d.Analysis(), design, plane(b.Plant), s.limits)
	return s, nil
}

// plane is that of `design --json` without --plane.
func plane(p *plants.Plant) string {
	if p.Continuous {
		return "s"
	}
	return "z"
}

func (m *maker) title() {
	b := m.bench
	time := "continuous time"
	if b.Model.Discrete() {
		time = "a sample every " + Digits(b.Model.Period) + " s"
	}
	m.Title = "State estimator for " + b.Plant.Name
	m.Subtitle = fmt.Sprintf("%s; scenario: %s; %s", time, b.Scenario.Name, count(len(m.list), "candidate"))
	m.text(Caution, "%s", measures.Caution)
}

// stateUnits has the unit of every state of the design model: lags, delays and
// unknowns have that of the signal after which they are named, a slope that per
// second.
func stateUnits(b *desk.Bench) []string {
	n, _, _ := b.Model.Dims()
	units := make([]string, n)
	for i := range units {
		if i < len(b.Plant.States) {
			units[i] = b.Plant.States[i].Unit
			continue
		}
		longest, name := 0, b.Model.StateNames[i]
		match := func(signal, unit string) {
			if len(signal) > longest && strings.HasPrefix(name, signal+" ") {
				longest, units[i] = len(signal), unit
				if unit != "" && strings.HasSuffix(name, " slope") {
					units[i] = unit + "/s"
				}
			}
		}
		for _, s := range b.Plant.Inputs {
			match(s.Name, s.Unit)
		}
		for _, s := range b.Plant.Sensors {
			match(s.Name, s.Unit)
		}
	}
	return units
}

func count(n int, one string) string {
	if n == 1 {
		return "1 " + one
	}
	return fmt.Sprintf("%d %ss", n, one)
}
