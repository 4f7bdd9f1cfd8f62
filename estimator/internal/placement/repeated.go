package placement

import (
	"math"

	"gonum.org/v1/gonum/blas/blas64"
	"gonum.org/v1/gonum/mat"
)

// searchable is the most entries of a gain for which repeated poles are searched: the
// cost of a step grows with the fifth power of n.
const searchable = 40

// quietRepeated is LeastNoise for repeated poles. A gain with as many eigenvectors as
// copies is the exception among those with the same poles, so that the search goes over
// all of them, by their block-triangular form. It starts from the gain in warm, else
// from the robust gain and from the least-noise gain of the same poles pulled apart.
func (s *Solver) quietRepeated(dst, a, c blas64.General, poles []complex128, warm *Warm) (Info, error) {
	n, p := a.Rows, c.Rows
	q := &s.noise
	l := mat.NewDense(n, p, nil)
	info, err := s.Robust(l.RawMatrix(), a, c, poles, nil)
	if err != nil {
		if warm != nil {
			warm.clear()
		}
		return info, err
	}
	info.Condition = math.NaN()
	copy(q.l, l.RawMatrix().Data)
	best := q.covariance()
	gains, steps := []*mat.Dense{mat.DenseCopyOf(l)}, 120
	if warm.fits(n, p) && len(warm.gain) == n*p {
		gains, steps = []*mat.Dense{mat.NewDense(n, p, append([]float64(nil), warm.gain...))}, 20
	} else if apart := s.pulledApart(a, c); apart != nil {
		gains = append(gains, apart)
	}
	info.Converged = n*p <= searchable
	if info.Converged {
		wrapped := func(g blas64.General) *mat.Dense {
			m := new(mat.Dense)
			m.SetRawMatrix(g)
			return mat.DenseCopyOf(m.T())
		}
		t := newTriangular(wrapped(a), wrapped(c), s.list)
		info.Converged = false
		for _, g := range gains {
			x, ok := t.read(g)
			if !ok {
				continue
			}
			cost, used, done := s.descendTriangular(t, x, steps)
			info.Iterations += used
			if len(gains) == 1 || cost < best {
				best = cost
				t.gain(x)
				t.gainTo(l.RawMatrix().Data)
				info.Converged = done
			}
		}
	}
	for i := range n {
		copy(dst.Data[i*dst.Stride:i*dst.Stride+p], l.RawRowView(i))
	}
	if warm != nil {
		warm.keepGain(n, p, l.RawMatrix().Data)
	}
	return s.finish(dst, info)
}

// pulledApart returns the least-noise gain of poles of which the copies are slowed by
// 8 % each; nil where there is none.
func (s *Solver) pulledApart(a, c blas64.General) *mat.Dense {
	list := s.list
	defer func() { s.list = list }()
	s.list = make([]pole, len(list))
	for i, v := range list {
		k := float64(multiplicity(list[:i], v.at))
		s.list[i] = v
		if v.at == 0 {
			s.list[i].at = complex(0.04*k, 0)
		} else {
			s.list[i].at *= complex(math.Pow(0.92, k), 0)
		}
	}
	q, r := &s.noise, &s.robust
	if !r.load(a, c) || r.gather(s.list) > 1 {
		return nil
	}
	r.noise = q
	_, ok := r.quiet(nil)
	r.noise = nil
	l := mat.NewDense(a.Rows, c.Rows, nil)
	if !ok || !r.gain(l.RawMatrix()) {
		return nil
	}
	return l
}

// descendTriangular minimises the noise over the parameters x, which it leaves at the
// best point, by BFGS with central differences.
func (s *Solver) descendTriangular(t *triangular, x []float64, most int) (cost float64, steps int, done bool) {
	q := &s.noise
	value := func(x []float64) float64 {
		if !t.gain(x) {
			return math.Inf(1)
		}
		t.gainTo(q.l)
		cost := q.covariance()
		if math.IsNaN(cost) {
			return math.Inf(1)
		}
		return math.Log(cost)
	}
	slope := func(g, x []float64) {
		const h = 1e-6
		for i, v := range x {
			x[i] = v + h
			up := value(x)
			x[i] = v - h
			g[i] = (up - value(x)) / (2 * h)
			x[i] = v
			if math.IsNaN(g[i]) || math.IsInf(g[i], 0) {
				g[i] = 0
			}
		}
	}
	m := new(descent)
	m.reset(len(x), 0)
	next := make([]float64, len(x))
	f := value(x)
	if math.IsInf(f, 0) {
		return math.Exp(f), 0, false
	}
	slope(m.g, x)
	fresh := true
	for steps < most {
		down := m.direction(fresh)
		step, fNext := 1.0, math.Inf(1)
		for step > 1e-10 {
			for i, v := range x {
				next[i] = v + step*m.d[i]
			}
			if fNext = value(next); fNext <= f+1e-4*step*down {
				break
			}
			step /= 2
		}
		if step <= 1e-10 {
			if fresh {
				return math.Exp(f), steps, true
			}
			fresh = true
			continue
		}
		steps++
		drop := f - fNext
		f = fNext
		copy(x, next)
		slope(m.gNext, x)
		m.update(step, fresh)
		fresh = false
		m.g, m.gNext = m.gNext, m.g
		if drop < 1e-8 {
			return math.Exp(f), steps, true
		}
	}
	return math.Exp(f), steps, false
}
