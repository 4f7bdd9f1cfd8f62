package frequency

import (
	"math"
	"math/cmplx"

	"gonum.org/v1/gonum/blas"
	"gonum.org/v1/gonum/lapack"
	lapackgonum "gonum.org/v1/gonum/lapack/gonum"
)

var impl lapackgonum.Implementation

// tame refuses entries so large that the balancing of package lapack never ends
// (it does not survive an overflow of a norm), and drops those so small that its
// powers of two underflow.
func tame(a dense) error {
	const huge = 1e120
	for i, v := range a.v {
		if !(math.Abs(v) < huge) {
			return ErrNotFinite
		}
		if math.Abs(v) < 1/huge {
			a.v[i] = 0
		}
	}
	return nil
}

// eigenvalues returns those of a, which is overwritten. It balances first.
func eigenvalues(a dense) (re, im []float64, err error) {
	n := a.r
	if err := tame(a); err != nil {
		return nil, nil, err
	}
	re, im = make([]float64, n), make([]float64, n)
	work := make([]float64, max(1, 40*n))
	if first := impl.Dgeev(lapack.LeftEVNone, lapack.RightEVNone, n, a.v, n, re, im, nil, 1, nil, 1, work, len(work)); first != 0 {
		return nil, nil, ErrNoConvergence
	}
	return re, im, nil
}

// response evaluates C (jν I − A)⁻¹ B + D on a balanced Hessenberg form of A
// (Laub 1981), n² operations per input and frequency.
type response struct {
	n, in, out int
	h, b, c, d dense
	re, im     []float64    // eigenvalues of A
	lu         []complex128 // jν I − H under elimination
	x, g       []complex128 // n×in and out×in
	noise      float64      // size of the terms behind the last value
	gram       []float64
	values     []float64
	work       []float64
}

func newResponse(m *model) (*response, error) {
	n := m.n
	r := &response{n: n, in: m.b.c, out: m.c.r, h: m.a.clone(), b: m.b.clone(), c: m.c.clone(), d: m.d}
	if err := tame(r.h); err != nil {
		return nil, err
	}
	scale := make([]float64, n)
	impl.Dgebal(lapack.Scale, n, r.h.v, n, scale)
	for i, f := range scale {
		for k := range r.b.row(i) {
			r.b.row(i)[k] /= f
		}
		for k := range r.out {
			r.c.row(k)[i] *= f
		}
	}
	tau, work := make([]float64, max(1, n-1)), make([]float64, max(1, 40*(n+r.in+r.out)))
	if n > 1 {
		impl.Dgehrd(n, 0, n-1, r.h.v, n, tau, work, len(work))
		impl.Dormhr(blas.Left, blas.Trans, n, r.in, 0, n-1, r.h.v, n, tau, r.b.v, r.in, work, len(work))
		impl.Dormhr(blas.Right, blas.NoTrans, r.out, n, 0, n-1, r.h.v, n, tau, r.c.v, n, work, len(work))
		for i := 2; i < n; i++ {
			clear(r.h.row(i)[:i-1])
		}
	}
	var err error
	if r.re, r.im, err = eigenvalues(r.h.clone()); err != nil {
		return nil, err
	}
	r.lu, r.x, r.g = make([]complex128, n*n), make([]complex128, n*r.in), make([]complex128, r.out*r.in)
	k := 2 * min(r.in, r.out)
	r.gram, r.values, r.work = make([]float64, k*k), make([]float64, k), make([]float64, 3*k)
	return r, nil
}

// row is the response of output i alone, on the same workspace.
func (r *response) row(i int) *response {
	one := *r
	one.out = 1
	one.c, one.d = dense{1, r.n, r.c.row(i)}, dense{1, r.in, r.d.row(i)}
	one.g = r.g[:r.in]
	return &one
}

// stable says whether all eigenvalues lie to the left by more than rounding.
func (r *response) stable() bool {
	for i, re := range r.re {
		if !(re < -1e-13*math.Hypot(re, r.im[i])) {
			return false
		}
	}
	return true
}

