package frequency

import (
	"errors"
	"math"
	"math/rand/v2"
	"testing"

	"gonum.org/v1/gonum/blas/blas64"
)

func gaussian(r *rand.Rand, a, b int) blas64.General {
	m := blas64.General{Rows: a, Cols: b, Stride: b, Data: make([]float64, a*b)}
	for i := range m.Data {
		m.Data[i] = r.NormFloat64()
	}
	return m
}

// abscissa is the largest real part of an eigenvalue, or the spectral radius.
func abscissa(t *testing.T, a dense, discrete bool) float64 {
	t.Helper()
	re, im, err := eigenvalues(a.clone())
	if err != nil {
		t.Fatal(err)
	}
	most := math.Inf(-1)
	for i, v := range re {
		if discrete {
			v = math.Hypot(v, im[i])
		}
		most = max(most, v)
	}
	return most
}

// setLimit shifts or scales a so that its abscissa or radius becomes limit.
func setLimit(t *testing.T, a blas64.General, limit float64, discrete bool) {
	t.Helper()
	now := abscissa(t, dense{a.Rows, a.Cols, a.Data}, discrete)
	for i := range a.Data {
		if discrete {
			a.Data[i] *= limit / now
		} else if i%(a.Cols+1) == 0 {
			a.Data[i] += limit - now
		}
	}
}

// TestPeakAgainstScan holds the peak against a scan over a grid, dense around
// each resonance, that ends in ever smaller steps uphill.
func TestPeakAgainstScan(t *testing.T) {
	for seed := range uint64(60) {
		r := rand.New(rand.NewPCG(seed, 9))
		n, in, out := 1+r.IntN(6), 1+r.IntN(3), 1+r.IntN(3)
		sys := System{A: gaussian(r, n, n), B: gaussian(r, n, in), C: gaussian(r, out, n), D: gaussian(r, out, in)}
		damp := math.Pow(10, -4*r.Float64())
		if seed%2 == 1 {
			sys.Period = 0.5
			setLimit(t, sys.A, 1-0.5*damp, true)
		} else {
			setLimit(t, sys.A, -damp, false)
		}
		if r.IntN(2) == 0 {
			sys.D = blas64.General{}
		}
		v, w, err := PeakGain(sys)
		if err != nil {
			t.Fatal(err)
		}
		m, err := read(sys)
		if err != nil {
			t.Fatal(err)
		}
		if err := m.toContinuous(); err != nil {
			t.Fatal(err)
		}
		rr, err := newResponse(m)
		if err != nil {
			t.Fatal(err)
		}
		best, where := max(rr.gain(0), rr.gain(math.Inf(1))), 0.0
		try := func(nu float64) bool {
			if nu <= 0 {
				return false
			}
			g := rr.gain(nu)
			if g > best {
				best, where = g, nu
				return true
			}
			return false
		}
		for i := range 2000 {
			try(1e-3 * math.Pow(1e6, float64(i)/2000))
		}
		for k := range rr.re {
			for i := -100; i <= 100; i++ {
				try(math.Abs(rr.im[k]) + rr.re[k]*float64(i)/20)
			}
		}
		for step := where * 2e-3; step > 1e-13*where; {
			if !try(where-step) && !try(where+step) {
				step /= 2
			}
		}
		if math.Abs(best/v-1) > 1e-9 {
			t.Errorf("seed %d: peak %.12g at %v rad/s, the scan finds %.12g", seed, v, w, best)
		}
	}
}

// closedWith is the closed loop with L multiplied by the complex factor, as a
// real matrix of twice the size.
func closedWith(sys System, re, im float64) dense {
	n := sys.A.Rows
	d := complex(0, 0)
	if sys.D.Rows > 0 {
		d = complex(sys.D.Data[0], 0)
	}
	k := complex(re, im)
	k /= 1 + k*d
	m := newDense(2*n, 2*n)
	for i := range n {
		for j := range n {
			bc := sys.B.Data[i] * sys.C.Data[j]
			a := sys.A.Data[i*n+j] - real(k)*bc
			m.row(i)[j], m.row(n + i)[n+j] = a, a
			m.row(i)[n+j], m.row(n + i)[j] = imag(k)*bc, -imag(k)*bc
		}
	}
	return m
}

