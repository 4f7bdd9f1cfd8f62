// Package replays runs designs over a log of the real machine that is held in
// memory, for looking at while poles move. It knows no terminal.
package replays

import (
	"context"
	"errors"
	"fmt"
	"reflect"

	"polewright/estimator"
	"polewright/plants"
	"polewright/scenarios/logs"
)

// Most is how many samples of a log are held in memory; of a longer one, a window.
const Most = 200_000

// Log is a window of a log with what a replay of it needs to know. It is immutable.
type Log struct {
	File   string
	Record *logs.Record
	Whole  int64 // samples of the whole log
	Start  logs.Start
	Skip   *float64 // s; nil for a tenth of the samples
}

// ErrEmpty tells that a window of a log has no sample.
var ErrEmpty = errors.New("no sample of the log is in the window")

// Load takes at most `most` samples of a log into memory, from the time `from` in s
// on.
func Load(ctx context.Context, log *logs.Log, from float64, most int) (*Log, error) {
	r, err := logs.Load(ctx, log, from, most)
	if err != nil {
		return nil, err
	}
	if r.Survey().Samples == 0 {
		return nil, ErrEmpty
	}
	return &Log{File: log.Survey().File, Record: r, Whole: log.Survey().Samples}, nil
}

// Fits tells whether the log was read for this plant and model.
func (g *Log) Fits(p *plants.Plant, m *estimator.Model) bool {
	l, err := logs.NewLayout(p, m)
	return err == nil && reflect.DeepEqual(l, g.Record.Layout())
}

// Outcome is what a replay of the design in hand comes to. It is immutable.
type Outcome struct {
	Result *logs.Result
	// Noise is nil where the log gives no noise figures; NoNoise says why.
	Noise   *logs.NoiseFigures
	NoNoise error
	// Traces has the innovations of each sensor over Span seconds from the first
	// sample, in at most TraceBins equal bins: of each the largest in size, NaN where
	// the bin has none.
	Traces [][]float64
	// Followed has per reference of the log its column and the estimate, absolute
	// values in as many bins: of each the
	// first row that has the column.
	Followed [][2][]float64
	Span     float64
}

// Rival is a kept design on the same log.
type Rival struct {
	Name   string
	Result *logs.Result // nil where Err says why there is none
	Err    error
}

// Runner replays designs of one model. It is not for concurrent use.
type Runner struct {
	model *estimator.Model
	floor *logs.Gain // nil where there is none
}

// NewRunner finds the floor gain of the model.
func NewRunner(m *estimator.Model) (*Runner, error) {
	d, err := estimator.NewDesigner(m, estimator.Options{})
	if err != nil {
		return nil, err
	}
	floor, err := logs.FloorGain(m, d.Analysis())
	if err != nil {
		return nil, err
	}
	return &Runner{model: m, floor: floor}, nil
}

func (r *Runner) request(log *Log, d *estimator.Design) (logs.Request, error) {
	if d == nil || d.Gain == nil {
		return logs.Request{}, fmt.Errorf("a design without a gain: %w", estimator.ErrShape)
	}
	return logs.Request{Model: r.model, Gain: logs.GainOf(d), Start: log.Start, Skip: log.Skip}, nil
}

// Run replays the design in hand.
func (r *Runner) Run(ctx context.Context, log *Log, d *estimator.Design) (*Outcome, error) {
	q, err := r.request(log, d)
	if err != nil {
		return nil, err
	}
	v := log.Record.Survey()
	t := newTracer(v, log.Record.Layout(), r.model)
	q.Floor, q.Each = r.floor, t.take
	o := &Outcome{Traces: t.bins, Followed: t.followed, Span: v.End - v.Start}
	if o.Result, err = logs.Replay(ctx, log.Record, q); err != nil {
		return nil, err
	}
	if o.Noise, o.NoNoise = o.Result.NoiseFigures(); o.NoNoise != nil {
		o.Noise = nil
	}
	return o, nil
}

// Rival replays a kept design, without what belongs to the log alone.
func (r *Runner) Rival(ctx context.Context, log *Log, name string, d *estimator.Design) Rival {
	q, err := r.request(log, d)
	if err != nil {
		return Rival{Name: name, Err: err}
	}
	res, err := logs.Replay(ctx, log.Record, q)
	return Rival{Name: name, Result: res, Err: err}
}
