package estimator_test

import (
	"errors"
	"math"
	"testing"

	"gonum.org/v1/gonum/mat"
	"pgregory.net/rapid"

	"polewright/estimator"
	"polewright/estimator/poles"
)

// At the poles of the best linear estimator of either form, the least-noise gain is
// that estimator (riccati.json, evaluated at 70 digits).
func TestLeastNoiseReachesTheFloor(t *testing.T) {
	seen := 0
	for _, c := range cases(t, "riccati.json") {
		if len(c.C) < 2 || c.Name == "carex_1_3_aircraft" || c.Name == "carex_1_4_distillation" {
			continue // one sensor leaves no choice; these two have an indefinite W
		}
		forms := []estimator.Form{estimator.Prediction}
		if c.Domain == "discrete" {
			forms = append(forms, estimator.Current)
		}
		for _, form := range forms {
			d := newDesigner(t, c.model(), estimator.Options{Form: form, Method: estimator.LeastNoise})
			floor := d.Analysis().Floor
			wanted := poles.Without(floor.Poles, d.Fixed())
			got, err := d.Place(wanted, nil)
			if err != nil {
				t.Errorf("%s: %v", c.Name, err)
				continue
			}
			seen++
			worst := 0.0
			for i, s := range floor.Std {
				if s > 0 {
					worst = max(worst, math.Abs(got.Noise.Std[i]*got.Noise.Std[i]/s/s-1))
				}
			}
			t.Logf("%-28s form %d: worst variance off the floor's by %.1e", c.Name, form, worst)
			if !(worst <= 1e-6) {
				t.Errorf("%s, form %d: variances are off the floor's by %.2g", c.Name, form, worst)
			}
		}
	}
	if seen < 7 {
		t.Errorf("only %d designs", seen)
	}
}

// cost is the weighted sum of variances that the least-noise gain minimises.
func cost(d *estimator.Designer, got *estimator.Design) float64 {
	var sum float64
	for i, s := range got.Noise.Std {
		w := 1.0
		if f := d.Analysis().Floor; f != nil && f.Std[i] > 0 {
			w = 1 / f.Std[i] / f.Std[i]
		}
		sum += w * s * s
	}
	return sum
}

// The least-noise gain is never noisier than the robust one at the same poles, in
// either form and with modes that no sensor sees, and one sensor leaves no choice.
func TestLeastNoiseAgainstRobust(t *testing.T) {
	compared := 0
	rapid.Check(t, func(t *rapid.T) {
		m := anyModel(t)
		n, _, p := m.Dims()
		o := estimator.Options{}
		if m.Discrete() && rapid.Bool().Draw(t, "current") {
			o.Form = estimator.Current
		}
		if p > 1 && rapid.IntRange(0, 3).Draw(t, "alike") == 0 { // two sensors of one quantity
			m.C.SetRow(1, mat.Row(nil, 0, m.C))
		}
		if n > 2 && rapid.IntRange(0, 3).Draw(t, "blind") == 0 { // a stable mode that no sensor sees
			for i := range n {
				m.A.Set(i, n-1, 0)
			}
			m.A.Set(n-1, n-1, -1)
			if m.Discrete() {
				m.A.Set(n-1, n-1, 0.5)
			}
			for j := range p {
				m.C.Set(j, n-1, 0)
			}
		}
		d, err := estimator.NewDesigner(m, o)
		if err != nil {
			t.Fatal(err)
		}
		for _, mode := range d.Analysis().Observability.Modes {
			if mode.Observable && mode.Sigma < 0.05 {
				t.Skip("a mode that is hardly seen")
			}
		}
		movable, _ := d.Movable()
		wanted := anyPoles(t, movable, m.Discrete())
		robust, err := d.Place(wanted, nil)
		if err != nil {
			t.Skip(err)
		}
		o.Method = estimator.LeastNoise
		quiet, err := estimator.NewDesigner(m, o)
		if err != nil {
			t.Fatal(err)
		}
		least, err := quiet.Place(wanted, nil)
		if errors.Is(err, estimator.ErrNotReached) {
			t.Skip(err)
		}
		if err != nil {
			t.Fatal(err)
		}
		if robust.WorstError > 1e-9 || least.WorstError > 1e-9 || !robust.Stable || !least.Stable {
			t.Skip("the poles are not the same")
		}
		compared++
		if a, b := cost(quiet, least), cost(quiet, robust); a > b*(1+1e-7) {
			t.Errorf("noise %.9g, with the robust gain %.9g", a, b)
		}
	})
	if compared < 20 {
		t.Errorf("only %d comparisons", compared)
	}
}

