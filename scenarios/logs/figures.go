package logs

import (
	"errors"
	"math"

	"gonum.org/v1/gonum/mat"
	"gonum.org/v1/gonum/stat/distuv"

	"polewright/estimator"
)

// Estimate is a figure found from a log with its 95 % confidence interval.
type Estimate struct {
	Value Number `json:"value"`
	Low   Number `json:"low"`
	High  Number `json:"high"`
}

// NoiseFigures are what a log says about the noise figures of a model.
type NoiseFigures struct {
	// Process is the factor on the model's Q; undefined where the innovations do
	// not tell it apart from the sensors' noise.
	Process Estimate `json:"process_factor"`
	// Sensors has the variance of one sample per sensor, Model the model's own.
	Sensors []Estimate `json:"sensor_variance"`
	Model   []Number   `json:"sensor_variance_model"`
	// Fit is how often a log of the fitted noise departs further from its fit. Near
	// 0, what is wrong is not (only) the noise figures.
	Fit Number `json:"fit_p"`
	// Apart is false where process and sensor noise cannot be told apart; the
	// sensors' figures then hold for the model's own Q.
	Apart bool `json:"told_apart"`
}

// Reasons why a log gives no noise figures.
var (
	ErrTooFew = errors.New("too few samples for noise figures, expected at least 50 in the statistics")
	ErrNoFit  = errors.New("the innovations do not determine the noise figures")
)

// fitRounds is how often the weights are made anew from the fit.
const fitRounds = 4

// NoiseFigures finds a factor on Q and the variance of each sensor from the
// innovations of a replay: for a given stable gain, the autocovariances at lags 0
// to 20 are linear in them, Γⱼ = factor·Γⱼ(Q) + Σ rᵢ Γⱼ(i). They are fitted by least
// squares (Mehra 1970; Odelson, Rajamani & Rawlings 2006), weighted by the
// covariance that sample autocovariances of such a process have (Bartlett 1946).
// Covariances between sensors stay those of the model.
func (r *Result) NoiseFigures() (*NoiseFigures, error) {
	if r.Counted < 50 {
		return nil, ErrTooFew
	}
	f, err := newFit(r.model, r.gain, r.moments)
	if err != nil {
		return nil, err
	}
	out, err := f.solve(true)
	if errors.Is(err, ErrNoFit) {
		out, err = f.solve(false)
	}
	return out, err
}

// fit is the linear model of the autocovariances, sensor after sensor, lags 0..20.
type fit struct {
	m       *estimator.Model
	l       *mat.Dense
	count   float64
	data    []float64   // measured
	fixed   []float64   // what covariances between sensors give
	columns [][]float64 // per unknown: the factor on Q, then the sensors' variances
}

func newFit(m *estimator.Model, l *mat.Dense, list []moments) (*fit, error) {
	n, _, p := m.Dims()
	f := &fit{m: m, l: l, count: float64(list[0].count)}
	for _, s := range list {
		f.data = append(f.data, s.covariance[:]...)
	}
	for _, v := range f.data {
		if math.IsNaN(v) {
			return nil, ErrTooFew
		}
	}
	none, zero := mat.NewSymDense(n, nil), mat.NewSymDense(p, nil)
	column, err := f.response(processNoise(m), zero)
	if err != nil {
		return nil, err
	}
	f.columns = append(f.columns, column)
	cross := mat.NewSymDense(p, nil)
	for i := range p {
		one := mat.NewSymDense(p, nil)
		one.SetSym(i, i, 1)
		if column, err = f.response(none, one); err != nil {
			return nil, err
		}
		f.columns = append(f.columns, column)
		for j := range i {
			cross.SetSym(i, j, m.R.At(i, j))
		}
	}
	f.fixed, err = f.response(none, cross)
	return f, err
}

