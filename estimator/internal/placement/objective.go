package placement

import "math"

// power is the exponent q of the measure below; squarings of a matrix reach it.
const (
	powerRough = 0  // q = 1: the Frobenius condition number
	powerFine  = 4  // q = 16
	powerNoise = -1 // not a power: the noise takes the measure's place
)

// value is what a descent minimises: the measure below with the given squarings, or
// the noise.
func (r *robust) value(squarings int) float64 {
	if squarings == powerNoise {
		return r.noise.measure(r)
	}
	return r.measure(squarings)
}

// measure computes f = (log tr Gᑫ + log tr G⁻ᑫ) / 2q with G = XᵀX, q = 2^squarings,
// and its gradient with respect to X. exp f bounds the 2-norm condition number of
// X from above and tends to it as q grows; q = 1 gives the Frobenius condition
// number, the measure of Byers & Nash 1989. The columns of X are the unit
// eigenvectors, √2 Re x and √2 Im x for a pair, which have the singular values of
// the complex matrix. X is taken from and the gradient left in transposed form:
// one row per column. f is +Inf where X is singular.
func (r *robust) measure(squarings int) float64 {
	n := r.n
	r.fillX()
	if !invert(r.dual, r.xt, r.lu, r.pivot, n) {
		return math.Inf(1)
	}
	f := 0.0
	for pass, rows := range [][]float64{r.xt, r.dual} {
		g := r.gram
		if pass == 1 {
			g = r.gramInverse
		}
		trace := gramian(g, rows, n)
		f += math.Log(trace)
		if !(trace > 0) || math.IsInf(trace, 1) {
			return math.Inf(1)
		}
		scale(g, 1/trace)
		q := 1.0
		for range squarings {
			q *= 2
			trace = gramian(r.lu, g, n) // the square of a symmetric matrix
			copy(g, r.lu)
			f += math.Log(trace) / q
			scale(g, 1/trace)
		}
	}
	// Both are now Gᑫ / tr Gᑫ and G⁻ᑫ / tr G⁻ᑫ.
	for i, v := range r.gramInverse {
		r.gram[i] -= v
	}
	multiply(r.gradient, r.gram, r.dual, n)
	return f / 2
}

// fillX copies the eigenvectors of all groups to the rows of xt.
func (r *robust) fillX() {
	n := r.n
	for i := range r.groups {
		g := &r.groups[i]
		row := g.first * n
		for j := range g.m {
			x := g.t[j*n : j*n+n]
			if !g.pair {
				for k, v := range x {
					r.xt[row+k] = real(v)
				}
				row += n
				continue
			}
			for k, v := range x {
				r.xt[row+k] = math.Sqrt2 * real(v)
				r.xt[row+n+k] = math.Sqrt2 * imag(v)
			}
			row += 2 * n
		}
	}
}

// gramian writes rows·rowsᵀ to g and returns its trace. It works on blocks of 2×2
// entries, so that four sums run side by side.
func gramian(g, rows []float64, n int) float64 {
	even := n &^ 1
	for i := 0; i < even; i += 2 {
		a0 := rows[i*n : i*n+n]
		a1 := rows[i*n+n : i*n+2*n]
		for j := 0; j <= i; j += 2 {
			b0 := rows[j*n : j*n+n]
			b1 := rows[j*n+n : j*n+2*n]
			var s00, s01, s10, s11 float64
			for k, u := range a0 {
				v, x, y := a1[k], b0[k], b1[k]
				s00 += u * x
				s01 += u * y
				s10 += v * x
				s11 += v * y
			}
			g[i*n+j], g[i*n+j+1], g[(i+1)*n+j], g[(i+1)*n+j+1] = s00, s01, s10, s11
			g[j*n+i], g[(j+1)*n+i], g[j*n+i+1], g[(j+1)*n+i+1] = s00, s01, s10, s11
		}
	}
	if even < n {
		a := rows[even*n : even*n+n]
		for j := range n {
			b := rows[j*n : j*n+n]
			sum := 0.0
			for k, v := range a {
				sum += v * b[k]
			}
			g[even*n+j], g[j*n+even] = sum, sum
		}
	}
	trace := 0.0
	for i := range n {
		trace += g[i*n+i]
	}
	return trace
}

func scale(g []float64, s float64) {
	for i := range g {
		g[i] *= s
	}
}

// multiply writes a·b to dst, all n×n, two rows of b at a time.
func multiply(dst, a, b []float64, n int) {
	for i := range n {
		row := dst[i*n : i*n+n]
		k := 0
		if n&1 == 1 {
			t := a[i*n]
			for j, v := range b[:n] {
				row[j] = t * v
			}
			k = 1
		} else {
			clear(row)
		}
		for ; k < n; k += 2 {
			t, u := a[i*n+k], a[i*n+k+1]
			x, y := b[k*n:k*n+n], b[(k+1)*n:(k+2)*n]
			for j, v := range x {
				row[j] += t*v + u*y[j]
			}
		}
	}
}

// invert writes the transposed inverse of a to dst: dst·aᵀ = I. lu and pivot are
// work space. It reports false for a singular matrix.
func invert(dst, a, lu []float64, pivot []int, n int) bool {
	copy(lu, a)
	for i := range pivot {
		pivot[i] = i
	}
	for k := range n {
		best, at := 0.0, k
		for i := k; i < n; i++ {
			if v := math.Abs(lu[i*n+k]); v > best {
				best, at = v, i
			}
		}
		if !(best > 1e-14) {
			return false
		}
		if at != k {
			pivot[k], pivot[at] = pivot[at], pivot[k]
			for j := range n {
				lu[k*n+j], lu[at*n+j] = lu[at*n+j], lu[k*n+j]
			}
		}
		inv := 1 / lu[k*n+k]
		top := lu[k*n+k+1 : k*n+n]
		for i := k + 1; i < n; i++ {
			t := lu[i*n+k] * inv
			lu[i*n+k] = t
			if t == 0 {
				continue
			}
			row := lu[i*n+k+1 : i*n+n]
			for j, v := range top {
				row[j] -= t * v
			}
		}
	}
	// Row c of dst solves L U x = P e_c, of which the first entries are known zeros.
	for i, c := range pivot {
		x := dst[c*n : c*n+n]
		clear(x)
		x[i] = 1
		for k := i + 1; k < n; k++ {
			x[k] = -dot(lu[k*n+i:k*n+k], x[i:k])
		}
		for k := n - 1; k >= 0; k-- {
			x[k] = (x[k] - dot(lu[k*n+k+1:k*n+n], x[k+1:])) / lu[k*n+k]
		}
	}
	return true
}

// dot returns xᵀy with two running sums.
func dot(x, y []float64) float64 {
	y = y[:len(x)]
	var s, t float64
	i := 0
	for ; i+1 < len(x); i += 2 {
		s += x[i] * y[i]
		t += x[i+1] * y[i+1]
	}
	if i < len(x) {
		s += x[i] * y[i]
	}
	return s + t
}
