package poles_test

import (
	"math"
	"math/cmplx"
	"testing"

	"pgregory.net/rapid"

	"polewright/estimator/poles"
)

// closedList draws real poles and pairs with repeats.
func closedList(t *rapid.T, most int) []complex128 {
	part := rapid.OneOf(rapid.Float64Range(-1e3, 1e3), rapid.Float64(), rapid.SampledFrom([]float64{0, -1, -2, 3}))
	finite := part.Filter(func(v float64) bool { return !math.IsInf(v, 0) && !math.IsNaN(v) })
	var list []complex128
	for range rapid.IntRange(1, most).Draw(t, "entries") {
		re, im := finite.Draw(t, "re"), finite.Draw(t, "im")
		if im == 0 || rapid.Bool().Draw(t, "real") {
			list = append(list, complex(re, 0))
		} else {
			list = append(list, complex(re, im), complex(re, -im))
		}
	}
	return rapid.Permutation(list).Draw(t, "order")
}

func TestFormatListReadsBack(t *testing.T) {
	rapid.Check(t, func(t *rapid.T) {
		list := closedList(t, 10)
		text := poles.FormatList(list)
		spec, err := poles.Parse(text)
		if err != nil {
			t.Fatalf("%v as %q: %v", list, text, err)
		}
		sameMultiset(t, list, spec.Poles)
		for _, v := range list {
			if imag(v) == 0 {
				if one, err := poles.ParseOne(poles.Format(v)); err != nil || one[0] != v {
					t.Fatalf("%v as %q: %v, %v", v, poles.Format(v), one, err)
				}
			}
		}
	})
}

func TestPlanesAreInverse(t *testing.T) {
	rapid.Check(t, func(t *rapid.T) {
		period := math.Exp(rapid.Float64Range(-9, 3).Draw(t, "period"))
		s := complex(rapid.Float64Range(-8, 2).Draw(t, "re"), rapid.Float64Range(-3.1, 3.1).Draw(t, "im")) / complex(period, 0)
		z := poles.ToZ(s, period)
		back, ok := poles.ToS(z, period)
		if !ok || cmplx.Abs(back-s) > 1e-13*(cmplx.Abs(s)+1/period) {
			t.Fatalf("%v at %v s becomes %v and %v", s, period, z, back)
		}
		if poles.CheckSampling([]complex128{s}, period) != nil {
			t.Fatalf("%v refused", s)
		}
		d, c := poles.Describe(z, period), poles.Describe(s, 0)
		if math.Abs(d.Frequency-c.Frequency) > 1e-12*(c.Frequency+1/period) || !math.IsNaN(c.TimeConstantSamples) {
			t.Fatalf("%+v and %+v", d, c)
		}
	})
}

func TestToSNearTheUnitCircle(t *testing.T) {
	// ln(1 − 2^-40) = −2^-40 − 2^-81 − …
	s, ok := poles.ToS(complex(1-math.Pow(2, -40), 0), 1)
	if want := -math.Pow(2, -40) - math.Pow(2, -81); !ok || math.Abs(real(s)/want-1) > 1e-15 {
		t.Errorf("%v", s)
	}
	if _, ok := poles.ToS(0, 1); ok {
		t.Error("z = 0 has a place in the s-plane")
	}
}

func TestDescribe(t *testing.T) {
	inf := math.Inf(1)
	nan := math.NaN()
	for _, c := range []struct {
		p      complex128
		period float64
		want   poles.Description
	}{
		{-3 + 4i, 0, poles.Description{Frequency: 5, Damping: 0.6, TimeConstant: 1. / 3, TimeConstantSamples: nan}},
		{-2, 0, poles.Description{Frequency: 2, Damping: 1, TimeConstant: 0.5, TimeConstantSamples: nan}},
		{2i, 0, poles.Description{Frequency: 2, Damping: 0, TimeConstant: inf, TimeConstantSamples: nan}},
		{2, 0, poles.Description{Frequency: 2, Damping: -1, TimeConstant: -0.5, TimeConstantSamples: nan}},
		{0, 0, poles.Description{Frequency: 0, Damping: nan, TimeConstant: inf, TimeConstantSamples: nan}},
		{0, 0.1, poles.Description{Frequency: inf, Damping: nan}},
		{1, 0.1, poles.Description{Frequency: 0, Damping: nan, TimeConstant: inf, TimeConstantSamples: inf}},
		{complex(math.Exp(-0.5), 0), 0.1, poles.Description{Frequency: 5, Damping: 1, TimeConstant: 0.2, TimeConstantSamples: 2}},
	} {
		d := poles.Describe(c.p, c.period)
		for k, pair := range [][2]float64{{d.Frequency, c.want.Frequency}, {d.Damping, c.want.Damping},
			{d.TimeConstant, c.want.TimeConstant}, {d.TimeConstantSamples, c.want.TimeConstantSamples}} {
			have, want := pair[0], pair[1]
			if have != want && !(math.Abs(have-want) < 1e-14*math.Abs(want)) && !(math.IsNaN(have) && math.IsNaN(want)) {
				t.Errorf("%v at %v s: figure %d is %v, want %v", c.p, c.period, k, have, want)
			}
		}
	}
}

func TestCheckSampling(t *testing.T) {
	edge, _ := poles.ToS(-0.5, 0.1)
	if err := poles.CheckSampling([]complex128{-1, edge}, 0.1); err != nil {
		t.Error(err)
	}
	err := poles.CheckSampling([]complex128{-1, -3 + 40i}, 0.1)
	if want := "pole -3+40i: beyond the sampling limit; expected |Im s| up to π/period = 31.4159 rad/s"; err == nil || err.Error() != want {
		t.Errorf("%v", err)
	}
	if err := poles.CheckSampling([]complex128{-3 + 40i}, 0); err != nil {
		t.Error(err)
	}
}

func TestFaster(t *testing.T) {
	list, err := poles.Faster([]complex128{-1, 2 + 3i, 2 - 3i}, 3)
	if err != nil || list[0] != -3 || list[1] != -6+9i || list[2] != -6-9i {
		t.Errorf("%v, %v", list, err)
	}
	for _, c := range []struct {
		base []complex128
		k    float64
		want string
	}{
		{[]complex128{-1, 0}, 2, "pole 0: on the stability limit, no factor makes it stable; expected poles off the imaginary axis"},
		{[]complex128{1e-10 + 1i}, 2, "pole 1e-10+1i: on the stability limit, no factor makes it stable; expected poles off the imaginary axis"},
		{[]complex128{-1}, 0, "factor 0: not above zero; expected a factor like 3"},
		{[]complex128{-1}, math.NaN(), "factor NaN: not above zero; expected a factor like 3"},
		{[]complex128{-1e300}, 1e300, "pole -1e+300 times 1e+300: not finite; expected finite numbers"},
	} {
		if list, err := poles.Faster(c.base, c.k); err == nil || err.Error() != c.want {
			t.Errorf("%v: %v, %v", c.base, list, err)
		}
	}
}

func TestConjugateClosed(t *testing.T) {
	if err := poles.ConjugateClosed([]complex128{-1, 2i, -2i}); err != nil {
		t.Error(err)
	}
	for _, list := range [][]complex128{{2i}, {2i, -2i, 2i}, {cmplx.NaN()}, {cmplx.Inf()}} {
		if poles.ConjugateClosed(list) == nil {
			t.Errorf("%v passes", list)
		}
	}
}
