package schur

import "math"

// tiniest is the size below which a subdiagonal entry counts as nothing; the
// matrices that come here are scaled to squares inside the range of numbers.
const tiniest = 0x1p-1022 / eps

// maxSweeps is how many steps one eigenvalue may take; a few are usual.
const maxSweeps = 60

// francis turns the upper Hessenberg matrix in f.t to standardised real Schur
// form and multiplies the rotations into f.z: the implicit double-shift QR
// iteration of Francis, "The QR transformation", Computer J. 4 (1961-62), as
// told by Golub & Van Loan, "Matrix Computations", section 7.5, with the
// deflation test of Ahues & Tisseur (LAPACK working note 122, 1997). It works
// on the Form's own slices and allocates nothing. False: no convergence.
func (f *Form) francis() bool {
	size := largest(f.t)
	sweeps := 0
	for hi := f.n - 1; hi >= 0; {
		switch lo := f.deflate(hi, size); {
		case lo == hi:
			hi, sweeps = hi-1, 0
		case lo == hi-1:
			f.standardise(lo)
			hi, sweeps = hi-2, 0
		default:
			if sweeps++; sweeps > maxSweeps {
				return false
			}
			f.sweep(lo, hi, f.shifts(lo, hi, sweeps))
		}
	}
	f.read()
	return true
}

// deflate returns the first row of the unreduced block that ends at hi, and
// sets the negligible entry before it to zero.
func (f *Form) deflate(hi int, size float64) int {
	n, h := f.n, f.t.Data
	for k := hi; k > 0; k-- {
		low, high := math.Abs(h[k*n+k-1]), math.Abs(h[(k-1)*n+k])
		if low <= tiniest {
			h[k*n+k-1] = 0
			return k
		}
		a, b := h[(k-1)*n+k-1], h[k*n+k]
		sum := math.Abs(a) + math.Abs(b)
		if sum == 0 {
			sum = size
		}
		if low > eps*sum {
			continue
		}
		large, small := max(low, high), min(low, high)
		one, two := math.Abs(b), math.Abs(a-b)
		one, two = max(one, two), min(one, two)
		s := one + large
		if small*(large/s) <= max(tiniest, eps*(two*(one/s))) {
			h[k*n+k-1] = 0
			return k
		}
	}
	return 0
}

// shift is a pair of shifts re ± i im; for two real ones im is 0 and the one
// closer to the last diagonal entry is taken twice.
type shift struct{ re, im float64 }

func (f *Form) shifts(lo, hi, sweeps int) shift {
	n, h := f.n, f.t.Data
	a, b := h[(hi-1)*n+hi-1], h[(hi-1)*n+hi]
	c, d := h[hi*n+hi-1], h[hi*n+hi]
	if sweeps%10 == 0 { // out of the ordinary, to break a cycle
		s := math.Abs(c) + math.Abs(h[(hi-1)*n+hi-2])
		at := d
		if sweeps%20 == 0 {
			s = math.Abs(h[(lo+1)*n+lo]) + math.Abs(h[(lo+2)*n+lo+1])
			at = h[lo*n+lo]
		}
		return shift{re: 0.75*s + at, im: math.Sqrt(0.4375) * s}
	}
	half, mid := (a-d)/2, (a+d)/2
	disc := half*half + b*c
	if disc < 0 {
		return shift{re: mid, im: math.Sqrt(-disc)}
	}
	root := math.Sqrt(disc)
	if math.Abs(mid+root-d) <= math.Abs(mid-root-d) {
		return shift{re: mid + root}
	}
	return shift{re: mid - root}
}

// sweep chases one bulge down rows lo to hi.
func (f *Form) sweep(lo, hi int, sh shift) {
	n, h := f.n, f.t.Data
	var x [3]float64
	start := hi - 2
	for ; ; start-- {
		x = f.firstColumn(start, sh)
		if start == lo {
			break
		}
		before := math.Abs(h[start*n+start-1]) * (math.Abs(x[1]) + math.Abs(x[2]))
		around := math.Abs(h[(start-1)*n+start-1]) + math.Abs(h[start*n+start]) + math.Abs(h[(start+1)*n+start+1])
		if before <= eps*math.Abs(x[0])*around {
			break // two small entries in a row
		}
	}
	for k := start; k < hi; k++ {
		count := min(3, hi-k+1)
		if k > start {
			x = [3]float64{}
			for i := range count {
				x[i] = h[(k+i)*n+k-1]
			}
		}
		v1, v2, tau, beta := reflector(x)
		switch {
		case k > start:
			h[k*n+k-1] = beta
			for i := 1; i < count; i++ {
				h[(k+i)*n+k-1] = 0
			}
		case k > lo:
			h[k*n+k-1] *= 1 - tau
		}
		if tau != 0 {
			f.reflect(k, count, hi, v1, v2, tau)
		}
	}
}

