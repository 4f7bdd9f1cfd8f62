package placement

import (
	"math"
	"math/cmplx"
	"slices"
)

// Warm carries the eigenvectors that the Solver chose, as the start of the next
// call. The zero value is empty. It belongs to the caller; a call overwrites it and
// keeps no reference, so a Clone may be stored with a finished design.
type Warm struct {
	n, p    int
	groups  []group // their frames point into frames
	frames  []complex128
	hessian []float64 // of the descent that ended there, or empty
	gain    []float64 // n×p, in place of eigenvectors where least noise met repeated poles
}

// Clone returns an independent copy; of nil, nil.
func (w *Warm) Clone() *Warm {
	if w == nil {
		return nil
	}
	c := &Warm{n: w.n, p: w.p}
	c.store(w.groups, w.frames, w.hessian)
	c.gain = slices.Clone(w.gain)
	return c
}

// Empty tells whether w holds no choice yet.
func (w *Warm) Empty() bool { return w == nil || len(w.groups) == 0 && len(w.gain) == 0 }

func (w *Warm) clear() { w.groups, w.gain = w.groups[:0], w.gain[:0] }

// fits tells whether w holds a choice for n states and p sensors.
func (w *Warm) fits(n, p int) bool { return !w.Empty() && w.n == n && w.p == p }

func (w *Warm) keepGain(n, p int, gain []float64) {
	w.clear()
	w.n, w.p = n, p
	w.gain = append(w.gain, gain...)
}

func (w *Warm) store(groups []group, frames []complex128, hessian []float64) {
	w.gain = w.gain[:0]
	w.groups = append(w.groups[:0], groups...)
	w.frames = append(w.frames[:0], frames...)
	w.hessian = append(w.hessian[:0], hessian...)
	size := w.n * w.p
	for i := range w.groups {
		w.groups[i].t = w.frames[i*size : (i+1)*size : (i+1)*size]
	}
}

// keep stores the eigenvectors of r.
func (w *Warm) keep(r *robust) {
	w.n, w.p = r.n, r.p
	var hessian []float64
	if r.n > r.p && r.descent.learnt {
		hessian = r.descent.hessian
	}
	w.store(r.groups, r.frames, hessian)
}

// project turns the frames of r, which hold bases of the null spaces, so that the
// eigenvectors are as near as possible to the stored ones of the nearest poles. It
// reports false where nothing fits. carried tells that the stored inverse Hessian
// fits as well and has been handed to the descent.
func (w *Warm) project(r *robust) (ok, carried bool) {
	if !w.fits(r.n, r.p) || len(w.groups) == 0 {
		return false, false
	}
	r.start = grow(r.start, len(r.frames))
	copy(r.start, r.frames)
	if w.sameOrder(r.groups) {
		if !w.projectFrames(r) {
			return false, false
		}
		if len(w.hessian) == r.free*r.free && r.free > 0 {
			r.descent.reset(r.free, len(r.frames))
			copy(r.descent.hessian, w.hessian)
			return true, true
		}
		return true, false
	}
	return w.projectVectors(r), false
}

// moved returns how far the poles have gone from the stored ones: the largest
// distance to the nearest, relative to the pole, for a slow one to a tenth of the
// fastest.
func (w *Warm) moved(groups []group) float64 {
	if w.Empty() || len(w.groups) == 0 {
		return 0
	}
	size := 0.0
	for _, g := range groups {
		size = math.Max(size, cmplx.Abs(g.at))
	}
	far := 0.0
	for _, g := range groups {
		near := math.Inf(1)
		for _, o := range w.groups {
			near = math.Min(near, cmplx.Abs(o.at-g.at))
		}
		if near > 0 {
			far = math.Max(far, near/math.Max(cmplx.Abs(g.at), 0.1*size))
		}
	}
	return far
}

// sameOrder tells whether every group has its counterpart of the same kind at the
// same place in the stored list: at most one has moved, as in a drag, or none has a
// closer counterpart elsewhere.
func (w *Warm) sameOrder(groups []group) bool {
	if len(groups) != len(w.groups) {
		return false
	}
	moved, nearest := 0, true
	for i, g := range groups {
		own := w.groups[i]
		if own.pair != g.pair || own.m != g.m {
			return false
		}
		distance := cmplx.Abs(own.at - g.at)
		if distance == 0 {
			continue
		}
		moved++
		for _, o := range w.groups {
			if o.pair == g.pair && cmplx.Abs(o.at-g.at) < distance {
				nearest = false
			}
		}
	}
	return moved <= 1 || nearest
}

