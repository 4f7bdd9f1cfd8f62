package placement

import (
	"math"

	"gonum.org/v1/gonum/blas"
	"gonum.org/v1/gonum/blas/blas64"
	"gonum.org/v1/gonum/lapack/gonum"
)

// robust holds the dual problem M − B K and the workspaces of its solution.
type robust struct {
	n, p   int
	free   int // real parameters of the eigenvectors
	groups []group
	frames []complex128
	start  []complex128 // the best frames so far
	basis  []complex128 // frames before any choice

	m, b, q []float64 // Aᵀ n×n; Cᵀ n×p, then its QR factors; the orthogonal factor
	u1, w   []float64 // U₁ᵀ and U₁ᵀ M, (n−p)×n
	u0m     []float64 // U₀ᵀ M, p×n
	tau     []float64
	work    []float64
	house   []complex128

	xt, dual, gradient      []float64 // Xᵀ, X⁻¹, gradient of the measure, n×n
	gram, gramInverse, lu   []float64
	gamma, closed, residual []float64
	pivot                   []int
	descent                 descent
	plain, quietest         []complex128 // frames, while LeastNoise runs
	noise                   *noise       // set while LeastNoise runs
}

func (r *robust) reset(n, p int) {
	r.n, r.p = n, p
	for _, s := range []*[]float64{&r.m, &r.q, &r.xt, &r.dual, &r.gradient, &r.gram, &r.gramInverse, &r.lu, &r.closed, &r.residual} {
		*s = grow(*s, n*n)
	}
	for _, s := range []*[]float64{&r.b, &r.u0m, &r.gamma} {
		*s = grow(*s, n*p)
	}
	r.u1 = grow(r.u1, (n-p)*n)
	r.w = grow(r.w, (n-p)*n)
	r.house = grow(r.house, (n-p)*n)
	r.tau = grow(r.tau, p)
	r.work = grow(r.work, n)
	r.pivot = grow(r.pivot, n)
}

// load takes the dual of (a, c) and splits the range of B = Cᵀ = U₀ Z. It reports
// false where the rows of c are dependent.
func (r *robust) load(a, c blas64.General) bool {
	n, p := a.Rows, c.Rows
	r.reset(n, p)
	for i := range n {
		for j := range n {
			r.m[i*n+j] = a.Data[j*a.Stride+i]
		}
		for j := range p {
			r.b[i*p+j] = c.Data[j*c.Stride+i]
		}
	}
	impl := gonum.Implementation{}
	impl.Dgeqr2(n, p, r.b, p, r.tau, r.work[:max(n, p)])
	most, least := 0.0, math.Inf(1)
	for i := range n {
		copy(r.q[i*n:i*n+p], r.b[i*p:i*p+p])
	}
	for i := range p {
		v := math.Abs(r.b[i*p+i])
		most, least = math.Max(most, v), math.Min(least, v)
	}
	if !(least > 0x1p-50*most) {
		return false
	}
	for i := range n {
		clear(r.q[i*n+p : i*n+n])
	}
	impl.Dorg2r(n, n, p, r.q, n, r.tau, r.work[:n])
	mm := blas64.General{Rows: n, Cols: n, Stride: n, Data: r.m}
	clear(r.u0m)
	for i := range n {
		for j := range p {
			axpy(r.u0m[j*n:j*n+n], r.q[i*n+j], mm.Data[i*n:i*n+n])
		}
	}
	clear(r.w)
	for i := range n {
		for j := range n - p {
			v := r.q[i*n+p+j]
			r.u1[j*n+i] = v
			axpy(r.w[j*n:j*n+n], v, mm.Data[i*n:i*n+n])
		}
	}
	return true
}

func axpy(dst []float64, t float64, x []float64) {
	for i, v := range x {
		dst[i] += t * v
	}
}

