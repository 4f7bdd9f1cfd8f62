// Package solver recomputes designs in the background. The newest request wins:
// asking never waits, a pending request is replaced, and a run in progress stops
// at its next look at the clock of its context.
package solver

import (
	"context"
	"fmt"
	"maps"

	"polewright/estimator"
	"polewright/scenarios"
	"polewright/ui/aim"
	"polewright/ui/desk"
	"polewright/ui/newest"
)

// Solver owns one worker and all its workspaces.
type Solver struct {
	notify func(desk.Answer)
	box    *newest.Box[desk.Request]
}

// New starts a solver for one bench. notify is called from the worker, one answer
// at a time; it may wait, but must not be reached from inside Ask or Close.
func New(bench *desk.Bench, notify func(desk.Answer)) *Solver {
	return start(newWork(bench).stages, notify)
}

// stages computes the answers of one request in order and hands each to send. It
// may leave out what comes after ctx is cancelled.
type stages func(ctx context.Context, r desk.Request, send func(desk.Answer))

func start(work stages, notify func(desk.Answer)) *Solver {
	s := &Solver{notify: notify}
	ready := make(chan struct{})
	s.box = newest.Start(func(ctx context.Context, r desk.Request) {
		<-ready
		s.serve(ctx, r, work)
	})
	close(ready)
	return s
}

// Ask hands over a request and returns at once.
func (s *Solver) Ask(r desk.Request) { s.box.Ask(r) }

// Close cancels the work in progress and waits for the worker to end. No answer
// is delivered after it returns.
func (s *Solver) Close() { s.box.Close() }

func (s *Solver) serve(ctx context.Context, r desk.Request, work stages) {
	send := func(a desk.Answer) {
		if s.box.Closed() {
			return
		}
		a.Gen = r.Gen
		s.notify(a)
	}
	defer func() {
		if p := recover(); p != nil {
			send(desk.Answer{Err: fmt.Errorf("this design broke the solver (%v): undo and go on; the work is kept", p)})
		}
	}()
	work(ctx, r, send)
}

// work answers requests about one bench.
type work struct {
	bench     *desk.Bench
	designers map[estimator.Options]*estimator.Designer
	runner    *scenarios.Runner
	stressed  *scenarios.Runner // on the real plant of truth
	truth     map[string]float64
}

func newWork(b *desk.Bench) *work {
	return &work{bench: b, designers: map[estimator.Options]*estimator.Designer{}}
}

func (w *work) stages(ctx context.Context, r desk.Request, send func(desk.Answer)) {
	a, err := w.judge(r)
	if err != nil {
		a.Err = err
		send(a)
		return
	}
	send(a)
	if ctx.Err() != nil {
		return
	}
	run, err := w.run(ctx, a.Design, r.Truth)
	if ctx.Err() != nil {
		return
	}
	a.Stage = desk.Traced
	whole, failed := w.complete(ctx, r, a.Design)
	if ctx.Err() != nil {
		return
	}
	if failed != nil {
		a.Err = failed
	} else {
		a.Design = whole
	}
	if err != nil {
		a.Err = fmt.Errorf("the scenario's run: %w", err)
	} else {
		a.Run = run
		a.Limits = w.bench.Scenario.Judge(a.Design, w.bench.Model, w.bench.Plant, run)
	}
	send(a)
	if r.From == nil || r.Gain != nil || r.GainCurrent != nil || a.Err != nil {
		return
	}
	if a.Better = w.fresh(ctx, r, a.Design); a.Better != nil && ctx.Err() == nil {
		send(a)
	}
}

// fresh looks from cold for a gain that is better than the branch.
func (w *work) fresh(ctx context.Context, r desk.Request, design *estimator.Design) *estimator.Design {
	d, err := w.designer(estimator.Options{Form: r.Form, Method: r.Method})
	if err != nil {
		return nil
	}
	better, err := d.Fresh(ctx, design)
	if err != nil {
		return nil // no offer: the design at hand stands
	}
	return better
}

// judge is the first stage: the design, its readings and the limits on these.
func (w *work) judge(r desk.Request) (desk.Answer, error) {
	var a desk.Answer
	d, err := w.designer(estimator.Options{Form: r.Form, Method: r.Method})
	if err != nil {
		return a, err
	}
	a.Analysis, a.Fixed = d.Analysis(), d.Fixed()
	a.Movable, a.Registers = d.Movable()
	wanted := r.Poles
	switch {
	case r.Gain != nil || r.GainCurrent != nil:
		a.Design, err = d.QuickJudge(estimator.Given{L: r.Gain, Lf: r.GainCurrent, Wanted: wanted})
	default:
		if wanted == nil {
			if wanted, err = aim.Start(w.bench.Model, d); err != nil {
				return a, err
			}
		}
		a.Design, err = d.QuickPlace(wanted, r.From)
	}
	if err != nil {
		return a, err
	}
	a.Limits = w.bench.Scenario.Judge(a.Design, w.bench.Model, w.bench.Plant, nil)
	return a, nil
}

// complete adds the figures that the first stage left out.
func (w *work) complete(ctx context.Context, r desk.Request, quick *estimator.Design) (*estimator.Design, error) {
	d, err := w.designer(estimator.Options{Form: r.Form, Method: r.Method})
	if err != nil {
		return nil, err
	}
	return d.Complete(ctx, quick)
}

func (w *work) designer(o estimator.Options) (*estimator.Designer, error) {
	if d := w.designers[o]; d != nil {
		return d, nil
	}
	d, err := estimator.NewDesigner(w.bench.Model, o)
	if err != nil {
		return nil, err
	}
	w.designers[o] = d
	return d, nil
}

func (w *work) run(ctx context.Context, d *estimator.Design, truth map[string]float64) (*scenarios.Run, error) {
	r, err := w.on(truth)
	if err != nil {
		return nil, err
	}
	return r.Run(ctx, scenarios.Gain{L: d.Gain, Lf: d.GainCurrent, Form: d.Form})
}

// on returns the runner of the scenario on its own real plant, or on one whose
// parameters are multiplied by truth. The newest of the latter is kept.
func (w *work) on(truth map[string]float64) (*scenarios.Runner, error) {
	s, plant, keep := w.bench.Scenario, w.bench.Truth, &w.runner
	if len(truth) > 0 {
		if !maps.Equal(truth, w.truth) {
			w.stressed, w.truth = nil, maps.Clone(truth)
		}
		other := *s
		other.Factors, other.TruthPlant = w.truth, ""
		s, plant, keep = &other, nil, &w.stressed
	}
	if *keep == nil {
		r, err := scenarios.NewRunner(w.bench.Plant, w.bench.Model, s, plant)
		if err != nil {
			return nil, err
		}
		*keep = r
	}
	return *keep, nil
}
