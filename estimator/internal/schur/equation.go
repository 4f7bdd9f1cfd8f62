package schur

import (
	"math"

	"gonum.org/v1/gonum/blas"
	"gonum.org/v1/gonum/blas/blas64"
)

// equation is the workspace of the four matrix equations. All of them are
// solved by one upward sweep: the adjoint ones after turning T over its
// antidiagonal, which exchanges T and Tᵀ and keeps the form.
type equation struct {
	x, w, h  blas64.General // unknown, T X, intermediate products
	turnedT  blas64.General
	turnedZ  blas64.General
	r        [2][]float64
	t, z     blas64.General // the factors in use
	size     float64        // n times the largest entry of T
	discrete bool
}

// Lyapunov sets dst to the solution P of A P + P Aᵀ + Q = 0, all n×n, for
// symmetric q. dst may share the data of q. Only (q + qᵀ)/2 counts and the
// result is exactly symmetric. Where two eigenvalues of A add to zero, to
// working precision, the error is ErrSingular and dst is left as it was.
func (f *Form) Lyapunov(dst, q blas64.General) error { return f.solve(dst, q, false, false) }

// LyapunovAdjoint is Lyapunov for Aᵀ P + P A + Q = 0.
func (f *Form) LyapunovAdjoint(dst, q blas64.General) error { return f.solve(dst, q, false, true) }

// Stein sets dst to the solution P of P = A P Aᵀ + Q, all n×n, for symmetric
// q; dst may share the data of q. Where two eigenvalues of A have the product
// 1, to working precision, the error is ErrSingular and dst is left as it was.
func (f *Form) Stein(dst, q blas64.General) error { return f.solve(dst, q, true, false) }

// SteinAdjoint is Stein for P = Aᵀ P A + Q.
func (f *Form) SteinAdjoint(dst, q blas64.General) error { return f.solve(dst, q, true, true) }

func (f *Form) solve(dst, q blas64.General, discrete, adjoint bool) error {
	if !f.valid {
		return ErrEmpty
	}
	n := f.n
	if err := check(q, n); err != nil {
		return err
	}
	if err := check(dst, n); err != nil {
		return err
	}
	if n == 0 {
		return nil
	}
	if size := largest(q); math.IsNaN(size) || math.IsInf(size, 0) {
		return ErrNotFinite
	}
	e := &f.eq
	e.prepare(f, discrete, adjoint)
	e.turn(q)
	if !e.sweep() {
		return ErrSingular
	}
	e.turnBack()
	if size := largest(e.w); math.IsNaN(size) || math.IsInf(size, 0) {
		return ErrSingular
	}
	for i := range n {
		for j := range i + 1 {
			v := e.w.Data[i*n+j]/2 + e.w.Data[j*n+i]/2
			dst.Data[i*dst.Stride+j], dst.Data[j*dst.Stride+i] = v, v
		}
	}
	return nil
}

func (e *equation) prepare(f *Form, discrete, adjoint bool) {
	n := f.n
	if e.x.Data == nil {
		e.x, e.w, e.h = square(n), square(n), square(n)
		e.turnedT, e.turnedZ = square(n), square(n)
		e.r[0], e.r[1] = make([]float64, n), make([]float64, n)
	}
	e.discrete = discrete
	e.t, e.z = f.t, f.z
	if adjoint {
		for i := range n {
			for j := range n {
				e.turnedT.Data[i*n+j] = f.t.Data[(n-1-j)*n+n-1-i]
				e.turnedZ.Data[i*n+j] = f.z.Data[i*n+n-1-j]
			}
		}
		e.t, e.z = e.turnedT, e.turnedZ
	}
	e.size = float64(n) * largest(f.t)
}

// turn sets x to Zᵀ (Q + Qᵀ)/2 Z, made symmetric.
func (e *equation) turn(q blas64.General) {
	n := e.x.Rows
	for i := range n {
		for j := range n {
			e.w.Data[i*n+j] = q.Data[i*q.Stride+j]/2 + q.Data[j*q.Stride+i]/2
		}
	}
	blas64.Gemm(blas.NoTrans, blas.NoTrans, 1, e.w, e.z, 0, e.h)
	blas64.Gemm(blas.Trans, blas.NoTrans, 1, e.z, e.h, 0, e.x)
	for i := range n {
		for j := range i {
			v := e.x.Data[i*n+j]/2 + e.x.Data[j*n+i]/2
			e.x.Data[i*n+j], e.x.Data[j*n+i] = v, v
		}
	}
}

// turnBack sets w to Z X Zᵀ.
func (e *equation) turnBack() {
	blas64.Gemm(blas.NoTrans, blas.Trans, 1, e.x, e.z, 0, e.h)
	blas64.Gemm(blas.NoTrans, blas.NoTrans, 1, e.z, e.h, 0, e.w)
}

