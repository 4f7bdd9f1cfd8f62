package cli_test

import (
	"encoding/json"
	"math"
	"os"
	"path/filepath"
	"strings"
	"testing"
)

// audited is one design whose figures were computed with SciPy 1.10 from the
// plant file and the gain alone, by testdata/audit/figures.py: covariances by
// doubling or solve_continuous_lyapunov, floors by solve_*_are, margins and peak
// gains on a dense grid of frequencies, the transient by powers.
type audited struct {
	Plant, Form string
	Gain        [][]float64
	Figures     map[string]any
}

// numbers flattens nested lists; of an object it takes the value, and what is no
// number is NaN.
func numbers(v any) []float64 {
	switch v := v.(type) {
	case float64:
		return []float64{v}
	case []any:
		var list []float64
		for _, e := range v {
			list = append(list, numbers(e)...)
		}
		return list
	case map[string]any:
		return numbers(v["value"])
	}
	return []float64{math.NaN()}
}

func TestDesignAgreesWithSciPy(t *testing.T) {
	text, err := os.ReadFile("testdata/audit/figures.json")
	if err != nil {
		t.Fatal(err)
	}
	var file struct{ Cases []audited }
	if err := json.Unmarshal(text, &file); err != nil {
		t.Fatal(err)
	}
	if len(file.Cases) == 0 {
		t.Fatal("no cases")
	}
	for _, c := range file.Cases {
		t.Run(c.Plant+" "+c.Form, func(t *testing.T) {
			gain, err := json.Marshal(c.Gain)
			if err != nil {
				t.Fatal(err)
			}
			args := []string{"design", filepath.Join("testdata", "audit", c.Plant), "--use-gain", string(gain)}
			if c.Form == "current" {
				args = append(args, "--form", c.Form)
			}
			doc := document(t, args...)
			for path, want := range c.Figures {
				compareFigure(t, path, doc, numbers(want))
			}
		})
	}
}

// compareFigure holds a figure to 1e-6 of its largest entry, the accuracy of the
// grids; the program finds the transient's peak to 1e-5.
func compareFigure(t *testing.T, path string, doc map[string]any, want []float64) {
	t.Helper()
	var got any = doc
	for part := range strings.SplitSeq(path, ".") {
		inner, ok := got.(map[string]any)
		if !ok {
			t.Errorf("%s: not an object on the way", path)
			return
		}
		got = inner[part]
	}
	list := numbers(got)
	if path == "loop.gain_margin_db" {
		list = list[1:]
	}
	if len(list) != len(want) {
		t.Errorf("%s: %d values, want %d", path, len(list), len(want))
		return
	}
	size, tolerance := 0.0, 1e-6
	if path == "transient.peak" {
		tolerance = 1e-5
	}
	for _, w := range want {
		size = math.Max(size, math.Abs(w))
	}
	for i, w := range want {
		if !(math.Abs(list[i]-w) <= tolerance*size) {
			t.Errorf("%s, entry %d: %v, SciPy has %v", path, i, list[i], w)
		}
	}
}
