package emit

import (
	"fmt"
	"strings"

	"polewright/estimator"
)

// stBlock returns the estimator as one IEC 61131-3 function block. Identifiers
// made of signal names carry a class prefix: u_ input, y_ sample, m_ missing
// flag, s_ start value, x_ estimate, e_ innovation, q_ used flag.
func stBlock(p *program) []byte {
	var w writer
	w.stComment(headNotes(p, "State estimator in IEC 61131-3 structured text. Call it once per sample in a cyclic task."))
	w.line("\nFUNCTION_BLOCK %s_estimator", p.prefix)
	w.stInputs(p)
	w.stOutputs(p)
	w.stTables(p)
	w.stLocals(p)
	w.stBody(p)
	w.line("END_FUNCTION_BLOCK")
	return w.Bytes()
}

// stType is the structured text's number type.
func (p *program) stType() string {
	if p.arithmetic == Float {
		return "REAL"
	}
	return "LREAL"
}

func (w *writer) stComment(lines []string) {
	w.line("(*")
	for _, l := range lines {
		w.line("%s", strings.TrimRight("  "+l, " "))
	}
	w.line("*)")
}

func (w *writer) stInputs(p *program) {
	w.line("VAR_INPUT")
	for i, s := range p.inputs {
		w.line("    u_%s : %s := %s; (* %s: held from this sample to the next *)", s.id, p.stType(), p.stNumber(p.u0[i]), s.describe())
	}
	for i, s := range p.sensors {
		w.line("    y_%s : %s := %s; (* %s: newest sample *)", s.id, p.stType(), p.stNumber(p.y0[i]), s.describe())
	}
	for _, s := range p.sensors {
		w.line("    m_%s : BOOL := FALSE; (* TRUE: this sample is missing *)", s.id)
	}
	w.line("    reset : BOOL := FALSE; (* TRUE: start from the values below, use no sample *)")
	for i, s := range p.states {
		w.line("    s_%s : %s := %s; (* %s: start value *)", s.id, p.stType(), p.stNumber(p.x0[i]), s.describe())
	}
	if p.form == estimator.Current {
		w.line("    (* Two calls per sample where the controller needs the estimate first: one without")
		w.line("       do_predict, then the inputs are computed, then one without do_correct. *)")
		w.line("    do_correct : BOOL := TRUE;")
		w.line("    do_predict : BOOL := TRUE;")
	}
	w.line("END_VAR")
}

func (w *writer) stOutputs(p *program) {
	w.line("VAR_OUTPUT")
	for i, s := range p.states {
		w.line("    x_%s : %s := %s; (* %s: estimate *)", s.id, p.stType(), p.stNumber(p.x0[i]), s.describe())
	}
	for _, s := range p.sensors {
		w.line("    e_%s : %s := %s; (* innovation %s, 0 where left out *)", s.id, p.stType(), p.stNumber(0), s.unitOf())
	}
	for _, s := range p.sensors {
		w.line("    q_%s : BOOL := FALSE; (* TRUE: sample used *)", s.id)
	}
	w.line("    fault : BOOL := FALSE; (* a state left +-%s and all were reset; cleared by reset *)", p.limitText())
	w.line("END_VAR")
}

// stTables declares the constant tables, matrices row by row.
func (w *writer) stTables(p *program) {
	w.line("VAR CONSTANT")
	w.stTable(p, "t_a", p.a, p.n)
	if p.m > 0 {
		w.stTable(p, "t_b", p.b, p.m)
		w.stTable(p, "t_u0", p.u0, p.m)
	}
	w.stTable(p, "t_c", p.c, p.n)
	if p.hasD {
		w.stTable(p, "t_d", p.d, p.m)
	}
	w.stTable(p, "t_gain", p.gain, p.p)
	w.stTable(p, "t_x0", p.x0, p.n)
	w.stTable(p, "t_y0", p.y0, p.p)
	w.stTable(p, "t_low", p.low, p.p)
	w.stTable(p, "t_high", p.high, p.p)
	if p.hasWrap {
		w.stTable(p, "t_wrap", p.wrap, p.p)
	}
	w.line("    t_limit : %s := %s;", p.stType(), p.stNumber(p.limit()))
	w.line("END_VAR")
}