// projectFrames projects whole frames, which keeps the coordinates of the descent.
func (w *Warm) projectFrames(r *robust) bool {
	n, size := r.n, r.n*r.p
	for i := range r.groups {
		t, basis, old := r.groups[i].t, r.start[i*size:(i+1)*size], w.groups[i].t
		for j := 0; j < size; j += n {
			if !projectOnto(t[j:j+n], basis, old[j:j+n]) {
				return false
			}
		}
		if !orthonormalise(t, n) {
			return false
		}
	}
	return true
}

// projectVectors serves lists whose structure has changed: poles that have met,
// parted, or changed their order.
func (w *Warm) projectVectors(r *robust) bool {
	n, p, size := r.n, r.p, r.n*r.p
	stock := w.stock()
	for i := range r.groups {
		g := &r.groups[i]
		basis := r.start[i*size : (i+1)*size]
		for j := range g.m {
			x := stock.take(g.pole)
			if x == nil || !projectOnto(g.t[j*n:j*n+n], basis, x) {
				return false
			}
		}
		if !orthonormalise(g.t[:g.m*n], n) {
			return false
		}
		complete(g.t, basis, g.m, n, p)
	}
	return true
}

// stock is a list of eigenvectors to choose from.
type stock []eigenvector

type eigenvector struct {
	pole
	x    []complex128
	used bool
}

func (w *Warm) stock() *stock {
	var s stock
	for _, g := range w.groups {
		for j := range g.m {
			s = append(s, eigenvector{pole: g.pole, x: g.t[j*w.n : j*w.n+w.n]})
		}
	}
	return &s
}

// take returns the unused eigenvector of the nearest pole of the same kind. Where
// there is none, a pair gives its real and imaginary part to two real poles, or two
// real poles join to a pair.
func (s *stock) take(to pole) []complex128 {
	if i := s.nearest(to.at, to.pair); i >= 0 {
		(*s)[i].used = true
		return (*s)[i].x
	}
	i := s.nearest(to.at, !to.pair)
	if i < 0 {
		return nil
	}
	(*s)[i].used = true
	x := (*s)[i].x
	if to.pair {
		j := s.nearest(to.at, false)
		if j < 0 {
			return nil
		}
		(*s)[j].used = true
		z := slices.Clone(x)
		for k, v := range (*s)[j].x {
			z[k] = (z[k] + complex(0, real(v))) / complex(math.Sqrt2, 0)
		}
		return z
	}
	re, im := make([]complex128, len(x)), make([]complex128, len(x))
	for k, v := range x {
		re[k], im[k] = complex(math.Sqrt2*real(v), 0), complex(math.Sqrt2*imag(v), 0)
	}
	*s = append(*s, eigenvector{pole: pole{at: complex(real((*s)[i].at), 0)}, x: im})
	return re
}

func (s *stock) nearest(at complex128, pair bool) int {
	best := -1
	for i, e := range *s {
		if !e.used && e.pair == pair && (best < 0 || cmplx.Abs(e.at-at) < cmplx.Abs((*s)[best].at-at)) {
			best = i
		}
	}
	return best
}

// projectOnto writes to dst the part of x within the span of the orthonormal basis.
// It reports false where little of x is left.
func projectOnto(dst, basis, x []complex128) bool {
	n := len(x)
	clear(dst)
	sum := 0.0
	for i := 0; i < len(basis); i += n {
		u := basis[i : i+n]
		dot := complex(0, 0)
		for k, v := range u {
			dot += cmplx.Conj(v) * x[k]
		}
		sum += real(dot)*real(dot) + imag(dot)*imag(dot)
		for k, v := range u {
			dst[k] += dot * v
		}
	}
	return sum > 0.01
}

// complete fills vectors m … p−1 of t with the rest of the span of the basis, the
// largest remainder first.
func complete(t, basis []complex128, m, n, p int) {
	rest := slices.Clone(basis)
	for j := range p {
		if j >= m {
			best, at := -1.0, 0
			for i := 0; i < len(rest); i += n {
				sum := 0.0
				for _, v := range rest[i : i+n] {
					sum += real(v)*real(v) + imag(v)*imag(v)
				}
				if sum > best {
					best, at = sum, i
				}
			}
			s := complex(1/math.Sqrt(best), 0)
			for k, v := range rest[at : at+n] {
				t[j*n+k] = s * v
			}
		}
		for i := 0; i < len(rest); i += n {
			reflectComplex(rest[i:i+n], t[j*n:j*n+n])
		}
	}
}
