package estimator_test

import (
	"errors"
	"math"
	"math/cmplx"
	"testing"

	"gonum.org/v1/gonum/mat"
	"pgregory.net/rapid"

	"polewright/estimator"
)

func TestPointsRoundHalfToEven(t *testing.T) {
	q := estimator.Point{Integer: 2, Fraction: 1} // −4, −3.5 … 3.5
	if q.Bits() != 4 || q.String() != "Q2.1" || q.Step() != 0.5 {
		t.Errorf("%v has %d bits and a step of %g", q, q.Bits(), q.Step())
	}
	for _, c := range []struct {
		v, want float64
		fits    bool
	}{
		{0.25, 0, true}, {0.75, 1, true}, {-0.25, 0, true}, {-0.75, -1, true}, {1.3, 1.5, true},
		{3.5, 3.5, true}, {3.7, 3.5, true}, {3.75, 3.5, false}, {4, 3.5, false}, {math.Inf(1), 3.5, false},
		{-4, -4, true}, {-4.2, -4, true}, {-4.3, -4, false}, {math.Inf(-1), -4, false},
	} {
		if got, fits := q.Round(c.v); got != c.want || fits != c.fits {
			t.Errorf("%g becomes %g, %v; expected %g, %v", c.v, got, fits, c.want, c.fits)
		}
	}
	if v, fits := q.Round(math.NaN()); !math.IsNaN(v) || fits {
		t.Errorf("NaN becomes %g, %v", v, fits)
	}
}

func TestPointsKeepWithinHalfAStep(t *testing.T) {
	rapid.Check(t, func(t *rapid.T) {
		q := estimator.Point{Integer: rapid.IntRange(-40, 40).Draw(t, "integer"), Fraction: rapid.IntRange(-30, 80).Draw(t, "fraction")}
		if q.Bits() < 2 {
			t.Skip("no word")
		}
		end := math.Ldexp(1, q.Integer)
		v := end * rapid.Float64Range(-1, 1).Draw(t, "part")
		got, fits := q.Round(v)
		if math.Abs(got-v) > q.Step()/2 && fits {
			t.Errorf("%g becomes %g, more than half of %g away", v, got, q.Step())
		}
		if !fits && v < end-q.Step()/2 {
			t.Errorf("%g is said not to fit %v", v, q)
		}
		if k := math.Ldexp(got, q.Fraction); k != math.Trunc(k) || got < -end || got >= end {
			t.Errorf("%g is no value of %v", got, q)
		}
		if again, _ := q.Round(got); again != got {
			t.Errorf("%g becomes %g", got, again)
		}
	})
}

// single is x⁺ = a x + u with the gain l on y = x, state scale 2.
func single(t *testing.T, a, l float64) (*estimator.Model, *estimator.Design) {
	t.Helper()
	one := func(v float64) *mat.Dense { return mat.NewDense(1, 1, []float64{v}) }
	m := &estimator.Model{Period: 0.1, A: one(a), B: one(1), C: one(1), Q: unit(1), R: unit(1), StateScale: []float64{2}}
	d, err := newDesigner(t, m, estimator.Options{}).Judge(estimator.Given{L: one(l)})
	if err != nil {
		t.Fatal(err)
	}
	return m, d
}

