package ratio_test

import (
	"fmt"
	"math"
	"math/rand/v2"
	"testing"

	"gonum.org/v1/gonum/mat"

	"polewright/estimator/internal/frequency"
	"polewright/estimator/internal/ratio"
)

type loop struct {
	a, b, c      *mat.Dense
	d            float64
	open, closed []complex128
	period       float64
}

// drawLoop draws a loop that is stable when closed.
func drawLoop(r *rand.Rand, n int, discrete bool) *loop {
	draw := func(rows, cols int) *mat.Dense {
		m := mat.NewDense(rows, cols, nil)
		m.Apply(func(_, _ int, _ float64) float64 { return r.NormFloat64() }, m)
		return m
	}
	for {
		l := &loop{a: draw(n, n), b: draw(n, 1), c: draw(1, n)}
		if discrete {
			l.period = 0.1
			l.a.Scale(1.1/math.Sqrt(float64(n)), l.a)
			l.d = r.NormFloat64() / 3
		} else {
			for i := range n {
				l.a.Set(i, i, l.a.At(i, i)-math.Sqrt(float64(n)))
			}
		}
		var bc mat.Dense
		bc.Mul(l.b, l.c)
		bc.Scale(1/(1+l.d), &bc)
		bc.Sub(l.a, &bc)
		l.open, l.closed = values(l.a), values(&bc)
		stable := true
		for _, v := range l.closed {
			if discrete && math.Hypot(real(v), imag(v)) > 0.98 || !discrete && real(v) > -0.02 {
				stable = false
			}
		}
		if stable {
			return l
		}
	}
}

func values(a *mat.Dense) []complex128 {
	var e mat.Eigen
	if !e.Factorize(a, mat.EigenNone) {
		panic("no eigenvalues")
	}
	return e.Values(nil)
}

// The margins agree with those found on the Hessenberg form, whose crossings come from
// Hamiltonian matrices (internal/frequency), and whole delays with the eigenvalues of
// the loop with as many registers.
func TestAgainstHamiltonianCrossings(t *testing.T) {
	r := rand.New(rand.NewPCG(5, 6))
	var s ratio.Sensitivity
	for k := range 400 {
		discrete := k%2 == 1
		l := drawLoop(r, 1+k%9, discrete)
		if err := s.Reset(l.open, l.closed, 1/(1+l.d), discrete); err != nil {
			t.Fatal(err)
		}
		got := s.Margins()
		want, err := frequency.Margins(frequency.System{A: l.a.RawMatrix(), B: l.b.RawMatrix(), C: l.c.RawMatrix(),
			D: mat.NewDense(1, 1, []float64{l.d}).RawMatrix(), Period: l.period})
		if err != nil {
			t.Fatal(err)
		}
		near := func(what string, got, want float64) {
			t.Helper()
			if math.IsInf(got, 0) && math.IsInf(want, 0) {
				return
			}
			if !(math.Abs(got-want) <= 1e-6*math.Abs(want)) {
				t.Errorf("loop %d: %s is %.12g, expected %.12g", k, what, got, want)
			}
		}
		near("peak", got.Peak, want.SensitivityPeak)
		near("gain above", 20*math.Log10(got.GainAbove), want.GainAboveDB)
		near("gain below", 20*math.Log10(got.GainBelow), want.GainBelowDB)
		near("phase", got.Phase*180/math.Pi, want.PhaseDeg)
		delay := got.Delay
		if discrete {
			delay *= l.period
		}
		near("delay", delay, want.DelayS)
		if discrete {
			if have, want := s.WholeDelay(12), l.wholeDelay(12); have != want {
				t.Errorf("loop %d: whole delay %d, expected %d", k, have, want)
			}
		}
	}
}

// wholeDelay judges by eigenvalues.
func (l *loop) wholeDelay(limit int) int {
	n, _ := l.a.Dims()
	for d := 1; d <= limit; d++ {
		a := mat.NewDense(n+d, n+d, nil)
		a.Slice(0, n, 0, n).(*mat.Dense).Copy(l.a)
		for i := range n {
			a.Set(i, n+d-1, l.b.At(i, 0))
			a.Set(n, i, -l.c.At(0, i))
		}
		a.Set(n, n+d-1, -l.d)
		for i := 1; i < d; i++ {
			a.Set(n+i, n+i-1, 1)
		}
		for _, v := range values(a) {
			if math.Hypot(real(v), imag(v)) >= 1 {
				return d - 1
			}
		}
	}
	return limit
}

func TestRefuses(t *testing.T) {
	var s ratio.Sensitivity
	nan := complex(math.NaN(), 0)
	for _, c := range []struct {
		open, closed []complex128
		factor       float64
		discrete     bool
	}{
		{nil, nil, 1, false},
		{[]complex128{1}, []complex128{-1, -2}, 1, false},
		{[]complex128{nan}, []complex128{-1}, 1, false},
		{[]complex128{1}, []complex128{-1e200}, 1, false},
		{[]complex128{1}, []complex128{0}, 1, false},
		{[]complex128{1}, []complex128{1}, 1, true},
		{[]complex128{1}, []complex128{-1}, math.Inf(1), false},
	} {
		if s.Reset(c.open, c.closed, c.factor, c.discrete) == nil {
			t.Errorf("%v was taken", c)
		}
	}
}

// Poles far apart, on the limit, and repeated: a double integrator under control, by
// hand L = (2s + 1)/s²: unit gain at w² = 2 + √5.
func TestDoubleIntegrator(t *testing.T) {
	var s ratio.Sensitivity
	if err := s.Reset([]complex128{0, 0}, []complex128{-1, -1}, 1, false); err != nil {
		t.Fatal(err)
	}
	got := s.Margins()
	w := math.Sqrt(2 + math.Sqrt(5))
	phase := math.Atan2(2*w, 1) // of 1 + 2jw; −w² turns by π
	if math.Abs(got.Phase-phase) > 1e-12 || math.Abs(got.Delay-phase/w) > 1e-12 {
		t.Errorf("phase %.15g, delay %.15g, expected %.15g and %.15g", got.Phase, got.Delay, phase, phase/w)
	}
	if got.GainBelow != 0 || !math.IsInf(got.GainAbove, 1) {
		t.Errorf("gain margins %g, %g, expected none", got.GainBelow, got.GainAbove)
	}
	// |S|² = w⁴/(1 + w²)² < 1: the limit at infinity
	if got.Peak != 1 {
		t.Errorf("peak %g, expected 1", got.Peak)
	}
}

func BenchmarkMargins(b *testing.B) {
	for _, n := range []int{8, 20, 40, 100} {
		b.Run(fmt.Sprint(n), func(b *testing.B) {
			l := drawLoop(rand.New(rand.NewPCG(3, uint64(n))), n, false)
			var s ratio.Sensitivity
			b.ReportAllocs()
			for b.Loop() {
				if err := s.Reset(l.open, l.closed, 1, false); err != nil {
					b.Fatal(err)
				}
				sink = s.Margins()
			}
		})
	}
}

var sink ratio.Margins
