package logs

import (
	"math"
	"math/rand/v2"
	"strconv"
	"testing"

	"pgregory.net/rapid"
)

// plainMoments is the definition, with everything kept: NaN marks what is left out.
func plainMoments(list []float64) moments {
	var m moments
	sum := 0.0
	for _, v := range list {
		if v == v {
			m.count++
			sum += v
		}
	}
	m.mean = sum / float64(m.count)
	for j := range m.covariance {
		for k := j; k < len(list); k++ {
			broken := false
			for i := k - j; i <= k; i++ {
				broken = broken || list[i] != list[i]
			}
			if !broken {
				m.covariance[j] += (list[k] - m.mean) * (list[k-j] - m.mean)
				m.pairs[j]++
			}
		}
		m.covariance[j] /= float64(m.pairs[j])
	}
	m.variance = m.covariance[0]
	return m
}

func streamed(list []float64) moments {
	var s series
	for _, v := range list {
		if v != v {
			s.stop()
			continue
		}
		s.add(v)
	}
	return s.finish()
}

func TestSeriesIsTheDefinition(t *testing.T) {
	rapid.Check(t, func(t *rapid.T) {
		n := rapid.IntRange(0, 120).Draw(t, "n")
		offset := rapid.SampledFrom([]float64{0, 1, -1e4}).Draw(t, "offset")
		loss := rapid.SampledFrom([]float64{0, 0.02, 0.3, 1}).Draw(t, "loss")
		rng := rand.New(rand.NewPCG(rapid.Uint64().Draw(t, "seed"), 1))
		list, slow := make([]float64, n), 0.0
		for k := range list {
			slow = 0.9*slow + rng.NormFloat64()
			list[k] = offset + slow
			if rng.Float64() < loss {
				list[k] = math.NaN()
			}
		}
		want, have := plainMoments(list), streamed(list)
		close := func(what string, a, b, tolerance float64) {
			if !(math.Abs(a-b) <= tolerance || a != a && b != b) {
				t.Fatalf("%s: %g, want %g", what, a, b)
			}
		}
		if have.count != want.count || have.pairs != want.pairs {
			t.Fatalf("%v pairs, want %v", have.pairs, want.pairs)
		}
		close("mean", have.mean, want.mean, 1e-14*math.Abs(offset)+1e-13)
		for j := range want.covariance {
			close("covariance", have.covariance[j], want.covariance[j], 1e-12*(1+math.Abs(offset)))
		}
	})
}

// Ten million terms with a mean a million times the spread: x = 1e6 ± 1 in turn
// has the variance 1 and the autocorrelation (−1)ʲ.
func TestSeriesOfManyTerms(t *testing.T) {
	n := 10_000_000
	if testing.Short() {
		n = 1_000_000
	}
	var s series
	for k := range n {
		s.add(1e6 + float64(k%2*2-1))
	}
	m := s.finish()
	if m.mean != 1e6 || math.Abs(m.variance-1) > 1e-12 {
		t.Errorf("mean %.17g, variance %.17g", m.mean, m.variance)
	}
	for j, v := range m.autocorrelation() {
		want := float64(j%2*2-1) * float64(n-j-1) / float64(n)
		if math.Abs(v-want) > 1e-12 {
			t.Errorf("lag %d: %.17g, want %.17g", j+1, v, want)
		}
	}
	// A tenth has no exact double: plain addition of 1e7 terms is off by 1e-4 of
	// one term and more.
	var x sum
	for range n {
		x.add(0.1)
	}
	if want := 0.1 * float64(n); math.Abs(x.value()/want-1) > 1e-13 {
		t.Errorf("sum %.17g, want %.17g", x.value(), want)
	}
}