// By hand, 8 bits: 0.95 becomes 122/128, 0.45 becomes 115/256, 1 stays; the pole
// goes from 0.5 to 0.50390625. With one point for all, Q1.6, they are 61/64 and
// 29/64, and the pole stays by luck.
func TestWordsByHand(t *testing.T) {
	m, d := single(t, 0.95, 0.45)
	w, err := estimator.RoundWords(m, d, estimator.WordOptions{Bits: 8, InputSize: []float64{6}})
	if err != nil {
		t.Fatal(err)
	}
	if w.A.String() != "Q0.7" || w.Gain.String() != "Q-1.8" || w.C.String() != "Q1.6" || w.B.String() != "Q1.6" {
		t.Errorf("points %v %v %v %v", w.A, w.B, w.C, w.Gain)
	}
	near(t, "pole", real(w.Poles[0].To), 0.50390625, 1e-15)
	near(t, "distance", w.Poles[0].Distance, 0.00390625, 1e-12)
	near(t, "relative", w.Poles[0].Relative, 0.0078125, 1e-12)
	// 0.5039ᵏ stays below 0.02 from k = 6 on: 0.5 s have 0.0325, 0.6 s 0.0164
	near(t, "settle", w.Settle, 0.6, 1e-12)
	if !w.Stable || w.Lost != 0 || w.Loop != nil {
		t.Errorf("stable %v, %d lost, loop %v", w.Stable, w.Lost, w.Loop)
	}
	// The state reaches (1 + 1)·2: 4 needs three integer bits. 0.953·4 + 0.449 + 6
	// is above 8: one guard bit.
	if s := w.States[0]; s.Reach != 4 || s.Point.String() != "Q3.4" || s.Overflows || w.Guard != 1 {
		t.Errorf("state %+v, %d guard bits", s, w.Guard)
	}
	near(t, "step over noise", w.States[0].StepOverStd, 1.0/16/d.Noise.Std[0], 1e-12)

	common, err := estimator.RoundWords(m, d, estimator.WordOptions{Bits: 8, Common: true, States: []estimator.Point{{Integer: 1, Fraction: 6}}})
	if err != nil {
		t.Fatal(err)
	}
	if common.A.String() != "Q1.6" || common.Gain != common.A || common.Poles[0].Distance > 1e-15 {
		t.Errorf("points %v, %v, distance %g", common.A, common.Gain, common.Poles[0].Distance)
	}
	if !common.States[0].Overflows {
		t.Error("a reach of 4 in a word up to 2 overflows nothing")
	}
	folded, err := estimator.RoundWords(m, d, estimator.WordOptions{Bits: 8, Folded: true})
	if err != nil {
		t.Fatal(err)
	}
	// F is 0.95 − 0.45, a little off 1/2 in float64
	if folded.Poles[0].To != 0.5 {
		t.Errorf("folded pole %v", folded.Poles[0].To)
	}
}

// A gain too small for the common word is lost, and with it the estimator's hold
// on an integrator.
func TestLostEntriesLoseStability(t *testing.T) {
	m, d := single(t, 1, 0.001)
	w, err := estimator.RoundWords(m, d, estimator.WordOptions{Bits: 8, Common: true})
	if err != nil {
		t.Fatal(err)
	}
	if w.Lost != 1 || w.Stable || !math.IsNaN(w.Settle) {
		t.Errorf("%d lost, stable %v, settle %g", w.Lost, w.Stable, w.Settle)
	}
	short, err := estimator.SmallestWord(m, d, estimator.WordOptions{Common: true}, estimator.WordLimits{Shift: 1})
	if err != nil {
		t.Fatal(err)
	}
	// Q1.n: 0.001·2ⁿ rounds to 1 or more from n = 9 on (0.512); 11 bits in all
	if short.Bits != 11 || !short.Stable {
		t.Errorf("%d bits", short.Bits)
	}
}

// discreteDesign is the best linear estimator of a drawn model.
func discreteDesign(t *rapid.T) (*estimator.Model, *estimator.Design) {
	m := anyModel(t)
	if !m.Discrete() {
		m.Period = 0.1
		m.A.Scale(0.5, m.A)
	}
	m.K.Scale(0.1, m.K)
	o := estimator.Options{}
	if rapid.Bool().Draw(t, "current") {
		o.Form = estimator.Current
	}
	designer, err := estimator.NewDesigner(m, o)
	if err != nil {
		t.Fatal(err)
	}
	floor := designer.Analysis().Floor
	if floor == nil {
		t.Skip("no best linear estimator")
	}
	d, err := designer.Judge(estimator.Given{L: floor.Gain})
	if errors.Is(err, estimator.ErrMethod) {
		t.Skip("A is singular")
	}
	if err != nil {
		t.Fatal(err)
	}
	if d.EigenvectorCondition > 1e4 || math.IsNaN(d.EigenvectorCondition) {
		t.Skip("ill-conditioned")
	}
	if lf := d.GainCurrent; o.Form == estimator.Current && mat.Norm(lf, 2) > 100 {
		t.Skip("A is nearly singular, so that A Lf = L is ill-conditioned")
	}
	for _, v := range d.Reached {
		if cmplx.Abs(v) < 1e-3 {
			t.Skip("a pole close to 0 moves far, relatively")
		}
	}
	return m, d
}

