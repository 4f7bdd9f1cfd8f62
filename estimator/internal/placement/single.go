package placement

import (
	"fmt"
	"math"
	"math/cmplx"

	"gonum.org/v1/gonum/blas/blas64"
	"gonum.org/v1/gonum/lapack/gonum"
)

// Single writes to dst (n×1) the gain that gives A − L C the wanted poles; with
// one sensor, C 1×n, and (C, A) observable it is unique. The list may be in any
// order and of any multiplicities, complex poles with their conjugates.
//
// Method: Aᵀ is brought to Hessenberg form with Cᵀ along the first axis; then
// each pole is deflated by one sweep of plane rotations, as in a shifted QR step
// (Miminis & Paige 1982, 1988; Varga 1981). Everything is orthogonal (unitary for
// complex poles); no powers of A and no characteristic polynomials.
//
// Errors: ErrShape, ErrNotFinite, ErrRange, ErrPairs, ErrUnobservable; ErrNotReached, where dst
// holds the best gain found. After the other errors its content is unspecified.
func (s *Solver) Single(dst, a, c blas64.General, poles []complex128) error {
	if err := checkInput(dst, a, c, poles); err != nil {
		return err
	}
	if c.Rows != 1 {
		return fmt.Errorf("%d sensors where one is wanted: %w", c.Rows, ErrShape)
	}
	if err := s.pairUp(poles); err != nil {
		return err
	}
	return s.singleGain(dst, a, c)
}

// singleGain is Single for checked input.
func (s *Solver) singleGain(dst, a, c blas64.General) error {
	n := a.Rows
	s.one.reset(n)
	for i := range n {
		for j := range n {
			s.one.m[i*n+j] = a.Data[j*a.Stride+i]
		}
		s.one.b[i] = c.Data[i]
	}
	if err := s.one.place(s.list); err != nil {
		return err
	}
	for i, k := range s.one.k {
		dst.Data[i*dst.Stride] = k
	}
	return s.check.eigenvalues(dst, a, c, s.list)
}

// single places the eigenvalues of m − b kᵀ.
type single struct {
	n       int
	m, b, k []float64
	tau     []float64
	work    []float64
	h       []complex128 // the Hessenberg matrix, deflated from the top
	x, y    []complex128 // the rotations of every sweep, row j for pole j
	kappa   []complex128
	order   []complex128
}

func (s *single) reset(n int) {
	s.n = n
	s.m = grow(s.m, n*n)
	s.b = grow(s.b, n)
	s.k = grow(s.k, n)
	s.tau = grow(s.tau, n)
	s.work = grow(s.work, 4*n)
	s.h = grow(s.h, n*n)
	s.x = grow(s.x, n*n)
	s.y = grow(s.y, n*n)
	s.kappa = grow(s.kappa, n)
}

// place overwrites m and b and leaves the answer in k.
func (s *single) place(list []pole) error {
	n := s.n
	beta, v := s.hessenberg()
	if beta == 0 {
		return ErrUnobservable
	}
	s.order = leja(s.order, list)
	b := complex(beta, 0)
	for j, lambda := range s.order {
		b = s.deflate(j, lambda, b)
	}
	// The gain in the coordinates of the last sweep, turned back sweep by sweep.
	k := s.kappa
	for j := n - 2; j >= 0; j-- {
		for i := j + 1; i < n; i++ {
			x, y := s.x[j*n+i], s.y[j*n+i]
			p, q := k[i-1], k[i]
			k[i-1] = p*cmplx.Conj(y) + q*x
			k[i] = -p*cmplx.Conj(x) + q*y
		}
	}
	for i := range n {
		s.k[i] = real(k[i])
		if math.IsNaN(s.k[i]) || math.IsInf(s.k[i], 0) {
			return ErrUnobservable
		}
	}
	s.turnBack(v)
	return nil
}

// hessenberg reduces m to upper Hessenberg form H with Zᵀ b = beta e₁, copies H
// to h and checks that no link of the chain is missing. It returns the Householder
// vector of the first reflection (length n, scaled so that H₁ = I − v vᵀ); the
// others stay in m and tau.
func (s *single) hessenberg() (beta float64, v []float64) {
	n, m := s.n, s.m
	v = s.b
	norm := blas64.Nrm2(blas64.Vector{N: n, Inc: 1, Data: v})
	if norm == 0 {
		return 0, v
	}
	beta = -math.Copysign(norm, v[0])
	v[0] -= beta
	scale := math.Sqrt2 / blas64.Nrm2(blas64.Vector{N: n, Inc: 1, Data: v})
	for i := range v {
		v[i] *= scale
	}
	for i := range n { // rows: m ← m (I − v vᵀ)
		reflect(m[i*n:i*n+n], 1, v)
	}
	for j := range n {
		reflect(m[j:], n, v)
	}
	impl := gonum.Implementation{}
	if n > 1 {
		impl.Dgehd2(n, 0, n-1, m, n, s.tau[:n-1], s.work[:n])
	}
	size := 0.0
	for i := range n {
		for j := range n {
			s.h[i*n+j] = 0
			if j >= i-1 {
				s.h[i*n+j] = complex(m[i*n+j], 0)
				size = math.Max(size, math.Abs(m[i*n+j]))
			}
		}
	}
	for i := 1; i < n; i++ {
		if math.Abs(m[i*n+i-1]) <= 0x1p-52*size {
			return 0, v
		}
	}
	return beta, v
}

