package frequency

import (
	"math"
	"sort"
)

// grid returns frequencies that resolve every pole, lightly damped ones too,
// and the candidates with the places between them, in rising order.
func (r *response) grid(candidates []float64) []float64 {
	least, most := math.Inf(1), 0.0
	var list []float64
	for i, re := range r.re {
		size := math.Hypot(re, r.im[i])
		if size == 0 {
			continue
		}
		least, most = min(least, size), max(most, size)
		if r.im[i] > 0 {
			for _, f := range []float64{-3, -1, -0.5, -0.2, 0, 0.2, 0.5, 1, 3} {
				list = append(list, r.im[i]+f*re)
			}
		}
	}
	for _, v := range candidates {
		// a candidate carries rounding: look on both sides of it
		list = append(list, v, v*(1-1e-6), v*(1+1e-6))
		if v > 0 {
			least, most = min(least, v), max(most, v)
		}
	}
	const perDecade = 12
	for k := 0; k < 400; k++ {
		v := least / 100 * math.Pow(10, float64(k)/perDecade)
		if v > most*100 {
			break
		}
		list = append(list, v)
	}
	sort.Float64s(list)
	kept := list[:0]
	for _, v := range list {
		if v > 0 && !math.IsInf(v, 0) && (len(kept) == 0 || v > kept[len(kept)-1]) {
			kept = append(kept, v)
		}
	}
	return kept
}

// The two functions of T whose signs divide the frequencies.
func turning(v complex128) float64 { return imag(v) }

func unity(v complex128) float64 { return real(v) - 0.5 }

// roots returns the frequencies above zero where Im T and where Re T − 1/2
// changes sign.
func (r *response) roots(candidates []float64) (turns, unit []float64) {
	var last, lastIm, lastRe float64
	for _, nu := range r.grid(candidates) {
		v := r.at(nu)[0]
		im, re := r.signal(turning(v)), r.signal(unity(v))
		if im == 0 {
			turns = append(turns, nu)
		} else if lastIm*im < 0 {
			turns = append(turns, r.root(turning, last, nu, lastIm, im))
		}
		if re == 0 {
			unit = append(unit, nu)
		} else if lastRe*re < 0 {
			unit = append(unit, r.root(unity, last, nu, lastRe, re))
		}
		last, lastIm, lastRe = nu, im, re
	}
	return turns, unit
}

// signal is v, or zero where the last response leaves nothing but rounding.
func (r *response) signal(v float64) float64 {
	if math.Abs(v) <= 1e-15*r.noise {
		return 0
	}
	return v
}

// root closes in on the change of sign between a and b: halving on a geometric
// scale while they are far apart, then by Ridders 1979.
func (r *response) root(f func(complex128) float64, a, b, fa, fb float64) float64 {
	at := func(nu float64) float64 { return r.signal(f(r.at(nu)[0])) }
	for range 200 {
		mid := (a + b) / 2
		wide := b > 1.5*a
		if wide {
			mid = math.Sqrt(a) * math.Sqrt(b)
		}
		if mid <= a || mid >= b || b-a <= 4e-16*b {
			return mid
		}
		fm := at(mid)
		if fm == 0 {
			return mid
		}
		if !wide {
			nu := mid + (mid-a)*math.Copysign(1, fa)*fm/math.Sqrt(fm*fm-fa*fb)
			if nu > a && nu < b && nu != mid {
				fn := at(nu)
				if fn == 0 {
					return nu
				}
				if math.Abs(nu-mid) < 1e-15*nu {
					return nu
				}
				// keep the closest pair of unlike signs among a, mid, nu, b
				if (fn > 0) != (fm > 0) {
					if mid < nu {
						a, fa, b, fb = mid, fm, nu, fn
					} else {
						a, fa, b, fb = nu, fn, mid, fm
					}
					continue
				}
				if (fn > 0) == (fa > 0) {
					a, fa = math.Max(mid, nu), fn
					if mid > nu {
						fa = fm
					}
				} else {
					b, fb = math.Min(mid, nu), fn
					if mid < nu {
						fb = fm
					}
				}
				continue
			}
		}
		if (fm > 0) == (fa > 0) {
			a, fa = mid, fm
		} else {
			b, fb = mid, fm
		}
	}
	return (a + b) / 2
}