func (w *writer) stTable(p *program, name string, v []float64, cols int) {
	w.line("    %s : ARRAY [0..%d] OF %s := [", name, len(v)-1, p.stType())
	w.table(v, chunk(cols), "        ", p.stNumber)
	w.line("    ];")
}

func (w *writer) stLocals(p *program) {
	t := p.stType()
	w.line("VAR")
	w.line("    x : ARRAY [0..%d] OF %s; (* deviation from the operating point *)", p.n-1, t)
	w.line("    next : ARRAY [0..%d] OF %s;", p.n-1, t)
	if p.m > 0 {
		w.line("    vu : ARRAY [0..%d] OF %s;", p.m-1, t)
		w.line("    du : ARRAY [0..%d] OF %s; (* last good input, as deviation *)", p.m-1, t)
	}
	w.line("    vy : ARRAY [0..%d] OF %s;", p.p-1, t)
	w.line("    vm : ARRAY [0..%d] OF BOOL;", p.p-1)
	w.line("    ve : ARRAY [0..%d] OF %s;", p.p-1, t)
	w.line("    vq : ARRAY [0..%d] OF BOOL;", p.p-1)
	w.line("    acc : %s;", t)
	if p.hasWrap {
		w.line("    turns : DINT;")
	}
	w.line("    sound : BOOL;")
	w.line("    i : DINT;")
	w.line("    j : DINT;")
	w.line("END_VAR\n")
}

// stBody writes the statements.
func (w *writer) stBody(p *program) {
	w.line("IF reset THEN")
	for i, s := range p.states {
		w.line("    next[%d] := s_%s - t_x0[%d];", i, s.id, i)
	}
	if p.m > 0 {
		w.line("    FOR j := 0 TO %d DO\n        du[j] := %s;\n    END_FOR;", p.m-1, p.stNumber(0))
	}
	w.line("    FOR j := 0 TO %d DO\n        ve[j] := %s;\n        vq[j] := FALSE;\n    END_FOR;", p.p-1, p.stNumber(0))
	w.line("    fault := FALSE;")
	w.stAccept(p)
	w.stPublish(p)
	w.line("ELSE")
	if p.form == estimator.Current {
		w.line("    IF do_correct THEN")
		w.indented(func(w *writer) {
			if p.hasD {
				w.stTakeInput(p)
			}
			w.stInnovate(p)
			w.stCorrect(p)
			w.stAccept(p)
			w.stPublish(p)
		})
		w.line("    END_IF;\n    IF do_predict THEN")
		w.indented(func(w *writer) {
			w.stTakeInput(p)
			w.stAdvance(p)
			w.stAccept(p)
		})
		w.line("    END_IF;")
	} else {
		w.stTakeInput(p)
		w.stInnovate(p)
		w.stAdvance(p)
		w.stAccept(p)
		w.stPublish(p)
	}
	w.line("END_IF;")
	for i, s := range p.sensors {
		w.line("e_%s := ve[%d];\nq_%s := vq[%d];", s.id, i, s.id, i)
	}
}

func (w *writer) stTakeInput(p *program) {
	if p.m == 0 {
		return
	}
	for j, s := range p.inputs {
		w.line("    vu[%d] := u_%s;", j, s.id)
	}
	w.line(`    FOR j := 0 TO %d DO
        IF (vu[j] >= -t_limit) AND (vu[j] <= t_limit) THEN
            du[j] := vu[j] - t_u0[j];
        END_IF;
    END_FOR;`, p.m-1)
}

