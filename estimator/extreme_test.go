package estimator_test

import (
	"context"
	"errors"
	"math"
	"strings"
	"testing"

	"gonum.org/v1/gonum/mat"

	"polewright/estimator"
)

// bench is an oscillator with a position sensor; cases change it.
func oscillator() *estimator.Model {
	return &estimator.Model{
		A: mat.NewDense(2, 2, []float64{0, 1, -4, -0.4}), B: mat.NewDense(2, 1, []float64{0, 1}),
		C: mat.NewDense(1, 2, []float64{1, 0}), Q: mat.NewSymDense(2, []float64{0, 0, 0, 1}), R: mat.NewSymDense(1, []float64{0.01}),
	}
}

func everyTenth() *estimator.Model {
	m := oscillator()
	a, b, q, err := estimator.Discretise(m.A, m.B, nil, m.Q, 0.1)
	if err != nil {
		panic(err)
	}
	m.A, m.B, m.Q, m.Period = a, b, q, 0.1
	return m
}

func rows(r ...[]float64) *mat.Dense { return dense(r) }

func diagonal(v ...float64) *mat.SymDense {
	s := mat.NewSymDense(len(v), nil)
	for i, x := range v {
		s.SetSym(i, i, x)
	}
	return s
}

// extreme is one design at the edge or beyond, and what it gives: an error (fails), or
// a design with a word in its warnings or in the reason why there is no floor.
type extreme struct {
	name   string
	model  func() *estimator.Model
	o      estimator.Options
	poles  []complex128
	gain   *mat.Dense // judged in place of poles
	fails  error      // a sentinel, or errFixed
	says   string     // in the error, a warning or the floor's reason
	stable bool
	blank  bool // noise that is defined but cannot be computed
	check  func(*testing.T, *estimator.Designer, *estimator.Design)
}

var errFixed = errors.New("fixed modes")

func with(change func(*estimator.Model)) func() *estimator.Model {
	return func() *estimator.Model {
		m := oscillator()
		change(m)
		return m
	}
}

func discrete(change func(*estimator.Model)) func() *estimator.Model {
	return func() *estimator.Model {
		m := everyTenth()
		change(m)
		return m
	}
}

var fast = []complex128{-5 + 2i, -5 - 2i}