// start returns the first index of the diagonal block of t that ends at i.
func start(t blas64.General, i int) int {
	if i > 0 && t.Data[i*t.Stride+i-1] != 0 {
		return i - 1
	}
	return i
}

// sweep solves, in place of the right side F held in x,
//
//	T X + X Tᵀ + F = 0   or   X = T X Tᵀ + F,
//
// from the last block column to the first. As X is symmetric its column j is
// its row j, so that every inner loop runs along rows; what lies below the
// diagonal block is known from the columns done before.
func (e *equation) sweep() bool {
	n := e.x.Rows
	for last := n - 1; last >= 0; {
		first := start(e.t, last)
		done := e.lyapunovColumn
		if e.discrete {
			done = e.steinColumn
		}
		if !done(first, last) {
			return false
		}
		for j := first; j <= last; j++ {
			for i := range first {
				e.x.Data[i*n+j] = e.x.Data[j*n+i]
			}
		}
		last = first - 1
	}
	return true
}

// lyapunovColumn finds the block column first..last of X down to row last.
func (e *equation) lyapunovColumn(first, last int) bool {
	n, t, x := e.x.Rows, e.t.Data, e.x.Data
	for j := first; j <= last; j++ {
		r := e.r[j-first][:last+1]
		for i := range r {
			r[i] = -x[j*n+i] - dot(t[i*n+last+1:i*n+n], x[j*n+last+1:j*n+n])
		}
		for k := last + 1; k < n; k++ {
			axpy(r, -t[j*n+k], x[k*n:k*n+last+1])
		}
	}
	for bottom := last; bottom >= 0; {
		top := start(e.t, bottom)
		var sys small
		for i := top; i <= bottom; i++ {
			for j := first; j <= last; j++ {
				r := e.r[j-first]
				sys.set(i-top, j-first, r[i]-dot(t[i*n+bottom+1:i*n+last+1], x[j*n+bottom+1:j*n+last+1]))
			}
		}
		sys.lyapunov(e.t, top, bottom, first, last, e.size)
		if !sys.solve() {
			return false
		}
		if top == first {
			sys.symmetrise()
		}
		for i := top; i <= bottom; i++ {
			for j := first; j <= last; j++ {
				x[j*n+i] = sys.get(i-top, j-first)
			}
		}
		bottom = top - 1
	}
	return true
}

// steinColumn finds the block column first..last of X down to row last. The
// rows of w keep T X of the columns done, which makes the sweep O(n³).
func (e *equation) steinColumn(first, last int) bool {
	n, t, x, w := e.x.Rows, e.t.Data, e.x.Data, e.w.Data
	for j := first; j <= last; j++ {
		r := e.r[j-first][:last+1]
		copy(r, x[j*n:j*n+last+1])
		for k := last + 1; k < n; k++ {
			axpy(r, t[j*n+k], w[k*n:k*n+last+1])
		}
	}
	for bottom := last; bottom >= 0; {
		top := start(e.t, bottom)
		var v [2][2]float64 // the part of T X that is known already
		var sys small
		for i := top; i <= bottom; i++ {
			for j := first; j <= last; j++ {
				v[i-top][j-first] = dot(t[i*n+bottom+1:i*n+n], x[j*n+bottom+1:j*n+n])
			}
		}
		for i := top; i <= bottom; i++ {
			for j := first; j <= last; j++ {
				g := e.r[j-first][i]
				for k := first; k <= last; k++ {
					g += v[i-top][k-first] * t[j*n+k]
				}
				sys.set(i-top, j-first, g)
			}
		}
		sys.stein(e.t, top, bottom, first, last)
		if !sys.solve() {
			return false
		}
		if top == first {
			sys.symmetrise()
		}
		for i := top; i <= bottom; i++ {
			for j := first; j <= last; j++ {
				x[j*n+i] = sys.get(i-top, j-first)
				w[j*n+i] = v[i-top][j-first]
			}
		}
		for i := top; i <= bottom; i++ {
			for j := first; j <= last; j++ {
				w[j*n+i] += dot(t[i*n+top:i*n+bottom+1], x[j*n+top:j*n+bottom+1])
			}
		}
		bottom = top - 1
	}
	return true
}

func dot(a, b []float64) float64 {
	sum := 0.0
	b = b[:len(a)]
	for i, v := range a {
		sum += v * b[i]
	}
	return sum
}

func axpy(y []float64, alpha float64, x []float64) {
	x = x[:len(y)]
	for i := range y {
		y[i] += alpha * x[i]
	}
}
