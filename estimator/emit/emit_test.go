package emit_test

import (
	"bytes"
	"errors"
	"flag"
	"fmt"
	"math"
	"os"
	"path/filepath"
	"strings"
	"testing"

	"gonum.org/v1/gonum/mat"

	"polewright/estimator"
	"polewright/estimator/emit"
)

var update = flag.Bool("update", false, "write the golden files anew")

// everyFile emits a source for every target.
func everyFile(t testing.TB, src emit.Source) []emit.File {
	t.Helper()
	var all []emit.File
	for target := emit.C99; target <= emit.CSV; target++ {
		files, err := emit.Emit(src, target)
		if err != nil {
			t.Fatal(err)
		}
		all = append(all, files...)
	}
	return all
}

func TestGolden(t *testing.T) {
	files := everyFile(t, gate())
	fixed := fixedGate(20)
	fixed.Candidate = "fixed"
	for _, f := range append(files, emitC(t, fixed)...) {
		path := filepath.Join("testdata", "golden", f.Name)
		if *update {
			if err := os.MkdirAll(filepath.Dir(path), 0o755); err != nil {
				t.Fatal(err)
			}
			if err := os.WriteFile(path, f.Text, 0o644); err != nil {
				t.Fatal(err)
			}
		}
		want, err := os.ReadFile(path)
		if err != nil {
			t.Fatal(err)
		}
		if !bytes.Equal(f.Text, want) {
			t.Errorf("%s differs from its golden file; look at it, then run the test with -update", f.Name)
		}
	}
}

func TestSameSourceSameBytes(t *testing.T) {
	src := randomSource(t, shape{n: 5, m: 2, p: 2, wrap: true, ranges: true}, 4)
	a, b := everyFile(t, src), everyFile(t, src)
	for i := range a {
		if a[i].Name != b[i].Name || !bytes.Equal(a[i].Text, b[i].Text) {
			t.Errorf("%s differs between two calls", a[i].Name)
		}
	}
}

// Every file says where it comes from, the units and the cautions.
func TestProvenanceUnitsAndCautions(t *testing.T) {
	src := gate()
	for _, f := range everyFile(t, src) {
		text := strings.Join(strings.Fields(strings.NewReplacer(" * ", " ").Replace(string(f.Text))), " ")
		for _, want := range []string{
			src.Plant, src.Candidate, src.PlantSHA256, src.SessionSHA256, src.Version, src.Cautions[0], "low energy", "really applied", "0.0625",
		} {
			if !strings.Contains(text, want) {
				t.Errorf("%s lacks %q", f.Name, want)
			}
		}
		if !strings.Contains(f.Name, "selftest") && !strings.Contains(text, "m/s") {
			t.Errorf("%s lacks units", f.Name)
		}
	}
}

func TestStabilityCautions(t *testing.T) {
	src := gate()
	src.Model.A.Set(0, 0, 1.5) // the plant alone is unstable
	src.Model.A.Set(1, 1, 0.5)
	src.L = mat.NewDense(2, 1, []float64{1.2, 0})
	head := string(emitC(t, src)[0].Text)
	if !strings.Contains(head, "Without sensor rail encoder the estimate drifts") || strings.Contains(head, "NOT STABLE") {
		t.Errorf("unstable plant, stable estimator:\n%.1800s", head)
	}
	src.L = mat.NewDense(2, 1, []float64{0.1, 0})
	if head = string(emitC(t, src)[0].Text); !strings.Contains(head, "THE ESTIMATOR IS NOT STABLE") {
		t.Errorf("unstable estimator:\n%.1800s", head)
	}
	src = gate()
	src.Model.A = mat.NewDense(2, 2, []float64{1.1, 0, 0, 0.9})
	src.Model.C = mat.NewDense(2, 2, []float64{1, 0, 0, 1})
	src.L = mat.NewDense(2, 2, []float64{0.6, 0, 0, 0.1})
	src.Sensors = append(src.Sensors, emit.Signal{Name: "speedo"})
	src.Model.SensorNames = nil
	src.Sensors[0].Name = "rail"
	head = string(emitC(t, src)[0].Text)
	if !strings.Contains(head, "Losing sensor rail makes") || strings.Contains(head, "Losing sensor speedo") {
		t.Errorf("sensor sets:\n%.1800s", head)
	}
}