// The shortest word keeps the limits, so does every longer one, and the next
// shorter one does not.
func TestSmallestWordIsTheSmallest(t *testing.T) {
	rapid.Check(t, func(t *rapid.T) {
		m, d := discreteDesign(t)
		o := estimator.WordOptions{Common: rapid.Bool().Draw(t, "common"), Folded: rapid.Bool().Draw(t, "folded")}
		const limit = 1e-3
		w, err := estimator.SmallestWord(m, d, o, estimator.WordLimits{Shift: limit})
		if errors.Is(err, estimator.ErrWord) {
			t.Skip("no word")
		}
		if err != nil {
			t.Fatal(err)
		}
		keeps := func(bits int) bool {
			o.Bits = bits
			w, err := estimator.RoundWords(m, d, o)
			if err != nil {
				t.Fatal(err)
			}
			farthest := 0.0
			for _, s := range w.Poles {
				if cmplx.Abs(s.From) > 0.1 || cmplx.Abs(s.To) > 0.1 {
					farthest = max(farthest, s.Distance/max(cmplx.Abs(s.From), 0.1))
				}
				if s.Relative > w.Poles[w.Worst].Relative {
					t.Errorf("pole %v moves more than the worst", s.From)
				}
			}
			return w.Stable && farthest <= limit && (w.Loop == nil || w.Loop.Stable)
		}
		if !keeps(w.Bits) || !keeps(min(w.Bits+3, estimator.MaxWord)) || !keeps(estimator.MaxWord) {
			t.Errorf("%d bits do not keep the limit", w.Bits)
		}
		if w.Bits > estimator.MinWord && keeps(w.Bits-1) {
			t.Errorf("%d bits keep the limit too", w.Bits-1)
		}
	})
}

// The loop of rounded numbers on the plant as modelled, prediction form without
// feedthrough: [[A, −BK], [L C, Â − B̂K − L̂ Ĉ]] with the firmware's rounded Â, B̂,
// Ĉ, L̂.
func TestRoundedLoopHasItsOwnPoles(t *testing.T) {
	rapid.Check(t, func(t *rapid.T) {
		m, d := discreteDesign(t)
		if d.Form == estimator.Current || !d.Loop.Stable {
			t.Skip("another form, or no loop")
		}
		w, err := estimator.RoundWords(m, d, estimator.WordOptions{Bits: 14})
		if err != nil {
			t.Fatal(err)
		}
		if w.Loop == nil {
			t.Fatal("the loop was not judged")
		}
		round := func(q estimator.Point, a *mat.Dense) *mat.Dense {
			out := mat.DenseCopyOf(a)
			out.Apply(func(_, _ int, v float64) float64 { r, _ := q.Round(v); return r }, out)
			return out
		}
		a, b, c, l := round(w.A, m.A), round(w.B, m.B), round(w.C, m.C), round(w.Gain, d.Gain)
		n, _, _ := m.Dims()
		var bk, brk, lc, lrc mat.Dense
		bk.Mul(m.B, m.K)
		brk.Mul(b, m.K)
		lc.Mul(l, m.C)
		lrc.Mul(l, c)
		whole := mat.NewDense(2*n, 2*n, nil)
		for i := range n {
			for j := range n {
				whole.Set(i, j, m.A.At(i, j))
				whole.Set(i, n+j, -bk.At(i, j))
				whole.Set(n+i, j, lc.At(i, j))
				whole.Set(n+i, n+j, a.At(i, j)-brk.At(i, j)-lrc.At(i, j))
			}
		}
		var e mat.Eigen
		e.Factorize(whole, mat.EigenNone)
		sum, product := complex128(0), complex128(0)
		for _, v := range e.Values(nil) {
			sum, product = sum+v, product+v*v
		}
		for _, v := range w.Loop.Poles {
			sum, product = sum-v, product-v*v
		}
		if math.Abs(real(sum)) > 1e-10*float64(n) || math.Abs(real(product)) > 1e-9*float64(n)*(1+d.GainNorm) {
			t.Errorf("the poles differ: their sum by %v, that of their squares by %v", sum, product)
		}
	})
}

