package poles

import (
	"math"
	"math/big"
	"math/cmplx"
)

// BesselAt returns the n poles of the maximally flat group delay (Thomson 1949),
// scaled so that the magnitude is −3 dB (1/√2) at w rad/s. They are the zeros of
// the reverse Bessel polynomial θn, found all at once (Ehrlich 1967, Aberth
// 1973). Conjugates are adjacent, a real pole comes last. It returns nil unless
// n and w are above zero.
func BesselAt(n int, w float64) []complex128 {
	if !usable(n, w) {
		return nil
	}
	list := besselZeros(n)
	scale := complex(w/halfPower(list), 0)
	for i := range list {
		list[i] *= scale
	}
	return list
}

// bessel evaluates the reverse Bessel polynomial of order n. Its value near its
// zeros is a small difference of large terms, about n/3 digits below them, hence
// the long numbers.
type bessel struct {
	coefficients []*big.Float // highest power first
	precision    uint
}

// newBessel builds the coefficients (2n−k)! / (2ⁿ⁻ᵏ k! (n−k)!) of sᵏ by their
// ratios.
func newBessel(n int) *bessel {
	b := &bessel{precision: uint(128 + 4*n), coefficients: make([]*big.Float, n+1)}
	c := big.NewInt(1)
	for k := n; k >= 0; k-- {
		b.coefficients[n-k] = new(big.Float).SetPrec(b.precision).SetInt(c)
		// from k to k−1: times (2n−k+1)·k, divided by 2 (n−k+1)
		c.Mul(c, big.NewInt(int64(2*n-k+1)*int64(k)))
		c.Quo(c, big.NewInt(int64(2*(n-k+1))))
	}
	return b
}

// step returns θ/θ' at s by Horner's scheme.
func (b *bessel) step(s complex128) complex128 {
	float := func(v float64) *big.Float { return new(big.Float).SetPrec(b.precision).SetFloat64(v) }
	x, y := float(real(s)), float(imag(s))
	re, im, dre, dim := float(0), float(0), float(0), float(0)
	t1, t2 := float(0), float(0)
	times := func(re, im *big.Float) { // (re + i im) *= s
		t1.Mul(re, x)
		t2.Mul(im, y)
		t1.Sub(t1, t2)
		t2.Mul(re, y)
		im.Mul(im, x)
		im.Add(im, t2)
		re.Set(t1)
	}
	for _, c := range b.coefficients {
		times(dre, dim)
		dre.Add(dre, re)
		dim.Add(dim, im)
		times(re, im)
		re.Add(re, c)
	}
	// the common size leaves the range of float64 from about n = 150 on
	scale := -max(dre.MantExp(nil), dim.MantExp(nil))
	number := func(v *big.Float) float64 {
		f, _ := t1.SetMantExp(v, scale).Float64()
		return f
	}
	slope := complex(number(dre), number(dim))
	if slope == 0 {
		return 0
	}
	return complex(number(re), number(im)) / slope
}

// besselZeros iterates on the zeros of the upper half plane and the real one.
func besselZeros(n int) []complex128 {
	half := make([]complex128, (n+1)/2) // the real one last, for odd n
	for k := range half {
		// near the curve that the zeros approach; any start off the axes will do
		angle := math.Pi / 2 * float64(n-1-2*k) / float64(n)
		size := float64(n) * (0.66 + 0.34*math.Abs(angle)/(math.Pi/2))
		half[k] = cmplx.Rect(size, math.Pi-angle)
	}
	if n%2 == 1 {
		half[len(half)-1] = complex(-0.66*float64(n)-0.34, 0)
	}
	poly := newBessel(n)
	still := make([]bool, len(half))
	for range 100 {
		moving := false
		for k, s := range half {
			if still[k] {
				continue
			}
			step := poly.step(s)
			var sum complex128
			for j, v := range half {
				if j != k {
					sum += 1 / (s - v)
				}
				if imag(v) != 0 {
					sum += 1 / (s - cmplx.Conj(v))
				}
			}
			step /= 1 - step*sum
			if imag(s) == 0 {
				step = complex(real(step), 0)
			}
			half[k] -= step
			still[k] = cmplx.Abs(step) < 1e-15*cmplx.Abs(s)
			moving = moving || !still[k]
		}
		if !moving {
			break
		}
	}
	list := make([]complex128, 0, n)
	for _, s := range half {
		list = append(list, s)
		if imag(s) != 0 {
			list = append(list, cmplx.Conj(s))
		}
	}
	return list
}

// halfPower is the frequency where the all-pole set has lost half of its power,
// by Newton on the logarithm of the loss, which grows with the frequency.
func halfPower(list []complex128) float64 {
	loss := func(w float64) (value, slope float64) {
		for _, p := range list {
			// |jw − p|² / |p|² = 1 + w (w − 2 Im p) / |p|²
			size := real(p)*real(p) + imag(p)*imag(p)
			value += math.Log1p(w * (w - 2*imag(p)) / size)
			slope += 2 * (w - imag(p)) / (size + w*(w-2*imag(p)))
		}
		return value - math.Ln2, slope
	}
	n := float64(len(list))
	w := math.Sqrt((2*n - 1) * math.Ln2)
	for range 50 {
		v, slope := loss(w)
		next := w - v/slope
		if !(next > 0) {
			next = w / 2
		}
		if math.Abs(next-w) <= 1e-15*w {
			return next
		}
		w = next
	}
	return w
}
