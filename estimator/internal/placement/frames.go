package placement

import (
	"math"
	"math/cmplx"
)

// group is one distinct wanted eigenvalue with all its copies. Its eigenvectors
// lie in the null space of U₁ᵀ (M − λI), of dimension p for an observable plant,
// where B = U₀ Z and U₁ spans what B does not reach (Kautsky, Nichols & Van
// Dooren 1985).
type group struct {
	pole
	m int // copies of the eigenvalue, at most p
	// t is an orthonormal basis of the null space, p vectors of length n one
	// after the other; the first m are the eigenvectors. Real for a real pole.
	t []complex128
	// first is the row of Xᵀ where the group's eigenvectors start.
	first int
}

// free counts the real parameters that choose the group's eigenvectors.
func (g *group) free(p int) int {
	k := g.m * (p - g.m)
	if g.pair {
		k *= 2
	}
	return k
}

// gather sorts the poles into groups of equal ones. It returns the largest
// multiplicity.
func (r *robust) gather(list []pole) int {
	r.groups = r.groups[:0]
	most, width := 0, 0
	for _, p := range list {
		known := false
		for i := range r.groups {
			if r.groups[i].at == p.at {
				r.groups[i].m++
				known = true
				most = max(most, r.groups[i].m)
				break
			}
		}
		if !known {
			r.groups = append(r.groups, group{pole: p, m: 1})
			most = max(most, 1)
		}
	}
	r.free = 0
	for i := range r.groups {
		g := &r.groups[i]
		g.first = width
		width += g.m * g.width()
		if g.m <= r.p {
			r.free += g.free(r.p)
		}
	}
	return most
}

// nullSpaces fills the frames of all groups with a basis of their null spaces.
func (r *robust) nullSpaces() {
	size := r.n * r.p
	r.frames = grow(r.frames, size*len(r.groups))
	for i := range r.groups {
		g := &r.groups[i]
		g.t = r.frames[i*size : (i+1)*size : (i+1)*size]
		r.nullSpace(g.t, g.at)
	}
}

// nullSpace writes an orthonormal basis of the null space of W − λ U₁ᵀ to t, from
// a Householder QR factorisation of its conjugate transpose.
func (r *robust) nullSpace(t []complex128, lambda complex128) {
	n := r.n
	k := n - r.p
	h := r.house[:k*n]
	for i := range h {
		h[i] = complex(r.w[i], 0) - cmplx.Conj(lambda)*complex(r.u1[i], 0)
	}
	complement(t, h, k, n)
}

// complement writes an orthonormal basis of what is orthogonal to the k vectors of
// length n in h, which it overwrites, to t: n − k vectors.
func complement(t, h []complex128, k, n int) {
	for j := range k {
		v := h[j*n+j : j*n+n]
		if !householder(v) {
			clear(v)
			continue
		}
		for l := j + 1; l < k; l++ {
			reflectComplex(h[l*n+j:l*n+n], v)
		}
	}
	t = t[:(n-k)*n]
	clear(t)
	for i := range n - k {
		x := t[i*n : i*n+n]
		x[k+i] = 1
		for j := k - 1; j >= 0; j-- {
			reflectComplex(x[j:], h[j*n+j:j*n+n])
		}
	}
}

// householder replaces v by the vector u for which I − u uᴴ maps v to the first
// axis. It reports false for a zero vector.
func householder(v []complex128) bool {
	sum := 0.0
	for _, x := range v {
		sum += real(x)*real(x) + imag(x)*imag(x)
	}
	norm := math.Sqrt(sum)
	if norm == 0 {
		return false
	}
	lead := cmplx.Abs(v[0])
	if lead == 0 {
		v[0] = complex(norm, 0)
	} else {
		v[0] *= complex(1+norm/lead, 0)
	}
	// ‖u‖² = 2 (norm² + norm lead) before scaling to 2.
	scale := complex(1/math.Sqrt(norm*(norm+lead)), 0)
	for i := range v {
		v[i] *= scale
	}
	return true
}

// reflectComplex applies I − v vᴴ to x.
func reflectComplex(x, v []complex128) {
	x = x[:len(v)]
	var dr, di float64
	for i, a := range v {
		b := x[i]
		dr += real(a)*real(b) + imag(a)*imag(b)
		di += real(a)*imag(b) - imag(a)*real(b)
	}
	dot := complex(dr, di)
	for i, a := range v {
		x[i] -= dot * a
	}
}

// orthonormalise makes the p vectors of length n in t orthonormal, the first ones
// keeping their span. It reports false where they are dependent.
func orthonormalise(t []complex128, n int) bool {
	for i := 0; i < len(t); i += n {
		x := t[i : i+n]
		for j := 0; j < i; j += n {
			reflectComplex(x, t[j:j+n]) // for a unit vector a projection
		}
		sum := 0.0
		for _, v := range x {
			sum += real(v)*real(v) + imag(v)*imag(v)
		}
		if !(sum > 1e-16) {
			return false
		}
		s := 1 / math.Sqrt(sum)
		for k, v := range x {
			x[k] = complex(real(v)*s, imag(v)*s)
		}
	}
	return true
}
