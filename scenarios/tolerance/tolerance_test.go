package tolerance_test

import (
	"context"
	"errors"
	"fmt"
	"math"
	"reflect"
	"strings"
	"testing"

	"gonum.org/v1/gonum/mat"
	"pgregory.net/rapid"

	"polewright/estimator"
	"polewright/plants"
	"polewright/plants/library"
	"polewright/scenarios"
	"polewright/scenarios/tolerance"
)

// first is x' = (−x + gain u)/lag, measured as it is.
const first = `format = 1
name = "First order"
[parameters]
gain = { value = 1.0, tolerance = 0.2 }
lag = { value = 1.0, tolerance = 0.25 }
rest = { value = 0.0, tolerance = 0.5 }
fixed = { value = 1.0 }
[model]
time = "continuous"
A = [["-fixed/lag"]]
B = [["gain/lag"]]
C = [[1]]
[[states]]
name = "level"
unit = "m"
[[inputs]]
name = "valve"
scale = 2.0
[[sensors]]
name = "gauge"
noise_density = 1.0
[process_noise]
density = [1.0]
`

// falling is x' = rise x + u, held by u = −2 x̂.
const falling = `format = 1
name = "Falling"
[parameters]
rise = { value = 1.0, tolerance = 0.6 }
[model]
time = "continuous"
A = [["rise"]]
B = [[1]]
C = [[1]]
[[inputs]]
name = "push"
[[sensors]]
noise_density = 1.0
[process_noise]
density = [1.0]
[feedback]
K = [[2]]
`

func study(t *testing.T, text string, poles ...complex128) tolerance.Study {
	t.Helper()
	p, err := plants.Parse("plant.toml", []byte(text))
	if err != nil {
		t.Fatal(err)
	}
	m, err := p.Model(plants.Options{})
	if err != nil {
		t.Fatal(err)
	}
	d, err := estimator.NewDesigner(m, estimator.Options{})
	if err != nil {
		t.Fatal(err)
	}
	if poles == nil {
		poles = d.Analysis().Floor.Poles
	}
	design, err := d.Place(poles, nil)
	if err != nil {
		t.Fatal(err)
	}
	return tolerance.Study{Plant: p, Design: design}
}

func builtIn(t *testing.T, name string) string {
	t.Helper()
	text, _, ok := library.Plant(name)
	if !ok {
		t.Fatalf("no plant %s", name)
	}
	return string(text)
}

func run(t *testing.T, s tolerance.Study) *tolerance.Envelope {
	t.Helper()
	e, err := s.Run(context.Background(), nil)
	if err != nil {
		t.Fatal(err)
	}
	return e
}

func find(t *testing.T, e *tolerance.Envelope, f tolerance.Figure) tolerance.Measure {
	t.Helper()
	for _, m := range e.Measures {
		if m.Figure == f {
			return m
		}
	}
	t.Fatalf("no measure %d", f)
	return tolerance.Measure{}
}

func near(t *testing.T, what string, have, want, tol float64) {
	t.Helper()
	if !(math.Abs(have-want) <= tol*max(1, math.Abs(want))) {
		t.Errorf("%s: %.15g, expected %.15g", what, have, want)
	}
}

// By hand: the estimator x̂' = −x̂ + u + 3 (y − x̂) has the pole −4. In the steady
// state x = g u and 0 = −x̂ + u + 3 (g u − x̂), so the error is (g − 1)/4 u; the
// poles together are −1/lag and −4.
func TestFirstOrderByHand(t *testing.T) {
	e := run(t, study(t, first, -4))
	if e.Cases != 1+4+200 || !e.Exhaustive || e.Unstable != 0 || e.Failed != 0 {
		t.Errorf("%d cases, %d unstable, %d failed", e.Cases, e.Unstable, e.Failed)
	}
	edge := find(t, e, tolerance.Stability)
	near(t, "nominal edge", edge.Nominal, -1, 1e-12)
	near(t, "worst edge", edge.Worst, -1/1.25, 1e-12)
	if f := edge.Case.Truth()["lag"]; f != 1.25 {
		t.Errorf("worst edge at lag x %g", f)
	}
	bias := find(t, e, tolerance.Bias)
	near(t, "nominal bias", bias.Nominal, 0, 1e-12)
	near(t, "worst bias", bias.Worst, 2*0.2/4, 1e-12)
	if f := bias.Case.Truth()["gain"]; math.Abs(math.Abs(f-1)-0.2) > 1e-12 {
		t.Errorf("worst bias at gain x %g", f)
	}
	if !strings.Contains(bias.Name, "valve") || bias.Unit != "m" {
		t.Errorf("named %q in %q", bias.Name, bias.Unit)
	}
	// e' = −4 e + w − 3 v with unit noises at lag = 1: variance (1 + 9)/8
	near(t, "nominal noise", find(t, e, tolerance.Noise).Nominal, math.Sqrt(10.0/8), 1e-12)
	if len(e.Notes) != 2 || !strings.Contains(e.Notes[0], "rest is 0") {
		t.Errorf("notes %q", e.Notes)
	}
	if len(e.Parameters) != 2 {
		t.Errorf("parameters %v", e.Parameters)
	}
}

