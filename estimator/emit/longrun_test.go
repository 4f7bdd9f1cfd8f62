package emit_test

import (
	"bytes"
	"encoding/binary"
	"fmt"
	"math"
	"os"
	"os/exec"
	"path/filepath"
	"strings"
	"testing"

	"polewright/estimator"
	"polewright/estimator/emit"
)

// The driver reads binary doubles (inputs, samples, missing flags per step)
// and writes the estimates and used flags. With "selftest" it runs all self-tests.
const driverRun = `
static void run_$I(void)
{
    $PRE_estimator s;
    double in[$COUNT];
    int i;
    $PRE_init(&s);
    while (fread(in, sizeof in, 1, stdin) == 1) {
        $PRE_real y[$UP_SENSORS];
        unsigned char missing[$UP_SENSORS];
        double out[$UP_STATES + $UP_SENSORS];
$INPUT
        for (i = 0; i < $UP_SENSORS; i++) {
            y[i] = ($PRE_real)in[$UP_INPUTS + i];
            missing[i] = (unsigned char)(in[$UP_INPUTS + $UP_SENSORS + i] > 0.5);
        }
        $PRE_step(&s,$PASS y, missing);
        for (i = 0; i < $UP_STATES; i++) {
            out[i] = (double)s.estimate[i];
        }
        for (i = 0; i < $UP_SENSORS; i++) {
            out[$UP_STATES + i] = (double)s.used[i];
        }
        fwrite(out, sizeof out, 1, stdout);
    }
}
`

// plantName gives every compiled design names of its own.
func plantName(i int) string { return fmt.Sprintf("Design %d", i) }

// driver writes the files of every nth design and one program over them.
func driver(t *testing.T, dir string, sources []emit.Source, nth int) string {
	var include, runs, table, tests strings.Builder
	include.WriteString("#include <stdio.h>\n#include <stdlib.h>\n#include <string.h>\n")
	for i, src := range sources {
		if i%nth != 0 {
			continue
		}
		files, err := emit.Emit(src, emit.C99)
		if err != nil {
			t.Fatal(err)
		}
		write(t, dir, files)
		pre := strings.TrimSuffix(files[0].Name, ".h")
		up := strings.ToUpper(pre) + "_"
		fmt.Fprintf(&include, "#define %sNO_MAIN\n#include \"%s\"\n", up, files[1].Name)
		fmt.Fprintf(&table, "    case %d: run_%d(); break;\n", i, i)
		fmt.Fprintf(&tests, "    if (%s_selftest() != 0) { return %d; }\n", pre, i+1)
		_, m, p := src.Model.Dims()
		input, pass := "", ""
		if m > 0 {
			input = "        $PRE_real u[$UP_INPUTS];\n        for (i = 0; i < $UP_INPUTS; i++) {\n            u[i] = ($PRE_real)in[i];\n        }\n"
			pass = " u,"
		}
		text := strings.ReplaceAll(strings.ReplaceAll(driverRun, "$INPUT\n", input), "$PASS", pass)
		runs.WriteString(strings.NewReplacer("$I", fmt.Sprint(i), "$PRE", pre, "$UP_", up, "$COUNT", fmt.Sprint(m+2*p)).Replace(text))
	}
	path := filepath.Join(dir, "driver.c")
	text := include.String() + runs.String() + "int main(int argc, char **argv)\n{\n    if (argc != 2) { return 100; }\n" +
		"    if (strcmp(argv[1], \"selftest\") == 0) {\n" + tests.String() + "    return 0;\n    }\n" +
		"    switch (atoi(argv[1])) {\n" + table.String() + "    default: return 101;\n    }\n    return 0;\n}\n"
	if err := os.WriteFile(path, []byte(text), 0o644); err != nil {
		t.Fatal(err)
	}
	return path
}

// TestTenThousandSteps compiles every shape and holds 10,000 steps against a
// plain evaluation with matrices: 1e-12 of the state's largest size in double
// precision, the stated bound in single precision.
func TestTenThousandSteps(t *testing.T) {
	var sources []emit.Source
	for i, s := range shapes() {
		src := randomSource(t, s, uint64(i))
		src.Plant = plantName(i)
		sources = append(sources, src)
	}
	runs := make([]*emit.Run, len(sources))
	for _, cc := range []string{"gcc", "clang"} {
		t.Run(cc, func(t *testing.T) {
			path := compiler(t, cc)
			nth := 1
			if cc == "clang" {
				nth = 5
			}
			dir := t.TempDir()
			exe := filepath.Join(dir, "driver")
			build(t, path, exe, "-O1", driver(t, dir, sources, nth))
			if err := exec.Command(exe, "selftest").Run(); err != nil {
				t.Fatalf("self-test of a design: %v", err)
			}
			for i, src := range sources {
				if i%nth != 0 {
					continue
				}
				if runs[i] == nil {
					runs[i] = runFor(t, src)
				}
				compareRun(t, exe, i, src, runs[i])
			}
		})
	}
}

const (
	longSteps  = 10_000
	boundSteps = 200
)

// runFor follows the bound all the way in single precision, where it is the
// limit, and over a shorter start in double precision.
func runFor(t *testing.T, src emit.Source) *emit.Run {
	t.Helper()
	follow := longSteps
	if src.Arithmetic == emit.Double {
		follow = boundSteps
	}
	run, err := emit.RunOf(src, longSteps, follow)
	if err != nil {
		t.Fatal(err)
	}
	return run
}