// response is the autocovariance that the process noise w and the sensor noise r
// give.
func (f *fit) response(w, r *mat.SymDense) ([]float64, error) {
	cov, fm, err := predictionCovariance(f.m, f.l, w, r)
	if err != nil {
		return nil, err
	}
	var pct, s, x, ls, next, g mat.Dense
	pct.Mul(cov, f.m.C.T())
	s.Mul(f.m.C, &pct)
	s.Add(&s, r)
	x.Mul(f.m.A, &pct)
	ls.Mul(f.l, &s)
	x.Sub(&x, &ls)
	_, _, p := f.m.Dims()
	out := make([]float64, p*(lags+1))
	for i := range p {
		out[i*(lags+1)] = s.At(i, i)
	}
	for j := 1; j <= lags; j++ {
		g.Mul(f.m.C, &x)
		for i := range p {
			out[i*(lags+1)+j] = g.At(i, i)
		}
		next.Mul(fm, &x)
		x.Copy(&next)
	}
	return out, nil
}

// solve fits the sensors' variances, and the factor on Q where that is asked for.
func (f *fit) solve(process bool) (*NoiseFigures, error) {
	_, _, p := f.m.Dims()
	// The weights need noise that is above zero.
	theta, least := make([]float64, p+1), make([]float64, p+1)
	theta[0], least[0] = 1, 1e-4
	for i := range p {
		least[i+1] = 1e-4 * f.data[i*(lags+1)]
		theta[i+1] = math.Max(f.m.R.At(i, i), least[i+1])
	}
	columns, first := f.columns, 0
	if !process {
		columns, first = f.columns[1:], 1
	}
	var s *solution
	for range fitRounds {
		weights, bias, err := f.weights(theta)
		if err != nil {
			return nil, err
		}
		rest := make([]float64, len(f.data))
		for k, v := range f.data {
			rest[k] = v + bias[k/(lags+1)] - f.fixed[k]
			if !process {
				rest[k] -= f.columns[0][k]
			}
		}
		if s, err = leastSquares(columns, rest, weights); err != nil {
			return nil, err
		}
		for k, v := range s.value {
			theta[first+k] = math.Max(v, least[first+k])
		}
	}
	return f.figures(s, process), nil
}

func (f *fit) figures(s *solution, process bool) *NoiseFigures {
	nan := Number(math.NaN())
	out := &NoiseFigures{Process: Estimate{nan, nan, nan}}
	at := 0
	take := func() Estimate {
		v, w := s.value[at], normal95*s.spread[at]
		at++
		return Estimate{Number(math.Max(v, 0)), Number(math.Max(v-w, 0)), Number(math.Max(v+w, 0))}
	}
	if process {
		out.Process = take()
		out.Apart = out.Process.Low > 0
	}
	_, _, p := f.m.Dims()
	for i := range p {
		out.Sensors = append(out.Sensors, take())
		out.Model = append(out.Model, Number(f.m.R.At(i, i)))
	}
	out.Fit = Number(distuv.ChiSquared{K: float64(len(f.data) - len(s.value))}.Survival(s.distance))
	return out
}

// weights are the covariances of the sample autocovariances if the noise figures
// are theta, and per sensor the variance of its mean, which is missing in them.
//
// With g(h) = E e_a[k+h] e_b[k], the covariance at lag j of sensor a and lag k of
// sensor b is (1/N) Σₕ g(h) g(h+j−k) + g(h+j) g(h−k).
func (f *fit) weights(theta []float64) (*mat.SymDense, []float64, error) {
	n, _, p := f.m.Dims()
	w, r := mat.NewSymDense(n, nil), mat.NewSymDense(p, nil)
	w.ScaleSym(theta[0], processNoise(f.m))
	for i := range p {
		r.SetSym(i, i, theta[i+1])
		for j := range i {
			// As correlated as in the model, so that it stays a covariance.
			if v := math.Sqrt(f.m.R.At(i, i) * f.m.R.At(j, j)); v > 0 {
				r.SetSym(i, j, f.m.R.At(i, j)/v*math.Sqrt(theta[i+1]*theta[j+1]))
			}
		}
	}
	cov, fm, err := predictionCovariance(f.m, f.l, w, r)
	if err != nil {
		return nil, nil, err
	}
	pr := promiseOf(f.m, f.l, fm, cov, r)
	out, bias := mat.NewSymDense(p*(lags+1), nil), make([]float64, p)
	for a := range p {
		for b := range a + 1 {
			pr.spread(out, a, b, f.count)
		}
		band := meanBand(math.Sqrt(pr.s.At(a, a)), pr.correlation(a), f.count)
		bias[a] = (band.High / normal95) * (band.High / normal95)
	}
	return out, bias, nil
}

