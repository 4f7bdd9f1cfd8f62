package emit_test

import (
	"bytes"
	"encoding/csv"
	"encoding/json"
	"math"
	"strconv"
	"testing"

	"gonum.org/v1/gonum/mat"

	"polewright/estimator"
	"polewright/estimator/emit"
)

func TestJSONReadsBack(t *testing.T) {
	src := randomSource(t, shape{n: 4, m: 2, p: 2, through: true, ranges: true, wrap: true}, 8)
	src.Model.StateNames = []string{"µ \u202e \U0001F600", "b", "c", "d"}
	src.Arithmetic = emit.Float // does not touch the data
	files, err := emit.Emit(src, emit.JSON)
	if err != nil {
		t.Fatal(err)
	}
	var doc struct {
		A, B, C, D  [][]float64
		Gain        [][]float64
		GainCurrent [][]float64 `json:"gain_current"`
		Form        string
		Period      float64 `json:"period_s"`
		States      []struct{ Name string }
		Sensors     []struct {
			Range []float64
			Wrap  float64
		}
		Cautions []string
	}
	if err := json.Unmarshal(files[0].Text, &doc); err != nil {
		t.Fatal(err)
	}
	for _, m := range []struct {
		got  [][]float64
		want *mat.Dense
	}{{doc.A, src.Model.A}, {doc.B, src.Model.B}, {doc.C, src.Model.C}, {doc.D, src.Model.D}, {doc.Gain, src.L}, {doc.GainCurrent, src.Lf}} {
		for i, row := range m.got {
			for j, v := range row {
				if v != m.want.At(i, j) {
					t.Errorf("%g, want %g", v, m.want.At(i, j))
				}
			}
		}
	}
	if doc.Form != "prediction" || doc.Period != 0.005 || doc.States[0].Name != src.Model.StateNames[0] ||
		doc.Sensors[0].Wrap != 2*math.Pi || doc.Sensors[1].Range[1] != 4.7 || len(doc.Cautions) < 5 {
		t.Errorf("document %+v", doc)
	}
}

func TestCSVReadsBack(t *testing.T) {
	src := randomSource(t, shape{n: 3, m: 1, p: 2, form: estimator.Current}, 8)
	src.Model.StateNames = []string{"=1+1", "a,\"b\"", "c\nd"}
	files, err := emit.Emit(src, emit.CSV)
	if err != nil {
		t.Fatal(err)
	}
	records, err := csv.NewReader(bytes.NewReader(files[0].Text)).ReadAll()
	if err != nil {
		t.Fatal(err)
	}
	from := map[string]*mat.Dense{"A": src.Model.A, "B": src.Model.B, "C": src.Model.C, "L": src.L, "Lf": src.Lf}
	count, names := 0, []string{"'=1+1", "a,\"b\"", "c<U+000A>d"}
	for _, r := range records {
		m := from[r[0]]
		if m == nil {
			continue
		}
		i, _ := strconv.Atoi(r[1])
		j, _ := strconv.Atoi(r[2])
		if v, err := strconv.ParseFloat(r[6], 64); err != nil || v != m.At(i-1, j-1) {
			t.Errorf("%v: want %g", r, m.At(i-1, j-1))
		}
		if r[0] == "A" && (r[3] != names[i-1] || r[4] != names[j-1]) {
			t.Errorf("names %q, %q", r[3], r[4])
		}
		count++
	}
	if count != 9+3+6+6+6 {
		t.Errorf("%d entries", count)
	}
}
