package aim

import (
	"errors"
	"fmt"

	"polewright/estimator"
	"polewright/estimator/poles"
)

// Resolver reads typed lists and patterns for one model, with designers of its
// own, so that a prompt never waits for the solver, and refuses what has too few
// or too many poles. Its function serves one goroutine at a time.
func Resolver(m *estimator.Model) func(text, plane string, form estimator.Form) ([]complex128, error) {
	var designers [2]*estimator.Designer // by form
	return func(text, plane string, form estimator.Form) ([]complex128, error) {
		if int(form) >= len(designers) {
			return nil, errors.New("unknown form")
		}
		spec, err := poles.Parse(text)
		if err != nil {
			return nil, err
		}
		if designers[form] == nil {
			d, err := estimator.NewDesigner(m, estimator.Options{Form: form})
			if err != nil {
				return nil, err
			}
			designers[form] = d
		}
		list, err := Own(spec, plane, m, designers[form])
		if err == nil {
			err = counted(len(list), m, designers[form])
		}
		return list, err
	}
}

// counted says whether a design can have so many poles: all that can be chosen,
// or all there are, either without the delay registers.
func counted(k int, m *estimator.Model, d *estimator.Designer) error {
	n, _, _ := m.Dims()
	movable, registers := d.Movable()
	if k == movable || k == n || registers > 0 && (k == movable-registers || k == n-registers) {
		return nil
	}
	err := &estimator.FixedModesError{Fixed: d.Fixed(), Movable: movable, Wanted: k}
	if registers > 0 && len(err.Fixed) == 0 {
		return fmt.Errorf("%w, or %d without the delay registers", err, movable-registers)
	}
	return err
}