// TestMarginsByEigenvalues checks what margins mean: within them the closed
// loop is stable, just beyond the nearest it is not.
func TestMarginsByEigenvalues(t *testing.T) {
	var loops, finite int
	for seed := range uint64(400) {
		r := rand.New(rand.NewPCG(seed, 11))
		n := 1 + r.IntN(6)
		discrete := seed%2 == 1
		sys := System{A: gaussian(r, n, n), B: gaussian(r, n, 1), C: gaussian(r, 1, n)}
		if r.IntN(3) == 0 {
			sys.D = gaussian(r, 1, 1)
			sys.D.Data[0] *= 0.3
		}
		limit := 0.0
		if discrete {
			sys.Period, limit = 0.5, 1
		}
		setLimit(t, sys.A, limit-0.2+0.22*r.Float64(), discrete) // a few are unstable in the open
		if !(abscissa(t, closedWith(sys, 1, 0), discrete) < limit-1e-3) {
			if _, err := Margins(sys); err == nil && abscissa(t, closedWith(sys, 1, 0), discrete) > limit {
				t.Errorf("seed %d: an unstable loop has margins", seed)
			}
			continue
		}
		loops++
		m, err := Margins(sys)
		if err != nil {
			t.Fatalf("seed %d: %v", seed, err)
		}
		stableAt := func(re, im float64) bool { return abscissa(t, closedWith(sys, re, im), discrete) < limit }
		low, high := math.Pow(10, m.GainBelowDB/20), math.Pow(10, m.GainAboveDB/20)
		for i := 1; i < 40; i++ {
			x := float64(i) / 40
			if !stableAt(1+(low-1)*x, 0) || !stableAt(1+(min(high, 50)-1)*x, 0) {
				t.Errorf("seed %d: unstable within the gain margins %v and %v", seed, low, high)
				break
			}
			phase := min(m.PhaseDeg*math.Pi/180, math.Pi) * x
			if s, c := math.Sincos(phase); !stableAt(c, s) || !stableAt(c, -s) {
				t.Errorf("seed %d: unstable at %v rad within the phase margin of %v°", seed, phase, m.PhaseDeg)
				break
			}
		}
		touches := func(re, im float64) bool { // an eigenvalue on the limit, or across it
			return abscissa(t, closedWith(sys, re, im), discrete) > limit-1e-7
		}
		if low > 0 && !touches(low, 0) || !math.IsInf(high, 1) && math.Abs(1+high*first(sys.D)) > 1e-6 && !touches(high, 0) {
			t.Errorf("seed %d: stable at the gain margins %v or %v", seed, low, high)
		}
		if !math.IsInf(m.PhaseDeg, 1) {
			finite++
			if s, c := math.Sincos(m.PhaseDeg * math.Pi / 180); !touches(c, s) && !touches(c, -s) {
				t.Errorf("seed %d: stable at the phase margin of %v°", seed, m.PhaseDeg)
			}
		}
		if m.GainBelowDB >= 0 || m.GainAboveDB <= 0 || m.DelayS <= 0 || m.SensitivityPeak < 1-1e-9 && sys.D.Rows == 0 {
			t.Errorf("seed %d: %+v", seed, m)
		}
		if v, err := SensitivityPeakMIMO(sys); err != nil || math.Abs(v-m.SensitivityPeak) > 1e-12*v {
			t.Errorf("seed %d: sensitivity %v and %v, %v", seed, m.SensitivityPeak, v, err)
		}
	}
	if loops < 100 || finite < 50 {
		t.Errorf("only %d loops, %d with a phase margin", loops, finite)
	}
	t.Logf("%d loops, %d with a phase margin", loops, finite)
}

