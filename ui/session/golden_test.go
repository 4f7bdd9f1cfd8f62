package session_test

import (
	"encoding/json"
	"flag"
	"math"
	"math/cmplx"
	"os"
	"testing"

	"polewright/estimator"
	"polewright/ui/session"
)

var writeGolden = flag.Bool("write-golden", false, "write the golden session of a new format anew")

const golden = "testdata/format1.session.json"

// Sessions of format 1 open for ever: this file was saved by version 0.1.0 and is
// not to be changed.
func TestFormat1OpensForEver(t *testing.T) {
	if *writeGolden {
		data, err := session.Encode("polewright 0.1.0", work(t, "balancer"))
		if err != nil {
			t.Fatal(err)
		}
		if err := os.WriteFile(golden, data, 0o644); err != nil {
			t.Fatal(err)
		}
	}
	data, err := os.ReadFile(golden)
	if err != nil {
		t.Fatal(err)
	}
	type design struct {
		Name  string
		Poles [][2]float64
		Gain  [][]float64
	}
	var plain struct {
		Format     int
		Period     float64 `json:"period_s"`
		Current    design
		Candidates []design
	}
	if err := json.Unmarshal(data, &plain); err != nil {
		t.Fatal(err)
	}
	w, err := session.Load(golden)
	if err != nil {
		t.Fatal(err)
	}
	if plain.Format != 1 || len(plain.Candidates) != 2 || len(w.Candidates) != 2 || w.Current != "B" || w.Form != estimator.Current {
		t.Fatalf("format %d, %d candidates, %d opened, selected %q", plain.Format, len(plain.Candidates), len(w.Candidates), w.Current)
	}
	if w.Bench.Model.Period != plain.Period || plain.Period == 0 {
		t.Errorf("period %g, expected %g", w.Bench.Model.Period, plain.Period)
	}
	if w.View.Plane != "s" || w.View.Zoom != 40 || w.View.Selected != 1 || w.View.Trace != 2 {
		t.Errorf("view %+v", w.View)
	}
	for i, c := range w.Candidates {
		p := plain.Candidates[i]
		if c.Letter != p.Name || len(c.Poles) != len(p.Poles) || len(c.Poles) == 0 {
			t.Fatalf("candidate %d: %q with %d poles, expected %q with %d", i, c.Letter, len(c.Poles), p.Name, len(p.Poles))
		}
		for k, pole := range c.Poles {
			if pole != complex(p.Poles[k][0], p.Poles[k][1]) {
				t.Errorf("%s: pole %v, expected %v", c.Letter, pole, p.Poles[k])
			}
		}
		rows, cols := c.Design.Gain.Dims()
		for r := range rows {
			for k := range cols {
				if c.Design.Gain.At(r, k) != p.Gain[r][k] {
					t.Errorf("%s: gain %d,%d: %g, expected %g", c.Letter, r, k, c.Design.Gain.At(r, k), p.Gain[r][k])
				}
			}
		}
		// what is judged of the stored gain still reaches the stored poles
		for _, want := range c.Poles {
			near := math.Inf(1)
			for _, got := range c.Design.Reached {
				near = min(near, cmplx.Abs(got-want))
			}
			if near > 1e-6 {
				t.Errorf("%s: %v is missed by %g", c.Letter, want, near)
			}
		}
	}
}
