package logs

import (
	"context"
	"fmt"
	"io"
	"math"

	"gonum.org/v1/gonum/mat"

	"polewright/estimator"
	"polewright/plants"
)

// Gain is an estimator for a replay.
type Gain struct {
	// L is n×p, of the prediction form.
	L *mat.Dense
	// Lf is the current form's with A Lf = L; nil runs the prediction form.
	Lf *mat.Dense
	// Settle is the time in s that an error takes to die out: as long after a loss,
	// samples stay out of the statistics. NaN counts as 0.
	Settle float64
}

// GainOf takes the gain of a design, in its form.
func GainOf(d *estimator.Design) Gain {
	g := Gain{L: d.Gain, Settle: d.Transient.Settle}
	if d.Form == estimator.Current {
		g.Lf = d.GainCurrent
	}
	return g
}

// FloorGain takes the gain of the best linear estimator, in prediction form: the
// innovations of both forms are the same. It is nil where there is no floor, and
// fails where the model does.
func FloorGain(m *estimator.Model, a *estimator.Analysis) (*Gain, error) {
	if a == nil || a.Floor == nil {
		return nil, nil
	}
	d, err := estimator.NewDesigner(m, estimator.Options{})
	if err != nil {
		return nil, err
	}
	design, err := d.Judge(estimator.Given{L: a.Floor.Gain})
	if err != nil {
		return nil, fmt.Errorf("judging the floor gain: %w", err)
	}
	g := GainOf(design)
	return &g, nil
}

// Request is one replay.
type Request struct {
	Model *estimator.Model
	Gain  Gain
	// Floor is the floor gain of the model, whose innovations alone are white if
	// the model is true; nil leaves whiteness out.
	Floor *Gain
	Start Start
	// Skip is the time in s at the start that stays out of the statistics; nil is
	// the first tenth of the samples.
	Skip *float64
	// Each is called for every sample of the log, nil for none. Its error ends the
	// replay.
	Each func(*Row) error
}

// Row is what the estimator makes of one sample. Its slices last until the next.
type Row struct {
	Sample *Sample
	// Estimate has an absolute value per state: x̂[k|k−1] in prediction form, x̂[k|k]
	// in current form.
	Estimate []float64
	// Innovation has one entry per sensor, NaN where it was lost.
	Innovation []float64
}

func (q *Request) check(l *Layout) error {
	if q.Model == nil {
		return fmt.Errorf("no model to replay: %w", estimator.ErrShape)
	}
	if err := q.Model.Check(); err != nil {
		return err
	}
	n, inputs, p := q.Model.Dims()
	if len(l.Inputs) != inputs || len(l.Sensors) != p || len(l.States) != n || l.Period != q.Model.Period {
		return fmt.Errorf("the log was opened for another model: %w", estimator.ErrShape)
	}
	if err := q.Gain.check(n, p); err != nil {
		return err
	}
	if q.Floor != nil {
		if err := q.Floor.check(n, p); err != nil {
			return fmt.Errorf("the floor: %w", err)
		}
	}
	if s := q.Skip; s != nil && !(*s >= 0) {
		return &plants.Error{Where: "skip", Wrong: fmt.Sprintf("%g s", *s), Expected: "expected 0 or above"}
	}
	return nil
}

func (g *Gain) check(n, p int) error {
	if g.L == nil {
		return fmt.Errorf("no gain to replay: %w", estimator.ErrShape)
	}
	for _, l := range []*mat.Dense{g.L, g.Lf} {
		if l == nil {
			continue
		}
		if r, c := l.Dims(); r != n || c != p {
			return fmt.Errorf("the gain is %d×%d, expected %d×%d: %w", r, c, n, p, estimator.ErrShape)
		}
		for i := range n {
			for j := range p {
				if v := l.At(i, j); math.IsNaN(v) || math.IsInf(v, 0) {
					return fmt.Errorf("the gain: %w", estimator.ErrNotFinite)
				}
			}
		}
	}
	return nil
}

// Replay runs an estimator over a log. Lost sensors have no part in their step,
// missing rows are predicted through with the inputs before them. The context
// ends it early.
//
// The error is a *plants.Error where the log or the request is to blame.
func Replay(ctx context.Context, log Recording, q Request) (*Result, error) {
	l := log.Layout()
	if err := q.check(l); err != nil {
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
	for {
		if r.clock.index%4096 == 0 && ctx.Err() != nil {
			return nil, ctx.Err()
		}
		s, err := source.Next()
		if err == io.EOF {
			break
		}
		if err != nil {
			return nil, err
		}
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

// clock knows which samples are late enough for the statistics.
type clock struct {
	index int64
	first int64   // samples before it stay out
	from  float64 // and so do times before this one
}

func newClock(v *Survey, skip *float64) clock {
	if skip != nil {
		return clock{from: v.Start + *skip}
	}
	return clock{first: v.Samples / 10, from: math.Inf(-1)}
}

// late takes the next sample.
func (c *clock) late(s *Sample) bool {
	c.index++
	return c.index > c.first && s.T >= c.from
}

// settleSamples is a settle time in samples; NaN is none.
func settleSamples(settle, period float64) int {
	if !(settle > 0) {
		return 0
	}
	return int(math.Min(math.Ceil(settle/period-1e-9), math.MaxInt32))
}

func wraps(l *Layout) []float64 {
	list := make([]float64, len(l.Sensors))
	for i, s := range l.Sensors {
		list[i] = s.Wrap
	}
	return list
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

// sum adds many terms: plainly in blocks, the blocks compensated.
type sum struct {
	part  float64
	terms int
	whole total
}

func (s *sum) add(v float64) {
	s.part += v
	if s.terms++; s.terms == blockSize {
		s.whole.add(s.part)
		s.part, s.terms = 0, 0
	}
}

func (s *sum) value() float64 {
	s.whole.add(s.part)
	s.part, s.terms = 0, 0
	return s.whole.value()
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
			c.row = mat.Row(nil, ref.Index, l.rows)
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
	return &plants.Error{Where: fmt.Sprintf("log line %d or before", r.line), Wrong: "the estimate grows beyond all bounds", Expected: "expected an estimator that is stable"}
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