func compareRun(t *testing.T, exe string, i int, src emit.Source, run *emit.Run) {
	t.Helper()
	steps := longSteps
	n, m, p := src.Model.Dims()
	var in bytes.Buffer
	for k := range run.Y {
		row := append(append([]float64{}, run.U[k]...), run.Y[k]...)
		if src.Arithmetic == emit.Fixed {
			toCounts(row)
		}
		for _, b := range run.Missing[k] {
			row = append(row, map[bool]float64{true: 1}[b])
		}
		if err := binary.Write(&in, binary.NativeEndian, row); err != nil {
			t.Fatal(err)
		}
	}
	cmd := exec.Command(exe, fmt.Sprint(i))
	cmd.Stdin = &in
	out, err := cmd.Output()
	if err != nil || len(out) != steps*(n+p)*8 {
		t.Fatalf("design %d: %v, %d bytes", i, err, len(out))
	}
	got := make([]float64, steps*(n+p))
	if err := binary.Read(bytes.NewReader(out), binary.NativeEndian, got); err != nil {
		t.Fatal(err)
	}
	oracle := newOracle(src)
	largest, off, plain, early := make([]float64, n), make([]float64, n), make([]float64, n), make([]float64, n)
	for k := range steps {
		want := oracle.step(run.U[k], run.Y[k], run.Missing[k])
		for s := range n {
			if src.Arithmetic == emit.Fixed {
				got[k*(n+p)+s] = math.Ldexp(got[k*(n+p)+s], -fractionBits)
			}
			largest[s] = max(largest[s], math.Abs(want[s]))
			off[s] = max(off[s], math.Abs(got[k*(n+p)+s]-want[s]))
			if k < boundSteps {
				early[s] = off[s]
			}
			plain[s] = max(plain[s], math.Abs(run.Expected[k][s]-want[s]))
		}
		for s := range p {
			if g := got[k*(n+p)+n+s] != 0; g != run.Used[k][s] {
				t.Fatalf("design %d step %d sensor %d: used %v, want %v", i, k, s, g, run.Used[k][s])
			}
		}
	}
	worst, worstBound := 0.0, 0.0
	for s := range n {
		if plain[s] > 1e-12*largest[s] {
			t.Errorf("design %d state %d: the package's own evaluation is off by %g of %g", i, s, plain[s], largest[s])
		}
		limit := 1e-12 * largest[s]
		if src.Arithmetic != emit.Double {
			limit = run.Tolerance[s]
			if limit > 5e-2*largest[s] {
				t.Errorf("design %d state %d: bound %g says nothing beside %g", i, s, limit, largest[s])
			}
		} else if early[s] > run.Tolerance[s] {
			t.Errorf("design %d state %d: off by %g, bound %g", i, s, early[s], run.Tolerance[s])
		}
		if !(off[s] <= limit) {
			t.Errorf("design %d state %d: off by %g, allowed %g", i, s, off[s], limit)
		}
		worst = max(worst, off[s]/largest[s])
		worstBound = max(worstBound, run.Tolerance[s]/largest[s])
	}
	t.Logf("design %d n=%d m=%d p=%d arithmetic %d form %d: off by %.2g of the largest estimate, bound %.2g", i, n, m, p, src.Arithmetic, src.Form, worst, worstBound)
}

// toCounts turns values into counts; what is not a number becomes INT32_MIN.
func toCounts(v []float64) {
	for i := range v {
		v[i] = math.Ldexp(v[i], fractionBits)
		if math.IsNaN(v[i]) {
			v[i] = math.MinInt32
		}
	}
}

// oracle evaluates the equations with absolute values and a general remainder,
// written independently of the package.
type oracle struct {
	src   emit.Source
	x, u  []float64
	sound float64 // a value of this size or more is rejected
}

func newOracle(src emit.Source) *oracle {
	n, m, _ := src.Model.Dims()
	o := &oracle{src: src, x: make([]float64, n), u: make([]float64, m), sound: 1e29}
	if src.Arithmetic == emit.Fixed {
		o.sound = math.Ldexp(1, 31-fractionBits)
	}
	return o
}

func (o *oracle) step(u, y []float64, missing []bool) []float64 {
	md := o.src.Model
	n, m, p := md.Dims()
	for j := range m {
		if math.Abs(u[j]) < o.sound {
			o.u[j] = u[j] - o.src.Inputs[j].Offset
		}
	}
	gain := o.src.L
	if o.src.Form == estimator.Current {
		gain = o.src.Lf
	}
	corr := make([]float64, n)
	for s := range p {
		sig := o.src.Sensors[s]
		bad := missing[s] || !(math.Abs(y[s]) < o.sound)
		if sig.Range != nil && !bad {
			bad = y[s] < sig.Range[0] || y[s] > sig.Range[1]
		}
		if bad {
			continue
		}
		hat := sig.Offset
		for i := range n {
			hat += md.C.At(s, i) * o.x[i]
		}
		for j := range m {
			if md.D != nil {
				hat += md.D.At(s, j) * o.u[j]
			}
		}
		e := y[s] - hat
		if sig.Wrap > 0 {
			e = math.Remainder(e, sig.Wrap)
		}
		for i := range n {
			corr[i] += gain.At(i, s) * e
		}
	}
	from := append([]float64(nil), o.x...)
	if o.src.Form == estimator.Current {
		for i := range n {
			from[i] += corr[i]
		}
	}
	next := make([]float64, n)
	for i := range n {
		for j := range n {
			next[i] += md.A.At(i, j) * from[j]
		}
		for j := range m {
			next[i] += md.B.At(i, j) * o.u[j]
		}
		if o.src.Form == estimator.Prediction {
			next[i] += corr[i]
		}
	}
	o.x = next
	out := next
	if o.src.Form == estimator.Current {
		out = from
	}
	abs := make([]float64, n)
	for i := range abs {
		abs[i] = out[i] + o.src.States[i].Offset
	}
	return abs
}