// at returns the response, out×in by rows; ν = +Inf gives D. The slice is valid
// until the next call.
func (r *response) at(nu float64) []complex128 {
	for i, v := range r.d.v {
		r.g[i] = complex(v, 0)
	}
	r.noise = r.d.largest()
	if math.IsInf(nu, 1) {
		return r.g
	}
	r.solve(nu)
	for i := range r.out {
		for l, c := range r.c.row(i) {
			for k, x := range r.x[l*r.in : (l+1)*r.in] {
				v := complex(c*real(x), c*imag(x))
				r.g[i*r.in+k] += v
				r.noise = max(r.noise, cmplx.Abs(v))
			}
		}
	}
	return r.g
}

// solve sets x = (jν I − H)⁻¹ B by elimination with neighbouring rows as pivots.
func (r *response) solve(nu float64) {
	n, in := r.n, r.in
	for i, v := range r.h.v {
		r.lu[i] = complex(-v, 0)
	}
	for i := range n {
		r.lu[i*n+i] += complex(0, nu)
	}
	for i, v := range r.b.v {
		r.x[i] = complex(v, 0)
	}
	size := func(v complex128) float64 { return math.Abs(real(v)) + math.Abs(imag(v)) }
	for k := range n - 1 {
		top, low := r.lu[k*n:k*n+n], r.lu[(k+1)*n:(k+2)*n]
		xt, xl := r.x[k*in:(k+1)*in], r.x[(k+1)*in:(k+2)*in]
		if size(low[k]) > size(top[k]) {
			for j := k; j < n; j++ {
				top[j], low[j] = low[j], top[j]
			}
			for j := range xt {
				xt[j], xl[j] = xl[j], xt[j]
			}
		}
		if low[k] == 0 {
			continue
		}
		f := low[k] / top[k]
		for j := k + 1; j < n; j++ {
			low[j] -= f * top[j]
		}
		for j, v := range xt {
			xl[j] -= f * v
		}
	}
	for k := n - 1; k >= 0; k-- {
		row := r.lu[k*n : k*n+n]
		for j := range in {
			v := r.x[k*in+j]
			for l := k + 1; l < n; l++ {
				v -= row[l] * r.x[l*in+j]
			}
			r.x[k*in+j] = v / row[k]
		}
	}
}

// gain is the largest singular value of the response at ν.
func (r *response) gain(nu float64) float64 {
	g := r.at(nu)
	var scale float64
	for _, v := range g {
		scale = max(scale, cmplx.Abs(v))
	}
	if scale == 0 || math.IsNaN(scale) || math.IsInf(scale, 0) {
		return scale
	}
	if r.in == 1 || r.out == 1 {
		var sum float64
		for _, v := range g {
			a := cmplx.Abs(v) / scale
			sum += a * a
		}
		return scale * math.Sqrt(sum)
	}
	// G Gᴴ (or Gᴴ G) = X + jY is embedded as [X −Y; Y X]
	k, other := min(r.in, r.out), max(r.in, r.out)
	entry := func(i, l int) complex128 {
		if r.out <= r.in {
			return g[i*r.in+l] / complex(scale, 0)
		}
		return cmplx.Conj(g[l*r.in+i]) / complex(scale, 0)
	}
	for i := range k {
		for j := range k {
			var sum complex128
			for l := range other {
				sum += entry(i, l) * cmplx.Conj(entry(j, l))
			}
			r.gram[i*2*k+j], r.gram[(k+i)*2*k+k+j] = real(sum), real(sum)
			r.gram[(k+i)*2*k+j], r.gram[i*2*k+k+j] = imag(sum), -imag(sum)
		}
	}
	if !impl.Dsyev(lapack.EVNone, blas.Upper, 2*k, r.gram, 2*k, r.values, r.work, len(r.work)) {
		return math.NaN()
	}
	return scale * math.Sqrt(max(r.values[2*k-1], 0))
}
