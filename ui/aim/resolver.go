package aim

import (
	"errors"

	"polewright/estimator"
	"polewright/estimator/poles"
)

// Resolver reads typed lists and patterns for one model, with designers of its
// own, so that a prompt never waits for the solver. Its function serves one
// goroutine at a time.
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
		return Own(spec, plane, m, designers[form])
	}
}