func (w *writer) stInnovate(p *program) {
	for j, s := range p.sensors {
		w.line("    vy[%d] := y_%s;\n    vm[%d] := m_%s;", j, s.id, j, s.id)
	}
	w.line(`    FOR i := 0 TO %d DO
        ve[i] := %s;
        vq[i] := FALSE;
        IF (NOT vm[i]) AND (vy[i] >= t_low[i]) AND (vy[i] <= t_high[i]) THEN
            vq[i] := TRUE;
            acc := vy[i] - t_y0[i];
            FOR j := 0 TO %d DO
                acc := acc - t_c[i * %d + j] * x[j];
            END_FOR;`, p.p-1, p.stNumber(0), p.n-1, p.n)
	if p.hasD {
		w.line("            FOR j := 0 TO %d DO\n                acc := acc - t_d[i * %d + j] * du[j];\n            END_FOR;", p.m-1, p.m)
	}
	if p.hasWrap {
		w.stWrap(p)
	}
	w.line(`            IF vq[i] AND (acc >= -t_limit) AND (acc <= t_limit) THEN
                ve[i] := acc;
            ELSE
                vq[i] := FALSE;
            END_IF;
        END_IF;
    END_FOR;`)
}

// stWrap works whether the target's conversion rounds or cuts off.
func (w *writer) stWrap(p *program) {
	t := p.stType()
	w.line(`            IF t_wrap[i] > %s THEN
                IF (acc > -%s * t_wrap[i]) AND (acc < %s * t_wrap[i]) THEN
                    turns := %s_TO_DINT(acc / t_wrap[i]);
                    acc := acc - t_wrap[i] * DINT_TO_%s(turns);
                    IF acc > %s * t_wrap[i] THEN
                        acc := acc - t_wrap[i];
                    ELSIF acc < -%s * t_wrap[i] THEN
                        acc := acc + t_wrap[i];
                    END_IF;
                ELSE
                    vq[i] := FALSE;
                END_IF;
            END_IF;`, p.stNumber(0), p.stNumber(maxTurns), p.stNumber(maxTurns), t, t, p.stNumber(0.5), p.stNumber(0.5))
}

func (w *writer) stCorrect(p *program) {
	w.line(`    FOR i := 0 TO %d DO
        acc := x[i];
        FOR j := 0 TO %d DO
            acc := acc + t_gain[i * %d + j] * ve[j];
        END_FOR;
        next[i] := acc;
    END_FOR;`, p.n-1, p.p-1, p.p)
}

func (w *writer) stAdvance(p *program) {
	sum := func(table, vector string, count int) string {
		return fmt.Sprintf(`        FOR j := 0 TO %d DO
            acc := acc + %s[i * %d + j] * %s[j];
        END_FOR;
`, count-1, table, count, vector)
	}
	w.line("    FOR i := 0 TO %d DO\n        acc := %s;", p.n-1, p.stNumber(0))
	w.WriteString(sum("t_a", "x", p.n))
	if p.m > 0 {
		w.WriteString(sum("t_b", "du", p.m))
	}
	if p.form == estimator.Prediction {
		w.WriteString(sum("t_gain", "ve", p.p))
	}
	w.line("        next[i] := acc;\n    END_FOR;")
}

// stAccept takes the new state over or resets it where it is not sound.
func (w *writer) stAccept(p *program) {
	w.line(`    sound := TRUE;
    FOR i := 0 TO %d DO
        IF NOT ((next[i] >= -t_limit) AND (next[i] <= t_limit)) THEN
            sound := FALSE;
        END_IF;
    END_FOR;
    FOR i := 0 TO %d DO
        IF sound THEN
            x[i] := next[i];
        ELSE
            x[i] := %s;
            fault := TRUE;
        END_IF;
    END_FOR;`, p.n-1, p.n-1, p.stNumber(0))
}

func (w *writer) stPublish(p *program) {
	for i, s := range p.states {
		w.line("    x_%s := t_x0[%d] + x[%d];", s.id, i, i)
	}
}
