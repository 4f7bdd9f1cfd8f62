package logs_test

import (
	"math"
	"math/rand/v2"
	"testing"

	"gonum.org/v1/gonum/mat"

	"polewright/estimator"
	"polewright/scenarios/logs"
)

// A designer's floor and designs go straight into a replay, in both forms.
func TestDesigns(t *testing.T) {
	m := tracker()
	u, y, _ := simulate(m, 3000, rand.New(rand.NewPCG(51, 52)))
	log := memoryOf(layoutOf(m), u, y)
	for _, form := range []estimator.Form{estimator.Prediction, estimator.Current} {
		d, err := estimator.NewDesigner(m, estimator.Options{Form: form})
		if err != nil {
			t.Fatal(err)
		}
		floor, err := logs.FloorGain(m, d.Analysis())
		if err != nil || floor == nil {
			t.Fatalf("no floor: %v, %s", err, d.Analysis().FloorReason)
		}
		var diff mat.Dense
		diff.Sub(floor.L, kalman(m, 1))
		if e := mat.Norm(&diff, 2) / mat.Norm(floor.L, 2); e > 1e-9 {
			t.Errorf("the floor gain is off by %g", e)
		}
		if !(floor.Settle > 0) {
			t.Errorf("settle time %g", floor.Settle)
		}
		design, err := d.Judge(estimator.Given{L: kalman(m, 30)})
		if err != nil {
			t.Fatal(err)
		}
		g := logs.GainOf(design)
		if (g.Lf != nil) != (form == estimator.Current) || g.Settle != design.Transient.Settle {
			t.Errorf("gain %+v", g)
		}
		r := replay(t, log, logs.Request{Model: m, Gain: g, Floor: floor})
		for i, in := range r.Innovations {
			// The prediction covariance gives the expected standard deviation.
			p := design.Noise.Covariance
			var cov mat.Dense
			cov.CloneFrom(p)
			if form == estimator.Current {
				var ap mat.Dense
				ap.Mul(m.A, p)
				cov.Mul(&ap, m.A.T())
				var gq, w mat.Dense
				gq.Mul(m.G, m.Q)
				w.Mul(&gq, m.G.T())
				cov.Add(&cov, &w)
			}
			want := math.Sqrt(cov.At(2*i, 2*i) + m.R.At(i, i))
			if d := math.Abs(float64(in.StdExpected)/want - 1); d > 1e-9 {
				t.Errorf("expected std off by %g", d)
			}
			if w := r.Whiteness[i]; w.P < 0.001 {
				t.Errorf("whiteness %+v of an exact model", w)
			}
		}
		if r.NISMean < r.NISLow || r.NISMean > r.NISHigh {
			t.Errorf("NIS %g outside %g..%g", r.NISMean, r.NISLow, r.NISHigh)
		}
	}
}
