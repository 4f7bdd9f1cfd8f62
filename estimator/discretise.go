package estimator

import (
	"errors"
	"fmt"
	"math"

	"gonum.org/v1/gonum/mat"
)

// Discretise samples the continuous plant x' = A x + B u + G w every period
// seconds. u is held over each period (zero-order hold), w is white noise of
// two-sided density Q:
//
//	Ad = exp(A T),  Bd = ∫₀ᵀ exp(A τ) dτ B,  Qd = ∫₀ᵀ exp(A τ) G Q Gᵀ exp(Aᵀ τ) dτ
//
// a is n×n, b n×m, g n×q, q q×q positive semi-definite; Qd is the n×n
// covariance that one period adds to the state. A nil b gives a nil bd, a nil
// g stands for the identity, a nil q gives a nil qd. The arguments are left as
// they are.
//
// Over a short step h = T/2ˢ, with ‖A h‖ at most 1/2, all three come from
// Taylor series of entire functions. The steps are then doubled s times:
//
//	Φ(2t) = Φ(t)²,  Γ(2t) = Γ(t) + Φ(t) Γ(t),  Q(2t) = Q(t) + Φ(t) Q(t) Φ(t)ᵀ
//
// Nothing is subtracted and only exp(A t) is formed, never exp(−A t), so that
// stiff plants neither overflow nor lose figures as they do in the block
// exponential of Van Loan, "Computing integrals involving the matrix
// exponential", IEEE Trans. Automatic Control 23 (1978). Φ is kept less the
// identity while it is close to it, which keeps slow modes exact.
//
// Wrong shapes, numbers that are not finite, a period that is not positive and
// results that overflow (an unstable plant sampled far too slowly) are errors.
func Discretise(a, b, g *mat.Dense, q *mat.SymDense, period float64) (ad, bd *mat.Dense, qd *mat.SymDense, err error) {
	n, err := checkSampling(a, b, g, q, period)
	if err != nil {
		return nil, nil, nil, err
	}
	s, err := newSampling(a, b, g, q, n, period)
	if err != nil {
		return nil, nil, nil, err
	}
	for range s.doublings {
		s.double()
	}
	ad = s.e
	for i := range n {
		ad.Set(i, i, ad.At(i, i)+1)
	}
	if !finite(ad) || s.gamma != nil && !finite(s.gamma) || s.q != nil && !finite(s.q) {
		return nil, nil, nil, fmt.Errorf("the plant grows out of the range of numbers within one period of %g s", period)
	}
	if s.q != nil {
		qd = symmetric(s.q)
	}
	return ad, s.gamma, qd, nil
}

func checkSampling(a, b, g *mat.Dense, q *mat.SymDense, period float64) (n int, err error) {
	if a == nil || a.IsEmpty() {
		return 0, errors.New("there is no A to discretise")
	}
	n, cols := a.Dims()
	if n != cols {
		return 0, fmt.Errorf("A is %d×%d, it must be square", n, cols)
	}
	if b != nil {
		if r, c := b.Dims(); r != n {
			return 0, fmt.Errorf("B is %d×%d, it must have %d rows", r, c, n)
		}
	}
	wide := n
	if g != nil {
		r, c := g.Dims()
		if r != n {
			return 0, fmt.Errorf("G is %d×%d, it must have %d rows", r, c, n)
		}
		wide = c
	}
	if q != nil && q.SymmetricDim() != wide {
		return 0, fmt.Errorf("Q is %d×%d, it must be %d×%d", q.SymmetricDim(), q.SymmetricDim(), wide, wide)
	}
	if !(period > 0) || math.IsInf(period, 1) {
		return 0, fmt.Errorf("the period must be a positive number of seconds, not %g", period)
	}
	if !finite(a) || b != nil && !finite(b) || g != nil && !finite(g) || q != nil && !finite(q) {
		return 0, errors.New("A, B, G and Q must be finite")
	}
	return n, nil
}

// sampling holds the three integrals over the step reached so far.
type sampling struct {
	e         *mat.Dense // Φ − I
	gamma     *mat.Dense // n×m, nil without inputs
	q         *mat.Dense // n×n, nil without noise
	doublings int
}