// spread fills in the block of sensors a and b: with R(d) = Σₕ g(h) g(h+d), which is
// even in d, the covariance is (R(j−k) + R(j+k)) / N.
func (pr *promise) spread(out *mat.SymDense, a, b int, count float64) {
	reach := len(pr.gamma)
	g := make([]float64, 2*reach+1)
	g[reach] = pr.s.At(a, b)
	for j, m := range pr.gamma {
		g[reach+j+1], g[reach-j-1] = m.At(a, b), m.At(b, a)
	}
	var r [2*lags + 1]float64
	for d := range r {
		for h := 0; h+d < len(g); h++ {
			r[d] += g[h] * g[h+d]
		}
	}
	for j := 0; j <= lags; j++ {
		for k := 0; k <= lags; k++ {
			out.SetSym(a*(lags+1)+j, b*(lags+1)+k, (r[max(j-k, k-j)]+r[j+k])/count)
		}
	}
}

type solution struct {
	value, spread []float64
	distance      float64 // weighted sum of squares of what is left
}

// leastSquares fits data by the columns with the weights of its covariance.
func leastSquares(columns [][]float64, data []float64, covariance *mat.SymDense) (*solution, error) {
	n, k := len(data), len(columns)
	d := make([]float64, n) // scales the covariance to ones on its diagonal
	for i := range d {
		if d[i] = math.Sqrt(covariance.At(i, i)); !(d[i] > 0) {
			return nil, ErrNoFit
		}
	}
	scaled := mat.NewSymDense(n, nil)
	for i := range n {
		for j := range i {
			scaled.SetSym(i, j, covariance.At(i, j)/d[i]/d[j])
		}
		scaled.SetSym(i, i, 1+1e-9) // lags of a smooth signal are nearly dependent
	}
	var ch mat.Cholesky
	if !ch.Factorize(scaled) {
		return nil, ErrNoFit
	}
	x, y := mat.NewDense(n, k, nil), mat.NewVecDense(n, nil)
	size := make([]float64, k)
	for j, c := range columns {
		for i, v := range c {
			x.Set(i, j, v/d[i])
			size[j] = math.Max(size[j], math.Abs(v/d[i]))
		}
		if size[j] == 0 {
			return nil, ErrNoFit
		}
		for i := range n {
			x.Set(i, j, x.At(i, j)/size[j])
		}
	}
	for i, v := range data {
		y.SetVec(i, v/d[i])
	}
	var wx, normal, inverse mat.Dense
	var wy, right, value mat.VecDense
	if ch.SolveTo(&wx, x) != nil || ch.SolveVecTo(&wy, y) != nil {
		return nil, ErrNoFit
	}
	normal.Mul(x.T(), &wx)
	right.MulVec(x.T(), &wy)
	if inverse.Inverse(&normal) != nil {
		return nil, ErrNoFit
	}
	value.MulVec(&inverse, &right)
	out := &solution{}
	for j := range k {
		out.value = append(out.value, value.AtVec(j)/size[j])
		out.spread = append(out.spread, math.Sqrt(inverse.At(j, j))/size[j])
	}
	var left, wl mat.VecDense
	left.MulVec(x, &value)
	left.SubVec(y, &left)
	if ch.SolveVecTo(&wl, &left) != nil {
		return nil, ErrNoFit
	}
	out.distance = mat.Dot(&left, &wl)
	return out, nil
}
