// Package seek looks for poles by what they shall achieve: the fastest within all
// limits of a scenario, or the quietest within a settle time. It is a search by
// Nelder and Mead 1965 from several starts: what it finds is good, not proved best.
package seek

import (
	"context"
	"errors"
	"fmt"
	"math"

	"gonum.org/v1/gonum/optimize"

	"polewright/estimator"
	"polewright/estimator/poles"
	"polewright/estimator/sweep"
	"polewright/plants"
	"polewright/scenarios"
)

// Goal is what is made as small as possible.
type Goal uint8

const (
	// Fastest is the least settle time within all limits.
	Fastest Goal = iota
	// Quietest is the least noise over the floor within a settle time and all
	// limits.
	Quietest
)

// Problem is one search. Model must be the plant's design model.
type Problem struct {
	Plant    *plants.Plant
	Model    *estimator.Model
	Scenario *scenarios.Scenario
	Options  estimator.Options
	// Start is the design to begin with; it must have wanted poles.
	Start *estimator.Design
	Goal  Goal
	// SettleMax in s is needed for Quietest, and not used else.
	SettleMax float64
}

// Result is the best design found.
type Result struct {
	Design *estimator.Design
	// Limits are all that can be judged without the scenario's run.
	Limits []scenarios.LimitResult
	// Met tells whether they all are, and for Quietest the settle time too.
	Met    bool
	Tries  int  // designs that were made
	Better bool // than the start
}

// Progress is told of every try: how many there were of how many at most, and the
// best so far. It is called from the searching goroutine and must be short.
type Progress func(done, most int, best *estimator.Design)

// maxTries bounds a search.
const maxTries = 4000

// Errors of a search.
var (
	// ErrStart reports a start without wanted poles or without any that can move.
	ErrStart = errors.New("nothing to start from")
	// ErrSettle reports a Quietest search without a settle time above 0.
	ErrSettle = errors.New("a settle time above 0 is needed")
)

// Run searches until nothing improves, the tries are used up, or ctx is cancelled;
// then it returns the best so far with ctx's error.
func Run(ctx context.Context, p Problem, progress Progress) (*Result, error) {
	s, err := newSearch(ctx, p, progress)
	if err != nil {
		return nil, err
	}
	first := s.try(s.start)
	for _, x := range s.starts() {
		s.descend(x)
	}
	for round := 0; round < 6; round++ { // a new simplex around the best
		before := s.bestCost
		s.descend(s.best)
		if before-s.bestCost < 1e-4 {
			break
		}
	}
	design, err := s.designer.Place(s.shape.poles(s.best), s.p.Start)
	if err != nil {
		return nil, fmt.Errorf("the best poles found: %w", err)
	}
	out := &Result{Design: design, Tries: s.tries, Better: s.bestCost < first-1e-9}
	out.Limits = p.Scenario.Judge(design, p.Model, p.Plant, nil)
	out.Met = s.excess(design, out.Limits) == 0
	return out, ctx.Err()
}

type search struct {
	p        Problem
	ctx      context.Context
	progress Progress
	designer *estimator.Designer
	shape    shape
	start    []float64
	tries    int
	best     []float64
	bestCost float64
	found    *estimator.Design
}

func newSearch(ctx context.Context, p Problem, progress Progress) (*search, error) {
	if p.Plant == nil || p.Model == nil || p.Scenario == nil || p.Start == nil {
		return nil, ErrStart
	}
	if p.Goal == Quietest && !(p.SettleMax > 0 && !math.IsInf(p.SettleMax, 0)) {
		return nil, ErrSettle
	}
	d, err := estimator.NewDesigner(p.Model, p.Options)
	if err != nil {
		return nil, err
	}
	movable, _ := d.Movable()
	if movable == 0 || len(p.Start.Wanted) < movable {
		return nil, ErrStart
	}
	s := &search{p: p, ctx: ctx, progress: progress, designer: d, bestCost: math.Inf(1)}
	if s.shape, s.start, err = newShape(p.Start.Wanted[:movable], p.Model.Period); err != nil {
		return nil, err
	}
	if len(s.start) == 0 {
		return nil, ErrStart
	}
	return s, nil
}

