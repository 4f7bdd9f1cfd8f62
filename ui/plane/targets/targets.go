// Package targets edits the wanted poles of an estimator as a hand moves them:
// conjugate pairs move as one, a pair that reaches the real axis parts, two real
// poles in one cell that are lifted join. It draws nothing and knows no keys.
package targets

import (
	"errors"
	"fmt"
	"math"
	"math/cmplx"
	"slices"

	"polewright/estimator/poles"
)

// Target is what moves as one: a real pole, or a conjugate pair of which At is
// the upper one. At is in the model's own plane.
type Target struct {
	At   complex128
	Pair bool
}

// Set is a list of targets of a model with a sample period, 0 in continuous
// time. It is immutable: every edit returns a new one, and an edit that fails
// returns the old one.
type Set struct {
	List   []Target
	Period float64
}

// Plane is the plane in which poles are shown and typed.
type Plane byte

const (
	// S is the plane of continuous poles, in rad/s.
	S Plane = 's'
	// Z is the plane of sampled poles.
	Z Plane = 'z'
)

// Grid is the picture's grid of cells: the plane shown, the real part at the left
// edge of column 0, and the width and height of a cell.
type Grid struct {
	Plane  Plane
	X0     float64
	DX, DY float64
}

// far bounds the size of a pole: beyond it nothing is a design any more.
const far = 1e12

// Refusals. They are sentences for the person who moves.
var (
	ErrOrigin = errors.New("a pole at z = 0 has no place in the s-plane; show the z-plane to move it")
	ErrAlone  = errors.New("a real pole leaves the axis only with another real pole in its cell")
	ErrLimit  = errors.New("the sampling limit: no pole of a sampled estimator lies beyond it")
	ErrFar    = errors.New("too far out for a number that means anything")
	ErrCoarse = errors.New("one cell is more than the whole way to the sampling limit; zoom in")
)

// From collects a list, closed under conjugation, into targets in its order.
func From(list []complex128, period float64) (Set, error) {
	s := Set{Period: period}
	used := make([]bool, len(list))
	for i, v := range list {
		if used[i] {
			continue
		}
		used[i] = true
		if !finite(v) {
			return Set{}, fmt.Errorf("pole %d is not finite", i+1)
		}
		if imag(v) == 0 {
			s.List = append(s.List, Target{At: v})
			continue
		}
		partner := -1
		for j := i + 1; j < len(list); j++ {
			if !used[j] && cmplx.Abs(list[j]-cmplx.Conj(v)) <= 1e-9*cmplx.Abs(v) {
				partner = j
				break
			}
		}
		if partner < 0 {
			return Set{}, fmt.Errorf("pole %s: its conjugate is missing", poles.Format(v))
		}
		used[partner] = true
		s.List = append(s.List, Target{At: complex(real(v), math.Abs(imag(v))), Pair: true})
	}
	return s, nil
}

func finite(v complex128) bool {
	return !cmplx.IsNaN(v) && !cmplx.IsInf(v)
}

// Poles returns all poles in the model's own plane, each pair as two.
func (s Set) Poles() []complex128 {
	out := make([]complex128, 0, 2*len(s.List))
	for _, t := range s.List {
		out = append(out, t.At)
		if t.Pair {
			out = append(out, cmplx.Conj(t.At))
		}
	}
	return out
}

// Count is the number of poles.
func (s Set) Count() int {
	n := len(s.List)
	for _, t := range s.List {
		if t.Pair {
			n++
		}
	}
	return n
}

// Shown is the place of a pole of the model's own plane in the plane shown; false
// where it has none, as z = 0 in the s-plane.
func Shown(own complex128, plane Plane, period float64) (complex128, bool) {
	if period > 0 && plane == S {
		return poles.ToS(own, period)
	}
	return own, true
}

// own is the way back. It fails where the place has no use as a pole.
func (s Set) own(shown complex128, plane Plane) (complex128, error) {
	if !finite(shown) || cmplx.Abs(shown) > far {
		return 0, ErrFar
	}
	if s.Period == 0 || plane == Z {
		return shown, nil
	}
	limit := math.Pi / s.Period
	if math.Abs(imag(shown)) > limit*(1+1e-12) {
		return 0, ErrLimit
	}
	z := poles.ToZ(shown, s.Period)
	switch size := math.Exp(real(shown) * s.Period); {
	case size < 1e-300 || size > far:
		return 0, ErrFar
	case math.Abs(imag(shown)) >= limit*(1-1e-12):
		z = complex(-size, 0)
	case imag(z) == 0 && imag(shown) != 0: // too close to the axis to differ
		z = complex(real(z), 0)
	}
	return z, nil
}

