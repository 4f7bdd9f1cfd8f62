package estimator_test

import (
	"errors"
	"math"
	"strings"
	"testing"

	"gonum.org/v1/gonum/mat"
	"pgregory.net/rapid"

	"polewright/estimator"
)

// oscillators is a block diagonal plant of damped oscillators, each seen through
// its first state by the one sensor.
func oscillators(damping, frequency []float64) *estimator.Model {
	n := 2 * len(frequency)
	a, c := mat.NewDense(n, n, nil), mat.NewDense(1, n, nil)
	for k, w := range frequency {
		i := 2 * k
		a.Set(i, i, -damping[k])
		a.Set(i+1, i+1, -damping[k])
		a.Set(i, i+1, w)
		a.Set(i+1, i, -w)
		c.Set(0, i, 1)
	}
	return &estimator.Model{A: a, C: c, Q: unit(n), R: unit(1)}
}

func foldsOf(t *testing.T, m *estimator.Model, period float64) []estimator.Fold {
	t.Helper()
	list, err := estimator.Folds(m, period)
	if err != nil {
		t.Fatal(err)
	}
	return list
}

// The sampled oscillators of the reference cases, from their continuous plants:
// what is not observable there is gone here, what hardly is, is faint.
func TestHalfPeriodOscillators(t *testing.T) {
	want := map[string]struct {
		damping, period float64
		folds           int
		verdict         estimator.Verdict
	}{
		"d_oscillator_half_period_exact":        {0, math.Pi, 1, estimator.Gone},
		"d_oscillator_half_period_offset_0.001": {0, math.Pi * 1.001, 1, estimator.Faint},
		"d_oscillator_half_period_offset_1e-06": {0, math.Pi * (1 + 1e-6), 1, estimator.Faint},
		"d_damped_oscillator_half_period":       {0.04, math.Pi, 1, estimator.Gone},
		"d_oscillator_quarter_period":           {0, math.Pi / 2, 0, estimator.Told},
	}
	found := 0
	for _, c := range cases(t, "observability.json") {
		w, ok := want[c.Name]
		if !ok {
			continue
		}
		found++
		m := oscillators([]float64{w.damping}, []float64{1})
		ad, _, _, err := estimator.Discretise(m.A, nil, nil, nil, w.period)
		if err != nil {
			t.Fatal(err)
		}
		if c.Name == "d_damped_oscillator_half_period" {
			near(t, "the damping of the case", math.Exp(-w.damping*w.period), -c.A[0][0], 1e-6)
		} else if d := distance(ad, dense(c.A)); d > 1e-14 {
			t.Errorf("%s: another plant, by %g", c.Name, d)
		}
		list := foldsOf(t, m, w.period)
		if len(list) != w.folds {
			t.Errorf("%s: folds %v", c.Name, list)
			continue
		}
		if w.folds == 0 {
			continue
		}
		f := list[0]
		if f.Verdict != w.verdict || (f.Verdict == estimator.Gone) != (c.Rank < 2) {
			t.Errorf("%s: %v, rank %d", c.Name, f, c.Rank)
		}
		if len(f.Modes) != 2 || math.Abs(imag(f.Modes[1])-1) > 1e-12 {
			t.Errorf("%s: modes %v", c.Name, f.Modes)
		}
		if !(f.Better > 0) || len(foldsOf(t, m, f.Better)) != 0 {
			t.Errorf("%s: a better period of %g s", c.Name, f.Better)
		}
	}
	if found != len(want) {
		t.Errorf("%d of %d cases", found, len(want))
	}
}

// By hand: for the oscillator of 1 rad/s with θ the period, the matrix is unitarily
// diag(0, δ/θ) above the row (1, 1)/√2, |δ| = 2|sin θ|. Its least singular value
// squared is x/(1 + x + √(1 + x²)) with x = |δ/θ|²; in continuous time x = 4.
func TestVisibilityByHand(t *testing.T) {
	sigma := func(x float64) float64 { return math.Sqrt(x / (1 + x + math.Sqrt(1+x*x))) }
	for _, off := range []float64{0.01, 1e-3, 1e-4, 1e-5} {
		theta := math.Pi * (1 + off)
		list := foldsOf(t, oscillators([]float64{0}, []float64{1}), theta)
		if len(list) != 1 {
			t.Fatalf("%g off: %v", off, list)
		}
		x := math.Pow(2*math.Sin(theta)/theta, 2)
		near(t, "visibility", list[0].Sigma, sigma(x)/sigma(4), 1e-8)
		near(t, "gap", list[0].Gap, 2*math.Abs(math.Sin(theta)), 1e-9)
	}
}

// Two oscillators of equal damping whose frequencies differ by the sampling
// frequency: one sensor cannot tell them apart, two can.
func TestModesThatShareAnAlias(t *testing.T) {
	const period = 0.25
	m := oscillators([]float64{0.5, 0.5}, []float64{3, 3 + 2*math.Pi/period})
	list := foldsOf(t, m, period)
	if len(list) != 1 || list[0].Verdict != estimator.Gone || len(list[0].Modes) != 2 {
		t.Fatalf("folds %v", list)
	}
	text := list[0].String()
	for _, part := range []string{"0.25 s", "-0.5+3i and -0.5+28.1", "no longer see", "a period of "} {
		if !strings.Contains(text, part) {
			t.Errorf("%q is missing in %q", part, text)
		}
	}
	m.C = mat.NewDense(2, 4, []float64{1, 0, 1, 0, 1, 0, -1, 0})
	m.R = unit(2)
	list = foldsOf(t, m, period)
	if len(list) != 1 || list[0].Verdict != estimator.Told || !math.IsNaN(list[0].Better) {
		t.Errorf("two sensors: %v", list)
	}
	// unequal damping keeps them apart: exp(−0.5) of each other
	if list := foldsOf(t, oscillators([]float64{0.5, 2.5}, []float64{3, 3 + 2*math.Pi/period}), period); len(list) != 0 {
		t.Errorf("unequal damping: %v", list)
	}
}