// reflect applies I − v vᵀ to the vector x of the given stride.
func reflect(x []float64, stride int, v []float64) {
	dot := 0.0
	for i, vi := range v {
		dot += vi * x[i*stride]
	}
	for i, vi := range v {
		x[i*stride] -= dot * vi
	}
}

// deflate splits lambda off the block that starts at row j and has the input
// vector b e₁. It returns the input of the remaining block.
func (s *single) deflate(j int, lambda, b complex128) complex128 {
	n, h := s.n, s.h
	for i := j; i < n; i++ {
		h[i*n+i] -= lambda
	}
	if j == n-1 {
		s.kappa[j] = h[j*n+j] / b
		return 0
	}
	// (H − λI) Q = R: rotations of the columns, from the last row up.
	for i := n - 1; i > j; i-- {
		x, y := h[i*n+i-1], h[i*n+i]
		r := complex(math.Hypot(cmplx.Abs(x), cmplx.Abs(y)), 0)
		if r == 0 {
			x, y, r = 0, 1, 1
		}
		x, y = x/r, y/r
		s.x[j*n+i], s.y[j*n+i] = x, y
		cx, cy := cmplx.Conj(x), cmplx.Conj(y)
		for row := j; row <= i; row++ {
			p, q := h[row*n+i-1], h[row*n+i]
			h[row*n+i-1] = y*p - x*q
			h[row*n+i] = cx*p + cy*q
		}
		h[i*n+i-1] = 0
	}
	s.kappa[j] = h[j*n+j] / b
	// H ← Qᴴ R + λI: the same rotations on the rows.
	for i := n - 1; i > j; i-- {
		x, y := s.x[j*n+i], s.y[j*n+i]
		cx, cy := cmplx.Conj(x), cmplx.Conj(y)
		for col := i - 1; col < n; col++ {
			p, q := h[(i-1)*n+col], h[i*n+col]
			h[(i-1)*n+col] = cy*p - cx*q
			h[i*n+col] = x*p + y*q
		}
	}
	for i := j; i < n; i++ {
		h[i*n+i] += lambda
	}
	return b * s.x[j*n+j+1]
}

// turnBack turns k from the Hessenberg coordinates to those of m.
func (s *single) turnBack(v []float64) {
	n, k := s.n, s.k
	for r := n - 2; r >= 0; r-- { // the reflector r acts on entries r+1 …
		tau := s.tau[r]
		if tau == 0 {
			continue
		}
		dot := k[r+1]
		for i := r + 2; i < n; i++ {
			dot += s.m[i*n+r] * k[i]
		}
		dot *= tau
		k[r+1] -= dot
		for i := r + 2; i < n; i++ {
			k[i] -= dot * s.m[i*n+r]
		}
	}
	reflect(k, 1, v)
}

// leja lists the eigenvalues so that each is far from those before it (Reichel
// 1990: Leja order), conjugates side by side.
func leja(dst []complex128, list []pole) []complex128 {
	dst = dst[:0]
	for range list {
		best, at := -1, 0
		bestScore := math.Inf(-1)
		for i, p := range list {
			if count(dst, p.at) >= multiplicity(list, p.at) {
				continue
			}
			score := 0.0
			for _, d := range dst {
				if d != p.at {
					score += math.Log(cmplx.Abs(d - p.at))
				} else {
					score -= 40
				}
			}
			if len(dst) == 0 {
				score = cmplx.Abs(p.at)
			}
			if score > bestScore {
				best, bestScore, at = i, score, i
			}
		}
		if best < 0 {
			break
		}
		dst = append(dst, list[at].at)
		if list[at].pair {
			dst = append(dst, cmplx.Conj(list[at].at))
		}
	}
	return dst
}

func count(list []complex128, v complex128) int {
	k := 0
	for _, w := range list {
		if w == v {
			k++
		}
	}
	return k
}

func multiplicity(list []pole, v complex128) int {
	k := 0
	for _, w := range list {
		if w.at == v {
			k++
		}
	}
	return k
}
