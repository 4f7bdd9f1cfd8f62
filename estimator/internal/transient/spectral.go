package transient

import "math"

// spectral computes 2-norms through the largest eigenvalue of XᵀX, which loses
// no accuracy for the largest one.
type spectral struct {
	gram, diagonal, off2, v, w []float64
}

func (g *spectral) reset(n int) {
	*g = spectral{gram: make([]float64, n*n), diagonal: make([]float64, n), off2: make([]float64, n), v: make([]float64, n), w: make([]float64, n)}
}

// norm returns the 2-norm of the rows and columns keep of the n×n matrix x, whose row i
// is zero before column first[i].
func (g *spectral) norm(n int, x []float64, keep, first []int) float64 {
	m := len(keep)
	var scale float64
	for _, i := range keep {
		for _, k := range keep {
			scale = max(scale, math.Abs(x[i*n+k]))
		}
	}
	if scale == 0 || math.IsInf(scale, 0) || math.IsNaN(scale) {
		return scale
	}
	a := g.gram[:m*m]
	clear(a)
	row := g.v[:m]
	for _, i := range keep {
		from := m
		for p, k := range keep {
			row[p] = x[i*n+k] / scale
			if k >= first[i] {
				from = min(from, p)
			}
		}
		for p := from; p < m; p++ {
			v, part := row[p], row[p:]
			dst := a[p*m+p : p*m+m]
			dst = dst[:len(part)]
			for q, w := range part {
				dst[q] += v * w
			}
		}
	}
	g.tridiagonal(m)
	return scale * math.Sqrt(largest(g.diagonal[:m], g.off2[:m]))
}

// tridiagonal reduces the upper triangle of gram by Householder reflections, from
// the first row on, to diagonal and the squares off2[i] of what couples i and i+1.
func (g *spectral) tridiagonal(m int) {
	a := g.gram
	for k := range m {
		g.diagonal[k] = a[k*m+k]
		g.off2[k] = 0
		if k >= m-1 {
			break
		}
		row := a[k*m : k*m+m]
		var rest, total float64
		for _, v := range row[k+2:] {
			rest += v * v
		}
		head := row[k+1]
		total = rest + head*head
		g.off2[k] = total
		if rest < 1e-60 { // nothing beside the largest entry, which is 1, and its square may vanish
			continue
		}
		// v with H = I − 2 v vᵀ/(vᵀv) takes the row to one entry
		v, w := g.v[:m], g.w[:m]
		copy(v[k+1:], row[k+1:])
		v[k+1] = head + math.Copysign(math.Sqrt(total), head)
		beta := 2 / (rest + v[k+1]*v[k+1])
		var vw float64
		for i := k + 1; i < m; i++ {
			w[i] = 0
		}
		for i := k + 1; i < m; i++ {
			vi, sum := v[i], a[i*m+i]*v[i]
			line := a[i*m : i*m+m]
			for j := i + 1; j < m; j++ {
				sum += line[j] * v[j]
				w[j] += line[j] * vi
			}
			w[i] += sum
		}
		for i := k + 1; i < m; i++ {
			w[i] *= beta
			vw += w[i] * v[i]
		}
		half := vw * beta / 2
		for i := k + 1; i < m; i++ {
			w[i] -= half * v[i]
		}
		for i := k + 1; i < m; i++ {
			vi, wi := v[i], w[i]
			line := a[i*m : i*m+m]
			for j := i; j < m; j++ {
				line[j] -= vi*w[j] + wi*v[j]
			}
		}
	}
}

// largest returns the largest eigenvalue of a symmetric tridiagonal matrix that
// has none below zero, by Laguerre's method from an upper bound: it descends
// without passing it, and fast beside a second eigenvalue as well (Parlett 1964).
func largest(diagonal, off2 []float64) float64 {
	var x, left float64
	for i, d := range diagonal {
		right := 0.0
		if i < len(diagonal)-1 {
			right = math.Sqrt(off2[i])
		}
		x = max(x, d+left+right)
		left = right
	}
	if x == 0 {
		return 0
	}
	x *= 1 + 1e-14
	n := float64(len(diagonal))
	for range 60 {
		// pivots q of x I − T with their derivatives; s1 = Σ 1/(x − λ), s2 = Σ 1/(x − λ)²
		var s1, s2, q, dq, ddq float64
		for i, d := range diagonal {
			q0, dq0, ddq0 := q, dq, ddq
			q, dq, ddq = x-d, 1, 0
			if i > 0 {
				r := off2[i-1] / q0
				u := dq0 / q0
				q -= r
				dq += r * u
				ddq = r * (ddq0/q0 - 2*u*u)
			}
			if q <= 0 { // rounding: x has arrived
				return x
			}
			u := dq / q
			s1 += u
			s2 += u*u - ddq/q
		}
		step := n / (s1 + math.Sqrt(max((n-1)*(n*s2-s1*s1), 0)))
		x -= step
		if !(step > 1e-13*x) {
			break
		}
	}
	return x
}