// The longest words round nothing that matters; Float32Poles names the pole that
// the design's own figure is about.
func TestLongWordsAndFloat32(t *testing.T) {
	rapid.Check(t, func(t *rapid.T) {
		m, d := discreteDesign(t)
		w, err := estimator.RoundWords(m, d, estimator.WordOptions{Bits: 64})
		if err != nil {
			t.Fatal(err)
		}
		if s := w.Poles[w.Worst].Relative; s > 1e-13*d.EigenvectorCondition*(1+d.GainNorm)*10 {
			t.Errorf("64 bits move a pole by %g", s)
		}
		shifts, worst, err := estimator.Float32Poles(m, d)
		if err != nil {
			t.Fatal(err)
		}
		if got := shifts[worst].Relative; math.Abs(got-d.Float32Shift) > 1e-6*d.Float32Shift+1e-13 {
			t.Errorf("float32 moves %v by %g, the design says %g", shifts[worst].From, got, d.Float32Shift)
		}
	})
}

// Fewer bits, more bias: the rounded estimator no longer has the plant's own gain.
func TestRoundingLeavesABias(t *testing.T) {
	m := &estimator.Model{Period: 0.1, A: mat.NewDense(1, 1, []float64{0.7}), B: mat.NewDense(1, 1, []float64{0.3}),
		C: mat.NewDense(1, 1, []float64{1}), K: mat.NewDense(1, 1, []float64{0.1}), Q: unit(1), R: unit(1)}
	d, err := newDesigner(t, m, estimator.Options{}).Place([]complex128{0.4}, nil)
	if err != nil {
		t.Fatal(err)
	}
	w, err := estimator.RoundWords(m, d, estimator.WordOptions{Bits: 8})
	if err != nil {
		t.Fatal(err)
	}
	// Â = 90/128, B̂ = 77/256, L̂ = 77/256 (0.3 each), K = 0.1: x = 0.7 x + 0.3 u,
	// x̂ = Â x̂ + B̂ u + L̂ (x − x̂), u = r − 0.1 x̂; for r = 1 x = u and
	// x̂ (1 − Â + L̂) = (B̂ + L̂) u = x̂ (1 − 90/128 + 77/256) ⇒ x̂ = (154/153) u
	u := 1 / (1 + 0.1*154.0/153)
	near(t, "bias", w.Loop.Bias.At(0, 0), u-u*154/153, 1e-9)
}

func TestBadWordStudies(t *testing.T) {
	m, d := single(t, 0.95, 0.45)
	ok := estimator.WordOptions{Bits: 16}
	if _, err := estimator.RoundWords(m, d, ok); err != nil {
		t.Fatal(err)
	}
	continuous := *m
	continuous.Period = 0
	broken := *d
	broken.Gain = mat.NewDense(1, 1, []float64{math.NaN()})
	wide := *d
	wide.Gain = mat.NewDense(2, 1, nil)
	current := *d
	current.Form, current.GainCurrent = estimator.Current, nil
	for name, c := range map[string]struct {
		m    *estimator.Model
		d    *estimator.Design
		o    estimator.WordOptions
		want error
	}{
		"no model":      {nil, d, ok, estimator.ErrShape},
		"continuous":    {&continuous, d, ok, estimator.ErrMethod},
		"no design":     {m, nil, ok, estimator.ErrMethod},
		"empty design":  {m, &estimator.Design{}, ok, estimator.ErrMethod},
		"no Lf":         {m, &current, ok, estimator.ErrMethod},
		"NaN gain":      {m, &broken, ok, estimator.ErrNotFinite},
		"another gain":  {m, &wide, ok, estimator.ErrShape},
		"short word":    {m, d, estimator.WordOptions{Bits: 7}, estimator.ErrMethod},
		"long word":     {m, d, estimator.WordOptions{Bits: 65}, estimator.ErrMethod},
		"headroom":      {m, d, estimator.WordOptions{Bits: 8, Headroom: math.NaN()}, estimator.ErrNotFinite},
		"inputs":        {m, d, estimator.WordOptions{Bits: 8, InputSize: []float64{1, 1}}, estimator.ErrShape},
		"NaN input":     {m, d, estimator.WordOptions{Bits: 8, InputSize: []float64{math.NaN()}}, estimator.ErrNotFinite},
		"state points":  {m, d, estimator.WordOptions{Bits: 8, States: make([]estimator.Point, 2)}, estimator.ErrShape},
		"far off point": {m, d, estimator.WordOptions{Bits: 8, States: []estimator.Point{{Integer: math.MaxInt}}}, estimator.ErrMethod},
	} {
		if _, err := estimator.RoundWords(c.m, c.d, c.o); !errors.Is(err, c.want) {
			t.Errorf("%s: %v", name, err)
		}
	}
	for _, l := range []estimator.WordLimits{{}, {Shift: math.NaN()}, {Shift: 1, Settle: -1}, {Shift: 1, NearZero: math.NaN()}} {
		if _, err := estimator.SmallestWord(m, d, ok, l); !errors.Is(err, estimator.ErrMethod) {
			t.Errorf("limits %+v: %v", l, err)
		}
	}
	if w, err := estimator.SmallestWord(m, d, ok, estimator.WordLimits{Shift: 1e-300}); err == nil && w.Poles[0].Distance != 0 || err != nil && (!errors.Is(err, estimator.ErrWord) || w == nil) {
		t.Errorf("a limit beyond float64: %v, %v", w, err)
	}
}