func extremes() []extreme {
	nan, inf := math.NaN(), math.Inf(1)
	current := estimator.Options{Form: estimator.Current}
	quiet := estimator.Options{Method: estimator.LeastNoise}
	std := func(state int, want, tolerance float64) func(*testing.T, *estimator.Designer, *estimator.Design) {
		return func(t *testing.T, _ *estimator.Designer, d *estimator.Design) {
			near(t, "std", d.Noise.Std[state], want, tolerance)
		}
	}
	return []extreme{
		// the model
		{name: "A is missing", model: with(func(m *estimator.Model) { m.A = nil }), fails: estimator.ErrShape},
		{name: "A is empty", model: with(func(m *estimator.Model) { m.A = new(mat.Dense) }), fails: estimator.ErrShape},
		{name: "C is missing", model: with(func(m *estimator.Model) { m.C = nil }), fails: estimator.ErrShape},
		{name: "Q is missing", model: with(func(m *estimator.Model) { m.Q = nil }), fails: estimator.ErrShape},
		{name: "R is missing", model: with(func(m *estimator.Model) { m.R = nil }), fails: estimator.ErrShape},
		{name: "A is not square", model: with(func(m *estimator.Model) { m.A = mat.NewDense(2, 3, nil) }), fails: estimator.ErrShape, says: "2×3"},
		{name: "C of another size", model: with(func(m *estimator.Model) { m.C = mat.NewDense(1, 3, nil) }), fails: estimator.ErrShape, says: "expected 1×2"},
		{name: "R of another size", model: with(func(m *estimator.Model) { m.R = diagonal(1, 1) }), fails: estimator.ErrShape},
		{name: "K of another size", model: with(func(m *estimator.Model) { m.K = mat.NewDense(1, 3, nil) }), fails: estimator.ErrShape},
		{name: "too few roles", model: with(func(m *estimator.Model) { m.Roles = make([]estimator.Role, 1) }), fails: estimator.ErrShape},
		{name: "too many scales", model: with(func(m *estimator.Model) { m.StateScale = []float64{1, 1, 1} }), fails: estimator.ErrShape},
		{name: "NaN in A", model: with(func(m *estimator.Model) { m.A.Set(0, 0, nan) }), fails: estimator.ErrNotFinite},
		{name: "infinity in C", model: with(func(m *estimator.Model) { m.C.Set(0, 0, inf) }), fails: estimator.ErrNotFinite},
		{name: "infinite noise", model: with(func(m *estimator.Model) { m.R.SetSym(0, 0, inf) }), fails: estimator.ErrNotFinite},
		{name: "NaN period", model: with(func(m *estimator.Model) { m.Period = nan }), fails: estimator.ErrNotFinite},
		{name: "negative period", model: with(func(m *estimator.Model) { m.Period = -1 }), fails: estimator.ErrNotFinite},
		{name: "scale of zero", model: with(func(m *estimator.Model) { m.StateScale = []float64{1, 0} }), fails: estimator.ErrNotFinite},
		{name: "negative variance", model: with(func(m *estimator.Model) { m.R.SetSym(0, 0, -1) }), fails: estimator.ErrNoise},
		{name: "indefinite Q", model: with(func(m *estimator.Model) { m.Q = mat.NewSymDense(2, []float64{1, 2, 2, 1}) }), fails: estimator.ErrNoise},
		{name: "A of 1e150", model: with(func(m *estimator.Model) { m.A.Set(1, 0, -1e150) }), fails: estimator.ErrRange, says: "1e+150"},
		{name: "scales that make numbers huge", model: with(func(m *estimator.Model) { m.StateScale = []float64{1e-90, 1e90} }), fails: estimator.ErrRange, says: "given scales"},
		{name: "tolerance of 2", model: oscillator, o: estimator.Options{Tolerance: 2}, fails: estimator.ErrRange},
		{name: "current form without a period", model: oscillator, o: current, fails: estimator.ErrMethod, says: "sample period"},

		// the poles
		{name: "too few poles", model: oscillator, poles: []complex128{-1}, fails: errFixed, says: "expected 2"},
		{name: "no poles", model: oscillator, poles: []complex128{}, fails: errFixed},
		{name: "a NaN pole", model: oscillator, poles: []complex128{complex(nan, 0), -1}, fails: estimator.ErrNotFinite},
		{name: "an infinite pole", model: oscillator, poles: []complex128{complex(-inf, 0), -1}, fails: estimator.ErrNotFinite},
		{name: "a pole without its partner", model: oscillator, poles: []complex128{-1 + 1i, -2}, says: "partner"},
		{name: "poles of 1e150", model: oscillator, poles: []complex128{-1e150, -2e150}, says: "too large"},
		{name: "unstable poles", model: oscillator, poles: []complex128{1, 2}, says: "unstable"},
		{name: "poles on the limit", model: oscillator, poles: []complex128{2i, -2i}, says: "unstable"},
		{name: "all poles equal", model: oscillator, poles: []complex128{-5, -5}, says: "fewer eigenvectors", stable: true},
		{name: "the plant's own poles", model: with(func(m *estimator.Model) { m.A = rows([]float64{-1, 0}, []float64{1, -2}) }), poles: []complex128{-1, -2}, stable: true,
			check: func(t *testing.T, _ *estimator.Designer, d *estimator.Design) {
				if d.GainNorm > 1e-12 {
					t.Errorf("gain %g where none is needed", d.GainNorm)
				}
			}},
		{name: "very fast poles", model: oscillator, poles: []complex128{-1e6, -2e6}, stable: true},
		{name: "very slow poles", model: oscillator, poles: []complex128{-1e-6, -2e-6}, says: "reached only", stable: true}, // det F = 2e-12 is the difference of numbers near 4
		{name: "far apart", model: oscillator, poles: []complex128{-1e-3, -1e5}, stable: true},
		{name: "deadbeat", model: everyTenth, poles: []complex128{0, 0}, says: "fewer eigenvectors", stable: true},
		{name: "at the sampling limit", model: everyTenth, poles: []complex128{-0.5, 0.2}, says: "sampling limit", stable: true},

		// what the sensors see
		{name: "a sensor that sees nothing", model: with(func(m *estimator.Model) { m.C.Zero() }), poles: []complex128{}, stable: true,
			check: func(t *testing.T, d *estimator.Designer, got *estimator.Design) {
				if len(d.Fixed()) != 2 || got.GainNorm > 1e-12 {
					t.Errorf("fixed %v, gain %g", d.Fixed(), got.GainNorm)
				}
			}},
		{name: "an unstable mode unseen", model: with(func(m *estimator.Model) { m.A = rows([]float64{-1, 0}, []float64{0, 2}) }), poles: []complex128{-3}, fails: errFixed, says: "no gain can help"},
		{name: "an integrator unseen", model: with(func(m *estimator.Model) { m.A = rows([]float64{-1, 0}, []float64{0, 0}) }), poles: []complex128{-3}, fails: errFixed, says: "no gain can help"},
		{name: "a fixed mode asked to move", model: with(func(m *estimator.Model) { m.A = rows([]float64{-1, 0}, []float64{0, -2}) }), poles: []complex128{-3, -4}, fails: errFixed, says: "-2"},
		{name: "a fixed mode left alone", model: with(func(m *estimator.Model) { m.A = rows([]float64{-1, 0}, []float64{0, -2}) }), poles: []complex128{-3, -2}, stable: true},
		{name: "two sensors of one quantity", model: with(func(m *estimator.Model) { m.C, m.R = rows([]float64{1, 0}, []float64{2, 0}), diagonal(0.01, 0.04) }), poles: fast, stable: true},
		{name: "the same, least noise", model: with(func(m *estimator.Model) { m.C, m.R = rows([]float64{1, 0}, []float64{2, 0}), diagonal(0.01, 0.04) }), o: quiet, poles: fast, stable: true},
		{name: "as many sensors as states", model: with(func(m *estimator.Model) { m.C, m.R = rows([]float64{1, 0}, []float64{0, 1}), diagonal(0.01, 0.01) }), poles: fast, stable: true},
		{name: "least noise at unstable poles", model: with(func(m *estimator.Model) { m.C, m.R = rows([]float64{1, 0}, []float64{0, 1}), diagonal(0.01, 0.01) }), o: quiet, poles: []complex128{1, 2}, says: "unstable"},
		{name: "a mode hardly seen", model: with(func(m *estimator.Model) {
			m.A, m.C = rows([]float64{-1, 0}, []float64{0, -2}), rows([]float64{1, 1e-9})
		}), poles: fast, stable: true,
			check: func(t *testing.T, _ *estimator.Designer, got *estimator.Design) { // as in units that suit
				m := oscillator()
				m.A, m.C, m.StateScale = rows([]float64{-1, 0}, []float64{0, -2}), rows([]float64{1, 1e-9}), []float64{1, 1e9}
				same, err := newDesigner(t, m, estimator.Options{}).Judge(estimator.Given{L: got.Gain})
				if err != nil {
					t.Fatal(err)
				}
				near(t, "first std", got.Noise.Std[0], same.Noise.Std[0], 1e-6)
				near(t, "second std", got.Noise.Std[1], same.Noise.Std[1], 1e-6)
			}},
		{name: "one state", model: func() *estimator.Model {
			return &estimator.Model{A: rows([]float64{1}), C: rows([]float64{2}), Q: diagonal(3), R: diagonal(5)}
		}, poles: []complex128{-4}, stable: true, check: std(0, math.Sqrt((3+2.5*2.5*5)/8), 1e-12)}, // L = 5/2

		// noise
		{name: "no sensor noise", model: with(func(m *estimator.Model) { m.R.Zero() }), poles: fast, says: "no noise at all", stable: true},
		{name: "no sensor noise, sampled", model: discrete(func(m *estimator.Model) { m.R.Zero() }), poles: []complex128{0.5, 0.4}, says: "no noise at all", stable: true},
		{name: "no process noise", model: with(func(m *estimator.Model) { m.Q.Zero() }), poles: fast, says: "no process noise", stable: true},
		{name: "no process noise on an integrator", model: with(func(m *estimator.Model) { m.A.Zero(); m.A.Set(0, 1, 1); m.Q.Zero() }), poles: fast, says: "no best linear estimator", stable: true},
		{name: "no noise at all", model: with(func(m *estimator.Model) { m.Q.Zero(); m.R.Zero() }), poles: fast, stable: true, says: "no process noise", check: std(0, 0, 0)},
		{name: "enormous noise", model: with(func(m *estimator.Model) { m.R.SetSym(0, 0, 1e80) }), poles: fast, stable: true},
		{name: "tiny noise", model: with(func(m *estimator.Model) { m.R.SetSym(0, 0, 1e-80); m.Q.SetSym(1, 1, 1e-80) }), poles: fast, stable: true},
		{name: "vanishing noise", model: with(func(m *estimator.Model) { m.R.SetSym(0, 0, 1e-150); m.Q.SetSym(1, 1, 1e-150) }), poles: fast, stable: true},

		// units
		{name: "units of 1e-9 and 1e9", model: with(func(m *estimator.Model) {
			m.A, m.StateScale = rows([]float64{0, 1e-18}, []float64{-4e18, -0.4}), []float64{1e-9, 1e9}
		}), poles: fast, stable: true},
		{name: "the same without scales", model: with(func(m *estimator.Model) { m.A = rows([]float64{0, 1e-18}, []float64{-4e18, -0.4}) }), poles: fast, fails: errFixed},

		// gains found elsewhere, and the loop
		{name: "a gain of another shape", model: oscillator, gain: mat.NewDense(1, 2, nil), fails: estimator.ErrShape, says: "expected 2×1"},
		{name: "a gain of NaN", model: oscillator, gain: mat.NewDense(2, 1, []float64{nan, 0}), fails: estimator.ErrNotFinite},
		{name: "a gain of 1e150", model: oscillator, gain: mat.NewDense(2, 1, []float64{1e150, 0}), fails: estimator.ErrRange},
		{name: "a gain of 1e90", model: oscillator, gain: mat.NewDense(2, 1, []float64{1e90, 1e90}), says: "no steady state that can be computed", stable: true, blank: true},
		{name: "a gain that destabilises", model: oscillator, gain: mat.NewDense(2, 1, []float64{-3, 0}), says: "unstable"},
		{name: "a gain of zero", model: oscillator, gain: mat.NewDense(2, 1, nil), stable: true},
		{name: "a controller that destabilises", model: with(func(m *estimator.Model) { m.K = rows([]float64{-10, -10}) }), poles: fast, says: "control loop is unstable", stable: true,
			check: func(t *testing.T, _ *estimator.Designer, d *estimator.Design) {
				if d.Loop == nil || d.Loop.Stable || !math.IsNaN(d.Loop.PhaseMargin) || len(d.Loop.Poles) != 4 {
					t.Errorf("loop %+v", d.Loop)
				}
			}},
		{name: "a controller that does nothing", model: with(func(m *estimator.Model) { m.K = mat.NewDense(1, 2, nil) }), poles: fast, stable: true,
			check: func(t *testing.T, _ *estimator.Designer, d *estimator.Design) {
				if l := d.Loop; !math.IsInf(l.GainMarginAbove, 1) || !math.IsInf(l.PhaseMargin, 1) || l.SensitivityPeak != 1 {
					t.Errorf("loop %+v", l)
				}
			}},
		{name: "a period far too slow", model: func() *estimator.Model {
			m := oscillator()
			a, b, q, err := estimator.Discretise(m.A, m.B, nil, m.Q, 1000)
			if err != nil {
				panic(err)
			}
			m.A, m.B, m.Q, m.Period = a, b, q, 1000
			return m
		}, poles: []complex128{0.5, 0.4}, fails: errFixed, says: "modes at 0"}, // A is zero to rounding: the sensors see one instant alone
		{name: "singular A in current form", model: discrete(func(m *estimator.Model) { m.A = rows([]float64{0, 0}, []float64{1, 0.5}); m.C = rows([]float64{0, 1}) }), o: current,
			poles: []complex128{0.3}, stable: true},
	}
}