// TestNarrowResonance closes the loop around L = g w²/(s² + 2ζws + w²),
// whose gain passes 1 twice within a sliver around w.
func TestNarrowResonance(t *testing.T) {
	const w = 40.0
	for _, z := range []float64{1e-2, 1e-4, 1e-6} {
		for _, over := range []float64{1.01, 1.5, 30} { // |L| at its top, nearly
			g := over * 2 * z
			sys := System{
				A: blas64.General{Rows: 2, Cols: 2, Stride: 2, Data: []float64{0, w, -w, -2 * z * w}},
				B: blas64.General{Rows: 2, Cols: 1, Stride: 1, Data: []float64{0, w}},
				C: blas64.General{Rows: 1, Cols: 2, Stride: 2, Data: []float64{g, 0}},
			}
			// with x = (ν/w)²: (1 − x)² + 4ζ²x = g², and −L = −g/(1 − x + 2ζ√x j)
			half, rest := 1-2*z*z, math.Sqrt(4*z*z*z*z-4*z*z+g*g)
			phase, delay := math.Inf(1), math.Inf(1)
			for _, x := range []float64{half - rest, half + rest} {
				angle := math.Pi - math.Atan2(2*z*math.Sqrt(x), 1-x)
				phase, delay = min(phase, angle*180/math.Pi), min(delay, angle/(w*math.Sqrt(x)))
			}
			m, err := Margins(sys)
			tol := 1e-9 + 1e-13/z // the matrix itself fixes the damping no better
			if err != nil || math.Abs(m.PhaseDeg/phase-1) > tol || math.Abs(m.DelayS/delay-1) > tol || !math.IsInf(m.GainAboveDB, 1) || !math.IsInf(m.GainBelowDB, -1) {
				t.Errorf("damping %v, %v: %+v, %v; want %v°, %v s", z, over, m, err, phase, delay)
			}
		}
	}
}

func TestPeakGainsByRow(t *testing.T) {
	for seed := range uint64(60) {
		r := rand.New(rand.NewPCG(seed, 13))
		n, out := 1+r.IntN(18), 1+r.IntN(4) // certified and scanned
		sys := System{A: gaussian(r, n, n), B: gaussian(r, n, 2), C: gaussian(r, out, n), D: gaussian(r, out, 2), Period: 0.1}
		setLimit(t, sys.A, 1-0.3*math.Pow(10, -3*r.Float64()), true)
		values, rads, err := PeakGains(sys)
		if err != nil || len(values) != out || len(rads) != out {
			t.Fatal(values, rads, err)
		}
		for i, v := range values {
			one := sys
			one.C = blas64.General{Rows: 1, Cols: n, Stride: n, Data: sys.C.Data[i*n:]}
			one.D = blas64.General{Rows: 1, Cols: 2, Stride: 2, Data: sys.D.Data[i*2:]}
			if want, _, err := PeakGain(one); err != nil || math.Abs(v-want) > 1e-9*want {
				t.Errorf("seed %d, output %d: %v, want %v, %v", seed, i, v, want, err)
			}
		}
	}
	if _, _, err := PeakGains(System{}); !errors.Is(err, ErrShape) {
		t.Error(err)
	}
}

func first(m blas64.General) float64 {
	if m.Rows == 0 {
		return 0
	}
	return m.Data[0]
}

func TestRefusals(t *testing.T) {
	one := func(v float64) blas64.General { return blas64.General{Rows: 1, Cols: 1, Stride: 1, Data: []float64{v}} }
	for _, c := range []struct {
		name string
		sys  System
		want error
	}{
		{"nothing", System{}, ErrShape},
		{"B too tall", System{A: one(-1), B: blas64.General{Rows: 2, Cols: 1, Stride: 1, Data: []float64{1, 1}}, C: one(1)}, ErrShape},
		{"short data", System{A: one(-1), B: blas64.General{Rows: 1, Cols: 1, Stride: 1}, C: one(1)}, ErrShape},
		{"NaN", System{A: one(math.NaN()), B: one(1), C: one(1)}, ErrNotFinite},
		{"period", System{A: one(-1), B: one(1), C: one(1), Period: math.Inf(1)}, ErrNotFinite},
		{"integrator", System{A: one(0), B: one(1), C: one(-1)}, ErrUnstable},
		{"growing", System{A: one(1), B: one(1), C: one(-1)}, ErrUnstable},
		{"on the circle", System{A: one(1), B: one(1), C: one(-1), Period: 1}, ErrUnstable},
		{"alternating for ever", System{A: one(-1), B: one(1), C: one(1), Period: 1}, ErrUnstable},
	} {
		if v, w, err := PeakGain(c.sys); !errors.Is(err, c.want) || !math.IsNaN(v) || !math.IsNaN(w) {
			t.Errorf("%s: peak %v, %v, %v", c.name, v, w, err)
		}
		if m, err := Margins(c.sys); !errors.Is(err, c.want) && c.want != ErrUnstable || err == nil || !math.IsNaN(m.PhaseDeg) {
			t.Errorf("%s: margins %+v, %v", c.name, m, err)
		}
		if v, err := SensitivityPeakMIMO(c.sys); err == nil || !math.IsNaN(v) {
			t.Errorf("%s: sensitivity %v, %v", c.name, v, err)
		}
	}
	if _, err := Margins(System{A: one(-1), B: one(1), C: one(1), D: one(-1)}); !errors.Is(err, ErrSingular) {
		t.Errorf("an algebraic loop: %v", err)
	}
}

