package placement

import (
	"math"
	"math/cmplx"
)

// descent is a quasi-Newton minimisation over the eigenvectors (BFGS; Nocedal &
// Wright 2006, chapter 6). A point is a set of frames; a step Y mixes the unused
// vectors of each frame into the eigenvectors, T₁ + T₂ Y, and turns the unused
// ones along with them, T₂ − T₁ Yᴴ, so that consecutive points have matching
// coordinates and the inverse Hessian can be carried over.
type descent struct {
	hessian         []float64 // inverse
	learnt          bool      // hessian belongs to the present frames
	g, gNext, d, hy []float64
	saved           []complex128 // the frames where the step starts
}

func (m *descent) reset(free, frames int) {
	m.hessian = grow(m.hessian, free*free)
	m.g = grow(m.g, free)
	m.gNext = grow(m.gNext, free)
	m.d = grow(m.d, free)
	m.hy = grow(m.hy, free)
	m.saved = grow(m.saved, frames)
}

// stopping rules of a descent.
type stopping struct {
	squarings int     // of the measure
	steps     int     // at most
	gradient  float64 // largest entry where it ends
	drop      float64 // decrease of the measure, twice in a row, where it ends
	travel    float64 // longest way in radians, all steps together; 0 means no limit
}

// descend minimises the measure from the present frames. It returns the last
// value, the steps taken and whether it came to rest. carried tells that the inverse
// Hessian of an earlier descent is in place.
func (r *robust) descend(rule stopping, carried bool) (f float64, steps int, done bool) {
	m := &r.descent
	m.reset(r.free, len(r.frames))
	f = r.value(rule.squarings)
	if r.free == 0 || math.IsInf(f, 1) {
		return f, 0, r.free == 0
	}
	r.pullBack(m.g)
	fresh := !carried
	m.learnt = carried
	left, small := rule.travel, false
	for steps < rule.steps {
		if largest(m.g) <= rule.gradient {
			return f, steps, true
		}
		slope, reach := m.direction(fresh), math.Inf(1)
		if rule.travel > 0 {
			if left < 1e-3*rule.travel {
				return f, steps, false
			}
			reach = left / norm2(m.d)
		}
		t, next, ok := r.search(rule.squarings, f, slope, reach)
		if !ok {
			if fresh {
				return f, steps, false
			}
			fresh = true // once more along the gradient
			continue
		}
		steps++
		drop := f - next
		m.update(t, fresh)
		left -= norm2(m.d) // which update has scaled to the step taken
		f, fresh, m.learnt = next, false, true
		m.g, m.gNext = m.gNext, m.g
		if small = drop <= rule.drop && small; small {
			return f, steps, true
		}
		small = drop <= rule.drop
	}
	return f, steps, false
}

// direction sets d = −H g, at most half a radian long, and returns gᵀd.
func (m *descent) direction(fresh bool) float64 {
	k := len(m.g)
	slope := 0.0
	for i := range k {
		sum := 0.0
		if fresh {
			sum = m.g[i]
		} else {
			for j, v := range m.hessian[i*k : i*k+k] {
				sum += v * m.g[j]
			}
		}
		m.d[i] = -sum
		slope -= sum * m.g[i]
	}
	if slope >= 0 {
		slope = 0
		for i, v := range m.g {
			m.d[i] = -v
			slope -= v * v
		}
	}
	if size := norm2(m.d); size > 0.5 {
		scale(m.d, 0.5/size)
		slope *= 0.5 / size
	}
	return slope
}