// Robust writes to dst (n×p) a gain that gives A − L C the wanted poles with left
// eigenvectors as well conditioned as a descent from several deterministic starts
// finds them; C is p×n of full row rank, (C, A) observable. Poles may be repeated
// and may be poles of A: up to p copies get independent eigenvectors, further
// copies form Jordan chains.
//
// Method: the eigenvectors of Aᵀ − Cᵀ Lᵀ are chosen within the null spaces of
// Kautsky, Nichols & Van Dooren 1985 by quasi-Newton descent on a smooth bound of
// their 2-norm condition number (after Byers & Nash 1989).
//
// With warm holding an earlier choice the descent starts there and stays near, so
// that the gain follows small movements of the poles (Converged is false while it
// lags behind its optimum); an empty warm or nil means a cold start. The call leaves its own choice in warm.
//
// Errors: ErrShape, ErrNotFinite, ErrRange, ErrPairs, ErrSensors, ErrUnobservable,
// ErrNotReached, where dst holds the best gain found. After the other errors the
// contents of dst and warm are unspecified.
func (s *Solver) Robust(dst, a, c blas64.General, poles []complex128, warm *Warm) (Info, error) {
	if err := checkInput(dst, a, c, poles); err != nil {
		return Info{}, err
	}
	if err := s.pairUp(poles); err != nil {
		return Info{}, err
	}
	r := &s.robust
	if !r.load(a, c) {
		if c.Rows == 1 {
			return Info{}, ErrUnobservable
		}
		return Info{}, ErrSensors
	}
	most := r.gather(s.list)
	if r.n == r.p {
		return s.normal(dst, a, c, warm)
	}
	if r.p == 1 && r.n > 1 {
		return s.unique(dst, a, c, most, warm)
	}
	if most <= r.p {
		info, ok := r.choose(warm)
		if ok && r.gain(dst) {
			if warm != nil {
				warm.keep(r)
			}
			if r.reached(dst, a, c) {
				return info, nil
			}
			return s.rescue(dst, a, c, warm, info)
		}
	}
	if warm != nil {
		warm.clear()
	}
	limit := r.n
	if most <= r.p {
		limit = r.n / 2
	}
	if err := chains(dst, a, c, s.list, limit); err != nil {
		return Info{}, err
	}
	return Info{Condition: math.NaN(), Converged: true}, s.check.eigenvalues(dst, a, c, s.list)
}

// rescue replaces a gain whose poor eigenvectors cost more than six digits of the
// poles, as for a cluster of more than p nearly equal ones, by the gain for long
// chains where that one comes ten times closer.
func (s *Solver) rescue(dst, a, c blas64.General, warm *Warm, info Info) (Info, error) {
	err := s.check.eigenvalues(dst, a, c, s.list)
	missed := s.check.missed
	if err == nil && missed <= 1e-6 {
		return info, nil
	}
	n, p := a.Rows, c.Rows
	other := matrix(n, p, make([]float64, n*p))
	if chains(other, a, c, s.list, n/2) != nil || s.check.eigenvalues(other, a, c, s.list) != nil ||
		err == nil && s.check.missed > 0.1*missed {
		return info, err
	}
	for i := range n {
		copy(dst.Data[i*dst.Stride:i*dst.Stride+p], other.Data[i*p:i*p+p])
	}
	if warm != nil {
		warm.clear()
	}
	return Info{Condition: math.NaN(), Iterations: info.Iterations, Converged: true}, nil
}

// unique serves one sensor, which leaves no choice.
func (s *Solver) unique(dst, a, c blas64.General, most int, warm *Warm) (Info, error) {
	r := &s.robust
	info := Info{Condition: math.NaN(), Converged: true}
	if warm != nil {
		warm.clear()
	}
	if most == 1 {
		r.nullSpaces()
		info.Condition = r.condition()
	}
	return info, s.singleGain(dst, a, c)
}

// gain writes L with Lᵀ = Z⁻¹ U₀ᵀ (M − X Λ X⁻¹). It reports false for a singular X.
func (r *robust) gain(dst blas64.General) bool {
	n, p := r.n, r.p
	r.fillX()
	if !invert(r.dual, r.xt, r.lu, r.pivot, n) {
		return false
	}
	// Row j of gamma: Z⁻¹ U₀ᵀ (M x_j − (XΛ)_j).
	for _, g := range r.groups {
		re, im := real(g.at), imag(g.at)
		for j := g.first; j < g.first+g.m*g.width(); j++ {
			x := r.xt[j*n : j*n+n]
			other, s := x, 0.0
			if g.pair && (j-g.first)%2 == 0 { // M u = a u − b v
				other, s = r.xt[(j+1)*n:(j+2)*n], -im
			} else if g.pair { // M v = b u + a v
				other, s = r.xt[(j-1)*n:j*n], im
			}
			for k := range p {
				sum := 0.0
				for i, v := range x {
					sum += r.u0m[k*n+i]*v - r.q[i*n+k]*(re*v+s*other[i])
				}
				r.gamma[j*p+k] = sum
			}
		}
	}
	z := blas64.Triangular{Uplo: blas.Upper, Diag: blas.NonUnit, N: p, Stride: p, Data: r.b}
	for j := range n {
		blas64.Trsv(blas.NoTrans, z, blas64.Vector{N: p, Inc: 1, Data: r.gamma[j*p : j*p+p]})
	}
	for i := range n {
		row := dst.Data[i*dst.Stride : i*dst.Stride+p]
		clear(row)
		for j := range n {
			axpy(row, r.dual[j*n+i], r.gamma[j*p:j*p+p])
		}
	}
	return finite(dst)
}