func TestClosedForms(t *testing.T) {
	one := func(v float64) blas64.General { return blas64.General{Rows: 1, Cols: 1, Stride: 1, Data: []float64{v}} }
	two := func(v ...float64) blas64.General { return blas64.General{Rows: 2, Cols: 2, Stride: 2, Data: v} }
	inf := math.Inf(1)
	near := func(a, b float64) bool { return a == b || math.Abs(a-b) <= 1e-12*math.Abs(b) }
	// L = 2/s: crossover at 2 rad/s with 90°, no gain margin, |S| < 1 everywhere
	m, err := Margins(System{A: one(0), B: one(1), C: one(2)})
	if err != nil || !near(m.PhaseDeg, 90) || !near(m.DelayS, math.Pi/4) || m.GainAboveDB != inf || m.GainBelowDB != -inf || !near(m.SensitivityPeak, 1) {
		t.Errorf("integrator: %+v, %v", m, err)
	}
	// L = 3/(s − 1) = stable for gains above 1/3
	m, err = Margins(System{A: one(1), B: one(1), C: one(3)})
	if err != nil || !near(m.GainBelowDB, -20*math.Log10(3)) || m.GainAboveDB != inf {
		t.Errorf("unstable plant: %+v, %v", m, err)
	}
	// L = 0.5/z: the pole −0.5 k leaves the circle at z = −1 for k = 2
	m, err = Margins(System{A: one(0), B: one(1), C: one(0.5), Period: 0.1})
	if err != nil || !near(m.GainAboveDB, 20*math.Log10(2)) || m.GainBelowDB != -inf || m.PhaseDeg != inf || m.DelayS != inf || !near(m.SensitivityPeak, 2) ||
		!near(m.SensitivityFrequency, math.Pi/0.1) {
		t.Errorf("delay: %+v, %v", m, err)
	}
	// no loop at all
	m, err = Margins(System{A: one(-1), B: one(0), C: one(0)})
	if err != nil || m.GainAboveDB != inf || m.GainBelowDB != -inf || m.PhaseDeg != inf || m.DelayS != inf || m.SensitivityPeak != 1 {
		t.Errorf("no loop: %+v, %v", m, err)
	}
	// what nothing drives has no gain anywhere
	if v, w, err := PeakGain(System{A: one(-1), B: one(0), C: one(1)}); v != 0 || w != 0 || err != nil {
		t.Errorf("no input: %v at %v, %v", v, w, err)
	}
	// a resonance w²/(s² + 2ζws + w²) peaks at 1/(2ζ√(1 − ζ²)), at w√(1 − 2ζ²), for any damping
	for _, z := range []float64{1e-9, 1e-6, 1e-3, 0.1, 0.5, 0.7} {
		const w = 30.0
		v, rad, err := PeakGain(System{A: two(0, 1, -w*w, -2*z*w), B: blas64.General{Rows: 2, Cols: 1, Stride: 1, Data: []float64{0, w * w}},
			C: blas64.General{Rows: 1, Cols: 2, Stride: 2, Data: []float64{1, 0}}})
		want := 1 / (2 * z * math.Sqrt(1-z*z))
		// the matrix itself fixes a tiny damping to eps/ζ only
		if err != nil || math.Abs(v/want-1) > 1e-9+1e-15/z || math.Abs(rad/(w*math.Sqrt(1-2*z*z))-1) > 1e-4 {
			t.Errorf("damping %v: %.12g at %v, %v, want %.12g", z, v, rad, err, want)
		}
	}
}
