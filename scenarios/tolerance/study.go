package tolerance

import (
	"context"
	"errors"
	"fmt"
	"runtime"
	"sync"
	"sync/atomic"

	"gonum.org/v1/gonum/mat"

	"polewright/estimator"
	"polewright/plants"
)

// ErrStudy reports a study that cannot be made.
var ErrStudy = errors.New("no tolerance study")

const (
	defaultSamples = 200
	maxSamples     = 100_000
)

// Study is a design and the plant it was made for.
type Study struct {
	Plant *plants.Plant
	// Options gave the design model; its Factors must be empty, since the study
	// sets them.
	Options  plants.Options
	Designer estimator.Options
	Design   *estimator.Design
	// Samples is the number of points inside the box; if zero, 200; below zero,
	// none. Seed draws them.
	Samples int
	Seed    uint64
	// Workers is the number of cases judged at a time; if zero, runtime.GOMAXPROCS.
	// The result does not depend on it.
	Workers int
}

// outcome is what one case gave.
type outcome struct {
	mismatch *estimator.Mismatch
	err      error
}

// Run judges every case. It fails with the error of ctx where that ends first,
// where the study is not sound (ErrStudy, or an error of plants or estimator) and
// where not even the nominal plant can be judged. progress may be nil; it is
// called on Run's own goroutine after every case, with done rising from 1 to
// total.
func (s Study) Run(ctx context.Context, progress func(done, total int)) (*Envelope, error) {
	model, err := s.check()
	if err != nil {
		return nil, err
	}
	list, notes, err := toleranced(s.Plant)
	if err != nil {
		return nil, err
	}
	samples := s.Samples
	switch {
	case samples == 0:
		samples = defaultSamples
	case samples < 0:
		samples = 0
	}
	all, exhaustive := cases(list, samples, s.Seed)
	results, err := s.judgeAll(ctx, model, all, progress)
	if err != nil {
		return nil, err
	}
	if err := results[0].err; err != nil {
		return nil, fmt.Errorf("the nominal plant: %w", err)
	}
	if len(s.Plant.Unknowns) > 0 {
		notes = append(notes, "the unknowns' own drift is left out, since off the model its effect can grow without end: noise can be below that of the design itself")
	}
	e := &Envelope{Parameters: list, Cases: len(all), Exhaustive: exhaustive, Notes: notes, Discrete: model.Discrete()}
	e.note(list, samples)
	e.collect(all, results, s.measures(model))
	return e, nil
}

// check makes the design model and holds the design against it.
func (s Study) check() (*estimator.Model, error) {
	switch {
	case s.Plant == nil:
		return nil, fmt.Errorf("there is no plant: %w", ErrStudy)
	case len(s.Options.Factors) > 0:
		return nil, fmt.Errorf("the design model has factors on its parameters: %w", ErrStudy)
	case s.Design == nil || s.Design.Gain == nil:
		return nil, fmt.Errorf("there is no design: %w", ErrStudy)
	case s.Samples > maxSamples:
		return nil, fmt.Errorf("%d samples, expected at most %d: %w", s.Samples, maxSamples, ErrStudy)
	}
	m, err := s.Plant.Model(s.Options)
	if err != nil {
		return nil, err
	}
	n, _, p := m.Dims()
	for _, l := range []*mat.Dense{s.Design.Gain, s.Design.GainCurrent} {
		if l == nil {
			continue
		}
		if r, c := l.Dims(); r != n || c != p {
			return nil, fmt.Errorf("the design has a gain of %d×%d, its model needs %d×%d: %w", r, c, n, p, ErrStudy)
		}
	}
	return m, nil
}

// judgeAll judges the cases on several goroutines, each with a designer of its
// own, and returns the outcomes in the order of the cases.
func (s Study) judgeAll(ctx context.Context, model *estimator.Model, all []Case, progress func(done, total int)) ([]outcome, error) {
	workers := s.Workers
	if workers <= 0 {
		workers = runtime.GOMAXPROCS(0)
	}
	workers = min(workers, len(all))
	results := make([]outcome, len(all))
	finished := make(chan error)
	stop, cancel := context.WithCancel(ctx)
	defer cancel()
	var next atomic.Int64
	var running sync.WaitGroup
	for range workers {
		running.Go(func() {
			d, err := estimator.NewDesigner(model, s.Designer)
			if err != nil {
				finished <- err
				return
			}
			for {
				k := int(next.Add(1)) - 1
				if k >= len(all) || stop.Err() != nil {
					return
				}
				results[k].mismatch, results[k].err = s.judge(d, all[k])
				finished <- nil
			}
		})
	}
	go func() {
		running.Wait()
		close(finished)
	}()
	done := 0
	var failed error
	for err := range finished {
		if err != nil {
			failed = err
			cancel()
			continue
		}
		done++
		if progress != nil && failed == nil && ctx.Err() == nil {
			progress(done, len(all))
		}
	}
	if failed != nil {
		return nil, failed
	}
	if done < len(all) {
		return nil, ctx.Err()
	}
	return results, nil
}

// judge builds the real plant of a case and holds the design against it.
func (s Study) judge(d *estimator.Designer, c Case) (*estimator.Mismatch, error) {
	o := s.Options
	o.Factors, o.WithoutUnknowns = c.Truth(), true
	real, err := s.Plant.Model(o)
	if err != nil {
		return nil, err
	}
	return d.Against(real, s.Design)
}
