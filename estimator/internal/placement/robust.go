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
// Errors: ErrShape, ErrNotFinite, ErrPairs, ErrSensors, ErrUnobservable,
// ErrNotReached. After an error the contents of dst and warm are unspecified.
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
			return info, s.check.eigenvalues(dst, a, c, s.list)
		}
	}
	if warm != nil {
		warm.clear()
	}
	info := Info{Condition: math.NaN(), Converged: true}
	if err := chains(dst, a, c, s.list); err != nil {
		return Info{}, err
	}
	return info, s.check.eigenvalues(dst, a, c, s.list)
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

// A warm descent may turn the eigenvectors by restless + follow times the relative
// movement of the poles, in radians. So the gain stays continuous where the valley
// that it follows ends: the fall into the next one is spread over several calls.
const (
	restless = 1e-3
	follow   = 4.0
)

// worstCondition is where eigenvectors count as dependent.
const worstCondition = 1e10

// choose finds the eigenvectors. It reports false where no independent ones were
// found.
func (r *robust) choose(warm *Warm) (Info, bool) {
	r.nullSpaces()
	r.start = grow(r.start, len(r.frames))
	moved := warm.moved(r.groups)
	if ok, carried := warm.project(r); ok {
		rule := nearby
		rule.travel = restless + follow*moved
		f, steps, done := r.descend(rule, carried)
		if f < math.Log(worstCondition) {
			return Info{Condition: r.condition(), Iterations: steps, Converged: done}, true
		}
	}
	if !warm.Empty() {
		r.nullSpaces()
	}
	return r.cold()
}

const starts = 4

// How far the descents go: from a start to the right valley, down that valley, and
// from an earlier choice.
var (
	rough  = stopping{squarings: powerRough, steps: 30, gradient: 1e-2, drop: 1e-2}
	fine   = stopping{squarings: powerFine, steps: 200, gradient: 1e-6, drop: 1e-5}
	nearby = stopping{squarings: powerFine, steps: 60, gradient: 1e-6, drop: 1e-9}
)

// cold descends from several starts on the rough measure, then polishes the best.
func (r *robust) cold() (Info, bool) {
	info := Info{}
	best := math.Inf(1)
	seed := uint64(1)
	r.basis = append(r.basis[:0], r.frames...)
	for range starts {
		copy(r.frames, r.basis)
		r.scatter(&seed)
		_, steps, _ := r.descend(rough, false)
		info.Iterations += steps
		if f := r.measure(powerFine); f < best {
			best = f
			copy(r.start, r.frames)
		}
		if r.free == 0 {
			break
		}
	}
	if math.IsInf(best, 1) {
		return info, false
	}
	copy(r.frames, r.start)
	f, steps, done := r.descend(fine, false)
	info.Iterations += steps
	info.Converged = done
	info.Condition = r.condition()
	return info, f < math.Log(worstCondition)
}

// scatter mixes each frame by random numbers.
func (r *robust) scatter(seed *uint64) {
	n, p := r.n, r.p
	draw := func() float64 { // Knuth's 64-bit linear congruential generator (MMIX)
		*seed = *seed*6364136223846793005 + 1442695040888963407
		return float64(*seed>>11)/(1<<52) - 1
	}
	r.descent.reset(r.free, len(r.frames))
	old := r.descent.saved
	copy(old, r.frames)
	for i := range r.groups {
		g := &r.groups[i]
		from := old[i*n*p : (i+1)*n*p]
		clear(g.t)
		for j := range p {
			for l := range p {
				y := complex(draw(), 0)
				if g.pair {
					y += complex(0, draw())
				}
				for k, v := range from[l*n : l*n+n] {
					g.t[j*n+k] += y * v
				}
			}
		}
		if !orthonormalise(g.t, n) {
			copy(g.t, from)
		}
	}
}

// condition returns the 2-norm condition number of the present eigenvectors.
func (r *robust) condition() float64 {
	n := r.n
	r.fillX()
	copy(r.lu, r.xt)
	impl := gonum.Implementation{}
	impl.Dgesvd('N', 'N', n, n, r.lu, n, r.gram[:n], nil, 1, nil, 1, r.residual[:1], -1)
	r.work = grow(r.work, max(n, int(r.residual[0])))
	if !impl.Dgesvd('N', 'N', n, n, r.lu, n, r.gram[:n], nil, 1, nil, 1, r.work, len(r.work)) {
		return math.NaN()
	}
	return r.gram[0] / r.gram[n-1]
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
