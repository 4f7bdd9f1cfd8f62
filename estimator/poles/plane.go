package poles

import (
	"fmt"
	"math"
	"math/cmplx"
)

// ToZ is the place z = exp(s·period) of a continuous pole under sampling.
func ToZ(s complex128, period float64) complex128 {
	if imag(s) == 0 {
		return complex(math.Exp(real(s)*period), 0)
	}
	return cmplx.Exp(s * complex(period, 0))
}

// ToS is s = ln(z)/period, of all such s the one with the least |Im s|. It
// returns false for z = 0, which is the place of no s.
func ToS(z complex128, period float64) (complex128, bool) {
	if z == 0 {
		return 0, false
	}
	return complex(lnAbs(z)/period, math.Atan2(imag(z)+0, real(z))/period), true
}

// lnAbs is ln|z|, accurate in relative terms near the unit circle.
func lnAbs(z complex128) float64 {
	x, y := real(z), imag(z)
	r := cmplx.Abs(z)
	if r > 0.5 && r < 2 {
		x, y = math.Abs(x), math.Abs(y)
		if x < y {
			x, y = y, x
		}
		return 0.5 * math.Log1p((x-1)*(x+1)+y*y)
	}
	return math.Log(r)
}

// Description spells a pole out.
type Description struct {
	// Frequency is the natural frequency |s| in rad/s: +Inf for z = 0.
	Frequency float64
	// Damping is −Re s/|s|, from −1 to 1: NaN for s = 0 and z = 0.
	Damping float64
	// TimeConstant is −1/Re s in seconds: +Inf on the stability limit, negative
	// for a pole that grows, 0 for z = 0.
	TimeConstant float64
	// TimeConstantSamples is the same in sample periods: NaN without a period.
	TimeConstantSamples float64
}

// Describe spells p out: a pole of the s-plane for period 0, else of the z-plane
// of a sampled system with that period.
func Describe(p complex128, period float64) Description {
	s, samples := p, math.NaN()
	if period > 0 {
		if p == 0 {
			return Description{Frequency: math.Inf(1), Damping: math.NaN()}
		}
		s, _ = ToS(p, period)
	}
	d := Description{Frequency: cmplx.Abs(s), Damping: math.NaN(), TimeConstant: math.Inf(1)}
	if d.Frequency > 0 {
		d.Damping = -real(s)/d.Frequency + 0
	}
	if real(s) != 0 {
		d.TimeConstant = -1 / real(s)
	}
	if period > 0 {
		samples = d.TimeConstant / period
	}
	d.TimeConstantSamples = samples
	return d
}

// CheckSampling fails where a pole of the s-plane lies beyond the sampling limit
// |Im s| ≤ π/period: a sampled system cannot tell it from a slower one. Rounding
// of 1e-12 is forgiven. A period of zero or less has no limit.
func CheckSampling(list []complex128, period float64) error {
	if !(period > 0) {
		return nil
	}
	limit := math.Pi / period
	for _, s := range list {
		if math.Abs(imag(s)) > limit*(1+1e-12) {
			return fmt.Errorf("pole %s: beyond the sampling limit; expected |Im s| up to π/period = %.6g rad/s", Format(s), limit)
		}
	}
	return nil
}

// Faster returns the poles of the s-plane k times as fast: k·p, unstable ones
// mirrored at the imaginary axis first. It fails for a pole on the stability
// limit (within 1e-9 of its size), which no factor makes stable, and where k is
// not above zero or a value is not finite.
func Faster(base []complex128, k float64) ([]complex128, error) {
	if !(k > 0) || math.IsInf(k, 0) {
		return nil, fmt.Errorf("factor %v: not above zero; expected a factor like 3", k)
	}
	out := make([]complex128, len(base))
	for i, p := range base {
		if finite(p) && math.Abs(real(p)) <= 1e-9*cmplx.Abs(p) {
			return nil, fmt.Errorf("pole %s: on the stability limit, no factor makes it stable; expected poles off the imaginary axis", Format(p))
		}
		out[i] = complex(-k*math.Abs(real(p)), k*imag(p))
		if !finite(out[i]) {
			return nil, fmt.Errorf("pole %s times %v: not finite; expected finite numbers", Format(p), k)
		}
	}
	return out, nil
}