func TestErrors(t *testing.T) {
	tests := []struct {
		name  string
		spoil func(*emit.Source)
		want  error
	}{
		{"no model", func(s *emit.Source) { s.Model = nil }, estimator.ErrShape},
		{"continuous", func(s *emit.Source) { s.Model.Period = 0 }, emit.ErrContinuous},
		{"no C", func(s *emit.Source) { s.Model.C = nil }, estimator.ErrShape},
		{"C of another size", func(s *emit.Source) { s.Model.C = mat.NewDense(1, 3, nil) }, estimator.ErrShape},
		{"no gain", func(s *emit.Source) { s.L = nil }, estimator.ErrShape},
		{"no current gain", func(s *emit.Source) { s.Form, s.Lf = estimator.Current, nil }, estimator.ErrShape},
		{"NaN in A", func(s *emit.Source) { s.Model.A.Set(0, 1, math.NaN()) }, estimator.ErrNotFinite},
		{"infinite gain", func(s *emit.Source) { s.L.Set(0, 0, math.Inf(1)) }, estimator.ErrNotFinite},
		{"NaN offset", func(s *emit.Source) { s.States[0].Offset = math.NaN() }, estimator.ErrNotFinite},
		{"two signals for one", func(s *emit.Source) { s.Inputs = append(s.Inputs, emit.Signal{}) }, estimator.ErrShape},
		{"names", func(s *emit.Source) { s.Model.StateNames = []string{"a"} }, estimator.ErrShape},
		{"roles", func(s *emit.Source) { s.Model.Roles = []estimator.Role{0} }, estimator.ErrShape},
		{"scale", func(s *emit.Source) { s.Model.StateScale = []float64{1, 0} }, emit.ErrValue},
		{"wrap", func(s *emit.Source) { s.Sensors[0].Wrap = -1 }, emit.ErrValue},
		{"range", func(s *emit.Source) { s.Sensors[0].Range = []float64{2, 1} }, emit.ErrValue},
		{"infinite range", func(s *emit.Source) { s.Sensors[0].Range = []float64{0, math.Inf(1)} }, emit.ErrValue},
		{"too large for float", func(s *emit.Source) { s.Arithmetic = emit.Float; s.Model.B.Set(0, 0, 1e35) }, emit.ErrValue},
		{"form", func(s *emit.Source) { s.Form = 7 }, emit.ErrTarget},
		{"arithmetic", func(s *emit.Source) { s.Arithmetic = 7 }, emit.ErrTarget},
	}
	for _, test := range tests {
		src := gate()
		test.spoil(&src)
		files, err := emit.Emit(src, emit.C99)
		if !errors.Is(err, test.want) || files != nil {
			t.Errorf("%s: error %v, want %v", test.name, err, test.want)
		}
	}
	if _, err := emit.Emit(gate(), 9); !errors.Is(err, emit.ErrTarget) {
		t.Errorf("target 9: %v", err)
	}
	if _, err := emit.ParseTarget("pascal"); !errors.Is(err, emit.ErrTarget) {
		t.Errorf("pascal: %v", err)
	}
	if _, _, err := emit.ParseArithmetic("half"); !errors.Is(err, emit.ErrTarget) {
		t.Errorf("half: %v", err)
	}
	for target := emit.C99; target <= emit.CSV; target++ {
		if got, err := emit.ParseTarget(target.String()); err != nil || got != target {
			t.Errorf("%s: %v, %v", target, got, err)
		}
	}
}

func TestSmallestNumbersCompile(t *testing.T) {
	src := gate()
	src.Model.A.Set(1, 0, 5e-324)
	src.Model.C.Set(0, 1, -1e-310)
	for _, a := range []emit.Arithmetic{emit.Double, emit.Float} {
		src.Arithmetic = a
		for _, cc := range []string{"gcc", "clang"} {
			path := compiler(t, cc)
			dir := t.TempDir()
			build(t, path, filepath.Join(dir, "out"), write(t, dir, emitC(t, src))[1])
		}
	}
}

var sink []emit.File

func BenchmarkEmit(b *testing.B) {
	for _, n := range []int{4, 8, 20, 50} {
		src := randomSource(b, shape{n: n, m: 2, p: 2, ranges: true}, 1)
		for target := emit.C99; target <= emit.CSV; target++ {
			b.Run(fmt.Sprintf("%s/n=%d", target, n), func(b *testing.B) {
				b.ReportAllocs()
				for b.Loop() {
					files, err := emit.Emit(src, target)
					if err != nil {
						b.Fatal(err)
					}
					sink = files
				}
			})
		}
	}
}
