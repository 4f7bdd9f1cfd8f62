// Package survey finds out what would happen if the held pole went to each cell
// of the plane: the noise over the floor there, and the first limit that would
// break. It works in the background, coarse first, and the newest request wins.
package survey

import (
	"context"
	"errors"
	"fmt"
	"math"
	"math/cmplx"
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
	bare   *desk.Bench // without the control loop; nil where bench has none either
	notify func(Answer)
	box    *newest.Box[Request]
	crew   []*worker
}

// worker has designers of its own: one Designer serves one goroutine.
type worker struct {
	designers map[post]*estimator.Designer
}

// post is what a designer is for.
type post struct {
	bench   *desk.Bench
	options estimator.Options
}

// New starts a surveyor. notify is called from the background, one answer at a
// time; it may wait, but must not be reached from inside Ask or Close.
func New(bench *desk.Bench, notify func(Answer)) *Surveyor {
	s := &Surveyor{bench: quicker(bench), notify: notify}
	if s.bench.Model.K != nil {
		s.bare = bare(bench)
	}
	for range min(max(runtime.GOMAXPROCS(0), 1), 8) {
		s.crew = append(s.crew, &worker{map[post]*estimator.Designer{}})
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
	return bare(b)
}

func bare(b *desk.Bench) *desk.Bench {
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
	w := &work{r: r, spots: make([]Spot, len(r.Cells)), sure: make([]bool, len(r.Cells))}
	copy(w.spots, r.Known)
	passes := []*desk.Bench{s.bench}
	if s.bare != nil { // the noise first: margins take several times as long
		passes = []*desk.Bench{s.bare, s.bench}
	}
	for _, w.bench = range passes {
		w.partial = w.bench != s.bench
		for stride := coarsest; stride >= 1; stride /= 2 {
			if err := s.level(ctx, w, stride); err != nil {
				send(Answer{Err: err})
				return
			}
			if ctx.Err() != nil {
				return
			}
			send(Answer{Spots: append([]Spot(nil), w.spots...), Limits: names, Done: stride == 1 && !w.partial})
		}
	}
}

// work is a map in the making.
type work struct {
	r     Request
	bench *desk.Bench
	// partial tells that the limits on margins are left for later.
	partial bool
	spots   []Spot
	sure    []bool // the noise of a spot is its own, though it is not known yet
}

// coarsest is the first distance between cells that are looked at.
const coarsest = 8

// level looks at every cell of a stride that is not known yet, with all workers,
// and lends what it finds to the unknown cells around.
func (s *Surveyor) level(ctx context.Context, m *work, stride int) error {
	r, spots := m.r, m.spots
	var list []int
	for y := 0; y < r.Height; y += stride {
		for x := 0; x < r.Width; x += stride {
			if i := y*r.Width + x; !spots[i].Known && !(m.partial && m.sure[i]) {
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
				spot, err := w.look(m, r.Cells[list[n]])
				if err != nil {
					problems[k] = err
					return
				}
				spots[list[n]], m.sure[list[n]] = spot, true
			}
		}()
	}
	crew.Wait()
	if err := errors.Join(problems...); err != nil {
		return err
	}
	if ctx.Err() == nil {
		for _, i := range list {
			m.lend(i, stride)
		}
	}
	return nil
}

// lend copies a cell to the unknown ones of its square; to those whose noise is
// their own, only that a limit breaks.
func (m *work) lend(i, stride int) {
	from, w := m.spots[i], m.r.Width
	from.Known = false
	for y := i / w; y < min(i/w+stride, m.r.Height); y++ {
		for x := i % w; x < min(i%w+stride, w); x++ {
			switch k := y*w + x; {
			case m.spots[k].Known:
			case !m.sure[k]:
				m.spots[k] = from
			case m.spots[k].Broken < 0 && !math.IsNaN(m.spots[k].OverFloor):
				m.spots[k].Broken = from.Broken
			}
		}
	}
}

// look makes the design with the held pole at a place. A design that cannot be
// made is an answer; an error is one of the model itself.
func (w *worker) look(m *work, at complex128) (Spot, error) {
	b, r := m.bench, m.r
	none := Spot{Known: !m.partial, Seen: true, OverFloor: math.NaN(), Broken: -1}
	if cmplx.IsNaN(at) { // no place
		none.Seen = false
		return none, nil
	}
	o := post{b, estimator.Options{Form: r.Form, Method: r.Method}}
	if w.designers[o] == nil {
		d, err := estimator.NewDesigner(b.Model, o.options)
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
	spot.Broken = firstBroken(b.Scenario.Judge(design, b.Model, b.Plant, nil), m.partial)
	return spot, nil
}

// firstBroken is the index of the first limit that breaks, -1 for none. One whose
// figure is not there breaks too, unless partial says that it is to come.
func firstBroken(list []scenarios.LimitResult, partial bool) int {
	for i, l := range list {
		if !l.Met && !(partial && math.IsNaN(l.Value)) {
			return i
		}
	}
	return -1
}
