// Package survey finds out what would happen if the held pole went to each cell
// of the plane: the noise over the floor there, and the first limit that would
// break. It works in the background, coarse first, and the newest request wins.
package survey

import (
	"context"
	"errors"
	"fmt"
	"math"
	"runtime"
	"sync"
	"sync/atomic"

	"polewright/estimator"
	"polewright/scenarios"
	"polewright/ui/desk"
	"polewright/ui/newest"
)

// Request is one map to make. It is immutable.
type Request struct {
	Gen    uint64
	Form   estimator.Form
	Method estimator.Method
	// Others are the movable poles that stay where they are, own plane.
	Others []complex128
	// Pair tells that the held one is a pair: a cell is the upper pole's place. A
	// pair on the real axis is two real poles there.
	Pair bool
	// Width and Height are those of the grid, Cells its places in the model's own
	// plane, row by row; NaN where the held pole cannot go.
	Width, Height int
	Cells         []complex128
	// Known is what an earlier map of the same cells found, nil for nothing: what
	// is known is not looked at again.
	Known []Spot
	// From is the design in hand, whose branch the gains follow.
	From *estimator.Design
}

// Spot is one cell's answer.
type Spot struct {
	// Known is false before the cell was looked at; the other fields then are
	// those of the nearest coarse cell, or zero.
	Known bool
	// Seen is true where the other fields mean something, known or coarse.
	Seen bool
	// OverFloor is the noise over the floor (rms); NaN where there is none.
	OverFloor float64
	// Broken is the index into Answer.Limits of the first limit that breaks; -1
	// for none. Without a design, it is -1 and OverFloor is NaN.
	Broken int
}

// Answer is the map as far as it is known. It is immutable.
type Answer struct {
	Gen    uint64
	Spots  []Spot
	Limits []string // names
	Done   bool
	Err    error // the map cannot be made
}

// Surveyor owns the workers.
type Surveyor struct {
	bench  *desk.Bench
	notify func(Answer)
	box    *newest.Box[Request]
	crew   []*worker
}

// worker has designers of its own: one Designer serves one goroutine.
type worker struct {
	designers map[estimator.Options]*estimator.Designer
}

// New starts a surveyor. notify is called from the background, one answer at a
// time; it may wait, but must not be reached from inside Ask or Close.
func New(bench *desk.Bench, notify func(Answer)) *Surveyor {
	s := &Surveyor{bench: quicker(bench), notify: notify}
	for range min(max(runtime.GOMAXPROCS(0), 1), 8) {
		s.crew = append(s.crew, &worker{map[estimator.Options]*estimator.Designer{}})
	}
	ready := make(chan struct{})
	s.box = newest.Start(func(ctx context.Context, r Request) {
		<-ready
		s.serve(ctx, r)
	})
	close(ready)
	return s
}

// quicker leaves the control loop out of the model where no limit asks for it: its
// margins cost more than all the rest.
func quicker(b *desk.Bench) *desk.Bench {
	l := &b.Scenario.Limits
	if l.Sensitivity != nil || l.PhaseMargin != nil || l.DelayMargin != nil || len(l.InputStd) > 0 {
		return b
	}
	c, m := *b, *b.Model
	m.K = nil
	c.Model = &m
	return &c
}

// Ask hands over a request and returns at once. One without cells only stops the
// work in progress.
func (s *Surveyor) Ask(r Request) { s.box.Ask(r) }

// Close cancels the work in progress and waits for its end.
func (s *Surveyor) Close() { s.box.Close() }

// errGrid reports a request whose cells are not Width times Height.
var errGrid = errors.New("cells that are no grid")