// firstColumn returns a multiple of the first column of (H − σ₁)(H − σ₂) of
// the block that starts at k.
func (f *Form) firstColumn(k int, sh shift) [3]float64 {
	n, h := f.n, f.t.Data
	a, b := h[k*n+k], h[k*n+k+1]
	c, d := h[(k+1)*n+k], h[(k+1)*n+k+1]
	s := math.Abs(a-sh.re) + math.Abs(sh.im) + math.Abs(c)
	g := c / s
	x := [3]float64{
		(a-sh.re)*((a-sh.re)/s) + sh.im*(sh.im/s) + g*b,
		g * (a + d - 2*sh.re),
		g * h[(k+2)*n+k+1],
	}
	if sum := math.Abs(x[0]) + math.Abs(x[1]) + math.Abs(x[2]); sum > 0 {
		x[0], x[1], x[2] = x[0]/sum, x[1]/sum, x[2]/sum
	}
	return x
}

// reflector returns the Householder reflection I − τ v vᵀ, v = (1, v1, v2),
// that turns x into (β, 0, 0).
func reflector(x [3]float64) (v1, v2, tau, beta float64) {
	s := math.Abs(x[1]) + math.Abs(x[2])
	if s == 0 {
		return 0, 0, 0, x[0]
	}
	s += math.Abs(x[0])
	a, b, c := x[0]/s, x[1]/s, x[2]/s
	norm := math.Sqrt(a*a + b*b + c*c)
	if a > 0 {
		norm = -norm
	}
	return b / (a - norm), c / (a - norm), (norm - a) / norm, norm * s
}

// reflect applies a reflection to rows and columns k.. of T and to Z.
func (f *Form) reflect(k, count, hi int, v1, v2, tau float64) {
	n, h, z := f.n, f.t.Data, f.z.Data
	t1, t2 := tau*v1, tau*v2
	r0, r1 := h[k*n+k:k*n+n], h[(k+1)*n+k:(k+1)*n+n]
	if count == 2 {
		for j := range r0 {
			sum := r0[j] + v1*r1[j]
			r0[j] -= sum * tau
			r1[j] -= sum * t1
		}
		two(h[k:], n, hi+1, v1, tau)
		two(z[k:], n, n, v1, tau)
		return
	}
	r2 := h[(k+2)*n+k : (k+2)*n+n]
	for j := range r0 {
		sum := r0[j] + v1*r1[j] + v2*r2[j]
		r0[j] -= sum * tau
		r1[j] -= sum * t1
		r2[j] -= sum * t2
	}
	three(h[k:], n, min(k+4, hi+1), v1, v2, tau)
	three(z[k:], n, n, v1, v2, tau)
}

// two and three apply a reflection from the right to the first entries of the
// given number of rows.
func two(m []float64, stride, rows int, v1, tau float64) {
	for i := range rows {
		r := m[i*stride : i*stride+2]
		sum := (r[0] + v1*r[1]) * tau
		r[0] -= sum
		r[1] -= sum * v1
	}
}

func three(m []float64, stride, rows int, v1, v2, tau float64) {
	for i := range rows {
		r := m[i*stride : i*stride+3]
		sum := (r[0] + v1*r[1] + v2*r[2]) * tau
		r[0] -= sum
		r[1] -= sum * v1
		r[2] -= sum * v2
	}
}

// standardise turns the 2×2 block at k so that it is triangular or has equal
// diagonal entries.
func (f *Form) standardise(k int) {
	n, h, z := f.n, f.t.Data, f.z.Data
	at := k*n + k
	aa, bb, cc, dd, _, _, _, _, cs, sn := impl.Dlanv2(h[at], h[at+1], h[at+n], h[at+n+1])
	h[at], h[at+1], h[at+n], h[at+n+1] = aa, bb, cc, dd
	for j := k + 2; j < n; j++ {
		x, y := h[k*n+j], h[(k+1)*n+j]
		h[k*n+j], h[(k+1)*n+j] = cs*x+sn*y, cs*y-sn*x
	}
	for i := range k {
		x, y := h[i*n+k], h[i*n+k+1]
		h[i*n+k], h[i*n+k+1] = cs*x+sn*y, cs*y-sn*x
	}
	for i := range n {
		x, y := z[i*n+k], z[i*n+k+1]
		z[i*n+k], z[i*n+k+1] = cs*x+sn*y, cs*y-sn*x
	}
}

// read takes the eigenvalues from the diagonal blocks.
func (f *Form) read() {
	n, h := f.n, f.t.Data
	for i := 0; i < n; i++ {
		f.wr[i], f.wi[i] = h[i*n+i], 0
		if i+1 < n && h[(i+1)*n+i] != 0 {
			f.wi[i] = math.Sqrt(math.Abs(h[i*n+i+1])) * math.Sqrt(math.Abs(h[(i+1)*n+i]))
			f.wr[i+1], f.wi[i+1] = h[(i+1)*n+i+1], -f.wi[i]
			i++
		}
	}
}