func TestChiSquareQuantile(t *testing.T) {
	// scipy.stats.chi2.ppf(level, k) / k, SciPy 1.10.
	for _, c := range []struct{ level, degrees, want float64 }{
		{0.025, 1, 0.0009820691171752555},
		{0.975, 1, 5.023886187314888},
		{0.025, 360, 0.8592438923475346},
		{0.975, 9999, 1.0279084228679816},
		{0.025, 10001, 0.972473204525307},
		{0.975, 10001, 1.0279056133211921},
		{0.025, 2e7, 0.9993802996884268},
		{0.975, 2e7, 1.00061988974216},
	} {
		if v := chiSquareQuantile(c.level, c.degrees); math.Abs(v/c.want-1) > 1e-7 {
			t.Errorf("level %g, %g degrees: %.12g, want %.12g", c.level, c.degrees, v, c.want)
		}
	}
	if v := chiSquareQuantile(0.5, math.NaN()); v == v {
		t.Errorf("%g for no degrees of freedom", v)
	}
}

func TestNumber(t *testing.T) {
	for text, want := range map[string]float64{
		"": math.NaN(), "  ": math.NaN(), "nan": math.NaN(), "NaN": math.NaN(), "0": 0, "-0": 0, "+1.5": 1.5, ".5": 0.5, "5.": 5,
		"1e3": 1000, "1E-3": 0.001, "0.1": 0.1, "123456789012345678901234567890": 123456789012345678901234567890,
		"0.30000000000000004": 0.30000000000000004, "1e-400": 0, "1.7976931348623157e308": math.MaxFloat64, "4.9e-324": 5e-324,
		"00000000000000000000000012": 12, "0.000000000000000000000000000000012": 1.2e-32,
	} {
		if v, ok := number([]byte(text)); !ok || v != want && want == want || (v != v) != (want != want) {
			t.Errorf("%q: %g %v, want %g", text, v, ok, want)
		}
	}
	for _, text := range []string{"-", ".", "e5", "1e", "1e+", "1.2.3", "1 2", "0x1", "1_000", "inf", "Infinity", "1e999", "-nan", "nanx", "1,5", "１"} {
		if v, ok := number([]byte(text)); ok {
			t.Errorf("%q gives %g", text, v)
		}
	}
}

// Where strconv reads a decimal number, the fast way gives the same bits.
func TestNumberAgainstStrconv(t *testing.T) {
	same := func(t interface{ Fatalf(string, ...any) }, text string) {
		want, err := strconv.ParseFloat(text, 64)
		have, ok := number([]byte(text))
		if ok != (err == nil) || ok && math.Float64bits(have) != math.Float64bits(want) {
			t.Fatalf("%q: %v %v, want %v %v", text, have, ok, want, err)
		}
	}
	rng := rand.New(rand.NewPCG(61, 62))
	for range 50000 {
		v := math.Ldexp(rng.Float64()-0.5, rng.IntN(60)-40)
		same(t, strconv.FormatFloat(v, 'g', -1, 64))
		same(t, strconv.FormatFloat(v, 'f', rng.IntN(22), 64))
		// Half way between two neighbours, and beside it.
		m := rng.Uint64()>>10 | 1<<53
		same(t, strconv.FormatUint(m, 10)+".5e"+strconv.Itoa(-rng.IntN(30)))
		same(t, strconv.FormatUint(m<<1|1, 10)+"e-"+strconv.Itoa(rng.IntN(30)))
	}
	rapid.Check(t, func(t *rapid.T) {
		same(t, rapid.StringMatching(`[+-]?[0-9]{0,24}\.?[0-9]{1,24}([eE][+-]?[0-9]{1,3})?`).Draw(t, "text"))
	})
}

func BenchmarkNumber(b *testing.B) {
	for _, text := range []string{"12.345", "-0.0123456", "0.30000000000000004"} {
		field := []byte(text)
		b.Run(text, func(b *testing.B) {
			for b.Loop() {
				_, _ = number(field)
			}
		})
		b.Run(text+" by strconv", func(b *testing.B) {
			for b.Loop() {
				_, _ = strconv.ParseFloat(string(field), 64)
			}
		})
	}
}