// search finds a step along d that meets the weak Wolfe conditions by bisection
// (Lewis & Overton 2013, which also serves where the measure has kinks). The
// frames and gNext are left at the accepted point, or where the step started. No
// step is longer than reach.
func (r *robust) search(squarings int, f, slope, reach float64) (t, next float64, ok bool) {
	m := &r.descent
	copy(m.saved, r.frames)
	low, high := 0.0, math.Inf(1)
	t = min(1, reach)
	for range 25 {
		r.move(m.saved, m.d, t)
		next = r.value(squarings)
		if !(next <= f+1e-4*t*slope) {
			high = t
		} else {
			r.pullBack(m.gNext)
			along := 0.0
			for i, v := range m.gNext {
				along += v * m.d[i]
			}
			if along >= 0.9*slope || t > 4 || t >= reach {
				return t, next, true
			}
			low = t
		}
		if math.IsInf(high, 1) {
			t = min(2*low, reach)
		} else {
			t = (low + high) / 2
		}
	}
	if low > 0 {
		r.move(m.saved, m.d, low)
		next = r.value(squarings)
		r.pullBack(m.gNext)
		return low, next, true
	}
	copy(r.frames, m.saved)
	return 0, f, false
}

// update revises the inverse Hessian with the step t d and the change of gradient.
func (m *descent) update(t float64, fresh bool) {
	k := len(m.g)
	s := m.d
	scale(s, t)
	y := m.g // not needed any more
	sy, yy := 0.0, 0.0
	for i := range y {
		y[i] = m.gNext[i] - y[i]
		sy += s[i] * y[i]
		yy += y[i] * y[i]
	}
	if fresh {
		clear(m.hessian)
		diagonal := 1.0
		if sy > 0 && yy > 0 {
			diagonal = sy / yy
		}
		for i := range k {
			m.hessian[i*k+i] = diagonal
		}
	}
	if !(sy > 1e-12*math.Sqrt(yy)*norm2(s)) {
		return
	}
	yhy := 0.0
	for i := range k {
		sum := 0.0
		for j, v := range m.hessian[i*k : i*k+k] {
			sum += v * y[j]
		}
		m.hy[i] = sum
		yhy += sum * y[i]
	}
	a := (1 + yhy/sy) / sy
	for i := range k {
		row := m.hessian[i*k : i*k+k]
		for j := range row {
			row[j] += a*s[i]*s[j] - (m.hy[i]*s[j]+s[i]*m.hy[j])/sy
		}
	}
}

// move sets the frames to those of from, moved by t d.
func (r *robust) move(from []complex128, d []float64, t float64) {
	n, p := r.n, r.p
	copy(r.frames, from)
	at, offset := 0, 0
	for i := range r.groups {
		g := &r.groups[i]
		old := from[offset : offset+n*p]
		offset += n * p
		for j := range g.m {
			for l := g.m; l < p; l++ {
				y := complex(t*d[at], 0)
				at++
				if g.pair {
					y += complex(0, t*d[at])
					at++
				}
				yc := cmplx.Conj(y)
				x, u := old[j*n:j*n+n], old[l*n:l*n+n]
				xn, un := g.t[j*n:j*n+n], g.t[l*n:l*n+n]
				for k := range x {
					xn[k] += y * u[k]
					un[k] -= yc * x[k]
				}
			}
		}
		orthonormalise(g.t, n)
	}
}

// pullBack turns the gradient with respect to X into that of the coordinates Y.
func (r *robust) pullBack(dst []float64) {
	n, p := r.n, r.p
	at := 0
	for i := range r.groups {
		g := &r.groups[i]
		row := g.first * n
		for range g.m {
			re := r.gradient[row : row+n]
			row += n
			var im []float64
			if g.pair {
				im = r.gradient[row : row+n]
				row += n
			}
			for l := g.m; l < p; l++ {
				u := g.t[l*n : l*n+n]
				var yr, yi float64
				if !g.pair {
					for k, v := range u {
						yr += real(v) * re[k]
					}
					dst[at] = yr
					at++
					continue
				}
				for k, v := range u {
					yr += real(v)*re[k] + imag(v)*im[k]
					yi += real(v)*im[k] - imag(v)*re[k]
				}
				dst[at], dst[at+1] = math.Sqrt2*yr, math.Sqrt2*yi
				at += 2
			}
		}
	}
}

func largest(x []float64) float64 {
	m := 0.0
	for _, v := range x {
		m = math.Max(m, math.Abs(v))
	}
	return m
}

func norm2(x []float64) float64 {
	sum := 0.0
	for _, v := range x {
		sum += v * v
	}
	return math.Sqrt(sum)
}
