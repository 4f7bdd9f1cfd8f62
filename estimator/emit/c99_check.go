package emit

import (
	"math"
	"strings"
)

// cSelfTest returns a C file with a function that runs the estimator over the
// test's samples and a main that reports by its exit status alone.
func cSelfTest(p *program, t *selfTest) []byte {
	var w writer
	w.cComment(append(headNotes(p, "Self-test of the state estimator in "+p.prefix+".h."), "",
		"The function returns 0 where all is well, else the number of the first bad sample,",
		"counted from 1. main returns 0 or 1 as exit status; define the macro",
		strings.ToUpper(p.prefix)+"_NO_MAIN to leave it out on the target.",
		"Expected values: the same estimator in double precision with the design's own numbers.",
		"Tolerance: an upper bound on what rounding can do in these samples, per state."))
	w.put(p, "#include \"$PRE.h\"\n\nenum { $UP_TEST_STEPS = $STEPS };\n\n", "$STEPS", full(float64(t.steps)))
	w.put(p, "int $PRE_selftest(void);\n\nint $PRE_selftest(void)\n{\n")
	if p.m > 0 {
		w.cSeries(p, "inputs", "INPUTS", p.withoutNaN(t.u), p.m)
	}
	w.cSeries(p, "samples", "SENSORS", p.withoutNaN(t.y), p.p)
	w.cFlags(p, "/* 0 good, 1 missing, 2 not a number */", "mark", marks(t.y, t.missing), p.p)
	if p.m > 0 {
		w.cFlags(p, "/* 2 where the input is not a number */", "input_mark", marks(t.u, nil), p.m)
	}
	w.cFlags(p, "/* samples that must be used */", "used", flags(t.used), p.p)
	w.cSeries(p, "expected", "STATES", flatten(t.expected), p.n)
	w.cTable(p, "tolerance", strings.ToUpper(p.prefix)+"_STATES", t.tolerance, p.n)
	zero := "    volatile " + p.prefix + "_real zero = " + p.cNumber(0) + "; /* zero / zero is not a number */\n"
	nan := "zero / zero"
	if p.arithmetic == Fixed {
		zero, nan = "", p.cNumber(p.beyond())
	}
	input, pass := "", ""
	if p.m > 0 {
		input = strings.NewReplacer("$PRE", p.prefix, "$UP_", strings.ToUpper(p.prefix)+"_", "$NAN", nan).Replace(`        for (i = 0; i < $UP_INPUTS; i++) {
            u[i] = input_mark[k][i] == 2 ? $NAN : inputs[k][i];
        }
`)
		pass = " u,"
	}
	declare := ""
	if p.m > 0 {
		declare = strings.NewReplacer("$PRE", p.prefix, "$UP_", strings.ToUpper(p.prefix)+"_").Replace("    $PRE_real u[$UP_INPUTS];\n")
	}
	w.put(p, `
$ZERO_LINE
    $PRE_estimator s;
    $PRE_real y[$UP_SENSORS];
    unsigned char missing[$UP_SENSORS];
$DECLARE
    int k;
    int i;
    $PRE_init(&s);
    for (k = 0; k < $UP_TEST_STEPS; k++) {
$INPUT
        for (i = 0; i < $UP_SENSORS; i++) {
            y[i] = mark[k][i] == 2 ? $NAN : samples[k][i];
            missing[i] = (unsigned char)(mark[k][i] == 1);
        }
        $PRE_step(&s,$PASS y, missing);
        for (i = 0; i < $UP_SENSORS; i++) {
            if (s.used[i] != used[k][i]) {
                return k + 1;
            }
        }
        for (i = 0; i < $UP_STATES; i++) {
            const $WIDE off = $TO64s.estimate[i] - expected[k][i];
            if (!(off >= -tolerance[i] && off <= tolerance[i])) {
                return k + 1;
            }
        }
    }
    return s.fault != 0 ? $UP_TEST_STEPS : 0;
}

#ifndef $UP_NO_MAIN
int main(void)
{
    return $PRE_selftest() != 0 ? 1 : 0;
}
#endif
`, "$ZERO_LINE\n", zero, "$NAN", nan, "$DECLARE\n", declare, "$INPUT\n", input, "$PASS", pass)
	return w.Bytes()
}

func (w *writer) cFlags(p *program, note, name string, v []int, cols int) {
	size := "SENSORS"
	if name == "input_mark" {
		size = "INPUTS"
	}
	w.put(p, "    $NOTE\n    static const unsigned char $NAME[$UP_TEST_STEPS][$UP_$SIZE] = {\n", "$NOTE", note, "$NAME", name, "$SIZE", size)
	for i := 0; i < len(v); i += cols {
		w.WriteString("        {")
		for j := range cols {
			if j > 0 {
				w.WriteString(", ")
			}
			w.WriteString(full(float64(v[i+j])))
		}
		if i+cols < len(v) {
			w.WriteString("},\n")
		} else {
			w.WriteString("}\n")
		}
	}
	w.line("    };")
}

// marks are 2 for NaN, 1 for missing, else 0.
func marks(v [][]float64, missing [][]bool) []int {
	var m []int
	for k := range v {
		for j, x := range v[k] {
			switch {
			case math.IsNaN(x):
				m = append(m, 2)
			case missing != nil && missing[k][j]:
				m = append(m, 1)
			default:
				m = append(m, 0)
			}
		}
	}
	return m
}

func flags(v [][]bool) []int {
	var f []int
	for _, r := range v {
		for _, x := range r {
			n := 0
			if x {
				n = 1
			}
			f = append(f, n)
		}
	}
	return f
}

func flatten(v [][]float64) []float64 {
	var f []float64
	for _, r := range v {
		f = append(f, r...)
	}
	return f
}

// withoutNaN flattens and puts a value beyond the limit in place of each NaN,
// which the emitted code rejects in the same way.
func (p *program) withoutNaN(v [][]float64) []float64 {
	f := flatten(v)
	for i, x := range f {
		if math.IsNaN(x) {
			f[i] = p.beyond()
		}
	}
	return f
}