// No other start finds less noise: gains of other designs for the same poles, each
// followed to the optimum of its own branch, on published problems.
func TestLeastNoiseFromOtherStarts(t *testing.T) {
	done := 0
	for _, c := range cases(t, "robust.json") {
		wanted := values(c.Poles)
		if len(c.A) > 6 || len(c.C) < 2 || done == 6 {
			continue
		}
		d := newDesigner(t, c.model(), estimator.Options{Method: estimator.LeastNoise})
		best, err := d.Place(wanted, nil)
		if err != nil || !best.Stable {
			continue
		}
		done++
		for turn := range 6 {
			// Come from other poles: the branch is followed from there.
			from := make([]complex128, len(wanted))
			for i, v := range wanted {
				f := 1 + 0.4*math.Sin(float64(7*turn+3)+real(v)+math.Abs(imag(v)))
				from[i] = v * complex(f, 0)
			}
			at, err := d.Place(from, nil)
			for k := 1; k <= 8 && err == nil; k++ {
				list := make([]complex128, len(wanted))
				for i := range list {
					list[i] = from[i] + (wanted[i]-from[i])*complex(float64(k)/8, 0)
				}
				at, err = d.QuickPlace(list, at)
			}
			for k := 0; k < 3 && err == nil; k++ {
				at, err = d.QuickPlace(wanted, at)
			}
			if err != nil || at.WorstError > 1e-9 {
				continue
			}
			if a, b := cost(d, at), cost(d, best); a < b*(1-1e-4) {
				t.Errorf("%s: %.9g from elsewhere, %.9g from cold", c.Name, a, b)
			}
		}
	}
	if done < 4 {
		t.Errorf("only %d cases", done)
	}
}

// A pole dragged in 200 small steps: the gain follows without jumps. The robust one
// does so even through another pole; the least-noise gain of poles that meet differs
// much from that of poles apart, so that its drag stays clear of them.
func TestGainFollowsADraggedPole(t *testing.T) {
	a := mat.NewDense(4, 4, []float64{0, 1, 0, 0, -4, -0.2, 2, 0.1, 0, 0, 0, 1, 1.5, 0.1, -3, -0.3})
	m := &estimator.Model{A: a, C: mat.NewDense(2, 4, []float64{1, 0, 0, 0, 0, 0, 1, 0}), Q: unit(4), R: unit(2)}
	m.Q.SetSym(0, 0, 0.01)
	m.Q.SetSym(2, 2, 0.02)
	for _, c := range []struct {
		name   string
		method estimator.Method
		other  complex128
	}{{"robust, through a pole", estimator.Robust, -5}, {"robust", estimator.Robust, -10}, {"least noise", estimator.LeastNoise, -10}} {
		d := newDesigner(t, m, estimator.Options{Method: c.method})
		var last *estimator.Design
		worst, worstAt := 0.0, 0.0
		for k := range 201 {
			x := -2 - 6*float64(k)/200
			got, err := d.QuickPlace([]complex128{complex(x, 0), c.other, -3 + 2i, -3 - 2i}, last)
			if err != nil {
				t.Fatalf("%s at %g: %v", c.name, x, err)
			}
			if got.WorstError > 1e-7 {
				t.Errorf("%s at %g: poles off by %.2g", c.name, x, got.WorstError)
			}
			if last != nil {
				if jump := distance(got.Gain, last.Gain); jump > worst {
					worst, worstAt = jump, x
				}
			}
			last = got
		}
		t.Logf("%s: a step of 0.03 changes the gain by at most %.2g of itself, at %g", c.name, worst, worstAt)
		if worst > 0.05 {
			t.Errorf("%s: the gain jumps by %.2g at %g", c.name, worst, worstAt)
		}
	}
}
