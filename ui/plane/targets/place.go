package targets

import (
	"errors"
	"fmt"
	"math"
	"math/cmplx"
	"slices"

	"polewright/estimator/poles"
)

// Place puts target i at a typed location: one real pole, or two values for a
// pair or for two real poles. Two values in place of one real pole take the
// nearest other real pole along. It returns the new index of what is held.
func (s Set) Place(i int, at []complex128, plane Plane) (Set, int, error) {
	if i < 0 || i >= len(s.List) {
		return s, i, errors.New("no pole is selected")
	}
	own := make([]complex128, len(at))
	for k, v := range at {
		z, err := s.own(v, plane)
		if err != nil {
			return s, i, err
		}
		own[k] = z
	}
	held := s.List[i]
	switch {
	case len(own) == 1 && imag(own[0]) != 0:
		return s, i, errors.New("a complex pole comes with its conjugate: type a pair like -4±3i")
	case len(own) == 1 && held.Pair:
		return s, i, errors.New("a pair is held: type a pair like -4±3i, or move it to the axis to part it")
	case len(own) == 1:
		return s.with(i, Target{At: own[0]}), i, nil
	case len(own) != 2:
		return s, i, fmt.Errorf("%d places for one target; expected a pole or a pair", len(own))
	}
	out := s
	if !held.Pair {
		other := s.nearestReal(i)
		if other < 0 {
			return s, i, errors.New("one real pole cannot become two: no other real pole is left to join it")
		}
		out.List = slices.Delete(slices.Clone(s.List), other, other+1)
		if other < i {
			i--
		}
	}
	if imag(own[0]) != 0 {
		up := own[0]
		return out.with(i, Target{At: complex(real(up), math.Abs(imag(up))), Pair: true}), i, nil
	}
	out = out.with(i, Target{At: own[0]})
	out.List = slices.Insert(out.List, i+1, Target{At: own[1]})
	return out, i, nil
}

func (s Set) nearestReal(i int) int {
	best, least := -1, math.Inf(1)
	for j, t := range s.List {
		if j == i || t.Pair {
			continue
		}
		if d := cmplx.Abs(t.At - s.List[i].At); d < least {
			best, least = j, d
		}
	}
	return best
}

// Scale makes all targets k times as fast: every s becomes k·s. Poles at z = 0
// stay, and poles on the sampling limit stay on it. It fails where a pair would
// pass the sampling limit.
func (s Set) Scale(k float64) (Set, error) {
	if !(k > 0) || math.IsInf(k, 0) {
		return s, fmt.Errorf("a factor of %g; expected one above 0", k)
	}
	out := Set{List: slices.Clone(s.List), Period: s.Period}
	for i, t := range out.List {
		if s.Period == 0 {
			at, err := s.own(t.At*complex(k, 0), S)
			if err != nil {
				return s, err
			}
			out.List[i].At = at
			continue
		}
		p, ok := poles.ToS(t.At, s.Period)
		if !ok {
			continue
		}
		next := p * complex(k, 0)
		if !t.Pair {
			next = complex(real(p)*k, imag(p))
		} else if imag(next) >= s.limit(S) {
			return s, fmt.Errorf("the pair at %s would pass the sampling limit", poles.Format(p))
		}
		at, err := s.own(next, S)
		if err != nil {
			return s, err
		}
		if t.Pair && imag(at) <= 0 {
			return s, ErrFar
		}
		if !t.Pair {
			at = complex(real(at), 0)
		}
		out.List[i].At = at
	}
	return out, nil
}

// Own is the place of a pole in the model's own plane; false where nothing of use
// lies there.
func (s Set) Own(shown complex128, plane Plane) (complex128, bool) {
	own, err := s.own(shown, plane)
	return own, err == nil
}
