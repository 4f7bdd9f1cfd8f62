package logs

import (
	"context"
	"fmt"
	"io"
	"math"

	"gonum.org/v1/gonum/mat"

	"polewright/estimator"
)

// Point is how well one gain of a sweep predicts a log one step ahead.
type Point struct {
	// RMS of the innovation per sensor.
	RMS []Number `json:"rms"`
	// Error is the 2p-th root of the determinant of the innovations' second moments:
	// for one sensor its RMS, for several the measure that no choice of units can
	// shift (prediction error method, Ljung 1999). Undefined where the estimate
	// grows without bound.
	Error Number `json:"error"`
	// Counted is how many samples that is over, the same for all gains.
	Counted int64 `json:"counted"`
}

// Sweep runs many gains over a log in one pass and returns a point for each. The
// least Error is the best speed for this log. Model, Start and Skip are as in
// Replay; after a loss, samples are left out for the longest settle time.
func Sweep(ctx context.Context, log Recording, q Request, gains []Gain) ([]Point, error) {
	l := log.Layout()
	if len(gains) == 0 {
		return nil, fmt.Errorf("no gains to sweep: %w", estimator.ErrShape)
	}
	longest := 0.0
	for _, g := range gains {
		q.Gain = g
		if err := q.check(l, log.Survey()); err != nil {
			return nil, err
		}
		longest = math.Max(longest, math.Max(g.Settle, 0))
	}
	q.Floor, q.Each = nil, nil
	x, err := q.Start.vector(q.Model)
	if err != nil {
		return nil, err
	}
	source, err := log.Samples()
	if err != nil {
		return nil, err
	}
	s := newSweep(l, log.Survey(), &q, gains, longest, x)
	for work := pollEvery; ; {
		if work >= pollEvery {
			if work = 0; ctx.Err() != nil {
				return nil, ctx.Err()
			}
		}
		sample, err := source.Next()
		if err == io.EOF {
			return s.points(), nil
		}
		if err != nil {
			return nil, err
		}
		s.step(sample)
		work += len(gains) * (1 + sample.Missing)
	}
}

// FloorFamily are the floor gains of a model as its assumed process noise goes
// through factors times Q: the curve of the best linear estimators, from slow to
// fast. A factor without a floor is left out; used has those that stand behind the
// gains.
func FloorFamily(ctx context.Context, m *estimator.Model, factors []float64) (gains []Gain, used []float64, err error) {
	if err := m.Check(); err != nil {
		return nil, nil, err
	}
	for _, factor := range factors {
		if ctx.Err() != nil {
			return nil, nil, ctx.Err()
		}
		if !(factor >= 0) || math.IsInf(factor, 0) {
			return nil, nil, fmt.Errorf("a factor of %g on the process noise: %w", factor, estimator.ErrNoise)
		}
		family := *m
		family.Q = mat.NewSymDense(m.Q.SymmetricDim(), nil)
		family.Q.ScaleSym(factor, m.Q)
		d, err := estimator.NewDesigner(&family, estimator.Options{})
		if err != nil {
			return nil, nil, fmt.Errorf("the floor at %g times the process noise: %w", factor, err)
		}
		floor := d.Analysis().Floor
		if floor == nil {
			continue
		}
		design, err := d.Judge(estimator.Given{L: floor.Gain})
		if err != nil {
			return nil, nil, fmt.Errorf("the floor at %g times the process noise: %w", factor, err)
		}
		gains, used = append(gains, GainOf(design)), append(used, factor)
	}
	return gains, used, nil
}

// sweep is many filters on one log.
type sweep struct {
	layout  *Layout
	q       *Request
	clock   clock
	filters []*filter
	squares [][]sum // per filter, p×p products of innovations, lower part
	count   int64
	settle  int
	wait    int
	waiting bool // for a first sample
}

func newSweep(l *Layout, v *Survey, q *Request, gains []Gain, settle float64, x []float64) *sweep {
	s := &sweep{layout: l, q: q, clock: newClock(v, q.Skip), settle: settleSamples(settle, l.Period), waiting: q.Start.FirstSample}
	p := len(l.Sensors)
	for _, g := range gains {
		f := newFilter(q.Model, g, wraps(l))
		f.start(x)
		s.filters = append(s.filters, f)
		s.squares = append(s.squares, make([]sum, p*p))
	}
	return s
}

func (s *sweep) step(sample *Sample) {
	if s.waiting {
		if x, ok := fromSensors(s.q.Model, s.layout, sample.U, sample.Y); ok {
			s.waiting = false
			for _, f := range s.filters {
				f.start(x)
			}
		}
	}
	counts := s.clock.late(sample) && s.wait == 0
	lost := sample.Held || sample.Missing > 0
	for _, y := range sample.Y {
		lost = lost || y != y
	}
	if lost {
		counts, s.wait = false, s.settle
	} else if s.wait > 0 {
		s.wait--
	}
	if counts {
		s.count++
	}
	p := len(sample.Y)
	for k, f := range s.filters {
		for range sample.Missing {
			f.skip()
		}
		f.measure(sample.U, sample.Y)
		if counts {
			for i, e := range f.e {
				for j := 0; j <= i; j++ {
					s.squares[k][i*p+j].add(e * f.e[j])
				}
			}
		}
		f.advance()
	}
}

func (s *sweep) points() []Point {
	p := len(s.layout.Sensors)
	list := make([]Point, len(s.filters))
	for k := range list {
		moment := mat.NewSymDense(p, nil)
		point := Point{Counted: s.count, Error: Number(math.NaN())}
		defined := s.count > 0 && s.filters[k].finite()
		for i := range p {
			for j := range i + 1 {
				v := s.squares[k][i*p+j].value() / float64(s.count)
				if !defined || math.IsInf(v, 0) {
					v = math.NaN()
				}
				moment.SetSym(i, j, v)
			}
			point.RMS = append(point.RMS, Number(math.Sqrt(moment.At(i, i))))
		}
		point.Error = Number(rootDeterminant(moment))
		list[k] = point
	}
	return list
}

// rootDeterminant is det^(1/2p) of a positive semidefinite matrix, NaN where it is
// none.
func rootDeterminant(s *mat.SymDense) float64 {
	p := s.SymmetricDim()
	d := make([]float64, p)
	logarithm := 0.0
	scaled := mat.NewSymDense(p, nil)
	for i := range p {
		d[i] = math.Sqrt(s.At(i, i))
		if d[i] == 0 {
			return 0
		}
		logarithm += 2 * math.Log(d[i])
		for j := range i + 1 {
			scaled.SetSym(i, j, s.At(i, j)/d[i]/d[j])
		}
	}
	for i := range p {
		for j := range i + 1 {
			if v := scaled.At(i, j); v != v {
				return math.NaN()
			}
		}
	}
	var ch mat.Cholesky
	if !ch.Factorize(scaled) {
		return 0 // sensors that tell the same
	}
	return math.Exp((logarithm + ch.LogDet()) / float64(2*p))
}
