package placement

import (
	"fmt"
	"math"
	"math/cmplx"

	"gonum.org/v1/gonum/blas/blas64"
	"gonum.org/v1/gonum/lapack"
	"gonum.org/v1/gonum/lapack/gonum"
)

// checker holds a gain against the poles it should give.
type checker struct {
	f, wr, wi, tau, scale, work []float64
	missed                      float64 // of the last check: the largest distance over the largest pole
	got                         []complex128
}

// eigenvalues computes the eigenvalues of A − L C and refuses the gain where they
// miss the poles by more than rounding explains: 1e-3 of the largest pole, or, for
// clusters of m poles, ten times (n ε ‖F‖ / size)^(1/m) of it, the usual spread of
// an m-fold eigenvalue (Wilkinson 1965).
func (k *checker) eigenvalues(l, a, c blas64.General, list []pole) error {
	n := a.Rows
	k.missed = math.Inf(1)
	if !finite(l) {
		return fmt.Errorf("the gain is not finite: %w", ErrNotReached)
	}
	k.f = grow(k.f, n*n)
	f := blas64.General{Rows: n, Cols: n, Stride: n, Data: k.f}
	own := 0.0 // Frobenius's norm of A
	for i := range n {
		copy(k.f[i*n:i*n+n], a.Data[i*a.Stride:i*a.Stride+n])
	}
	for _, v := range k.f {
		own = math.Hypot(own, v)
	}
	gemm(-1, l, c, 1, f)
	norm := 0.0
	for _, v := range k.f {
		norm += v * v
	}
	norm = math.Sqrt(norm)
	if math.IsInf(norm, 0) || math.IsNaN(norm) {
		return fmt.Errorf("the gain is too large: %w", ErrNotReached)
	}
	if !k.iterate(n) {
		return fmt.Errorf("the eigenvalues of A − L C did not converge: %w", ErrNotReached)
	}
	size := 0.0
	for _, p := range list {
		size = math.Max(size, cmplx.Abs(p.at))
	}
	if size == 0 {
		size = norm
	}
	if size == 0 {
		k.missed = 0
		return nil
	}
	m := largestCluster(list, 0.05*size)
	limit := size * math.Max(1e-3, 10*math.Pow(float64(n)*0x1p-52*norm/size, 1/float64(m)))
	limit = math.Max(limit, 10*float64(n)*0x1p-52*own) // what rounding A alone does
	worst := k.worst(list)
	k.missed = worst / size
	if worst > limit {
		return fmt.Errorf("off by %.2g where the largest pole is %.2g (the gain nearly loses a mode): %w", worst, size, ErrNotReached)
	}
	return nil
}

// iterate replaces f by its Schur form's eigenvalues in got.
func (k *checker) iterate(n int) bool {
	k.wr, k.wi = grow(k.wr, n), grow(k.wi, n)
	k.tau = grow(k.tau, n)
	impl := gonum.Implementation{}
	k.work = grow(k.work, n)
	impl.Dhseqr(lapack.EigenvaluesOnly, lapack.SchurNone, n, 0, n-1, k.f, n, k.wr, k.wi, nil, 1, k.work[:1], -1)
	k.work = grow(k.work, max(n, int(k.work[0])))
	k.scale = grow(k.scale, n)
	lo, hi := impl.Dgebal(lapack.PermuteScale, n, k.f, n, k.scale)
	if n > 1 {
		impl.Dgehd2(n, lo, hi, k.f, n, k.tau[:n-1], k.work)
	}
	for i := 2; i < n; i++ {
		for j := range i - 1 {
			k.f[i*n+j] = 0
		}
	}
	if impl.Dhseqr(lapack.EigenvaluesOnly, lapack.SchurNone, n, lo, hi, k.f, n, k.wr, k.wi, nil, 1, k.work, len(k.work)) > 0 {
		return false
	}
	k.got = grow(k.got, n)
	for i := range k.got {
		k.got[i] = complex(k.wr[i], k.wi[i])
	}
	return true
}

// worst matches poles and eigenvalues one to one, nearest first, and returns the
// largest distance.
func (k *checker) worst(list []pole) float64 {
	far := 0.0
	left := k.got
	take := func(at complex128) {
		best := 0
		for i, v := range left {
			if cmplx.Abs(v-at) < cmplx.Abs(left[best]-at) {
				best = i
			}
		}
		far = math.Max(far, cmplx.Abs(left[best]-at))
		left[best] = left[len(left)-1]
		left = left[:len(left)-1]
	}
	for _, p := range list {
		take(p.at)
		if p.pair {
			take(cmplx.Conj(p.at))
		}
	}
	return far
}

// largestCluster counts the most poles within radius of one of them.
func largestCluster(list []pole, radius float64) int {
	most := 1
	for _, p := range list {
		k := 0
		for _, q := range list {
			if cmplx.Abs(p.at-q.at) <= radius {
				k++
			}
			if q.pair && cmplx.Abs(p.at-cmplx.Conj(q.at)) <= radius {
				k++
			}
		}
		most = max(most, k)
	}
	return most
}

// gemm computes dst ← beta dst + alpha x y by plain loops, which for the small
// matrices here beat the call overhead of a blocked product.
func gemm(alpha float64, x, y blas64.General, beta float64, dst blas64.General) {
	for i := range dst.Rows {
		row := dst.Data[i*dst.Stride : i*dst.Stride+dst.Cols]
		if beta == 0 {
			clear(row)
		} else if beta != 1 {
			for j := range row {
				row[j] *= beta
			}
		}
		for k := range x.Cols {
			t := alpha * x.Data[i*x.Stride+k]
			if t == 0 {
				continue
			}
			yr := y.Data[k*y.Stride : k*y.Stride+dst.Cols]
			for j, v := range yr {
				row[j] += t * v
			}
		}
	}
}

// reached tells whether the eigenvalues of A − L C lie within 1e-9 of the wanted
// ones, relative to the largest, by the bound of Bauer & Fike 1960: with the chosen
// eigenvectors X, X⁻¹ (A − L C)ᵀ X = Λ + E moves no eigenvalue by more than ‖E‖.
func (r *robust) reached(l, a, c blas64.General) bool {
	n := r.n
	f := blas64.General{Rows: n, Cols: n, Stride: n, Data: r.closed}
	for i := range n {
		copy(r.closed[i*n:i*n+n], a.Data[i*a.Stride:i*a.Stride+n])
	}
	gemm(-1, l, c, 1, f)
	x := blas64.General{Rows: n, Cols: n, Stride: n, Data: r.xt}
	gemm(1, x, f, 0, blas64.General{Rows: n, Cols: n, Stride: n, Data: r.residual})
	size := 0.0
	for _, g := range r.groups {
		size = math.Max(size, cmplx.Abs(g.at))
		re, im := real(g.at), imag(g.at)
		for j := g.first; j < g.first+g.m*g.width(); j++ {
			row := r.residual[j*n : j*n+n]
			axpy(row, -re, r.xt[j*n:j*n+n])
			if g.pair && (j-g.first)%2 == 0 {
				axpy(row, im, r.xt[(j+1)*n:(j+2)*n])
			} else if g.pair {
				axpy(row, -im, r.xt[(j-1)*n:j*n])
			}
		}
	}
	sum := 0.0
	for i := range n {
		v := r.dual[i*n : i*n+n]
		for j := range n {
			e := 0.0
			for k, t := range r.residual[j*n : j*n+n] {
				e += v[k] * t
			}
			sum += e * e
		}
	}
	return math.Sqrt(sum) <= 1e-9*size
}