// starts are the poles at hand, faster and slower ones, and those of the best
// linear estimators for more and for less process noise.
func (s *search) starts() [][]float64 {
	list := [][]float64{s.start}
	for _, k := range []float64{0.5, 2} {
		x := append([]float64(nil), s.start...)
		for _, i := range s.shape.speeds {
			x[i] += math.Log(k)
		}
		list = append(list, x)
	}
	points, err := sweep.Floors(s.ctx, s.p.Model, s.p.Options, sweep.Factors(1000, 7))
	if err != nil {
		return list
	}
	cost, best := math.Inf(1), []float64(nil)
	for _, pt := range points {
		if pt.Design == nil {
			continue
		}
		_, x, err := newShape(poles.Without(pt.Design.Reached, s.designer.Fixed()), s.p.Model.Period)
		if err != nil || len(x) != len(s.start) {
			continue
		}
		if c := s.try(x); c < cost {
			cost, best = c, x
		}
	}
	if best != nil {
		list = append(list, best)
	}
	return list
}

// descend runs one simplex from x.
func (s *search) descend(x []float64) {
	if s.over() || x == nil {
		return
	}
	problem := optimize.Problem{
		Func: s.try,
		Status: func() (optimize.Status, error) {
			if s.over() {
				return optimize.RuntimeLimit, nil
			}
			return optimize.NotTerminated, nil
		},
	}
	settings := &optimize.Settings{
		Converger:       &optimize.FunctionConverge{Absolute: 1e-5, Iterations: 30 * len(x)},
		FuncEvaluations: maxTries - s.tries,
	}
	// Its answer is not looked at: try keeps the best there was.
	_, _ = optimize.Minimize(problem, x, settings, &optimize.NelderMead{SimplexSize: 0.2})
}

func (s *search) over() bool { return s.tries >= maxTries || s.ctx.Err() != nil }

// try makes one design and returns its cost, finite in any case.
func (s *search) try(x []float64) (cost float64) {
	cost = 1e3
	if s.over() {
		return cost
	}
	s.tries++
	defer func() { // optimize runs this on a goroutine of its own
		if recover() != nil {
			cost = 1e3
		}
	}()
	design, err := s.designer.QuickPlace(s.shape.poles(x), s.p.Start)
	if err != nil || !design.Stable {
		return cost
	}
	goal := design.Transient.Settle
	if s.p.Goal == Quietest {
		goal = design.Noise.OverFloorRMS
	}
	if !(goal > 0) || math.IsInf(goal, 0) {
		return cost
	}
	limits := s.p.Scenario.Judge(design, s.p.Model, s.p.Plant, nil)
	cost = math.Log(goal) + 20*s.excess(design, limits)
	if cost < s.bestCost {
		s.best, s.bestCost, s.found = append(s.best[:0:0], x...), cost, design
	}
	if s.progress != nil {
		s.progress(s.tries, maxTries, s.found)
	}
	return cost
}

// excess adds up by how much limits are broken, each as a logarithm of the ratio,
// undefined figures as a large one.
func (s *search) excess(d *estimator.Design, limits []scenarios.LimitResult) float64 {
	sum := 0.0
	add := func(value, limit float64, atLeast, met bool) {
		if met {
			return
		}
		over := math.Log(value / limit)
		if atLeast {
			over = -over
		}
		if !(over > 0) || over > 5 { // also undefined ones, and limits of zero
			over = 5
		}
		sum += over
	}
	for _, l := range limits {
		add(l.Value, l.Limit, l.AtLeast, l.Met)
	}
	if s.p.Goal == Quietest {
		add(d.Transient.Settle, s.p.SettleMax, false, scenarios.Within(d.Transient.Settle, s.p.SettleMax, false))
	}
	return sum
}
