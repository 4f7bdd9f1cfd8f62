package scenarios

import (
	"context"
	"testing"

	"gonum.org/v1/gonum/mat"

	"polewright/plants"
	"polewright/plants/library"
)

// Every built-in scenario, and the default one of every built-in plant, runs to
// its end with a stable gain.
func TestEveryBuiltInScenarioRuns(t *testing.T) {
	for _, name := range library.Names() {
		text, file, _ := library.Plant(name)
		p, err := plants.Parse(file, text)
		if err != nil {
			t.Error(err)
			continue
		}
		list := []*Scenario{Default(p)}
		for _, f := range library.Scenarios(name) {
			s, err := Parse(f.Name, f.Text, p)
			if err != nil {
				t.Error(err)
				continue
			}
			list = append(list, s)
		}
		m := modelOf(t, p)
		n, _, sensors := m.Dims()
		l := mat.NewDense(n, sensors, nil)
		if m.Period > 0 {
			l = stableGain(t, m)
		}
		for _, s := range list {
			r, err := NewRunner(p, m, s, nil)
			if err != nil {
				t.Errorf("%s, %s: %v", name, s.Name, err)
				continue
			}
			run, err := r.Run(context.Background(), Gain{L: l})
			if err != nil {
				t.Errorf("%s, %s: %v", name, s.Name, err)
				continue
			}
			if m.Period > 0 && (run.Diverged || len(run.T) != r.Samples()) {
				t.Errorf("%s, %s: %d of %d samples", name, s.Name, len(run.T), r.Samples())
			}
		}
	}
}