// newSampling fills in the first step.
func newSampling(a, b, g *mat.Dense, q *mat.SymDense, n int, period float64) (*sampling, error) {
	s := &sampling{}
	var ah mat.Dense
	ah.Scale(period, a)
	size := min(mat.Norm(&ah, 1), mat.Norm(&ah, math.Inf(1)))
	if math.IsNaN(size) || math.IsInf(size, 0) {
		return nil, errors.New("A times the period is out of the range of numbers")
	}
	if size > 0.5 {
		_, s.doublings = math.Frexp(2 * size)
	}
	h := math.Ldexp(period, -s.doublings)
	ah.Scale(math.Ldexp(1, -s.doublings), &ah)
	s.e, s.gamma = firstStep(&ah, b, n, h)
	if q != nil {
		s.q = firstNoise(&ah, spread(g, q), h)
	}
	return s, nil
}

// spread returns G Q Gᵀ.
func spread(g *mat.Dense, q *mat.SymDense) *mat.Dense {
	if g == nil {
		return mat.DenseCopyOf(q)
	}
	var gq, w mat.Dense
	gq.Mul(g, q)
	w.Mul(&gq, g.T())
	return &w
}

// seriesTerms is enough for size up to 1/2: the terms left out of exp are
// below (1/2)²⁰/20!, those of the noise, which count 2‖A h‖, below 1/20!.
const seriesTerms = 20

// firstStep sums exp(Ah) − I = Σ (Ah)ᵏ/k! and Γ = h Σ (Ah)ᵏ/(k+1)! B.
func firstStep(ah, b *mat.Dense, n int, h float64) (e, gamma *mat.Dense) {
	e = mat.NewDense(n, n, nil)
	term := mat.DenseCopyOf(ah)
	for k := 1; k <= seriesTerms; k++ {
		e.Add(e, term)
		term = times(ah, term, 1/float64(k+1))
	}
	if b == nil {
		return e, nil
	}
	gamma = mat.NewDense(n, b.RawMatrix().Cols, nil)
	term = mat.NewDense(n, b.RawMatrix().Cols, nil)
	term.Scale(h, b)
	for k := 1; k <= seriesTerms; k++ {
		gamma.Add(gamma, term)
		term = times(ah, term, 1/float64(k+1))
	}
	return e, gamma
}

// times returns factor·x·y.
func times(x, y *mat.Dense, factor float64) *mat.Dense {
	var out mat.Dense
	out.Mul(x, y)
	out.Scale(factor, &out)
	return &out
}

// firstNoise sums ∫₀ʰ exp(Aτ) W exp(Aᵀτ) dτ = Σ hᵏ/k! Wₖ with W₁ = W and
// Wₖ₊₁ = A Wₖ + Wₖ Aᵀ, the Taylor series of the integral in h.
func firstNoise(ah, w *mat.Dense, h float64) *mat.Dense {
	n, _ := ah.Dims()
	sum := mat.NewDense(n, n, nil)
	term := mat.NewDense(n, n, nil)
	term.Scale(h, w)
	for k := 1; k <= seriesTerms; k++ {
		sum.Add(sum, term)
		next := times(ah, term, 1/float64(k+1))
		term.Add(next, next.T())
	}
	return sum
}

// double goes from t to 2t.
func (s *sampling) double() {
	var x, y mat.Dense
	if s.q != nil { // Q + ΦQΦᵀ = 2Q + EQ + QEᵀ + EQEᵀ
		x.Mul(s.e, s.q)
		x.Add(&x, s.q) // ΦQ
		y.Mul(&x, s.e.T())
		y.Add(&y, &x)
		s.q.Add(s.q, &y)
	}
	if s.gamma != nil { // Γ + ΦΓ = 2Γ + EΓ
		var z mat.Dense
		z.Mul(s.e, s.gamma)
		z.Add(&z, s.gamma)
		s.gamma.Add(s.gamma, &z)
	}
	var z mat.Dense // (I + E)² − I = 2E + E²
	z.Mul(s.e, s.e)
	z.Add(&z, s.e)
	s.e.Add(s.e, &z)
}