// Whatever the numbers, there is an answer or an error.
func TestWordsOfWildDesigns(t *testing.T) {
	rapid.Check(t, func(t *rapid.T) {
		m := wildModel(t)
		m.Period = 0.1
		d, err := estimator.NewDesigner(m, estimator.Options{})
		if err != nil {
			return
		}
		n, _, p := m.Dims()
		l := mat.NewDense(n, p, nil)
		l.Apply(func(_, _ int, _ float64) float64 { return math.Pow(10, rapid.Float64Range(-9, 9).Draw(t, "L")) }, l)
		got, err := d.Judge(estimator.Given{L: l})
		if err != nil {
			return
		}
		o := estimator.WordOptions{Bits: rapid.IntRange(8, 64).Draw(t, "bits"), Common: rapid.Bool().Draw(t, "common")}
		w, err := estimator.RoundWords(m, got, o)
		if err != nil {
			return
		}
		for _, q := range []estimator.Point{w.A, w.B, w.C, w.Gain, w.States[0].Point} {
			if q.Bits() != o.Bits {
				t.Errorf("%v in a word of %d bits", q, o.Bits)
			}
		}
		if s := w.Poles[w.Worst].Relative; math.IsNaN(s) || w.Stable && math.IsNaN(w.Settle) && w.Poles[w.Worst].Distance == 0 {
			t.Errorf("%+v", w)
		}
	})
}

// Three poles at 0 spread at the slightest rounding, but stay harmless there.
func TestWordsOfDeadbeat(t *testing.T) {
	m := &estimator.Model{Period: 0.1, A: mat.NewDense(3, 3, []float64{0.9, 0.1, 0, 0, 0.8, 0.1, 0, 0, 0.7}), C: mat.NewDense(1, 3, []float64{1, 0, 0}), Q: unit(3), R: unit(1)}
	d, err := newDesigner(t, m, estimator.Options{}).Place(make([]complex128, 3), nil)
	if err != nil {
		t.Fatal(err)
	}
	w, err := estimator.SmallestWord(m, d, estimator.WordOptions{}, estimator.WordLimits{Shift: 0.01})
	if err != nil {
		t.Fatal(err)
	}
	for _, s := range w.Poles {
		if cmplx.Abs(s.To) > 0.1 || s.Relative != s.Distance {
			t.Errorf("%+v", s)
		}
	}
	if w.Bits > 20 {
		t.Errorf("%d bits", w.Bits)
	}
	tight, err := estimator.SmallestWord(m, d, estimator.WordOptions{}, estimator.WordLimits{Shift: 0.01, NearZero: 1e-3})
	if err != nil || tight.Bits < w.Bits+15 { // a third root: 1/100 less takes 20 bits more
		t.Errorf("poles held within 1e-3 of 0: %v, %v", tight, err)
	}
}