// By hand: with u = −2 x̂ and L = 3 the plant x' = a x + u and its estimator have
// λ² + (4 − a) λ + 6 − 4 a, stable for a < 3/2. At the corner a = 1.6 the larger
// root is −1.2 + √1.84.
func TestUnstableCornerByHand(t *testing.T) {
	s := study(t, falling, -2)
	e := run(t, s)
	edge := find(t, e, tolerance.Stability)
	near(t, "nominal edge", edge.Nominal, -1, 1e-9) // λ² + 3 λ + 2
	near(t, "worst edge", edge.Worst, math.Sqrt(1.84)-1.2, 1e-9)
	if e.NominalUnstable || e.Unstable < 2 || len(e.UnstableCases) == 0 {
		t.Fatalf("%d unstable", e.Unstable)
	}
	if got := e.UnstableCases[0].String(); got != "rise +60 %" {
		t.Errorf("worst unstable case %q", got)
	}
	for _, c := range e.UnstableCases {
		if c.Factors[0] < 1.5 {
			t.Errorf("%v counted as unstable", c)
		}
	}
	c, ok := e.Stress()
	if !ok || c.String() != "rise +60 %" {
		t.Errorf("stress case %q, %v", c, ok)
	}
	if m := find(t, e, tolerance.PhaseMargin); !(m.Worst < m.Nominal) || m.Case.Factors[0] >= 1.5 {
		t.Errorf("phase margin %g, nominal %g at %v", m.Worst, m.Nominal, m.Case)
	}
}

// The nominal plant is one of the cases, so no figure's worst is better than it,
// and every worst figure comes back when its case is judged alone.
func TestEnvelopeHoldsTheNominalPlantAndItsOwnCases(t *testing.T) {
	names := []string{"lift", "balancer", "pan-drive"}
	if testing.Short() {
		names = names[:1]
	}
	for _, name := range names {
		s := study(t, builtIn(t, name))
		s.Samples = 3
		e := run(t, s)
		m, err := s.Plant.Model(plants.Options{})
		if err != nil {
			t.Fatal(err)
		}
		d, err := estimator.NewDesigner(m, estimator.Options{})
		if err != nil {
			t.Fatal(err)
		}
		for _, q := range e.Measures {
			if math.IsNaN(q.Nominal) || math.IsNaN(q.Worst) {
				t.Errorf("%s: %s is not defined", name, q.Name)
			}
			if q.LargerWorse && q.Worst < q.Nominal || !q.LargerWorse && q.Worst > q.Nominal {
				t.Errorf("%s: %s is %g at worst, %g nominally", name, q.Name, q.Worst, q.Nominal)
			}
			real, err := s.Plant.Model(plants.Options{Factors: q.Case.Truth(), WithoutUnknowns: true})
			if err != nil {
				t.Fatal(err)
			}
			mm, err := d.Against(real, s.Design)
			if err != nil {
				t.Fatal(err)
			}
			switch q.Figure {
			case tolerance.Noise:
				near(t, name+" "+q.Name, mm.Std[q.State], q.Worst, 1e-12)
			case tolerance.PhaseMargin:
				near(t, name+" "+q.Name, mm.Loop.PhaseMargin, q.Worst, 1e-12)
			case tolerance.Bias:
				near(t, name+" "+q.Name, math.Abs(mm.Bias.At(q.State, q.Input))*s.Plant.Inputs[q.Input].Scale, q.Worst, 1e-12)
			}
		}
	}
}

// plain is an envelope as text that two equal ones share.
func plain(e *tolerance.Envelope) string {
	var b strings.Builder
	fmt.Fprintln(&b, e.Cases, e.Unstable, e.Failed, e.Notes, e.UnstableCases)
	for _, m := range e.Measures {
		fmt.Fprintln(&b, m.Name, math.Float64bits(m.Nominal), math.Float64bits(m.Worst), m.Case.Factors, m.Case.Kind)
	}
	return b.String()
}

