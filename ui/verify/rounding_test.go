package verify_test

import (
	"encoding/json"
	"math/rand/v2"
	"testing"

	"gonum.org/v1/gonum/mat"

	"polewright/estimator"
	"polewright/plants/library"
	"polewright/ui/internal/sample"
	"polewright/ui/measures"
	"polewright/ui/session"
)

// rounded is a model whose entries are off by up to four units of the last place:
// a stand-in for a machine that rounds otherwise.
func rounded(m *estimator.Model, r *rand.Rand) *estimator.Model {
	off := func(a *mat.Dense) *mat.Dense {
		if a == nil || a.IsEmpty() {
			return a
		}
		out := mat.DenseCopyOf(a)
		out.Apply(func(_, _ int, v float64) float64 { return v * (1 + float64(r.IntN(9)-4)*0x1p-52) }, out)
		return out
	}
	out := *m
	out.A, out.B, out.C = off(m.A), off(m.B), off(m.C)
	return &out
}

// Figures that another machine stored are not taken for changed ones.
func TestAnotherMachinesRounding(t *testing.T) {
	r := rand.New(rand.NewPCG(7, 11))
	for _, name := range library.Names() {
		entries := []sample.Entry{{}}
		if name == "lift" {
			entries = append(entries, sample.Entry{Poles: "-15x3"}, sample.Entry{Poles: "-300,-310,-320"}, sample.Entry{Poles: "-0.1,-0.2,-0.3"})
		}
		s := store(t, name, entries...)
		k, err := session.DecodeKept(s.file, s.data)
		if err != nil {
			t.Fatal(err)
		}
		b, other := k.Bench, rounded(k.Bench.Model, r)
		for i, c := range k.Designs {
			d, err := estimator.NewDesigner(other, c.Kind)
			if err != nil {
				t.Fatal(err)
			}
			design, err := d.Judge(estimator.Given{L: c.Gain, Lf: c.GainCurrent, Wanted: c.Wanted})
			if err != nil {
				t.Fatal(err)
			}
			plane := "s"
			if b.Model.Discrete() {
				plane = "z"
			}
			s.candidate(i)["measures"] = tree(t, measures.Build(b.Plant.Name, other, d.Analysis(), design, plane, b.Scenario.Judge(design, other, b.Plant, nil)))
		}
		for i, c := range s.check().Candidates {
			if len(c.Differences) > 0 {
				t.Errorf("%s, candidate %d: %+v", name, i, c.Differences)
			}
		}
	}
}

func tree(t *testing.T, v any) map[string]any {
	t.Helper()
	data, err := json.Marshal(v)
	if err != nil {
		t.Fatal(err)
	}
	var out map[string]any
	if err := json.Unmarshal(data, &out); err != nil {
		t.Fatal(err)
	}
	return out
}
