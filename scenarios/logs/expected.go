package logs

import (
	"errors"
	"fmt"
	"math"

	"gonum.org/v1/gonum/mat"

	"polewright/estimator"
)

// errUnstable reports that A − LC is not stable, so that nothing settles.
var errUnstable = errors.New("the estimator is not stable")

// promise is what model, noise figures and gain say about the innovations, in
// units of the sensors.
type promise struct {
	p     int
	s     *mat.SymDense // covariance S = C P Cᵀ + R
	root  *mat.TriDense // lower factor of S; nil where S is singular
	gamma []*mat.Dense  // Γⱼ = E e[k] e[k−j]ᵀ for j = 1.. until they have died out; p×p each
}

const (
	// deadAt is where an autocorrelation counts as died out, beyond the lags that
	// are shown.
	deadAt = 1e-6
	// maxLags and maxWork bound how far an autocorrelation is followed.
	maxLags = 200000
	maxWork = 3e8
)

// newPromise solves for the steady state of the prediction form. For any gain,
// Γⱼ = C Fʲ⁻¹ (A P Cᵀ − L S); at the floor gain A P Cᵀ = L S, and all are zero.
func newPromise(m *estimator.Model, l *mat.Dense) (*promise, error) {
	cov, f, err := predictionCovariance(m, l, processNoise(m), m.R)
	if err != nil {
		return nil, err
	}
	return promiseOf(m, l, f, cov, m.R), nil
}

// promiseOf follows the autocovariance from a prediction covariance.
func promiseOf(m *estimator.Model, l, f *mat.Dense, cov mat.Matrix, r mat.Matrix) *promise {
	n, _, p := m.Dims()
	var pct, s, x, ls mat.Dense
	pct.Mul(cov, m.C.T())
	s.Mul(m.C, &pct)
	s.Add(&s, r)
	pr := &promise{p: p, s: symmetric(&s)}
	var ch mat.Cholesky
	if ch.Factorize(pr.s) {
		pr.root = mat.NewTriDense(p, mat.Lower, nil)
		ch.LTo(pr.root)
	}
	x.Mul(m.A, &pct)
	ls.Mul(l, pr.s)
	x.Sub(&x, &ls)
	// By Cayley and Hamilton, n zeros in a row are zeros for ever.
	quiet, most := 0, min(maxLags, int(maxWork)/(n*n*p))
	next := mat.NewDense(n, p, nil)
	for j := 0; j < most && (quiet <= n || j < lags); j++ {
		g := mat.NewDense(p, p, nil)
		g.Mul(m.C, &x)
		pr.gamma = append(pr.gamma, g)
		quiet++
		if pr.size(g) > deadAt {
			quiet = 0
		}
		next.Mul(f, &x)
		x.Copy(next)
	}
	pr.gamma = pr.gamma[:max(len(pr.gamma)-quiet, min(len(pr.gamma), lags))]
	return pr
}

// size is the largest correlation in an autocovariance.
func (pr *promise) size(g *mat.Dense) float64 {
	largest := 0.0
	for a := range pr.p {
		for b := range pr.p {
			if s := math.Sqrt(pr.s.At(a, a) * pr.s.At(b, b)); s > 0 {
				largest = math.Max(largest, math.Abs(g.At(a, b))/s)
			}
		}
	}
	return largest
}

// correlation of sensor i at lags 0.. until it has died out.
func (pr *promise) correlation(i int) []float64 {
	v := pr.s.At(i, i)
	out := make([]float64, len(pr.gamma)+1)
	out[0] = 1
	for j, g := range pr.gamma {
		out[j+1] = g.At(i, i) / v
	}
	return out
}

// whitened is Σⱼ (1 − j/N) tr(S⁻¹ Γⱼ S⁻¹ Γⱼᵀ) over N samples, what correlation
// adds to the spread of the NIS mean. The units of the sensors are taken out first.
func (pr *promise) whitened(samples float64) float64 {
	p := pr.p
	unit := make([]float64, p)
	for i := range unit {
		unit[i] = math.Sqrt(pr.s.At(i, i))
	}
	s, inverse := mat.NewSymDense(p, nil), mat.NewDense(p, p, nil)
	for a := range p {
		for b := range a + 1 {
			s.SetSym(a, b, pr.s.At(a, b)/unit[a]/unit[b])
		}
	}
	if inverse.Inverse(s) != nil {
		return math.NaN()
	}
	var t total
	var left, right mat.Dense
	g := mat.NewDense(p, p, nil)
	for j, gamma := range pr.gamma {
		weight := 1 - float64(j+1)/samples
		if weight <= 0 {
			break
		}
		g.Apply(func(a, b int, v float64) float64 { return v / unit[a] / unit[b] }, gamma)
		left.Mul(inverse, g)
		right.Mul(inverse, g.T())
		trace := 0.0
		for a := range p {
			for b := range p {
				trace += left.At(a, b) * right.At(b, a)
			}
		}
		t.add(weight * trace)
	}
	return t.value()
}

// processNoise returns G Q Gᵀ.
func processNoise(m *estimator.Model) *mat.SymDense {
	if m.G == nil {
		return m.Q
	}
	var gq, w mat.Dense
	gq.Mul(m.G, m.Q)
	w.Mul(&gq, m.G.T())
	return symmetric(&w)
}

// predictionCovariance solves P = F P Fᵀ + W + L R Lᵀ with F = A − L C by doubling
// (Smith 1968) and returns P and F.
func predictionCovariance(m *estimator.Model, l *mat.Dense, w, r mat.Matrix) (*mat.SymDense, *mat.Dense, error) {
	var f, lr, v mat.Dense
	f.Mul(l, m.C)
	f.Sub(m.A, &f)
	lr.Mul(l, r)
	v.Mul(&lr, l.T())
	v.Add(&v, w)
	sum, err := stein(&f, &v)
	if err != nil {
		return nil, nil, err
	}
	return sum, &f, nil
}

// stein solves X = F X Fᵀ + V: X of 2k terms is X + Fᵏ X Fᵏᵀ.
func stein(f, v *mat.Dense) (*mat.SymDense, error) {
	power, sum := mat.DenseCopyOf(f), mat.DenseCopyOf(v)
	var left, more, square mat.Dense
	for range 64 {
		if size := mat.Norm(power, 1); size < 1e-20 {
			return symmetric(sum), nil
		} else if !(size < 1e150) {
			break
		}
		left.Mul(power, sum)
		more.Mul(&left, power.T())
		sum.Add(sum, &more)
		square.Mul(power, power)
		power.Copy(&square)
	}
	return nil, fmt.Errorf("the steady state of its error: %w", errUnstable)
}

func symmetric(x *mat.Dense) *mat.SymDense {
	n, _ := x.Dims()
	s := mat.NewSymDense(n, nil)
	for i := range n {
		for j := i; j < n; j++ {
			s.SetSym(i, j, (x.At(i, j)+x.At(j, i))/2)
		}
	}
	return s
}
