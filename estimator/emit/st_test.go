package emit_test

import (
	"fmt"
	"math"
	"strings"
	"testing"

	"polewright/estimator"
	"polewright/estimator/emit"
)

// parseBoth parses the block and the self-test and returns both.
func parseBoth(t *testing.T, files []emit.File) (block, program *stUnit) {
	t.Helper()
	block, err := parseST(string(files[0].Text), nil)
	if err != nil {
		t.Fatalf("%s: %v", files[0].Name, err)
	}
	program, err = parseST(string(files[1].Text), map[string]*stUnit{block.name: block})
	if err != nil {
		t.Fatalf("%s: %v", files[1].Name, err)
	}
	return block, program
}

// checkST runs the self-test, with conversions that round and that cut off.
func checkST(t *testing.T, files []emit.File) {
	t.Helper()
	block, program := parseBoth(t, files)
	for _, cutOff := range []bool{false, true} {
		s := newInstance(program, map[string]*stUnit{block.name: block}, cutOff)
		s.run()
		if s.value("DONE") != 1 || s.value("PASSED") != 1 {
			t.Errorf("%s: self-test fails at sample %g (cut off: %v)", files[1].Name, s.value("FAILED_AT"), cutOff)
		}
	}
}

func TestStructuredTextSelfTest(t *testing.T) {
	for i, s := range shapes() {
		if s.arithmetic == emit.Fixed {
			continue
		}
		files, err := emit.Emit(randomSource(t, s, uint64(i)), emit.StructuredText)
		if err != nil {
			t.Fatal(err)
		}
		checkST(t, files)
	}
}

// The check itself must be able to fail.
func TestStructuredTextCheckFindsSpoiledText(t *testing.T) {
	src := gate()
	src.Sensors[0].Wrap = 2
	files, err := emit.Emit(src, emit.StructuredText)
	if err != nil {
		t.Fatal(err)
	}
	good := string(files[0].Text)
	block, program := parseBoth(t, files)
	for _, s := range [][2]string{
		{"END_FOR", ""}, {"END_IF", "END_FOR"}, {"acc : LREAL;", ""}, {"*)", ""}, {"t_y0", "t_yy"},
		{"u_cable_force :", "end_if :"}, {"next :", "x :"}, {"[0..3]", "[0..2]"},
	} {
		if _, err := parseST(strings.Replace(good, s[0], s[1], 1), nil); err == nil {
			t.Errorf("%q in place of %q goes unnoticed", s[1], s[0])
		}
	}
	for _, s := range [][2]string{
		{"1.0, 0.0625", "1.0, 0.0626"}, {"(NOT vm[i]) AND", ""}, {"<= t_high[i]", "<= t_limit"},
		{"acc := acc - t_wrap[i] * DINT", "acc := acc + t_wrap[i] * DINT"},
	} {
		bad, err := parseST(strings.Replace(good, s[0], s[1], 1), nil)
		if err != nil {
			t.Fatal(err)
		}
		run := newInstance(program, map[string]*stUnit{block.name: bad}, false)
		run.run()
		if run.value("PASSED") == 1 {
			t.Errorf("the self-test accepts %q in place of %q", s[1], s[0])
		}
	}
}

// A long run of the function block against the independent evaluation, with
// NaN samples and inputs, which the self-test leaves to finite values.
func TestStructuredTextLongRun(t *testing.T) {
	for _, form := range []estimator.Form{estimator.Prediction, estimator.Current} {
		s := shape{n: 3, m: 2, p: 2, form: form, wrap: true, ranges: true, through: true}
		src := randomSource(t, s, 9)
		run, err := emit.RunOf(src, 500, 0)
		if err != nil {
			t.Fatal(err)
		}
		files, err := emit.Emit(src, emit.StructuredText)
		if err != nil {
			t.Fatal(err)
		}
		block, _ := parseBoth(t, files)
		fb := newInstance(block, nil, false)
		set := func(name string, v float64) { fb.values[block.index[name]][0] = v }
		oracle := newOracle(src)
		for k := range run.Y {
			for j := range s.m {
				set(fmt.Sprintf("U_U%d", j+1), run.U[k][j])
			}
			for j := range s.p {
				set(fmt.Sprintf("Y_Y%d", j+1), run.Y[k][j])
				set(fmt.Sprintf("M_Y%d", j+1), map[bool]float64{true: 1}[run.Missing[k][j]])
			}
			fb.run()
			want := oracle.step(run.U[k], run.Y[k], run.Missing[k])
			for i := range want {
				if got := fb.value(fmt.Sprintf("X_X%d", i+1)); !(math.Abs(got-want[i]) <= 1e-12*(1+math.Abs(want[i]))) {
					t.Fatalf("form %d step %d state %d: %g, want %g", form, k, i, got, want[i])
				}
			}
		}
	}
}

// In current form a sample may be split in two calls; reset starts anew.
func TestStructuredTextSplitAndReset(t *testing.T) {
	src := gate()
	src.Form = estimator.Current
	files, err := emit.Emit(src, emit.StructuredText)
	if err != nil {
		t.Fatal(err)
	}
	block, _ := parseBoth(t, files)
	fb := newInstance(block, nil, false)
	call := func(values map[string]float64) {
		for name, v := range values {
			fb.values[block.index[name]][0] = v
		}
		fb.run()
	}
	expect := func(position float64) {
		t.Helper()
		if got := fb.value("X_GATE_POSITION"); got != position {
			t.Errorf("position %g, want %g", got, position)
		}
	}
	call(map[string]float64{"RESET": 1, "S_GATE_POSITION": 1.75, "S_GATE_SPEED": 0.5})
	expect(1.75)
	call(map[string]float64{"RESET": 0, "DO_PREDICT": 0, "Y_RAIL_ENCODER": 2})
	expect(1.875)
	call(map[string]float64{"DO_CORRECT": 0, "DO_PREDICT": 1, "U_CABLE_FORCE": 6})
	expect(1.875)
	call(map[string]float64{"DO_CORRECT": 1, "DO_PREDICT": 0, "M_RAIL_ENCODER": 1})
	expect(1.25 + 0.91796875)
}
