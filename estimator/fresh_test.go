package estimator_test

import (
	"context"
	"testing"

	"polewright/estimator"
)

// A gain that was chosen badly for its poles is found out from cold, and one found
// from cold is not.
func TestFreshOffersTheBetterGain(t *testing.T) {
	for _, c := range cases(t, "robust.json") {
		if c.Name != "bn02_distillation" {
			continue
		}
		m := c.model()
		robust := newDesigner(t, m, estimator.Options{})
		best, err := robust.Place(values(c.Poles), nil)
		if err != nil {
			t.Fatal(err)
		}
		if got, err := robust.Fresh(context.Background(), best); err != nil || got != nil {
			t.Errorf("something better than the best: %v, %v", got, err)
		}
		quiet, err := newDesigner(t, m, estimator.Options{Method: estimator.LeastNoise}).Place(values(c.Poles), nil)
		if err != nil {
			t.Fatal(err)
		}
		poor, err := robust.Judge(estimator.Given{L: quiet.Gain, Wanted: values(c.Poles)})
		if err != nil {
			t.Fatal(err)
		}
		if !(poor.EigenvectorCondition > 1.1*best.EigenvectorCondition) {
			t.Fatalf("condition %g beside %g shows nothing", poor.EigenvectorCondition, best.EigenvectorCondition)
		}
		got, err := robust.Fresh(context.Background(), poor)
		if err != nil || got == nil {
			t.Fatalf("nothing better than condition %g: %v", poor.EigenvectorCondition, err)
		}
		if got.EigenvectorCondition > 1.001*best.EigenvectorCondition || got.Partial {
			t.Errorf("condition %g, expected %g", got.EigenvectorCondition, best.EigenvectorCondition)
		}
		return
	}
	t.Fatal("no such case")
}
