package report_test

import (
	"path/filepath"
	"strings"
	"testing"

	"gonum.org/v1/gonum/mat"

	"polewright/estimator"
	"polewright/ui/desk"
	"polewright/ui/internal/sample"
	"polewright/ui/session"
)

// An unstable pendulum without a sample period, invented.
const pendulum = `
format = 1
name = "Pendulum"
[model]
time = "continuous"
A = [[0, 1], [9.0, 0]]
B = [[0], [1]]
C = [[1, 0]]
[[sensors]]
name = "angle"
unit = "rad"
noise_density = 1e-6
[process_noise]
density = [0.0, 0.1]
[feedback]
K = [[25.0, 8.0]]
`

// A continuous design beside an unstable one: words say what figures cannot.
func TestContinuousAndUnstable(t *testing.T) {
	b, err := sample.Bench("pendulum.toml", []byte(pendulum), "", nil)
	if err != nil {
		t.Fatal(err)
	}
	w, err := sample.Work(b, sample.Entry{Poles: "-6±2i"})
	if err != nil {
		t.Fatal(err)
	}
	d, err := estimator.NewDesigner(b.Model, estimator.Options{})
	if err != nil {
		t.Fatal(err)
	}
	loose, err := d.Judge(estimator.Given{L: mat.NewDense(2, 1, nil)})
	if err != nil {
		t.Fatal(err)
	}
	w.Candidates = append(w.Candidates, desk.Candidate{Letter: "B", Design: loose})
	file := filepath.Join(t.TempDir(), "work"+session.Ending)
	if err := session.Save(file, sample.Program, w, false); err != nil {
		t.Fatal(err)
	}
	page := string(document(t, load(t, file)).HTML())
	wellFormed(t, page)
	for _, want := range []string{
		"continuous time; scenario: Start-up; 2 candidates",
		"<strong>NO</strong>",
		"This estimator is UNSTABLE",
		"Continuous time; a gain found elsewhere.",
		"L: x̂&#39; = A x̂ + B u + L (y − C x̂ − D u)",
		"The nominal control loop is UNSTABLE: it has no margins.",
		`data-figure="transient.settle_s">–<`,
		"The scenario sets no limit.",
	} {
		if !strings.Contains(page, want) {
			t.Errorf("the page lacks %q", want)
		}
	}
	for _, never := range []string{"prediction form: x̂", "Lf, current form", ">NaN", ">Inf", ">+Inf"} {
		if strings.Contains(page, never) {
			t.Errorf("the page says %q", never)
		}
	}
}

// A session that keeps no candidate is shown with the design in hand.
func TestWithoutCandidates(t *testing.T) {
	b, err := sample.BuiltIn("lift")
	if err != nil {
		t.Fatal(err)
	}
	w, err := sample.Work(b, sample.Entry{})
	if err != nil {
		t.Fatal(err)
	}
	w.Candidates, w.Current = nil, ""
	file := filepath.Join(t.TempDir(), "work"+session.Ending)
	if err := session.Save(file, sample.Program, w, false); err != nil {
		t.Fatal(err)
	}
	if page := string(document(t, load(t, file)).HTML()); !strings.Contains(page, "The design in hand</h2>") {
		t.Error("the design in hand is not shown")
	}
}

// Chosen candidates are shown once, others not at all.
func TestChosenCandidates(t *testing.T) {
	k := kept(t, "lift", sample.Entry{}, sample.Entry{Poles: "-9±4i, -14"})
	page := string(document(t, k, "B", "B").HTML())
	if strings.Contains(page, "Candidate A<") || strings.Count(page, "Candidate B<") != 1 {
		t.Error("not the chosen candidate alone")
	}
}
