package emit

import "strings"

// stSelfTest returns a PROGRAM that runs the block over the test's samples in
// its first cycle.
func stSelfTest(p *program, t *selfTest) []byte {
	var w writer
	w.stComment(append(headNotes(p, "Self-test of the function block in "+p.prefix+".st."), "",
		"After the first cycle done is TRUE; passed tells the result, failed_at the number of the",
		"first bad sample, counted from 1.",
		"Expected values: the same estimator in double precision with the design's own numbers.",
		"Tolerance: an upper bound on what rounding can do in these samples, per state.",
		"Values of 4E+30 (REAL) and 4E+300 (LREAL) stand for samples and inputs to be rejected."))
	w.line("\nPROGRAM %s_selftest", p.prefix)
	w.line("VAR_OUTPUT\n    done : BOOL := FALSE;\n    passed : BOOL := FALSE;\n    failed_at : DINT := 0;\nEND_VAR")
	w.line("VAR CONSTANT")
	if p.m > 0 {
		w.stTable(p, "t_u", p.withoutNaN(t.u), p.m)
	}
	w.stTable(p, "t_y", p.withoutNaN(t.y), p.p)
	w.stBools("t_missing", flags(t.missing), p.p)
	w.stBools("t_used", flags(t.used), p.p)
	w.stTable(p, "t_expected", flatten(t.expected), p.n)
	w.stTable(p, "t_tolerance", t.tolerance, p.n)
	w.line("END_VAR\nVAR\n    est : %s_estimator;\n    good : BOOL;\n    k : DINT;\nEND_VAR\n", p.prefix)
	w.line("IF NOT done THEN\n    passed := TRUE;\n    FOR k := 0 TO %d DO", t.steps-1)
	w.stCall(p)
	w.line("        good := TRUE;")
	for j, s := range p.sensors {
		w.line("        IF est.q_%s <> t_used[k * %d + %d] THEN\n            good := FALSE;\n        END_IF;", s.id, p.p, j)
	}
	for i, s := range p.states {
		w.line("        IF NOT (ABS(est.x_%s - t_expected[k * %d + %d]) <= t_tolerance[%d]) THEN\n            good := FALSE;\n        END_IF;", s.id, p.n, i, i)
	}
	w.line(`        IF passed AND (NOT good) THEN
            passed := FALSE;
            failed_at := k + 1;
        END_IF;
    END_FOR;
    IF est.fault THEN
        passed := FALSE;
    END_IF;
    done := TRUE;
END_IF;
END_PROGRAM`)
	return w.Bytes()
}

// stCall calls the block with the samples of step k.
func (w *writer) stCall(p *program) {
	var args []string
	arg := func(class, id, table string, count, at int) {
		args = append(args, class+id+" := "+table+"[k * "+full(float64(count))+" + "+full(float64(at))+"]")
	}
	for j, s := range p.inputs {
		arg("u_", s.id, "t_u", p.m, j)
	}
	for j, s := range p.sensors {
		arg("y_", s.id, "t_y", p.p, j)
		arg("m_", s.id, "t_missing", p.p, j)
	}
	w.line("        est(\n            %s);", strings.Join(args, ",\n            "))
}

func (w *writer) stBools(name string, v []int, cols int) {
	w.line("    %s : ARRAY [0..%d] OF BOOL := [", name, len(v)-1)
	f := make([]float64, len(v))
	for i, x := range v {
		f[i] = float64(x)
	}
	w.table(f, max(1, min(cols, 12)), "        ", func(x float64) string {
		if x != 0 {
			return "TRUE"
		}
		return "FALSE"
	})
	w.line("    ];")
}
