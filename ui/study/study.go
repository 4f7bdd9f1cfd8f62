// Package study does in the background what takes longer than a drag: curves of
// the price of speed, the worst case over tolerances, searches for poles, the
// replay of a log. One
// study runs at a time; a new one replaces it.
package study

import (
	"context"
	"errors"
	"fmt"
	"sync"
	"time"

	"polewright/estimator"
	"polewright/estimator/sweep"
	"polewright/plants"
	"polewright/scenarios/seek"
	"polewright/scenarios/tolerance"
	"polewright/ui/desk"
	"polewright/ui/newest"
	"polewright/ui/replays"
)

// Kind of a study.
type Kind uint8

const (
	// None stops what is running.
	None Kind = iota
	// Tradeoff is noise against settle time: the design's poles scaled, and the
	// family of the best linear estimators.
	Tradeoff
	// Tolerances is the worst case over the parameters' tolerances.
	Tolerances
	// Fastest seeks the fastest poles within the scenario's limits.
	Fastest
	// Quietest seeks the quietest poles within SettleMax and the limits.
	Quietest
	// Replay runs the design, then Rivals, over Log.
	Replay
)

// Request is one study of a design. It is immutable.
type Request struct {
	Gen       uint64
	Kind      Kind
	Design    *estimator.Design
	SettleMax float64 // s, Quietest only

	Log    *replays.Log // Replay only
	Rivals []Rival
}

// Rival is a kept design that a replay shows beside the one in hand.
type Rival struct {
	Name   string
	Design *estimator.Design
}

// Answer is a study as far as it has come. It is immutable.
type Answer struct {
	Gen        uint64
	Kind       Kind
	Done       bool
	Tried, All int // progress; All is 0 where it is not known

	Scaling, Family []sweep.Point       // Tradeoff
	Envelope        *tolerance.Envelope // Tolerances, when done
	Best            *estimator.Design   // searches: the best so far
	Found           *seek.Result        // searches, when done
	Replay          *replays.Outcome    // Replay, of the design in hand
	Rivals          []replays.Rival     // Replay, those so far
	Err             error
}

// Student owns the worker.
type Student struct {
	bench  *desk.Bench
	period *float64
	notify func(Answer)
	box    *newest.Box[Request]
	runner *replays.Runner // of the worker; nil before the first replay
}

// New starts a student. notify is called from the background, one answer at a
// time; it may wait, but must not be reached from inside Ask or Close.
func New(bench *desk.Bench, notify func(Answer)) *Student {
	s := &Student{bench: bench, period: &bench.Model.Period, notify: notify}
	ready := make(chan struct{})
	s.box = newest.Start(func(ctx context.Context, r Request) {
		<-ready
		s.serve(ctx, r)
	})
	close(ready)
	return s
}

// Ask hands over a request and returns at once; a request of None stops what is
// running.
func (s *Student) Ask(r Request) { s.box.Ask(r) }

// Close cancels the study in progress and waits for its end.
func (s *Student) Close() { s.box.Close() }

func (s *Student) serve(ctx context.Context, r Request) {
	var mu sync.Mutex // answers come one at a time, also from progress
	send := func(a Answer) {
		mu.Lock()
		defer mu.Unlock()
		if a.Gen, a.Kind = r.Gen, r.Kind; ctx.Err() == nil {
			s.notify(a)
		}
	}
	defer func() {
		if p := recover(); p != nil {
			send(Answer{Done: true, Err: fmt.Errorf("this study broke: %v", p)})
		}
	}()
	if r.Kind == None {
		return
	}
	if r.Design == nil {
		send(Answer{Done: true, Err: errors.New("there is no design to study yet")})
		return
	}
	var a Answer
	switch r.Kind {
	case Tradeoff:
		a = s.tradeoff(ctx, r, send)
	case Tolerances:
		a = s.tolerances(ctx, r, send)
	case Fastest, Quietest:
		a = s.seek(ctx, r, send)
	case Replay:
		a = s.replay(ctx, r, send)
	default:
		a = Answer{Err: fmt.Errorf("no study of kind %d", r.Kind)}
	}
	a.Done = true
	send(a)
}

// often lets one report through in a while.
func often() func() bool {
	last := time.Now()
	return func() bool {
		if time.Since(last) < 100*time.Millisecond {
			return false
		}
		last = time.Now()
		return true
	}
}

// The curves' spans and numbers of points.
const (
	speedSpan, familySpan     = 4.0, 1e4
	speedPoints, familyPoints = 33, 25
)

func (s *Student) options(d *estimator.Design) estimator.Options {
	return estimator.Options{Form: d.Form, Method: d.Method}
}

func (s *Student) tradeoff(ctx context.Context, r Request, send func(Answer)) Answer {
	d, err := estimator.NewDesigner(s.bench.Model, s.options(r.Design))
	if err != nil {
		return Answer{Err: err}
	}
	var a Answer
	if a.Scaling, err = sweep.Speeds(ctx, d, r.Design, s.bench.Model.Period, sweep.Factors(speedSpan, speedPoints)); err != nil {
		a.Err = err
	}
	send(a)
	family, err := sweep.Floors(ctx, s.bench.Model, s.options(r.Design), sweep.Factors(familySpan, familyPoints))
	if a.Family = family; err != nil && a.Err == nil {
		a.Err = err
	}
	return a
}

func (s *Student) seek(ctx context.Context, r Request, send func(Answer)) Answer {
	p := seek.Problem{Plant: s.bench.Plant, Model: s.bench.Model, Scenario: s.bench.Scenario,
		Options: s.options(r.Design), Start: r.Design, SettleMax: r.SettleMax}
	if r.Kind == Quietest {
		p.Goal = seek.Quietest
	}
	due := often()
	found, err := seek.Run(ctx, p, func(done, most int, best *estimator.Design) {
		if due() {
			send(Answer{Tried: done, All: most, Best: best})
		}
	})
	a := Answer{Found: found, Err: err}
	if found != nil {
		a.Best, a.Tried, a.All = found.Design, found.Tries, found.Tries
	}
	return a
}

func (s *Student) tolerances(ctx context.Context, r Request, send func(Answer)) Answer {
	due := often()
	study := tolerance.Study{Plant: s.bench.Plant, Options: plants.Options{Period: s.period}, Designer: s.options(r.Design), Design: r.Design, Seed: 1}
	envelope, err := study.Run(ctx, func(done, total int) {
		if due() {
			send(Answer{Tried: done, All: total})
		}
	})
	return Answer{Envelope: envelope, Err: err}
}
