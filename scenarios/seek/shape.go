package seek

import (
	"math"
	"math/cmplx"
	"slices"

	"polewright/estimator/poles"
)

// shape turns a list of poles into numbers without bounds and back: two poles are
// the zeros of s² + 2ζω s + ω², real or a pair as ζ comes out, so that a search
// passes from one to the other; one that is left over is −ω. Poles at z = 0 and on
// the negative real axis of z stay.
type shape struct {
	twos   int
	one    bool
	stay   []complex128
	period float64
	speeds []int // indices of log ω
}

const (
	leastDamping = 0.05
	mostDamping  = 3.0
)

// newShape takes movable poles of a model's own plane. Poles that are not stable
// are mirrored.
func newShape(own []complex128, period float64) (shape, []float64, error) {
	f := shape{period: period}
	var real1, upper []complex128
	for _, v := range own {
		s := v
		if period > 0 {
			if imag(v) == 0 && real(v) <= 0 {
				f.stay = append(f.stay, v)
				continue
			}
			s, _ = poles.ToS(v, period)
		}
		s = complex(-math.Abs(real(s)), imag(s))
		if real(s) == 0 {
			s = complex(-1e-3*(1+cmplx.Abs(s)), imag(s))
		}
		switch {
		case imag(v) == 0:
			real1 = append(real1, complex(real(s), 0))
		case imag(s) > 0:
			upper = append(upper, s)
		}
	}
	if err := poles.ConjugateClosed(own); err != nil {
		return f, nil, err
	}
	slices.SortFunc(real1, func(a, b complex128) int {
		switch {
		case real(a) < real(b):
			return -1
		case real(a) > real(b):
			return 1
		}
		return 0
	})
	var x []float64
	two := func(a, b complex128) {
		w := math.Sqrt(real(a * b))
		f.speeds = append(f.speeds, len(x))
		x = append(x, math.Log(w), fromDamping(-real(a+b)/2/w))
		f.twos++
	}
	for _, s := range upper {
		two(s, cmplx.Conj(s))
	}
	for len(real1) > 1 {
		two(real1[0], real1[1])
		real1 = real1[2:]
	}
	if len(real1) == 1 {
		f.one = true
		f.speeds = append(f.speeds, len(x))
		x = append(x, math.Log(-real(real1[0])))
	}
	return f, x, nil
}

// fromDamping and toDamping map (leastDamping, mostDamping) to all numbers.
func fromDamping(z float64) float64 {
	u := (z - leastDamping) / (mostDamping - leastDamping)
	u = min(max(u, 1e-3), 1-1e-3)
	return math.Log(u / (1 - u))
}

func toDamping(x float64) float64 {
	return leastDamping + (mostDamping-leastDamping)/(1+math.Exp(-x))
}

// poles is the inverse of newShape, within what sampling lets through.
func (f shape) poles(x []float64) []complex128 {
	out := make([]complex128, 0, 2*f.twos+1+len(f.stay))
	for i := range f.twos {
		w, z := f.speed(x[2*i]), toDamping(x[2*i+1])
		if z < 1 {
			v := f.own(complex(-z*w, w*math.Sqrt(1-z*z)))
			out = append(out, v, cmplx.Conj(v))
			continue
		}
		root := math.Sqrt(z*z - 1)
		out = append(out, f.own(complex(-w*(z+root), 0)), f.own(complex(-w/(z+root), 0)))
	}
	if f.one {
		out = append(out, f.own(complex(-f.speed(x[2*f.twos]), 0)))
	}
	return append(out, f.stay...)
}

// speed is ω, short of the sampling limit.
func (f shape) speed(log float64) float64 {
	w := math.Exp(min(max(log, -300), 300))
	if f.period > 0 {
		w = min(w, 0.95*math.Pi/f.period)
	}
	return w
}

func (f shape) own(s complex128) complex128 {
	if f.period == 0 {
		return s
	}
	return poles.ToZ(s, f.period)
}