// What the user gets at the edges: a value, or an honest reason.
func TestExtremeDesigns(t *testing.T) {
	list := extremes()
	if len(list) < 40 {
		t.Errorf("only %d cases", len(list))
	}
	for _, c := range list {
		t.Run(c.name, func(t *testing.T) {
			d, got, err := c.design()
			switch {
			case err != nil:
				var fixed *estimator.FixedModesError
				if c.fails != errFixed && c.fails != nil && !errors.Is(err, c.fails) || c.fails == errFixed && !errors.As(err, &fixed) {
					t.Errorf("got %v, expected %v", err, c.fails)
				}
				if c.fails == nil && c.says == "" || !strings.Contains(err.Error(), c.says) {
					t.Errorf("the error is %q, expected something about %q", err, c.says)
				}
				return
			case c.fails != nil:
				t.Fatalf("no error, expected %v", c.fails)
			}
			if text := strings.Join(got.Warnings, "; "); !strings.Contains(text, c.says) {
				t.Errorf("the warnings are %q, expected something about %q", text, c.says)
			}
			if got.Stable != c.stable {
				t.Errorf("stable: %v", got.Stable)
			}
			for i, s := range got.Noise.Std {
				if math.IsNaN(s) || math.IsInf(s, 0) {
					t.Errorf("state %d has the noise %g", i, s)
				}
			}
			if defined := c.stable && !c.blank; defined != (got.Noise.Std != nil) {
				t.Errorf("noise %v of an estimator that is stable: %v; %q", got.Noise.Std, c.stable, got.Warnings)
			}
			if got.Wanted != nil && !(got.WorstError < 1e-6) && c.says != "reached only" {
				t.Errorf("poles off by %g", got.WorstError)
			}
			if c.check != nil {
				c.check(t, d, got)
			}
		})
	}
}

