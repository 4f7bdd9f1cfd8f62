package verify

import (
	"context"
	"encoding/json"
	"math"
	"slices"

	"gonum.org/v1/gonum/mat"

	"polewright/estimator"
	"polewright/scenarios"
	"polewright/ui/desk"
	"polewright/ui/measures"
	"polewright/ui/session"
)

// neighbours are judged beside each design, each entry off by nudge relative:
// 64 units of the last place, beyond what backward stable methods leave on
// matrices of a few dozen states. They come in pairs of opposite signs, so that
// what is on a border, such as a mode at z = 1, is seen from both sides.
const (
	neighbours = 4
	nudge      = 0x1p-46
)

// checker owns what the candidates of one session share.
type checker struct {
	bench  *desk.Bench
	runner *scenarios.Runner
	strict bool // figures that are missing are differences
	judges map[estimator.Options][]*judge
}

// judge judges gains on the model (sign nil) or on a neighbour of it.
type judge struct {
	model    *estimator.Model
	designer *estimator.Designer
	sign     func() float64 // the next factor of an entry; nil for the model itself
}

func (c *checker) judgesOf(kind estimator.Options) ([]*judge, error) {
	if list, ok := c.judges[kind]; ok {
		return list, nil
	}
	var list []*judge
	for k := range neighbours + 1 {
		j := &judge{model: c.bench.Model}
		if k > 0 {
			j.sign = signs(uint64(k+1)/2, k%2 == 0)
			j.model = neighbour(c.bench.Model, j.sign)
		}
		var err error
		j.designer, err = estimator.NewDesigner(j.model, kind)
		switch {
		case err == nil:
			list = append(list, j)
		case k == 0:
			return nil, err
		}
	}
	if c.judges == nil {
		c.judges = map[estimator.Options][]*judge{}
	}
	c.judges[kind] = list
	return list, nil
}

// signs returns a fixed sequence of factors 1 ± nudge (xorshift: Marsaglia 2003),
// or the opposite one.
func signs(seed uint64, opposite bool) func() float64 {
	state := seed * 0x9e3779b97f4a7c15
	return func() float64 {
		state ^= state << 13
		state ^= state >> 7
		state ^= state << 17
		if (state>>33&1 == 1) != opposite {
			return 1 + nudge
		}
		return 1 - nudge
	}
}

func neighbour(m *estimator.Model, sign func() float64) *estimator.Model {
	out := *m
	out.A, out.B, out.C, out.K = nudged(m.A, sign), nudged(m.B, sign), nudged(m.C, sign), nudged(m.K, sign)
	return &out
}

func nudged(m *mat.Dense, sign func() float64) *mat.Dense {
	if m == nil || m.IsEmpty() {
		return m
	}
	out := mat.DenseCopyOf(m)
	out.Apply(func(_, _ int, v float64) float64 { return v * sign() }, out)
	return out
}

// verdict is a design judged once.
type verdict struct {
	design *estimator.Design
	limits []scenarios.LimitResult
	tree   map[string]any
	run    *scenarios.Run
}

// verdicts judges a stored design on the model and on its neighbours: the first
// is the one that counts. What does not fit together is a difference, and what is
// left of it is judged.
//
// With places only the poles are judged, and nothing is run.
func (c *checker) verdicts(ctx context.Context, s *session.KeptDesign, places bool) ([]*verdict, []Difference, error) {
	list, err := c.judgesOf(s.Kind)
	if err != nil {
		return nil, nil, err
	}
	given := estimator.Given{L: s.Gain, Lf: s.GainCurrent, Wanted: s.Wanted}
	given, wrong := sound(list[0].designer, given)
	if given.L == nil && given.Lf == nil {
		return nil, wrong, nil
	}
	var out []*verdict
	for k, j := range list {
		g := given
		if k > 0 {
			g.L, g.Lf = nudged(g.L, j.sign), nudged(g.Lf, j.sign)
		}
		v, err := c.judge(ctx, j, g, k > 0, places)
		switch {
		case err == nil:
			out = append(out, v)
		case k == 0 || ctx.Err() != nil:
			return nil, wrong, err
		}
	}
	return out, wrong, nil
}

func (c *checker) judge(ctx context.Context, j *judge, g estimator.Given, aside, places bool) (*verdict, error) {
	if places {
		d, err := j.designer.QuickJudge(g)
		return &verdict{design: d}, err
	}
	d, err := j.designer.Judge(g)
	if err != nil {
		return nil, err
	}
	return c.measure(ctx, j, d, aside)
}