// A mode that no sensor sees is no loss, nor are repeated modes a fold.
func TestWhatIsNoFold(t *testing.T) {
	m := oscillators([]float64{0}, []float64{1})
	m.C.Zero()
	if list := foldsOf(t, m, math.Pi); len(list) != 0 {
		t.Errorf("an unseen mode: %v", list)
	}
	double := &estimator.Model{A: mat.NewDense(2, 2, []float64{0, 1, 0, 0}), C: mat.NewDense(1, 2, []float64{1, 0}), Q: unit(2), R: unit(1)}
	if list := foldsOf(t, double, 0.5); len(list) != 0 {
		t.Errorf("a double integrator: %v", list)
	}
}

// Whatever the frequencies and the period: what is called gone is not observable
// after sampling, what is not listed is, and the better period has no loss.
func TestFoldsAgreeWithTheSampledPlant(t *testing.T) {
	rapid.Check(t, func(t *rapid.T) {
		k := rapid.IntRange(1, 3).Draw(t, "oscillators")
		damping, frequency := make([]float64, k), make([]float64, k)
		for i := range k {
			damping[i] = float64(rapid.IntRange(0, 2).Draw(t, "damping")) * 0.1
			frequency[i] = float64(rapid.IntRange(1, 12).Draw(t, "frequency"))
			for j := range i {
				if frequency[i] == frequency[j] {
					t.Skip("the same oscillator twice")
				}
			}
		}
		m := oscillators(damping, frequency)
		// Multiples of π/24: many exact folds, and no near ones.
		period := math.Pi / 24 * float64(rapid.IntRange(1, 24).Draw(t, "period"))
		list, err := estimator.Folds(m, period)
		if err != nil {
			t.Fatal(err)
		}
		lost := 0
		for _, f := range list {
			if f.Verdict == estimator.Gone {
				lost++
			}
			if f.Better > 0 {
				after, err := estimator.Folds(m, f.Better)
				if err != nil {
					t.Fatal(err)
				}
				for _, g := range after {
					if g.Verdict == estimator.Gone {
						t.Errorf("%g s is no better: %v", f.Better, g)
					}
				}
			}
		}
		ad, _, _, err := estimator.Discretise(m.A, nil, nil, nil, period)
		if err != nil {
			t.Fatal(err)
		}
		sampled := &estimator.Model{Period: period, A: ad, C: m.C, Q: m.Q, R: m.R}
		d, err := estimator.NewDesigner(sampled, estimator.Options{Tolerance: 1e-10})
		if err != nil {
			t.Fatal(err)
		}
		n, _, _ := m.Dims()
		if rank := d.Analysis().Observability.Rank; (rank < n) != (lost > 0) {
			t.Errorf("rank %d of %d, folds %v", rank, n, list)
		}
	})
}

func TestBadSampling(t *testing.T) {
	m := oscillators([]float64{0}, []float64{1})
	for _, period := range []float64{0, -1, math.NaN(), math.Inf(1)} {
		if _, err := estimator.Folds(m, period); !errors.Is(err, estimator.ErrSampling) {
			t.Errorf("period %g: %v", period, err)
		}
	}
	sampled := *m
	sampled.Period = 1
	if _, err := estimator.Folds(&sampled, 1); !errors.Is(err, estimator.ErrSampling) {
		t.Errorf("a sampled plant: %v", err)
	}
	if _, err := estimator.Folds(nil, 1); !errors.Is(err, estimator.ErrShape) {
		t.Errorf("no plant: %v", err)
	}
	growing := oscillators([]float64{-400}, []float64{1})
	if _, err := estimator.Folds(growing, 2*math.Pi); !errors.Is(err, estimator.ErrSampling) {
		t.Errorf("a plant that outgrows the numbers: %v", err)
	}
}

// Whatever the numbers, there is an answer or an error.
func TestFoldsOfWildPlants(t *testing.T) {
	rapid.Check(t, func(t *rapid.T) {
		m := wildModel(t)
		m.Period = 0
		period := math.Pow(10, rapid.Float64Range(-9, 9).Draw(t, "period"))
		list, err := estimator.Folds(m, period)
		if err != nil {
			return
		}
		for _, f := range list {
			if len(f.Modes) < 2 || math.IsNaN(f.Sigma) || math.IsNaN(f.Gap) || f.Better <= 0 || f.String() == "" {
				t.Errorf("%+v", f)
			}
		}
	})
}

// wildModel is of any scale, and may be singular, unobservable or unstable.
func wildModel(t *rapid.T) *estimator.Model {
	n := rapid.IntRange(1, 5).Draw(t, "n")
	p := rapid.IntRange(1, 2).Draw(t, "p")
	number := rapid.Custom(func(t *rapid.T) float64 {
		v := math.Pow(10, rapid.Float64Range(-12, 12).Draw(t, "size"))
		return v * float64(rapid.IntRange(-1, 1).Draw(t, "sign"))
	})
	fill := func(r, c int) *mat.Dense {
		out := mat.NewDense(r, c, nil)
		for i := range r {
			for j := range c {
				out.Set(i, j, number.Draw(t, "entry"))
			}
		}
		return out
	}
	return &estimator.Model{A: fill(n, n), B: fill(n, 1), C: fill(p, n), K: fill(1, n), Q: unit(n), R: unit(p)}
}
