package ratio

import (
	"math"
	"math/cmplx"
)

// Margins of a loop. Frequencies are in rad/s, or angles of z in discrete time.
type Margins struct {
	GainBelow, GainAbove float64 // nearest destabilising gain factors; 0 and +Inf without
	Phase                float64 // rad, +Inf without
	Delay                float64 // s, or samples in discrete time; +Inf without
	Peak                 float64 // largest |S|
}

// factors beyond these count as no limit: they are rounding of a loop gain of
// zero or of infinity.
const (
	leastFactor = 1e-9
	mostFactor  = 1e9
)

// The three functions whose signs divide the frequencies.
func turning(q sample) float64  { return imag(q.s) }       // L is real
func unity(q sample) float64    { return real(q.s) - 0.5 } // |L| = 1
func rising(q sample) float64   { return real(q.slope) }   // of |S|
func along(q sample) complex128 { return q.s * q.slope }   // dS/dw

// Margins reads all margins off the grid, each followed down to rounding.
func (x *Sensitivity) Margins() Margins {
	m := Margins{GainAbove: math.Inf(1), Phase: math.Inf(1), Delay: math.Inf(1)}
	m.gain(x.grid[0])
	if !x.discrete { // infinite frequency
		m.gain(sample{s: complex(x.factor, 0)})
		m.Peak = math.Abs(x.factor)
	}
	for i, b := range x.grid {
		m.Peak = max(m.Peak, cmplx.Abs(b.s))
		if i == 0 {
			continue
		}
		a := x.grid[i-1]
		if rising(a) > 0 && rising(b) < 0 && max(cmplx.Abs(a.s), cmplx.Abs(b.s)) > 0.6*m.Peak {
			m.Peak = max(m.Peak, cmplx.Abs(x.refine(a, b, rising).s))
		}
		x.roots(a, b, turning, func(q sample) float64 { return imag(along(q)) }, m.gain)
		x.roots(a, b, unity, func(q sample) float64 { return real(along(q)) }, m.phase)
	}
	if x.discrete {
		m.gain(x.grid[len(x.grid)-1])
	}
	return m
}

// roots reports where f, with the derivative df, vanishes between a and b: once where
// its sign changes, twice where it turns towards zero and back far enough.
func (x *Sensitivity) roots(a, b sample, f, df func(sample) float64, found func(sample)) {
	fa, fb := f(a), f(b)
	switch {
	case fa == 0: // found before, or the end of the axis
	case fb == 0:
		found(b)
	case fa > 0 != (fb > 0):
		found(x.refine(a, b, f))
	case fa*df(a) < 0 && fb*df(b) > 0:
		turn := x.refine(a, b, df)
		if ft := f(turn); ft > 0 != (fa > 0) {
			found(x.refine(a, turn, f))
			found(x.refine(turn, b, f))
		}
	}
}

// gain takes a frequency where L = 1/S − 1 is real: 1 + g L = 0.
func (m *Margins) gain(q sample) {
	s := real(q.s)
	if math.Abs(1-s) < 1e-12 {
		return // L is zero
	}
	switch g := s / (s - 1); {
	case g > leastFactor && g < 1:
		m.GainBelow = max(m.GainBelow, g)
	case g > 1 && g < mostFactor:
		m.GainAbove = min(m.GainAbove, g)
	}
}

// phase takes a frequency where |L| = 1.
func (m *Margins) phase(q sample) {
	if q.w == 0 {
		return
	}
	angle := cmplx.Phase(1 - 1/q.s) // of −L
	m.Phase = min(m.Phase, math.Abs(angle))
	if angle <= 0 {
		angle += 2 * math.Pi
	}
	m.Delay = min(m.Delay, angle/q.w)
}

// WholeDelay returns the largest number of samples, up to limit, by which the loop can
// be delayed and stays stable: where 1 + L z⁻ᵈ over 1 + L, that is S + (1 − S) z⁻ᵈ, does
// not turn about zero along the unit circle. It is analytic outside, so that its turns
// count the unstable poles.
func (x *Sensitivity) WholeDelay(limit int) int {
	for d := 1; d <= limit; d++ {
		if math.Abs(x.turned(float64(d))) > 1 {
			return d - 1
		}
	}
	return limit
}

// turned returns the change of angle along the upper half of the unit circle, a
// multiple of π.
func (x *Sensitivity) turned(d float64) float64 {
	total := 0.0
	last, from := x.delayed(x.grid[0], d), x.grid[0]
	for _, q := range x.grid[1:] {
		next := x.delayed(q, d)
		total += x.angle(from, q, last, next, d, 40)
		from, last = q, next
	}
	return total
}

func (x *Sensitivity) delayed(q sample, d float64) complex128 {
	sin, cos := math.Sincos(-d * q.w)
	return q.s + (1-q.s)*complex(cos, sin)
}

// angle sums the change of angle between a and b in steps small enough to know its way.
func (x *Sensitivity) angle(a, b sample, va, vb complex128, d float64, depth int) float64 {
	by := cmplx.Phase(vb * cmplx.Conj(va))
	if depth == 0 || math.Abs(by) < 0.7 && d*(b.w-a.w) < 0.7 {
		return by
	}
	mid, _ := x.at((a.w + b.w) / 2)
	vm := x.delayed(mid, d)
	return x.angle(a, mid, va, vm, d, depth-1) + x.angle(mid, b, vm, vb, d, depth-1)
}
