package logs

import (
	"context"
	"fmt"
	"io"

	"gonum.org/v1/gonum/mat"

	"polewright/estimator"
	"polewright/plants"
)

// pollEvery is how many steps go between two looks at the context.
const pollEvery = 4096

// Replay runs an estimator over a log. Lost sensors have no part in their step,
// missing rows are predicted through with the inputs before them. The context
// ends it early.
//
// The error is a *plants.Error where the log or the request is to blame.
func Replay(ctx context.Context, log Recording, q Request) (*Result, error) {
	l := log.Layout()
	if err := q.check(l, log.Survey()); err != nil {
		return nil, err
	}
	x, err := q.Start.vector(q.Model)
	if err != nil {
		return nil, err
	}
	source, err := log.Samples()
	if err != nil {
		return nil, err
	}
	r := newRun(l, log.Survey(), &q)
	r.main.f.start(x)
	if r.floor != nil {
		r.floor.f.start(x)
	}
	r.starting = q.Start.FirstSample
	for work := pollEvery; ; {
		if work >= pollEvery {
			if work = 0; ctx.Err() != nil {
				return nil, ctx.Err()
			}
		}
		s, err := source.Next()
		if err == io.EOF {
			break
		}
		if err != nil {
			return nil, err
		}
		work += 1 + s.Missing
		if err := r.step(s); err != nil {
			return nil, err
		}
	}
	if err := r.bounded(); err != nil {
		return nil, err
	}
	return r.result(), nil
}

// run is a replay under way.
type run struct {
	layout *Layout
	survey *Survey
	q      *Request

	main  *judged
	floor *judged // nil without

	promise *promise // nil where the gain is not stable
	nis     sum
	white   []float64 // S^(−1/2) e while it is computed

	references []comparison

	clock    clock
	starting bool
	line     int
	row      Row
}

// judged is a filter with the statistics of its innovations.
type judged struct {
	f       *filter
	sensors []series
	settle  int // samples to leave out after a loss
	wait    int // of these, left
}

func newJudged(m *estimator.Model, g *Gain, wrap []float64) *judged {
	_, _, p := m.Dims()
	return &judged{f: newFilter(m, *g, wrap), sensors: make([]series, p), settle: settleSamples(g.Settle, m.Period)}
}

// comparison collects estimate − reference.
type comparison struct {
	index         int
	row           []float64 // combination of states; nil for one state
	count         int64
	bias, squares sum
}

func newRun(l *Layout, v *Survey, q *Request) *run {
	wrap := wraps(l)
	r := &run{
		layout: l, survey: v, q: q, main: newJudged(q.Model, &q.Gain, wrap),
		white: make([]float64, len(l.Sensors)), clock: newClock(v, q.Skip),
		row: Row{Estimate: make([]float64, len(l.States))},
	}
	if q.Floor != nil {
		r.floor = newJudged(q.Model, q.Floor, wrap)
	}
	r.promise, _ = newPromise(q.Model, q.Gain.L)
	for _, ref := range v.References {
		c := comparison{index: ref.Index}
		if ref.Output {
			c.row = mat.Row(nil, ref.Index, q.Model.Outputs)
		}
		r.references = append(r.references, c)
	}
	return r
}

// step takes one sample.
func (r *run) step(s *Sample) error {
	r.line = s.Line
	if r.starting {
		if x, ok := fromSensors(r.q.Model, r.layout, s.U, s.Y); ok {
			r.starting = false
			r.main.f.start(x)
			if r.floor != nil {
				r.floor.f.start(x)
			}
		}
	}
	late := r.clock.late(s)
	counts := r.main.step(s, late)
	if r.floor != nil {
		r.floor.step(s, late)
		r.floor.f.advance()
	}
	if counts {
		r.together()
		r.compare(s)
	}
	if r.q.Each != nil {
		x := r.main.f.estimate()
		for i, v := range x {
			r.row.Estimate[i] = v + r.layout.States[i].Operating
		}
		r.row.Sample, r.row.Innovation = s, r.main.f.e
		if err := r.q.Each(&r.row); err != nil {
			return err
		}
	}
	r.main.f.advance()
	if r.clock.index%1024 == 0 {
		return r.bounded()
	}
	return nil
}

// bounded fails once the estimate has left the range of numbers.
func (r *run) bounded() error {
	if r.main.f.finite() {
		return nil
	}
	return &plants.Error{File: r.survey.File, Where: fmt.Sprintf("line %d or before", r.line), Wrong: "the estimate grows beyond all bounds", Expected: "expected an estimator that is stable"}
}

// step predicts through what is missing and measures. It reports whether the
// sample counts in the statistics.
func (j *judged) step(s *Sample, late bool) bool {
	for range s.Missing {
		j.f.skip()
	}
	j.f.measure(s.U, s.Y)
	counts := late && j.wait == 0
	if j.f.lost || s.Held || s.Missing > 0 {
		counts = false
		j.wait = j.settle
	} else if j.wait > 0 {
		j.wait--
	}
	if !counts {
		for i := range j.sensors {
			if j.sensors[i].run > 0 {
				j.sensors[i].stop()
			}
		}
		return false
	}
	for i, e := range j.f.e {
		j.sensors[i].add(e)
	}
	return true
}

// together adds eᵀ S⁻¹ e.
func (r *run) together() {
	if r.promise == nil || r.promise.root == nil {
		return
	}
	root := r.promise.root.RawTriangular()
	e, z := r.main.f.e, r.white
	size := 0.0
	for i := range z {
		v := e[i]
		row := root.Data[i*root.Stride : i*root.Stride+i+1]
		for k := 0; k < i; k++ {
			v -= row[k] * z[k]
		}
		z[i] = v / row[i]
		size += z[i] * z[i]
	}
	r.nis.add(size)
}

// compare adds estimate − reference.
func (r *run) compare(s *Sample) {
	for k := range r.references {
		c := &r.references[k]
		x := r.main.f.estimate()
		d := -s.Reference[k]
		if c.row == nil {
			d += x[c.index]
		} else {
			for i, v := range c.row {
				d += v * x[i]
			}
		}
		if d == d {
			c.count++
			c.bias.add(d)
			c.squares.add(d * d)
		}
	}
}
