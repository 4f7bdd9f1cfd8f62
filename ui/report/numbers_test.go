package report_test

import (
	"context"
	"encoding/json"
	"html"
	"math"
	"regexp"
	"strconv"
	"strings"
	"testing"

	"polewright/estimator"
	"polewright/scenarios"
	"polewright/ui/internal/sample"
	"polewright/ui/measures"
	"polewright/ui/report"
	"polewright/ui/session"
)

var current = estimator.Options{Form: estimator.Current}

// trees makes the measures document of every candidate, as `design --json` does,
// and reads it back as JSON.
func trees(t *testing.T, k *session.Kept) map[string]any {
	t.Helper()
	b, out := k.Bench, map[string]any{}
	for _, c := range k.Designs {
		d, err := estimator.NewDesigner(b.Model, c.Kind)
		if err != nil {
			t.Fatal(err)
		}
		design, err := d.Judge(estimator.Given{L: c.Gain, Lf: c.GainCurrent, Wanted: c.Wanted})
		if err != nil {
			t.Fatal(err)
		}
		runner, err := scenarios.NewRunner(b.Plant, b.Model, b.Scenario, b.Truth)
		if err != nil {
			t.Fatal(err)
		}
		run, err := runner.Run(context.Background(), scenarios.Gain{L: design.Gain, Lf: design.GainCurrent, Form: design.Form})
		if err != nil {
			t.Fatal(err)
		}
		plane := "z"
		if b.Plant.Continuous {
			plane = "s"
		}
		text, err := json.Marshal(measures.Build(b.Plant.Name, b.Model, d.Analysis(), design, plane, b.Scenario.Judge(design, b.Model, b.Plant, run)))
		if err != nil {
			t.Fatal(err)
		}
		var tree any
		if err := json.Unmarshal(text, &tree); err != nil {
			t.Fatal(err)
		}
		out[c.Name] = tree
	}
	return out
}

// at follows a key like "noise.outputs.0.std".
func at(tree any, key string) (any, bool) {
	for _, step := range strings.Split(key, ".") {
		switch v := tree.(type) {
		case map[string]any:
			next, ok := v[step]
			if !ok {
				return nil, false
			}
			tree = next
		case []any:
			i, err := strconv.Atoi(step)
			if err != nil || i < 0 || i >= len(v) {
				return nil, false
			}
			tree = v[i]
		default:
			return nil, false
		}
	}
	return tree, true
}

// says tells whether a cell shows a figure of the JSON.
func says(text string, v any, exact bool) bool {
	switch v := v.(type) {
	case nil:
		return text == "–" || text == "unlimited"
	case float64:
		shown, err := strconv.ParseFloat(text, 64)
		if exact {
			return err == nil && shown == v
		}
		return err == nil && text == strconv.FormatFloat(v+0, 'g', 5, 64)
	case []any:
		re, im := v[0].(float64), v[1].(float64)
		parts := strings.Fields(text)
		near := func(s string, v float64) bool {
			shown, err := strconv.ParseFloat(strings.TrimSuffix(s, "i"), 64)
			return err == nil && math.Abs(shown-v) <= 1e-5*math.Abs(v)
		}
		if im == 0 {
			return len(parts) == 1 && near(parts[0], re)
		}
		return len(parts) == 3 && near(parts[0], re) && near(parts[2], math.Abs(im)) && (parts[1] == "-") == (im < 0)
	}
	return false
}

var token = regexp.MustCompile(`<h2[^>]*>([^<]*)</h2>|data-figure="([^"]*)">(?:<strong>)?([^<]*)<`)

// Every figure that the page shows stands in the measures document, and the other
// way round where it matters.
func TestFiguresAreThoseOfTheMeasures(t *testing.T) {
	for _, plant := range []string{"lift", "balancer", "kiln", "twin-drum", "web"} {
		t.Run(plant, func(t *testing.T) {
			entries := []sample.Entry{{}}
			if b, err := sample.BuiltIn(plant); err == nil && b.Model.Discrete() {
				entries = append(entries, sample.Entry{Options: current})
			}
			k := kept(t, plant, entries...)
			want := trees(t, k)
			name, seen := k.Designs[0].Name, map[string]bool{}
			for _, m := range token.FindAllStringSubmatch(string(document(t, k).HTML()), -1) {
				if m[2] == "" {
					if c, ok := strings.CutPrefix(m[1], "Candidate "); ok {
						name = c
					}
					continue
				}
				of, key, found := strings.Cut(html.UnescapeString(m[2]), "/")
				if !found {
					of, key = name, of
				}
				v, ok := at(want[of], key)
				text := html.UnescapeString(m[3])
				if !ok || !says(text, v, strings.HasPrefix(key, "gain.") || strings.HasPrefix(key, "gain_current.")) {
					t.Errorf("candidate %s, %s: the page says %q, the measures %v", of, key, text, v)
				}
				seen[of+"/"+key] = true
			}
			n, _, p := k.Bench.Model.Dims()
			for _, c := range k.Designs {
				for i := range n {
					for _, key := range []string{"noise.std.", "noise.floor_std.", "noise.over_floor.", "poles.reached.", "poles.wanted."} {
						if !seen[c.Name+"/"+key+strconv.Itoa(i)] {
							t.Errorf("candidate %s: %s%d is not shown", c.Name, key, i)
						}
					}
					for j := range p {
						for _, key := range []string{"gain.", "noise.sensor_to_state."} {
							if k := key + strconv.Itoa(i) + "." + strconv.Itoa(j); !seen[c.Name+"/"+k] {
								t.Errorf("candidate %s: %s is not shown", c.Name, k)
							}
						}
					}
				}
				for _, key := range []string{"gain_norm", "eigenvector_condition", "transient.settle_s", "transient.peak", "noise.over_floor_rms",
					"rounding.float32_pole_shift", "limits.0.value", "limits.0.limit", "poles.worst_relative_error"} {
					if !seen[c.Name+"/"+key] {
						t.Errorf("candidate %s: %s is not shown", c.Name, key)
					}
				}
			}
		})
	}
}

// A gain can be taken from the page: it reads back exactly.
func TestDigits(t *testing.T) {
	for v, want := range map[float64]string{0.1: "0.1", 123456: "1.2346e+05", math.Inf(1): "unlimited", math.Copysign(0, -1): "0"} {
		if got := report.Digits(v); got != want {
			t.Errorf("%v: got %s, expected %s", v, got, want)
		}
	}
	if got := report.Digits(math.NaN()); got != "–" {
		t.Errorf("NaN: got %s", got)
	}
	third := 1.0 / 3
	if v, err := strconv.ParseFloat(report.Exact(third), 64); err != nil || v != third {
		t.Errorf("a third reads back as %v", v)
	}
}

func BenchmarkReport(b *testing.B) {
	file := b.TempDir() + "/work" + session.Ending
	if err := sample.Save(file, sample.Program, "lift", sample.Entry{Poles: "-18±18i, -22"}, sample.Entry{Poles: "-9±4i, -14"}, sample.Entry{}); err != nil {
		b.Fatal(err)
	}
	b.ReportAllocs()
	for b.Loop() {
		k, err := session.LoadKept(file)
		if err != nil {
			b.Fatal(err)
		}
		d, err := report.Make(context.Background(), k, report.Options{Program: "polewright test"})
		if err != nil {
			b.Fatal(err)
		}
		b.SetBytes(int64(len(d.HTML())))
	}
}
