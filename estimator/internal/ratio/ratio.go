// Package ratio reads the margins of a control loop off the zeros and poles of its
// sensitivity.
//
// A loop L with one input and one output has S = 1/(1 + L) = k Π(s − zᵢ) / Π(s − pᵢ),
// with the eigenvalues zᵢ of the open and pᵢ of the closed loop, as
// det(sI − A) / det(sI − A_closed) shows. A value of it costs as many operations as there
// are poles, instead of their square on a Hessenberg form. It is as accurate as rounding
// of A lets the determinants be: ‖A‖ ‖(sI − A)⁻¹‖ ε relative, so that large gains cost
// digits, first of all where |L| is small.
package ratio

import (
	"cmp"
	"errors"
	"math"
	"math/cmplx"
	"slices"
)

// Errors of Reset.
var (
	ErrShape     = errors.New("as many open-loop as closed-loop poles are needed")
	ErrNotFinite = errors.New("a pole is not finite")
	ErrUnstable  = errors.New("the closed loop is not asymptotically stable")
)

// Sensitivity is S on its grid of frequencies. The zero value is ready for Reset; it
// keeps its workspace.
type Sensitivity struct {
	zeros, poles []complex128
	factor       float64
	discrete     bool
	grid         []sample
}

// sample is S at one place of the limit of stability: w is the frequency, or the angle
// of z in discrete time; slope is dS/dw over S.
type sample struct {
	w        float64
	s, slope complex128
}

const (
	part = 0.25  // largest step, as a part of the distance to the nearest zero or pole
	most = 20000 // grid points
)

// Reset takes the open-loop poles, the closed-loop poles and S at infinity, and divides
// the frequencies so finely that S is smooth in between.
func (x *Sensitivity) Reset(open, closed []complex128, factor float64, discrete bool) error {
	if len(open) != len(closed) || len(open) == 0 {
		return ErrShape
	}
	for _, list := range [][]complex128{open, closed} {
		for _, v := range list {
			if cmplx.IsNaN(v) || cmplx.IsInf(v) || cmplx.Abs(v) > 1e120 {
				return ErrNotFinite
			}
		}
	}
	if math.IsNaN(factor) || math.IsInf(factor, 0) {
		return ErrNotFinite
	}
	for _, v := range closed {
		if discrete && cmplx.Abs(v) >= 1 || !discrete && real(v) >= 0 {
			return ErrUnstable
		}
	}
	x.zeros = append(x.zeros[:0], open...)
	x.poles = append(x.poles[:0], closed...)
	bySize := func(list []complex128) {
		slices.SortFunc(list, func(a, b complex128) int {
			return cmp.Compare(real(a)*real(a)+imag(a)*imag(a), real(b)*real(b)+imag(b)*imag(b))
		})
	}
	bySize(x.zeros) // paired by size, the partial products stay within range
	bySize(x.poles)
	x.factor, x.discrete = factor, discrete
	x.divide()
	return nil
}

// at evaluates S and its slope, and returns the distance to the nearest zero or pole.
func (x *Sensitivity) at(w float64) (q sample, near float64) {
	s, turn := complex(0, w), complex(0, 1)
	if x.discrete {
		sin, cos := math.Sincos(w)
		s = complex(cos, sin)
		turn = complex(-sin, cos)
	}
	re, im := x.factor, 0.0
	var sumRe, sumIm float64
	near = math.Inf(1)
	for i, z := range x.zeros {
		zr, zi := real(s)-real(z), imag(s)-imag(z)
		p := x.poles[i]
		pr, pi := real(s)-real(p), imag(s)-imag(p)
		zz, pp := zr*zr+zi*zi, pr*pr+pi*pi
		near = min(near, pp)
		if zz > 1e-300 {
			near = min(near, zz)
			iz := 1 / zz
			sumRe += zr * iz
			sumIm -= zi * iz
		}
		ip := 1 / pp
		sumRe -= pr * ip
		sumIm += pi * ip
		// times (s − z) / (s − p)
		fr, fi := (zr*pr+zi*pi)*ip, (zi*pr-zr*pi)*ip
		re, im = re*fr-im*fi, re*fi+im*fr
	}
	return sample{w, complex(re, im), turn * complex(sumRe, sumIm)}, math.Sqrt(near)
}

// end is the last frequency: π in discrete time, none in continuous time.
func (x *Sensitivity) end() float64 {
	if x.discrete {
		return math.Pi
	}
	return math.Inf(1)
}

// divide fills the grid. Zeros on the limit of stability would stop it: S is linear
// beside them, so that a small step leads past.
func (x *Sensitivity) divide() {
	least, largest := math.Inf(1), 0.0
	var centre complex128
	if x.discrete {
		centre = 1
	}
	for _, list := range [][]complex128{x.zeros, x.poles} {
		for _, v := range list {
			largest = max(largest, cmplx.Abs(v-centre))
		}
	}
	for _, list := range [][]complex128{x.zeros, x.poles} {
		for _, v := range list {
			if d := cmplx.Abs(v - centre); d > 1e-12*largest {
				least = min(least, d)
			}
		}
	}
	stop := min(30*largest, x.end())
	x.grid = x.grid[:0]
	first, _ := x.at(0)
	x.grid = append(x.grid, first)
	for w := min(least/10, stop); len(x.grid) < most; {
		q, near := x.at(w)
		x.grid = append(x.grid, q)
		if w >= stop {
			break
		}
		w = min(w+max(part*near, 1e-3*min(w, 1/w+w)), stop)
	}
}

// refine closes in on a change of sign of f between two samples, by the secant that
// never leaves the bracket (Illinois; Dowell & Jarratt 1971).
func (x *Sensitivity) refine(a, b sample, f func(sample) float64) sample {
	fa, fb := f(a), f(b)
	side := 0
	best := b
	for range 100 {
		if b.w-a.w <= 4e-16*b.w {
			break
		}
		w := (a.w*fb - b.w*fa) / (fb - fa)
		if !(w > a.w && w < b.w) {
			w = a.w + (b.w-a.w)/2
			if w <= a.w || w >= b.w {
				break
			}
		}
		q, _ := x.at(w)
		fq := f(q)
		best = q
		switch {
		case fq == 0 || math.Abs(fq) < 1e-14 && b.w-a.w < 1e-9*b.w:
			return q
		case fq > 0 == (fb > 0):
			if math.Abs(b.w-q.w) < 1e-15*q.w {
				return q
			}
			b, fb = q, fq
			if side == -1 {
				fa /= 2
			}
			side = -1
		default:
			if math.Abs(a.w-q.w) < 1e-15*q.w {
				return q
			}
			a, fa = q, fq
			if side == 1 {
				fb /= 2
			}
			side = 1
		}
	}
	return best
}