// sound leaves out of a stored design what does not fit the rest of it: a current
// gain that is no partner of the gain, poles that are not as many.
func sound(d *estimator.Designer, g estimator.Given) (estimator.Given, []Difference) {
	if g.L == nil && g.Lf == nil {
		return g, []Difference{{Key: "gain", Tolerance: none}}
	}
	_, err := d.QuickJudge(g)
	if err == nil {
		return g, nil
	}
	for _, try := range []struct {
		key   string
		given estimator.Given
	}{
		{"gain_current", estimator.Given{L: g.L, Wanted: g.Wanted}},
		{"poles", estimator.Given{L: g.L, Lf: g.Lf}},
		{"gain", estimator.Given{Lf: g.Lf, Wanted: g.Wanted}},
	} {
		if try.given.L == nil && try.given.Lf == nil {
			continue
		}
		if _, bad := d.QuickJudge(try.given); bad == nil {
			return try.given, []Difference{{Key: try.key, At: err.Error(), Tolerance: none}}
		}
	}
	return estimator.Given{}, []Difference{{Key: "gain", At: err.Error(), Tolerance: none}}
}

var none = measures.Number(math.NaN())

// measure fills in what a design is compared by. The scenario is run for the
// design itself; for a neighbour only where a limit asks for it.
func (c *checker) measure(ctx context.Context, j *judge, d *estimator.Design, aside bool) (*verdict, error) {
	v := &verdict{design: d}
	b := c.bench
	if !aside || len(b.Scenario.Limits.Error) > 0 {
		var err error
		if v.run, err = c.runner.Run(ctx, scenarios.Gain{L: d.Gain, Lf: d.GainCurrent, Form: d.Form}); err != nil {
			return nil, err
		}
	}
	v.limits = b.Scenario.Judge(d, j.model, b.Plant, v.run)
	doc := measures.Build(b.Plant.Name, j.model, j.designer.Analysis(), d, ownPlane(b.Model), v.limits)
	text, err := json.Marshal(doc)
	if err != nil {
		return nil, err
	}
	return v, json.Unmarshal(text, &v.tree)
}

func ownPlane(m *estimator.Model) string {
	if m.Discrete() {
		return "z"
	}
	return "s"
}

// candidate checks one stored candidate.
func (c *checker) candidate(ctx context.Context, s *session.KeptDesign) (*Candidate, error) {
	out := &Candidate{Name: s.Name, Form: measures.FormName(s.Kind.Form), Method: measures.MethodName(s.Kind.Method),
		Differences: []Difference{}, Limits: []measures.Limit{}, Warnings: []string{}, Settle: none, OverFloor: none}
	list, wrong, err := c.verdicts(ctx, s, false)
	if err != nil {
		return nil, err
	}
	out.Differences = append(out.Differences, wrong...)
	if len(list) == 0 {
		return out, nil
	}
	now := list[0]
	switch {
	case s.Measures == nil:
		out.Differences = append(out.Differences, Difference{Key: "measures", Stored: nil, Recomputed: "all of them", Tolerance: none})
	default:
		t := &comparison{names: c.bench.Model, strict: c.strict}
		t.documents(s.Measures, list)
		out.Compared = t.compared
		out.Differences = append(out.Differences, t.differences...)
	}
	out.LimitsMet = true
	for _, l := range now.limits {
		out.Limits = append(out.Limits, measures.Limit{Name: l.Name, Value: measures.Number(l.Value), Limit: measures.Number(l.Limit), Met: l.Met})
		out.LimitsMet = out.LimitsMet && l.Met
	}
	out.Diverged = now.run.Diverged
	out.Settle, out.OverFloor = measures.Number(now.design.Transient.Settle), measures.Number(now.design.Noise.OverFloorRMS)
	out.Warnings = append(out.Warnings, now.design.Warnings...)
	out.OK = len(out.Differences) == 0 && out.LimitsMet
	return out, nil
}

// reachTolerance is how far a designed gain may miss its poles, relative to the
// largest of them, beyond what rounding explains.
const reachTolerance = 2e-3

// inHand checks the design in hand.
func (c *checker) inHand(ctx context.Context, k *session.Kept) (InHand, error) {
	s := &k.InHand
	out := InHand{OK: true, Differences: []Difference{}}
	if s.Gain == nil && s.GainCurrent == nil {
		return out, nil
	}
	out.Checked = true
	list, wrong, err := c.verdicts(ctx, s, true)
	if err != nil {
		return out, err
	}
	out.Differences = append(out.Differences, wrong...)
	i := slices.IndexFunc(k.Designs, func(d session.KeptDesign) bool { return d.Name == k.Selected })
	switch {
	case i >= 0:
		for _, g := range []struct {
			key       string
			own, kept *mat.Dense
		}{{"gain", s.Gain, k.Designs[i].Gain}, {"gain_current", s.GainCurrent, k.Designs[i].GainCurrent}} {
			if (g.own == nil) != (g.kept == nil) || g.own != nil && !mat.Equal(g.own, g.kept) {
				out.Differences = append(out.Differences, Difference{Key: g.key, At: "not that of the selected candidate " + k.Selected, Tolerance: none})
			}
		}
	case len(list) > 0 && s.Wanted != nil:
		if miss, allowed := missed(list); miss > allowed {
			out.Differences = append(out.Differences, Difference{Key: "poles", At: "worst miss over the largest pole",
				Stored: 0.0, Recomputed: miss, Tolerance: measures.Number(allowed)})
		}
	}
	out.OK = len(out.Differences) == 0
	return out, nil
}