// Event tells what a move did besides moving.
type Event uint8

const (
	// Moved is a plain move.
	Moved Event = iota
	// Parted says that a pair became two real poles.
	Parted
	// PartedAtLimit says that a pair reached the sampling limit: two poles on it.
	PartedAtLimit
	// Joined says that two real poles became a pair.
	Joined
)

// Move moves target i by dx, dy cells, up and to the right, and returns the new
// set, the new index of what is held, and what happened.
func (s Set) Move(i, dx, dy int, g Grid) (Set, int, Event, error) {
	if i < 0 || i >= len(s.List) {
		return s, i, Moved, errors.New("no pole is selected")
	}
	t := s.List[i]
	p, ok := Shown(t.At, g.Plane, s.Period)
	if !ok {
		return s, i, Moved, ErrOrigin
	}
	re := real(p) + float64(dx)*g.DX
	if t.Pair {
		return s.movePair(i, re, imag(p)+float64(dy)*g.DY, g)
	}
	if dy != 0 {
		return s.lift(i, dy, p, g)
	}
	at, err := s.own(complex(re, imag(p)), g.Plane)
	if err != nil {
		return s, i, Moved, err
	}
	return s.with(i, Target{At: complex(real(at), 0)}), i, Moved, nil
}

func (s Set) movePair(i int, re, im float64, g Grid) (Set, int, Event, error) {
	event := Moved
	switch limit := s.limit(g.Plane); {
	case im <= 1e-9*g.DY: // a step across the axis stops on it
		im, event = 0, Parted
	case im >= limit*(1-1e-12):
		im, event = limit, PartedAtLimit
	}
	at, err := s.own(complex(re, im), g.Plane)
	if err != nil {
		return s, i, Moved, err
	}
	if event == Moved && imag(at) > 0 {
		return s.with(i, Target{At: at, Pair: true}), i, Moved, nil
	}
	if event == Moved {
		event = Parted
	}
	real := Target{At: complex(real(at), 0)}
	out := s.with(i, real)
	out.List = slices.Insert(out.List, i+1, real)
	return out, i, event, nil
}

// limit is the largest imaginary part of the plane shown.
func (s Set) limit(plane Plane) float64 {
	if s.Period > 0 && plane == S {
		return math.Pi / s.Period
	}
	return math.Inf(1)
}

// lift takes a real pole off its axis, with a partner from the same cell. In the
// s-plane of a sampled model the poles with z < 0 lie on the sampling limit, which
// is left downwards.
func (s Set) lift(i, dy int, p complex128, g Grid) (Set, int, Event, error) {
	limit := s.limit(g.Plane)
	onLimit := imag(p) != 0
	if onLimit && dy > 0 {
		return s, i, Moved, ErrLimit
	}
	partner, mean := -1, 0.0
	for j, t := range s.List {
		if j == i || t.Pair {
			continue
		}
		q, ok := Shown(t.At, g.Plane, s.Period)
		if ok && (imag(q) != 0) == onLimit && g.column(real(q)) == g.column(real(p)) {
			partner, mean = j, real(p)/2+real(q)/2
			break
		}
	}
	if partner < 0 {
		return s, i, Moved, ErrAlone
	}
	im := math.Abs(float64(dy)) * g.DY
	if onLimit {
		im = limit - im
	}
	if im <= 0 || im >= limit {
		return s, i, Moved, ErrCoarse
	}
	at, err := s.own(complex(mean, im), g.Plane)
	if err != nil {
		return s, i, Moved, err
	}
	out := s.with(i, Target{At: at, Pair: true})
	out.List = slices.Delete(out.List, partner, partner+1)
	if partner < i {
		i--
	}
	return out, i, Joined, nil
}

// column is the cell of a real part; on the edge of two it is the right one,
// whatever rounding does.
func (g Grid) column(x float64) float64 { return math.Floor((x-g.X0)/g.DX + 1e-7) }

// with returns a copy with target i replaced.
func (s Set) with(i int, t Target) Set {
	s.List = slices.Clone(s.List)
	s.List[i] = t
	return s
}