func TestResultDoesNotDependOnTheWorkers(t *testing.T) {
	for _, s := range []tolerance.Study{study(t, builtIn(t, "balancer")), study(t, falling, -2)} {
		s.Samples, s.Seed = 6, 7
		s.Workers = 1
		one := plain(run(t, s))
		for _, workers := range []int{4, 100} {
			s.Workers = workers
			if got := plain(run(t, s)); got != one {
				t.Errorf("%d workers:\n%s\none:\n%s", workers, got, one)
			}
		}
	}
}

// The unstable cases of the falling plant are points inside the box, but for one.
func TestSeedDrawsThePoints(t *testing.T) {
	s := study(t, falling, -2)
	s.Samples, s.Seed = 60, 7
	seven := plain(run(t, s))
	if plain(run(t, s)) != seven {
		t.Error("the same seed gives other points")
	}
	s.Seed = 8
	if plain(run(t, s)) == seven {
		t.Error("another seed gives the same points")
	}
}

func TestProgressRisesToTheTotal(t *testing.T) {
	s := study(t, first, -4)
	s.Samples, s.Workers = 10, 3
	var seen []int
	_, err := s.Run(context.Background(), func(done, total int) {
		if total != 15 {
			t.Errorf("total %d", total)
		}
		seen = append(seen, done)
	})
	if err != nil {
		t.Fatal(err)
	}
	want := make([]int, 15)
	for i := range want {
		want[i] = i + 1
	}
	if !reflect.DeepEqual(seen, want) {
		t.Errorf("progress %v", seen)
	}
}

func TestCancelStopsEarly(t *testing.T) {
	s := study(t, first, -4)
	s.Samples = 50_000
	ctx, cancel := context.WithCancel(context.Background())
	done := 0
	e, err := s.Run(ctx, func(n, _ int) {
		if done = n; n == 50 {
			cancel()
		}
	})
	if e != nil || !errors.Is(err, context.Canceled) {
		t.Errorf("%v, %v", e, err)
	}
	if done > 50 {
		t.Errorf("%d cases were told of after the end", done)
	}
	before, stop := context.WithCancel(context.Background())
	stop()
	if _, err := s.Run(before, nil); !errors.Is(err, context.Canceled) {
		t.Errorf("already ended: %v", err)
	}
}

// With more than eight parameters not every corner is tried, and the notes say so.
func TestManyParameters(t *testing.T) {
	var names, terms []string
	for i := range 10 {
		names = append(names, fmt.Sprintf("p%d = { value = 1.0, tolerance = 0.1 }", i))
		terms = append(terms, fmt.Sprintf("p%d", i))
	}
	text := strings.Replace(first, "gain = {", strings.Join(names, "\n")+"\ngain = {", 1)
	text = strings.Replace(text, `"gain/lag"`, `"(`+strings.Join(terms, "+")+`)/lag"`, 1)
	s := study(t, text, -4)
	s.Samples = -1
	e := run(t, s)
	if e.Exhaustive || e.Cases != 1+2*12+256 {
		t.Errorf("%d cases, exhaustive %v", e.Cases, e.Exhaustive)
	}
	if !strings.Contains(strings.Join(e.Notes, " "), "too many corners to try all") {
		t.Errorf("notes %q", e.Notes)
	}
	// one alone at its end moves the bias by (0.1·2)/4; random corners by more
	if b := find(t, e, tolerance.Bias); b.Worst < 0.05 || b.Worst > 10*0.05+1e-12 {
		t.Errorf("bias %g", b.Worst)
	}
}

func TestWithoutTolerancesThereIsTheNominalPlant(t *testing.T) {
	text := strings.NewReplacer("tolerance = 0.25", "tolerance = 0", "tolerance = 0.2", "tolerance = 0").Replace(first)
	e := run(t, study(t, text, -4))
	if e.Cases != 1 {
		t.Errorf("%d cases", e.Cases)
	}
	if c, ok := e.Stress(); ok {
		t.Errorf("stress case %v", c)
	}
	for _, m := range e.Measures {
		if m.Worst != m.Nominal || m.Case.String() != "nominal" {
			t.Errorf("%s: %g, nominal %g", m.Name, m.Worst, m.Nominal)
		}
	}
}

