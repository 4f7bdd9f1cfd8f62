package estimator_test

import (
	"math"
	"math/rand/v2"
	"testing"
	"time"

	"gonum.org/v1/gonum/mat"

	"polewright/estimator"
)

// wild draws models and poles whose numbers may have any size, or be none.
type wild struct {
	*rand.Rand
	decades float64 // numbers lie within so many decades of 1
	odd     float64 // part of the numbers that are special
}

func (r wild) number() float64 {
	special := []float64{0, 0, 0, 1, -1, math.NaN(), math.Inf(1), math.Inf(-1), 1e150, -1e150, 1e-150, 5e-324, math.MaxFloat64}
	if r.Float64() < r.odd {
		return special[r.IntN(len(special))]
	}
	return r.NormFloat64() * math.Pow(10, r.decades*(2*r.Float64()-1))
}

func (r wild) dense(rows, cols int) *mat.Dense {
	m := mat.NewDense(rows, cols, nil)
	m.Apply(func(_, _ int, _ float64) float64 { return r.number() }, m)
	return m
}

func (r wild) covariance(n int) *mat.SymDense {
	s := mat.NewSymDense(n, nil)
	for i := range n {
		s.SetSym(i, i, math.Abs(r.number()))
	}
	if r.IntN(3) == 0 {
		var full mat.SymDense
		full.SymOuterK(1, r.dense(n, n))
		return &full
	}
	return s
}

func (r wild) scales(n int) []float64 {
	if r.IntN(2) == 0 {
		return nil
	}
	s := make([]float64, n)
	for i := range s {
		s[i] = math.Abs(r.number())
	}
	return s
}

func (r wild) model() *estimator.Model {
	n := 1 + r.IntN(6)
	p := 1 + r.IntN(min(n, 3))
	m := &estimator.Model{A: r.dense(n, n), C: r.dense(p, n), Q: r.covariance(n), R: r.covariance(p),
		StateScale: r.scales(n), SensorScale: r.scales(p)}
	if r.IntN(2) == 0 {
		inputs := 1 + r.IntN(2)
		m.B, m.K = r.dense(n, inputs), r.dense(inputs, n)
		if r.IntN(2) == 0 {
			m.D = r.dense(p, inputs)
		}
	}
	if r.IntN(2) == 0 {
		m.Period = math.Abs(r.number())
	}
	if r.IntN(4) == 0 {
		m.Roles = make([]estimator.Role, n)
		for i := range m.Roles {
			m.Roles[i] = estimator.Role(r.IntN(4))
		}
	}
	if r.IntN(3) == 0 {
		m.Outputs = r.dense(1, n)
	}
	return m
}

func (r wild) poles(n int, discrete bool) []complex128 {
	var list []complex128
	for len(list) < n {
		re, im := r.number(), 0.0
		if r.IntN(2) == 0 {
			re = -math.Abs(re)
		}
		if discrete && r.IntN(2) == 0 {
			re = 2*r.Float64() - 1
		}
		if len(list)+2 <= n && r.IntN(2) == 0 {
			im = r.number()
			list = append(list, complex(re, im), complex(re, -im))
			continue
		}
		list = append(list, complex(re, 0))
	}
	return list
}

// designWildly goes through every public function of the designer: an error is an
// answer, a panic or a silent infinity is not.
func designWildly(t testing.TB, seed uint64, decades, odd float64) {
	r := wild{rand.New(rand.NewPCG(seed, 77)), decades, odd}
	m := r.model()
	o := estimator.Options{Form: estimator.Form(r.IntN(2)), Method: estimator.Method(r.IntN(2))}
	d, err := estimator.NewDesigner(m, o)
	if err != nil {
		return
	}
	n, _, p := m.Dims()
	if f := d.Analysis().Floor; f != nil {
		for i, s := range f.Std {
			if math.IsNaN(s) || math.IsInf(s, 0) {
				t.Errorf("seed %d: floor of state %d is %g", seed, i, s)
			}
		}
	} else if d.Analysis().FloorReason == "" {
		t.Errorf("seed %d: no floor and no reason", seed)
	}
	movable, _ := d.Movable()
	design, err := d.Place(r.poles(movable, m.Discrete()), nil)
	if err == nil {
		sound(t, seed, design)
		if next, err := d.QuickPlace(r.poles(movable, m.Discrete()), design); err == nil {
			sound(t, seed, next)
		}
	}
	if judged, err := d.Judge(estimator.Given{L: r.dense(n, p)}); err == nil {
		sound(t, seed, judged)
		if _, err := d.Against(m, judged); err != nil && m.Check() != nil {
			t.Errorf("seed %d: the model is refused only now: %v", seed, err)
		}
	}
}

// sound holds that a figure is a number or comes with a warning.
func sound(t testing.TB, seed uint64, d *estimator.Design) {
	t.Helper()
	for i := range d.Gain.RawMatrix().Data {
		if v := d.Gain.RawMatrix().Data[i]; math.IsNaN(v) || math.IsInf(v, 0) {
			t.Errorf("seed %d: gain entry %g", seed, v)
		}
	}
	bad := len(d.Noise.Std) == 0
	for _, s := range d.Noise.Std {
		bad = bad || math.IsNaN(s) || math.IsInf(s, 0)
	}
	if (bad || math.IsNaN(d.Transient.Settle)) && len(d.Warnings) == 0 {
		t.Errorf("seed %d: undefined noise or transient without a warning", seed)
	}
	for _, s := range d.Noise.Std {
		if math.IsInf(s, 0) || math.IsNaN(s) {
			t.Errorf("seed %d: standard deviation %g", seed, s)
		}
	}
}

func FuzzDesign(f *testing.F) {
	for seed := range uint64(40) {
		f.Add(seed, float64(seed%20), float64(seed%3)/20)
	}
	f.Fuzz(func(t *testing.T, seed uint64, decades, odd float64) {
		if !(math.Abs(decades) < 160) || !(odd >= 0 && odd < 1) {
			t.Skip("beyond what numbers have")
		}
		start := time.Now()
		designWildly(t, seed, decades, odd)
		if took := time.Since(start); took > 20*time.Second {
			t.Errorf("took %v", took)
		}
	})
}
