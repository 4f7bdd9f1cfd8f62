package emit_test

import (
	"errors"
	"testing"

	"gonum.org/v1/gonum/mat"

	"polewright/estimator/emit"
)

func fixedGate(bits int) emit.Source {
	src := gate()
	src.Arithmetic, src.FractionBits = emit.Fixed, bits
	return src
}

func TestParseArithmetic(t *testing.T) {
	for _, test := range []struct {
		name string
		want emit.Arithmetic
		bits int
	}{{"double", emit.Double, 0}, {"float", emit.Float, 0}, {"q15.16", emit.Fixed, 16}, {"q30.1", emit.Fixed, 1}, {"q1.30", emit.Fixed, 30}} {
		if a, bits, err := emit.ParseArithmetic(test.name); err != nil || a != test.want || bits != test.bits {
			t.Errorf("%s: %v, %d, %v", test.name, a, bits, err)
		}
	}
	for _, name := range []string{"", "fixed", "q16.16", "q31.0", "q0.31", "Q15.16"} {
		if _, _, err := emit.ParseArithmetic(name); !errors.Is(err, emit.ErrTarget) {
			t.Errorf("%q: %v", name, err)
		}
	}
}

func TestFixedErrors(t *testing.T) {
	for _, bits := range []int{-1, 0, 31} {
		if _, err := emit.Emit(fixedGate(bits), emit.C99); !errors.Is(err, emit.ErrValue) {
			t.Errorf("%d fraction bits: %v", bits, err)
		}
	}
	if _, err := emit.Emit(fixedGate(16), emit.StructuredText); !errors.Is(err, emit.ErrTarget) {
		t.Errorf("structured text: %v", err)
	}
	src := fixedGate(16)
	src.Model.A.Set(0, 0, 3e9)
	if _, err := emit.Emit(src, emit.C99); !errors.Is(err, emit.ErrValue) {
		t.Errorf("large entry: %v", err)
	}
	src = fixedGate(30) // ±2 only: the operating point of 4 N does not fit
	if _, err := emit.Emit(src, emit.C99); !errors.Is(err, emit.ErrValue) {
		t.Errorf("operating point: %v", err)
	}
	if _, err := emit.Emit(src, emit.JSON); err != nil {
		t.Errorf("data do not depend on the arithmetic: %v", err)
	}
}

// Signals saturate, accumulators do not overflow (the compiler's checks trap),
// INT32_MIN is no number, and values in counts are exact where they are dyadic.
func TestFixedSaturates(t *testing.T) {
	src := fixedGate(16)
	src.Sensors[0].Range = nil
	src.L = mat.NewDense(2, 1, []float64{1, 3})
	runC(t, emitC(t, src)[0], `
    pw_tide_gate_hoist_quick_estimator s;
    const int32_t top[1] = {2147483647};
    const int32_t bottom[1] = {-2147483647};
    const int32_t none[1] = {-2147483647 - 1};
    const int32_t u[1] = {5 * 65536};
    int k;
    pw_tide_gate_hoist_quick_init(&s);
    if (s.estimate[0] != 81920 || s.estimate[1] != 0) { return 1; }
    pw_tide_gate_hoist_quick_step(&s, u, none, 0); /* x = B du */
    if (s.used[0] != 0 || s.estimate[0] != 81920 + 8192 || s.estimate[1] != 32768) { return 2; }
    for (k = 0; k < 20; k++) {
        pw_tide_gate_hoist_quick_step(&s, none, k % 2 == 0 ? top : bottom, 0);
        if (s.estimate[0] < -2147483647) { return 3; }
    }
    if (s.fault != 1) { return 4; }
    pw_tide_gate_hoist_quick_init(&s);
    pw_tide_gate_hoist_quick_step(&s, u, top, 0);
    if (s.estimate[0] != 2147483647 || s.x[1] != 2147483647) { return 5; }
`)
}
