// Package aim turns what a person writes for poles, a list or a pattern, into
// poles of an estimator's own plane. Commands, prompt and first start share it.
package aim

import (
	"errors"
	"fmt"
	"math"
	"math/cmplx"

	"gonum.org/v1/gonum/mat"

	"polewright/estimator"
	"polewright/estimator/poles"
)

// Own returns the poles that spec asks for: movable ones, or all n where the list
// names all. A list is in the given plane, "s" or "z"; patterns are made in the
// s-plane. The poles come back in the model's own plane.
func Own(spec *poles.Spec, plane string, m *estimator.Model, d *estimator.Designer) ([]complex128, error) {
	movable, registers := d.Movable()
	count := movable - registers
	switch spec.Kind {
	case poles.List:
		return listed(spec, plane, m)
	case poles.Butterworth:
		return toOwn(poles.ButterworthAt(count, spec.Value), m)
	case poles.Bessel:
		return toOwn(poles.BesselAt(count, spec.Value), m)
	case poles.Equal:
		return toOwn(poles.EqualAt(count, spec.Value), m)
	case poles.Floor:
		return floor(m, d)
	case poles.Plant:
		return faster("the plant's own", eigenvalues(m.A), spec.Value, m, d)
	case poles.Controller:
		base, err := controller(m)
		if err != nil {
			return nil, err
		}
		return faster("the controller's", base, spec.Value, m, d)
	}
	return nil, errors.New("unknown pattern")
}

// listed maps a list given in plane; a place given by frequency and damping is in
// the s-plane in any case.
func listed(spec *poles.Spec, plane string, m *estimator.Model) ([]complex128, error) {
	out := append([]complex128(nil), spec.Poles...)
	for i := range out {
		if plane != "s" && (spec.InS == nil || !spec.InS[i]) {
			continue
		}
		own, err := toOwn(out[i:i+1], m)
		if err != nil {
			return nil, err
		}
		out[i] = own[0]
	}
	return out, nil
}

// toOwn maps s-plane poles to the model's own plane.
func toOwn(s []complex128, m *estimator.Model) ([]complex128, error) {
	out := append([]complex128(nil), s...)
	if !m.Discrete() {
		return out, nil
	}
	if err := poles.CheckSampling(s, m.Period); err != nil {
		return nil, err
	}
	for i, v := range out {
		out[i] = poles.ToZ(v, m.Period)
	}
	return out, nil
}

func floor(m *estimator.Model, d *estimator.Designer) ([]complex128, error) {
	f := d.Analysis().Floor
	if f == nil {
		if err := d.Refusal(); err != nil {
			return nil, err
		}
		return nil, errors.New(d.Analysis().FloorReason)
	}
	list := poles.Without(f.Poles, d.Fixed())
	_, registers := d.Movable()
	for i, v := range list { // zero but for what an eigenvalue iteration scatters
		if m.Discrete() && cmplx.Abs(v) < 1e-8 {
			list[i] = 0
		}
	}
	for range registers - countZero(list) {
		small := -1
		for i, v := range list {
			if v != 0 && cmplx.Abs(v) < 1e-3 && (small < 0 || cmplx.Abs(v) < cmplx.Abs(list[small])) {
				small = i
			}
		}
		if small >= 0 {
			list[small] = 0
		}
	}
	return list, nil
}

// faster makes base k times as fast in the s-plane, without the fixed modes and
// the delay registers.
func faster(whose string, base []complex128, k float64, m *estimator.Model, d *estimator.Designer) ([]complex128, error) {
	movable, registers := d.Movable()
	list := poles.Without(base, d.Fixed())
	if m.Discrete() {
		for i, v := range list {
			if cmplx.Abs(v) < 1e-9 {
				list[i] = 0
			}
		}
		list = poles.Without(list, make([]complex128, min(registers, countZero(list))))
	}
	if want := movable - registers; len(list) != want {
		return nil, fmt.Errorf("%s poles are %d, but %d can be chosen here: list the poles instead", whose, len(list), want)
	}
	s := make([]complex128, len(list))
	for i, v := range list {
		s[i] = v
		if m.Discrete() {
			var ok bool
			if s[i], ok = poles.ToS(v, m.Period); !ok {
				return nil, fmt.Errorf("%s pole at z = 0 has no place in the s-plane to make faster", whose)
			}
		}
	}
	// Rounding moves a mode that neither grows nor dies off the limit.
	limit := 0.0
	for _, v := range s {
		limit = max(limit, 1e-13*cmplx.Abs(v))
	}
	if m.Discrete() {
		limit = 1e-12 / m.Period
	}
	for i, v := range s {
		if math.Abs(real(v)) <= limit {
			s[i] = complex(0, imag(v))
		}
	}
	out, err := poles.Faster(s, k)
	if err != nil {
		return nil, err
	}
	return toOwn(out, m)
}

func countZero(list []complex128) int {
	k := 0
	for _, v := range list {
		if v == 0 {
			k++
		}
	}
	return k
}

// controller returns the eigenvalues of A − B K without the unknowns' own.
func controller(m *estimator.Model) ([]complex128, error) {
	if m.K == nil || m.B == nil {
		return nil, errors.New("the plant file has no [feedback], so there are no controller poles")
	}
	var bk mat.Dense
	bk.Mul(m.B, m.K)
	bk.Sub(m.A, &bk)
	var own []int
	n, _, _ := m.Dims()
	for i := range n {
		if m.Roles == nil || m.Roles[i] != estimator.UnknownState {
			own = append(own, i)
		}
	}
	part := mat.NewDense(len(own), len(own), nil)
	for i, r := range own {
		for j, c := range own {
			part.Set(i, j, bk.At(r, c))
		}
	}
	return eigenvalues(part), nil
}

func eigenvalues(a *mat.Dense) []complex128 {
	var e mat.Eigen
	if !e.Factorize(a, mat.EigenNone) {
		return nil
	}
	return e.Values(nil)
}

// Start returns the poles that a person who has chosen none begins with: the
// floor's where it exists, else equal poles twice as fast as the fastest plant
// mode that sampling lets through.
func Start(m *estimator.Model, d *estimator.Designer) ([]complex128, error) {
	if list, err := floor(m, d); err == nil {
		return list, nil
	}
	fastest := 0.0
	for _, v := range eigenvalues(m.A) {
		if m.Discrete() {
			s, ok := poles.ToS(v, m.Period)
			if !ok {
				continue
			}
			v = s
		}
		fastest = max(fastest, cmplx.Abs(v))
	}
	w := 2 * fastest
	if w == 0 {
		w = 1
	}
	if m.Discrete() {
		w = min(w, math.Pi/m.Period/4)
	}
	movable, registers := d.Movable()
	return toOwn(poles.EqualAt(movable-registers, w), m)
}