// A case that no model comes of is counted and named, the others count.
func TestFailuresAreListed(t *testing.T) {
	text := strings.Replace(first, `"-fixed/lag"`, `"-sqrt(lag-0.76)/sqrt(0.24)"`, 1)
	e := run(t, study(t, text, -4))
	if e.Failed == 0 || len(e.Failures) == 0 || e.Failed >= e.Cases {
		t.Fatalf("%d of %d failed", e.Failed, e.Cases)
	}
	for _, f := range e.Failures {
		if f.Err == nil || f.Case.Truth()["lag"] >= 0.76 {
			t.Errorf("%v failed: %v", f.Case, f.Err)
		}
	}
}

// What a case writes as [truth] is what a scenario reads.
func TestTruthReadsBack(t *testing.T) {
	s := study(t, builtIn(t, "lift"))
	rapid.Check(t, func(t *rapid.T) {
		c := tolerance.Case{Names: []string{"mass", "damp", "drive"}}
		for _, name := range c.Names {
			c.Factors = append(c.Factors, rapid.OneOf(rapid.Just(1.0), rapid.Float64Range(0.1, 1.9)).Draw(t, name))
		}
		text := "format = 1\nname = \"worst\"\nduration_s = 1.0\n" + c.TruthText()
		sc, err := scenarios.Parse("worst.toml", []byte(text), s.Plant)
		if err != nil {
			t.Fatalf("%v\n%s", err, text)
		}
		if want := c.Truth(); len(want) != len(sc.Factors) || len(want) > 0 && !reflect.DeepEqual(sc.Factors, want) {
			t.Errorf("%v, expected %v", sc.Factors, want)
		}
	})
	whole := tolerance.Case{Names: []string{"mass"}, Factors: []float64{2}}
	if got := whole.TruthText(); got != "[truth]\nmass = 2.0\n" {
		t.Errorf("%q", got)
	}
	if got := (tolerance.Case{Names: []string{"mass", "stiff"}, Factors: []float64{0.85, 1.05}}).String(); got != "mass −15 %, stiff +5 %" {
		t.Errorf("%q", got)
	}
}

func TestBadStudies(t *testing.T) {
	good := study(t, first, -4)
	for name, change := range map[string]func(s *tolerance.Study){
		"no plant":    func(s *tolerance.Study) { s.Plant = nil },
		"no design":   func(s *tolerance.Study) { s.Design = nil },
		"no gain":     func(s *tolerance.Study) { s.Design = &estimator.Design{} },
		"wrong shape": func(s *tolerance.Study) { s.Design = &estimator.Design{Gain: mat.NewDense(2, 1, nil)} },
		"factors":     func(s *tolerance.Study) { s.Options.Factors = map[string]float64{"gain": 2} },
		"too many":    func(s *tolerance.Study) { s.Samples = math.MaxInt },
	} {
		s := good
		change(&s)
		if _, err := s.Run(context.Background(), nil); !errors.Is(err, tolerance.ErrStudy) {
			t.Errorf("%s: %v", name, err)
		}
	}
	s := good
	s.Designer.Form = estimator.Current
	if _, err := s.Run(context.Background(), nil); !errors.Is(err, estimator.ErrMethod) {
		t.Errorf("current form in continuous time: %v", err)
	}
}

// The worst figures are held against the limits; an unstable case meets none.
func TestLimitsHoldAtWorst(t *testing.T) {
	s := study(t, builtIn(t, "lift"))
	s.Samples = -1
	e := run(t, s)
	phase, speed := find(t, e, tolerance.PhaseMargin), e.Measures[2]
	limits := func(margin, noise float64) *scenarios.Limits {
		return &scenarios.Limits{PhaseMargin: &margin, Std: []scenarios.NamedLimit{{Name: "climb speed", Limit: noise}, {Name: "no state", Limit: 1}}}
	}
	for _, c := range []struct {
		margin, noise float64
		met           []bool
	}{
		{phase.Worst, speed.Worst, []bool{true, true}},
		{phase.Nominal, speed.Worst, []bool{false, true}},
		{phase.Worst - 1, speed.Nominal, []bool{true, false}},
	} {
		got := e.Judge(limits(c.margin, c.noise))
		if len(got) != 2 || got[0].Name != "phase_margin_deg" || got[1].Name != "std climb speed" {
			t.Fatalf("%+v", got)
		}
		for i, l := range got {
			if l.Met != c.met[i] {
				t.Errorf("%+v, expected met %v", l, c.met[i])
			}
		}
	}
	if e.Judge(nil) != nil {
		t.Error("limits out of nothing")
	}
	e = run(t, study(t, falling, -2))
	none := 0.0
	if got := e.Judge(&scenarios.Limits{PhaseMargin: &none}); len(got) != 1 || got[0].Met || !math.IsNaN(got[0].Value) {
		t.Errorf("with unstable cases: %+v", got)
	}
}
