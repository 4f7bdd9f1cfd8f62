package emit_test

import (
	"os"
	"os/exec"
	"path/filepath"
	"strings"
	"testing"

	"gonum.org/v1/gonum/mat"

	"polewright/estimator"
	"polewright/estimator/emit"
)

// gate is a small design with round numbers: a position and a speed, seen by
// one encoder.
func gate() emit.Source {
	a := mat.NewDense(2, 2, []float64{1, 0.0625, -0.25, 0.875})
	lf := mat.NewDense(2, 1, []float64{0.5, 0.75})
	l := new(mat.Dense)
	l.Mul(a, lf)
	return emit.Source{
		Model: &estimator.Model{
			Period: 0.0625, A: a, B: mat.NewDense(2, 1, []float64{0.125, 0.5}), C: mat.NewDense(1, 2, []float64{1, 0}),
			StateNames: []string{"gate position", "gate speed"}, InputNames: []string{"cable force"}, SensorNames: []string{"rail encoder"},
		},
		L: l, Lf: lf,
		States:  []emit.Signal{{Unit: "m", Offset: 1.25}, {Unit: "m/s"}},
		Inputs:  []emit.Signal{{Unit: "N", Offset: 4}},
		Sensors: []emit.Signal{{Unit: "m", Offset: 1.25, Range: []float64{-0.5, 3}}},
		Plant:   "Tide gate hoist", Candidate: "quick", Version: "1.0",
		PlantSHA256:   strings.Repeat("0f", 32),
		SessionSHA256: strings.Repeat("a5", 32),
		Cautions:      []string{"The speed is seen through the position alone."},
	}
}

// runC compiles a header with a program that returns the number of a failed
// check, and returns its output.
func runC(t *testing.T, header emit.File, body string) {
	t.Helper()
	path := compiler(t, "gcc")
	dir := t.TempDir()
	write(t, dir, []emit.File{header})
	file := filepath.Join(dir, "check.c")
	text := "#include \"" + header.Name + "\"\nint main(void)\n{\n" + body + "    return 0;\n}\n"
	if err := os.WriteFile(file, []byte(text), 0o644); err != nil {
		t.Fatal(err)
	}
	exe := filepath.Join(dir, "check")
	build(t, path, exe, "-fsanitize=undefined", "-fsanitize-undefined-trap-on-error", file)
	if err := exec.Command(exe).Run(); err != nil {
		t.Fatalf("check in C: %v", err)
	}
}

func emitC(t *testing.T, src emit.Source) []emit.File {
	t.Helper()
	files, err := emit.Emit(src, emit.C99)
	if err != nil {
		t.Fatal(err)
	}
	return files
}

// The numbers are dyadic, so the comparisons are exact.
func TestStartAndSplitCurrentForm(t *testing.T) {
	src := gate()
	src.Form = estimator.Current
	runC(t, emitC(t, src)[0], `
    pw_tide_gate_hoist_quick_estimator s;
    const double start[2] = {1.75, 0.5};
    const double y[1] = {2.0};
    const double u[1] = {6.0};
    const unsigned char lost[1] = {1};
    pw_tide_gate_hoist_quick_start(&s, start);
    if (s.estimate[0] != 1.75 || s.estimate[1] != 0.5) { return 1; }
    pw_tide_gate_hoist_quick_correct(&s, y, 0); /* e = 0.25 */
    if (s.innovation[0] != 0.25 || s.used[0] != 1) { return 2; }
    if (s.estimate[PW_TIDE_GATE_HOIST_QUICK_X_GATE_POSITION] != 1.875) { return 3; }
    if (s.estimate[PW_TIDE_GATE_HOIST_QUICK_X_GATE_SPEED] != 0.6875) { return 4; }
    pw_tide_gate_hoist_quick_predict(&s, u); /* x = [0.625 + 0.04296875 + 0.25, ...] */
    if (s.estimate[0] != 1.875) { return 5; }
    pw_tide_gate_hoist_quick_correct(&s, y, lost);
    if (s.estimate[0] != 1.25 + 0.91796875 || s.used[0] != 0 || s.innovation[0] != 0.0) { return 6; }
`)
}

// A state that leaves the limit resets all and raises the fault; init clears it.
func TestFaultResets(t *testing.T) {
	src := gate()
	src.Sensors[0].Range = nil
	src.L = mat.NewDense(2, 1, []float64{4, 4})
	runC(t, emitC(t, src)[0], `
    pw_tide_gate_hoist_quick_estimator s;
    const double huge[1] = {9e299};
    const double u[1] = {4.0};
    int k;
    pw_tide_gate_hoist_quick_init(&s);
    for (k = 0; k < 3 && s.fault == 0; k++) {
        pw_tide_gate_hoist_quick_step(&s, u, huge, 0);
    }
    if (s.fault != 1) { return 1; }
    if (s.estimate[0] != 1.25 || s.estimate[1] != 0.0) { return 2; }
    pw_tide_gate_hoist_quick_init(&s);
    if (s.fault != 0) { return 3; }
`)
}

// A self-test that cannot fail proves nothing: spoiled code must be found out.
func TestSelfTestFindsSpoiledCode(t *testing.T) {
	path := compiler(t, "gcc")
	src := gate()
	src.Sensors[0].Wrap = 2
	files := emitC(t, src)
	spoil := [][2]string{
		{"1.0, 0.0625", "1.0, 0.0625001"},       // A
		{"missing[i] == 0)", "missing[i] < 2)"}, // missing flag ignored
		{"y[i] <= high[i]", "y[i] == y[i]"},     // range ignored
		{"q + 0.5", "q"},                        // wrap cut off instead of rounded
	}
	for _, s := range spoil {
		text := strings.Replace(string(files[0].Text), s[0], s[1], 1)
		if text == string(files[0].Text) {
			t.Fatalf("%q is not in the header", s[0])
		}
		dir := t.TempDir()
		paths := write(t, dir, []emit.File{{Name: files[0].Name, Text: []byte(text)}, files[1]})
		exe := filepath.Join(dir, "selftest")
		build(t, path, exe, "-Wno-error", paths[1])
		if err := exec.Command(exe).Run(); err == nil {
			t.Errorf("the self-test accepts %q in place of %q", s[1], s[0])
		}
	}
}
