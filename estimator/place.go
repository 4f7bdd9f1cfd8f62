package estimator

import (
	"context"
	"errors"
	"fmt"
	"math/cmplx"

	"gonum.org/v1/gonum/mat"

	"polewright/estimator/internal/placement"
	"polewright/estimator/poles"
)

// Place designs the gain whose eigenvalues are the wanted poles, in the model's
// own plane (s in continuous, z in discrete time), a complex pole with its
// partner. The list holds the movable poles, or all n with the fixed ones among
// them; poles of delay registers may be left out and default to zero. A previous
// design of the same Designer, or nil, tells which branch to follow.
//
// It fails with a *FixedModesError where the list does not fit what the sensors
// give. An unstable list is an answer too: its design says so.
func (d *Designer) Place(wanted []complex128, prev *Design) (*Design, error) {
	quick, err := d.QuickPlace(wanted, prev)
	if err != nil {
		return nil, err
	}
	out, err := d.Complete(context.Background(), quick)
	if err != nil {
		return nil, err
	}
	d.compareMethods(out)
	return out, nil
}

// QuickPlace is Place for a pole that is being dragged: it leaves to Complete what
// Design.Partial lists.
func (d *Designer) QuickPlace(wanted []complex128, prev *Design) (_ *Design, err error) {
	defer guard(&err)
	movable, err := d.movable(wanted)
	if err != nil {
		return nil, err
	}
	ls, branch, frame, err := d.gainFor(movable, prev)
	if err != nil {
		return nil, err
	}
	var lf *mat.Dense
	if d.opt.Form == Current {
		lf = d.unscaleGain(ls)
		ls.Mul(d.a, mat.DenseCopyOf(ls))
	}
	out, err := d.judge(d.unscaleGain(ls), lf, append(movable, d.pair.fixed...))
	if err != nil {
		return nil, err
	}
	out.branch, out.frame = branch, frame
	return out, nil
}

// gainFor returns the scaled gain, the current form's in current form, for the
// movable poles.
func (d *Designer) gainFor(movable []complex128, prev *Design) (ls *mat.Dense, branch *placement.Warm, turned *frame, err error) {
	ls = mat.NewDense(d.n, d.p, nil)
	if d.pair.rank > 0 {
		if branch, turned, err = d.assign(ls, movable, prev); err != nil {
			return nil, nil, nil, err
		}
	}
	if d.pair.rank < d.n {
		d.addUnseenRows(ls)
	}
	return ls, branch, turned, nil
}

// Refusal is a *FixedModesError where a mode that the sensors do not see is not
// strictly stable, so that no poles at all can be placed; else nil.
func (d *Designer) Refusal() error {
	for _, v := range d.pair.fixed {
		if !strictlyStable(v, d.model.Discrete()) {
			return &FixedModesError{Fixed: d.Fixed(), Movable: d.pair.rank, Unstable: true}
		}
	}
	return nil
}

// movable reduces a list to the poles that placement can choose.
func (d *Designer) movable(wanted []complex128) ([]complex128, error) {
	for _, v := range wanted {
		if cmplx.IsNaN(v) || cmplx.IsInf(v) {
			return nil, fmt.Errorf("pole: %w", ErrNotFinite)
		}
	}
	if err := d.Refusal(); err != nil {
		return nil, err
	}
	refuse := &FixedModesError{Fixed: d.Fixed(), Movable: d.pair.rank, Wanted: len(wanted)}
	list := append([]complex128(nil), wanted...)
	rank, registers := d.Movable()
	if k := len(list); registers > 0 && (k == rank-registers || k == d.n-registers) {
		list = append(list, make([]complex128, registers)...)
	}
	switch len(list) {
	case rank:
		return list, nil
	case d.n:
		return withoutFixed(list, d.pair.fixed, refuse)
	}
	return nil, refuse
}

func withoutFixed(list, fixed []complex128, refuse error) ([]complex128, error) {
	for _, f := range fixed {
		best := -1
		for i, v := range list {
			if best < 0 || cmplx.Abs(v-f) < cmplx.Abs(list[best]-f) {
				best = i
			}
		}
		if best < 0 || cmplx.Abs(list[best]-f) > 1e-6*max(cmplx.Abs(f), 1e-3) {
			return nil, refuse
		}
		list = append(list[:best], list[best+1:]...)
	}
	return list, nil
}

// assign writes the scaled gain for the movable poles to ls and returns the choice
// that it made among several.
func (d *Designer) assign(ls *mat.Dense, movable []complex128, prev *Design) (branch *placement.Warm, turned *frame, err error) {
	pr := &d.pair
	p1, _ := pr.c.Dims()
	part := mat.NewDense(pr.rank, p1, nil)
	if p1 == 1 {
		err = d.placement.Single(raw(part), raw(pr.a), raw(pr.c), movable)
	} else {
		branch = new(placement.Warm)
		if prev != nil && prev.branch != nil && prev.Method == d.opt.Method && prev.Form == d.opt.Form {
			branch = prev.branch.Clone()
		}
		err = d.choose(part, movable, branch)
	}
	// What is not reached in double precision comes as near as it can, and the
	// design's warnings say how near.
	if err != nil && !(errors.Is(err, ErrNotReached) && finite(part)) {
		return nil, nil, fmt.Errorf("placement: %w", err)
	}
	if p1 > 1 && p1 == pr.rank && d.opt.Method == Robust {
		turned = d.quietNormal(part, movable, prev)
	}
	full := part
	if pr.combine != nil {
		full = new(mat.Dense)
		full.Mul(part, pr.combine)
	}
	ls.Mul(pr.q.Slice(0, d.n, 0, pr.rank), full)
	if pr.inject != nil {
		ls.Add(ls, pr.inject)
	}
	return branch, turned, nil
}

// choose takes one of the gains that several sensors leave.
func (d *Designer) choose(part *mat.Dense, movable []complex128, branch *placement.Warm) error {
	pr := &d.pair
	if d.opt.Method == LeastNoise {
		_, err := d.placement.LeastNoise(raw(part), raw(pr.a), raw(pr.c), raw(pr.w), raw(pr.r), pr.weights, movable, d.model.Discrete(), branch)
		if !errors.Is(err, placement.ErrUnstable) {
			return err
		}
		*branch = placement.Warm{} // no steady state to make quiet
	}
	_, err := d.placement.Robust(raw(part), raw(pr.a), raw(pr.c), movable, branch)
	return err
}

func formatPole(v complex128) string { return poles.Format(v) }
