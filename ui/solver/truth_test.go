package solver_test

import (
	"context"
	"slices"
	"testing"

	"polewright/estimator"
	"polewright/scenarios"
	"polewright/ui/desk"
	"polewright/ui/desk/desktest"
	"polewright/ui/solver"
)

// A request may put another real plant under the scenario; the next one without
// is on the scenario's own again.
func TestRunsOnAnotherRealPlant(t *testing.T) {
	b := desktest.Bench(t, "pan-drive")
	_, poles, design := desktest.Start(t, b, estimator.Options{})
	heavy := map[string]float64{"dish": 1.3, "shaft": 0.9}
	direct := func(factors map[string]float64) []float64 {
		s := *b.Scenario
		if factors != nil {
			s.Factors, s.TruthPlant = factors, ""
		}
		r, err := scenarios.NewRunner(b.Plant, b.Model, &s, nil)
		if err != nil {
			t.Fatal(err)
		}
		run, err := r.Run(context.Background(), scenarios.Gain{L: design.Gain, Form: design.Form})
		if err != nil {
			t.Fatal(err)
		}
		return run.True[2]
	}
	own, other, light := direct(nil), direct(heavy), direct(map[string]float64{"dish": 0.7})
	if slices.Equal(own, other) || slices.Equal(other, light) {
		t.Fatal("the real plants do not differ in their runs")
	}
	work := solver.NewDirect(b)
	for i, c := range []struct {
		truth map[string]float64
		want  []float64
	}{{nil, own}, {heavy, other}, {map[string]float64{"dish": 0.7}, light}, {nil, own}, {heavy, other}, {map[string]float64{}, own}} {
		a := work.Answer(context.Background(), desk.Request{Poles: poles, Truth: c.truth})
		if a.Err != nil || a.Run == nil {
			t.Fatal(a.Err)
		}
		if !slices.Equal(a.Run.True[2], c.want) {
			t.Errorf("request %d ran on another plant than %v", i, c.truth)
		}
	}
	if a := work.Answer(context.Background(), desk.Request{Poles: poles, Truth: map[string]float64{"no such": 2}}); a.Err == nil || a.Design == nil {
		t.Errorf("an unknown parameter gives %v and design %v", a.Err, a.Design)
	}
}
