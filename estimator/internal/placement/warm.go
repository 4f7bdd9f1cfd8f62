package placement

import (
	"math"
	"math/cmplx"
	"slices"
)

// Warm carries the eigenvectors that Robust chose, as the start of the next call.
// The zero value is empty. It belongs to the caller; a call to Robust overwrites
// it and keeps no reference, so a Clone may be stored with a finished design.
type Warm struct {
	n, p    int
	poles   []pole
	vectors []complex128 // one of length n per pole
}

// Clone returns an independent copy; of nil, nil.
func (w *Warm) Clone() *Warm {
	if w == nil {
		return nil
	}
	return &Warm{n: w.n, p: w.p, poles: slices.Clone(w.poles), vectors: slices.Clone(w.vectors)}
}

// Empty tells whether w holds no choice yet.
func (w *Warm) Empty() bool { return w == nil || len(w.poles) == 0 }

func (w *Warm) clear() { w.poles, w.vectors = w.poles[:0], w.vectors[:0] }

// keep stores the eigenvectors of r.
func (w *Warm) keep(r *robust) {
	w.n, w.p = r.n, r.p
	w.clear()
	for i := range r.groups {
		g := &r.groups[i]
		for j := range g.m {
			w.poles = append(w.poles, g.pole)
			w.vectors = append(w.vectors, g.t[j*r.n:j*r.n+r.n]...)
		}
	}
}

// project turns the frames of r, which hold bases of the null spaces, so that the
// eigenvectors are as near as possible to the stored ones of the nearest poles. It
// reports false where nothing fits.
func (w *Warm) project(r *robust) bool {
	if w.Empty() || w.n != r.n || w.p != r.p {
		return false
	}
	n, p := r.n, r.p
	used := make([]bool, len(w.poles))
	for i := range r.groups {
		g := &r.groups[i]
		basis := slices.Clone(g.t)
		for j := range g.m {
			k := w.nearest(g.pole, used)
			if k < 0 {
				return false
			}
			used[k] = true
			if !projectOnto(g.t[j*n:j*n+n], basis, w.vectors[k*n:k*n+n]) {
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

// nearest finds the unused stored pole of the same kind that is closest.
func (w *Warm) nearest(to pole, used []bool) int {
	best := -1
	for i, q := range w.poles {
		if !used[i] && q.pair == to.pair && (best < 0 || cmplx.Abs(q.at-to.at) < cmplx.Abs(w.poles[best].at-to.at)) {
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
	for j := m; j < p; j++ {
		if j == m {
			for i := 0; i < len(rest); i += n {
				for k := range m {
					reflectComplex(rest[i:i+n], t[k*n:k*n+n])
				}
			}
		}
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
		x := t[j*n : j*n+n]
		s := complex(1/math.Sqrt(best), 0)
		for k, v := range rest[at : at+n] {
			x[k] = s * v
		}
		for i := 0; i < len(rest); i += n {
			reflectComplex(rest[i:i+n], x)
		}
	}
}