func (c extreme) design() (*estimator.Designer, *estimator.Design, error) {
	d, err := estimator.NewDesigner(c.model(), c.o)
	if err != nil {
		return nil, nil, err
	}
	var got *estimator.Design
	if c.gain != nil {
		got, err = d.Judge(estimator.Given{L: c.gain})
	} else {
		got, err = d.Place(c.poles, nil)
	}
	return d, got, err
}

func TestNilIsRefused(t *testing.T) {
	if _, err := estimator.NewDesigner(nil, estimator.Options{}); !errors.Is(err, estimator.ErrShape) {
		t.Errorf("no model: %v", err)
	}
	d := newDesigner(t, oscillator(), estimator.Options{})
	if _, err := d.Judge(estimator.Given{}); !errors.Is(err, estimator.ErrShape) {
		t.Errorf("no gain: %v", err)
	}
	if _, err := d.Judge(estimator.Given{L: new(mat.Dense)}); !errors.Is(err, estimator.ErrShape) {
		t.Errorf("an empty gain: %v", err)
	}
	if _, err := d.Complete(context.Background(), nil); !errors.Is(err, estimator.ErrMethod) {
		t.Errorf("no design: %v", err)
	}
	if _, err := d.Complete(context.Background(), &estimator.Design{Gain: mat.NewDense(3, 1, nil)}); !errors.Is(err, estimator.ErrMethod) {
		t.Errorf("a design of another model: %v", err)
	}
	if _, err := d.Against(oscillator(), nil); !errors.Is(err, estimator.ErrMethod) {
		t.Errorf("no design: %v", err)
	}
	if _, err := d.Against(nil, nil); !errors.Is(err, estimator.ErrShape) {
		t.Errorf("no plant: %v", err)
	}
}
