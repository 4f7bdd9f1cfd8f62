package placement

import (
	"math"

	"gonum.org/v1/gonum/blas"
	"gonum.org/v1/gonum/blas/blas64"

	"polewright/estimator/internal/schur"
)

// noise computes the logarithm of Σ wᵢ Pᵢᵢ, P the steady-state error covariance, and
// its gradient with respect to the eigenvectors.
type noise struct {
	a, c, w, r blas64.General // as given
	weights    []float64
	discrete   bool

	form             schur.Form
	l, lr, pc, slope []float64 // n×p
	f, fp, q, p, adj []float64 // n×n
	re, im           []float64
	h                []complex128
	cost             float64
}

func (s *noise) reset(n, p int) {
	for _, x := range []*[]float64{&s.l, &s.lr, &s.pc, &s.slope} {
		*x = grow(*x, n*p)
	}
	for _, x := range []*[]float64{&s.f, &s.fp, &s.q, &s.p, &s.adj} {
		*x = grow(*x, n*n)
	}
	s.h = grow(s.h, p)
	s.re, s.im = grow(s.re, p), grow(s.im, p)
}

func matrix(rows, cols int, data []float64) blas64.General {
	return blas64.General{Rows: rows, Cols: cols, Stride: cols, Data: data}
}

// covariance solves (A − L C) P + P (A − L C)ᵀ + L R Lᵀ + W = 0, or in discrete time
// P = (A − L C) P (A − L C)ᵀ + L R Lᵀ + W, for the gain in s.l and returns the cost;
// NaN where there is no such P.
func (s *noise) covariance() float64 {
	n, p := s.a.Rows, s.c.Rows
	l, f, q := matrix(n, p, s.l), matrix(n, n, s.f), matrix(n, n, s.q)
	for i := range n {
		copy(s.f[i*n:i*n+n], s.a.Data[i*s.a.Stride:i*s.a.Stride+n])
		copy(s.q[i*n:i*n+n], s.w.Data[i*s.w.Stride:i*s.w.Stride+n])
	}
	gemm(-1, l, s.c, 1, f)
	gemm(1, l, s.r, 0, matrix(n, p, s.lr))
	for i := range n {
		for j := range n {
			s.q[i*n+j] += dot(s.lr[i*p:i*p+p], s.l[j*p:j*p+p])
		}
	}
	if !finite(f) || !finite(q) || s.form.Factor(f) != nil {
		return math.NaN()
	}
	var err error
	if s.discrete {
		err = s.form.Stein(matrix(n, n, s.p), q)
	} else {
		err = s.form.Lyapunov(matrix(n, n, s.p), q)
	}
	if err != nil {
		return math.NaN()
	}
	cost := 0.0
	for i, w := range s.weights {
		if s.p[i*n+i] < 0 {
			return math.NaN()
		}
		cost += w * s.p[i*n+i]
	}
	return cost
}

// measure returns log cost for the present eigenvectors and leaves its gradient with
// respect to Xᵀ in r.gradient: by the adjoint equation with solution Y the derivative
// with respect to L is 2 Y (L R − P Cᵀ), in discrete time 2 Y (L R − F P Cᵀ).
func (s *noise) measure(r *robust) float64 {
	n, p := r.n, r.p
	if !r.gain(matrix(n, p, s.l)) {
		return math.Inf(1)
	}
	s.cost = s.covariance()
	if !(s.cost >= 0) || math.IsInf(s.cost, 1) {
		return math.Inf(1)
	}
	clear(r.gradient)
	if s.cost == 0 {
		return math.Log(math.SmallestNonzeroFloat64)
	}
	clear(s.q)
	for i, w := range s.weights {
		s.q[i*n+i] = w
	}
	pm := matrix(n, n, s.p)
	var err error
	if s.discrete {
		err = s.form.SteinAdjoint(matrix(n, n, s.adj), matrix(n, n, s.q))
		pm = matrix(n, n, s.fp)
		gemm(1, matrix(n, n, s.f), matrix(n, n, s.p), 0, pm)
	} else {
		err = s.form.LyapunovAdjoint(matrix(n, n, s.adj), matrix(n, n, s.q))
	}
	if err != nil {
		return math.Inf(1)
	}
	for i := range n { // L R − P Cᵀ
		for j := range p {
			s.pc[i*p+j] = s.lr[i*p+j] - dot(pm.Data[i*n:i*n+n], s.c.Data[j*s.c.Stride:j*s.c.Stride+n])
		}
	}
	gemm(2/s.cost, matrix(n, n, s.adj), matrix(n, p, s.pc), 0, matrix(n, p, s.slope))
	s.chainRule(r)
	return math.Log(s.cost)
}

// chainRule turns the slope with respect to L into that with respect to X. Column x of
// X fixes K x = γ with γ = N x, N = Z⁻¹ U₀ᵀ (M − λI), so dK = Σ (N − K) dx vᵀ with v
// the matching row of X⁻¹.
func (s *noise) chainRule(r *robust) {
	n, p := r.n, r.p
	z := blas64.Triangular{Uplo: blas.Upper, Diag: blas.NonUnit, N: p, Stride: p, Data: r.b}
	re, im := s.re, s.im
	for _, g := range r.groups {
		for j := g.first; j < g.first+g.m*g.width(); j += g.width() {
			s.along(re, r.dual[j*n:j*n+n])
			clear(im)
			if g.pair {
				s.along(im, r.dual[(j+1)*n:(j+2)*n])
			}
			for k := range p {
				s.h[k] = complex(re[k], im[k])
			}
			blas64.Trsv(blas.Trans, z, blas64.Vector{N: p, Inc: 1, Data: re})
			blas64.Trsv(blas.Trans, z, blas64.Vector{N: p, Inc: 1, Data: im})
			for i := range n {
				sum := complex(0, 0)
				for k := range p {
					y := complex(re[k], im[k])
					conj := complex(r.u0m[k*n+i]-real(g.at)*r.q[i*n+k], imag(g.at)*r.q[i*n+k])
					sum += conj*y - complex(s.l[i*p+k], 0)*s.h[k]
				}
				r.gradient[j*n+i] = real(sum)
				if g.pair {
					r.gradient[(j+1)*n+i] = imag(sum)
				}
			}
		}
	}
}

// along writes slopeᵀ v to dst.
func (s *noise) along(dst, v []float64) {
	p := len(dst)
	clear(dst)
	for i, x := range v {
		axpy(dst, x, s.slope[i*p:i*p+p])
	}
}