func (s *Surveyor) serve(ctx context.Context, r Request) {
	send := func(a Answer) {
		if a.Gen = r.Gen; ctx.Err() == nil {
			s.notify(a)
		}
	}
	if len(r.Cells) == 0 {
		return
	}
	if r.Width < 1 || r.Height < 1 || len(r.Cells) != r.Width*r.Height {
		send(Answer{Err: errGrid})
		return
	}
	var names []string
	if r.From != nil {
		for _, l := range s.bench.Scenario.Judge(r.From, s.bench.Model, s.bench.Plant, nil) {
			names = append(names, l.Name)
		}
	}
	spots := make([]Spot, len(r.Cells))
	copy(spots, r.Known)
	for stride := coarsest; stride >= 1; stride /= 2 {
		if err := s.level(ctx, r, spots, stride); err != nil {
			send(Answer{Err: err})
			return
		}
		if ctx.Err() != nil {
			return
		}
		send(Answer{Spots: append([]Spot(nil), spots...), Limits: names, Done: stride == 1})
	}
}

// coarsest is the first distance between cells that are looked at.
const coarsest = 8

// level looks at every cell of a stride that is not known yet, with all workers,
// and lends what it finds to the unknown cells around.
func (s *Surveyor) level(ctx context.Context, r Request, spots []Spot, stride int) error {
	var list []int
	for y := 0; y < r.Height; y += stride {
		for x := 0; x < r.Width; x += stride {
			if i := y*r.Width + x; !spots[i].Known {
				list = append(list, i)
			}
		}
	}
	var next atomic.Int64
	var crew sync.WaitGroup
	problems := make([]error, len(s.crew))
	for k, w := range s.crew {
		crew.Add(1)
		go func() {
			defer crew.Done()
			defer func() {
				if p := recover(); p != nil {
					problems[k] = fmt.Errorf("the map broke: %v", p)
				}
			}()
			for ctx.Err() == nil {
				n := int(next.Add(1)) - 1
				if n >= len(list) {
					return
				}
				spot, err := w.look(s.bench, r, r.Cells[list[n]])
				if err != nil {
					problems[k] = err
					return
				}
				spots[list[n]] = spot
			}
		}()
	}
	crew.Wait()
	if err := errors.Join(problems...); err != nil {
		return err
	}
	if ctx.Err() == nil {
		for _, i := range list {
			lend(r, spots, i, stride)
		}
	}
	return nil
}

// lend copies a cell to the unknown ones of its square.
func lend(r Request, spots []Spot, i, stride int) {
	from := spots[i]
	from.Known = false
	for y := i / r.Width; y < min(i/r.Width+stride, r.Height); y++ {
		for x := i % r.Width; x < min(i%r.Width+stride, r.Width); x++ {
			if k := y*r.Width + x; !spots[k].Known {
				spots[k] = from
			}
		}
	}
}

// look makes the design with the held pole at a place. A design that cannot be
// made is an answer; an error is one of the model itself.
func (w *worker) look(b *desk.Bench, r Request, at complex128) (Spot, error) {
	none := Spot{Known: true, Seen: true, OverFloor: math.NaN(), Broken: -1}
	if at != at { // NaN: no place
		none.Seen = false
		return none, nil
	}
	o := estimator.Options{Form: r.Form, Method: r.Method}
	if w.designers[o] == nil {
		d, err := estimator.NewDesigner(b.Model, o)
		if err != nil {
			return none, err
		}
		w.designers[o] = d
	}
	list := append(make([]complex128, 0, len(r.Others)+2), r.Others...)
	list = append(list, at)
	if r.Pair {
		list = append(list, complex(real(at), -imag(at)))
	}
	design, err := w.designers[o].QuickPlace(list, r.From)
	if err != nil || !design.Stable {
		return none, nil
	}
	spot := none
	spot.OverFloor = design.Noise.OverFloorRMS
	spot.Broken = firstBroken(b.Scenario.Judge(design, b.Model, b.Plant, nil))
	return spot, nil
}

func firstBroken(list []scenarios.LimitResult) int {
	for i, l := range list {
		if !l.Met {
			return i
		}
	}
	return -1
}
