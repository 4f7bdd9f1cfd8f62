package emit

import (
	"strings"

	"polewright/estimator"
)

// cHeader returns the estimator as one C99 header: no library, no allocation,
// fixed loops; the caller owns the state.
func cHeader(p *program) []byte {
	var w writer
	w.cComment(headNotes(p, "State estimator in C99. Include it where it is used; it needs no library and no other file."))
	upper := strings.ToUpper(p.prefix)
	w.line("#ifndef %s_H\n#define %s_H\n", upper, upper)
	if p.arithmetic == Fixed {
		w.line("#include <stdint.h>\n")
	}
	w.line("#if defined(__FAST_MATH__) || (defined(__FINITE_MATH_ONLY__) && __FINITE_MATH_ONLY__ > 0)\n#error \"compile without -ffast-math: samples that are not a number must be told apart\"\n#endif\n")
	w.line("typedef %s %s_real;\n", p.cType(), p.prefix)
	w.line("enum {")
	w.line("    %s_STATES = %d,\n    %s_INPUTS = %d,\n    %s_SENSORS = %d\n};\n", upper, p.n, upper, p.m, upper, p.p)
	w.cIndices(p, "Places in the arrays of states", "X", p.states)
	w.cIndices(p, "Places in the arrays of inputs", "U", p.inputs)
	w.cIndices(p, "Places in the arrays of sensors", "Y", p.sensors)
	w.cStruct(p)
	if p.arithmetic == Fixed {
		w.cFixedHelpers(p)
	} else {
		w.cHelpers(p)
	}
	w.cInit(p)
	if p.m > 0 {
		w.cInput(p)
	}
	w.cInnovations(p)
	if p.form == estimator.Current {
		w.cCurrent(p)
	} else {
		w.cPrediction(p)
	}
	w.line("#endif")
	return w.Bytes()
}

// cType is the C number type.
func (p *program) cType() string {
	switch p.arithmetic {
	case Float:
		return "float"
	case Fixed:
		return "int32_t"
	}
	return "double"
}

func (w *writer) cComment(lines []string) {
	w.line("/*")
	for _, l := range lines {
		w.line("%s", strings.TrimRight(" * "+l, " "))
	}
	w.line(" */")
}

func (w *writer) cIndices(p *program, what, class string, signals []named) {
	if len(signals) == 0 {
		return
	}
	w.line("/* %s. */\nenum {", what)
	for i, s := range signals {
		comma := ","
		if i == len(signals)-1 {
			comma = ""
		}
		w.line("    %s_%s_%s = %d%s /* %s */", strings.ToUpper(p.prefix), class, strings.ToUpper(s.id), i, comma, s.describe())
	}
	w.line("};\n")
}

func (w *writer) cStruct(p *program) {
	at := "of the next sample, x[k+1|k]"
	if p.form == estimator.Current {
		at = "of the newest sample, x[k|k]"
	}
	reaction := "all were reset"
	if p.arithmetic == Fixed {
		reaction = "it was cut to that"
	}
	w.put(p, `
/* One estimator. The caller owns it, $PRE_init fills it. */
typedef struct {
    $PRE_real estimate[$UP_STATES];    /* absolute, $AT */
    $PRE_real innovation[$UP_SENSORS]; /* of the last sample, 0 where left out */
    unsigned char used[$UP_SENSORS]; /* 1: sample used; 0: missing or rejected */
    unsigned char fault; /* 1: a state left +-$LIMIT and $REACTION; cleared by init and start */
    $PRE_real x[$UP_STATES]; /* private: deviation from the operating point */
`, "$AT", at, "$LIMIT", p.limitText(), "$REACTION", reaction)
	if p.m > 0 {
		w.put(p, "    $PRE_real du[$UP_INPUTS]; /* private: last good input, as deviation */\n")
	}
	w.put(p, "} $PRE_estimator;\n\n")
}

// put writes a block with the program's prefix for $PRE and, in upper
// case with its underscore, for $UP_.
func (w *writer) put(p *program, block string, pairs ...string) {
	pairs = append(pairs, "$PRE", p.prefix, "$UP_", p.upper())
	if p.arithmetic == Fixed {
		pairs = append(pairs, "$WIDE", "int64_t", "$TO64", "(int64_t)", "$SCALED", p.prefix+"_scaled(acc)",
			"$LIFTED", "s->x[i] * "+p.one(p.tableBits), "$DEVIATION", p.prefix+"_clamp((int64_t)u[i] - u0[i])")
	} else {
		pairs = append(pairs, "$WIDE", p.prefix+"_real", "$TO64", "", "$SCALED", "acc",
			"$LIFTED", "s->x[i]", "$DEVIATION", "u[i] - u0[i]")
	}
	w.lines(block, pairs...)
}

// upper is the prefix of macros and constants.
func (p *program) upper() string { return strings.ToUpper(p.prefix) + "_" }

// cTable writes a constant table, one row of a matrix per group of lines.
func (w *writer) cTable(p *program, name, size string, v []float64, cols int) {
	w.put(p, "    static const $PRE_real $NAME[$SIZE] = {\n", "$NAME", name, "$SIZE", size)
	w.table(v, chunk(cols), "        ", p.cNumber)
	w.line("    };")
}

// cMatrix writes a table of coefficients, cSeries one of signals.
func (w *writer) cMatrix(p *program, name, rows, cols string, v []float64, nc int) {
	w.cRows(p, name, rows, cols, v, nc, p.cEntry)
}

func (w *writer) cSeries(p *program, name, cols string, v []float64, nc int) {
	w.cRows(p, name, "TEST_STEPS", cols, v, nc, p.cNumber)
}

func (w *writer) cRows(p *program, name, rows, cols string, v []float64, nc int, number func(float64) string) {
	w.put(p, "    static const $PRE_real $NAME[$UP_$ROWS][$UP_$COLS] = {\n", "$NAME", name, "$ROWS", rows, "$COLS", cols)
	nr := len(v) / nc
	for i := range nr {
		w.WriteString("        {\n")
		w.table(row(v, i, nc), chunk(nc), "            ", number)
		if i < nr-1 {
			w.WriteString("        },\n")
		} else {
			w.WriteString("        }\n")
		}
	}
	w.line("    };")
}

func (w *writer) cHelpers(p *program) {
	w.put(p, `
/* True for a number within the limit; false for NaN and infinities. */
static inline int $PRE_sound($PRE_real v)
{
    return v >= -$LIMIT && v <= $LIMIT;
}

/* Takes a new state over, or resets all to the operating point where one is
 * not sound. */
static inline void $PRE_accept($PRE_estimator *s, const $PRE_real next[$UP_STATES])
{
    int i;
    int sound = 1;
    for (i = 0; i < $UP_STATES; i++) {
        if (!$PRE_sound(next[i])) {
            sound = 0;
        }
    }
    for (i = 0; i < $UP_STATES; i++) {
        s->x[i] = sound ? next[i] : $ZERO;
    }
    if (!sound) {
        s->fault = 1;
    }
}

`, "$LIMIT", p.cNumber(p.limit()), "$ZERO", p.cNumber(0))
	w.put(p, `
/* Writes the absolute estimate. */
static inline void $PRE_publish($PRE_estimator *s)
{
`)
	w.cTable(p, "x0", strings.ToUpper(p.prefix)+"_STATES", p.x0, p.n)
	w.put(p, `
    int i;
    for (i = 0; i < $UP_STATES; i++) {
        s->estimate[i] = x0[i] + s->x[i];
    }
}

`)
}

func (w *writer) cInit(p *program) {
	inputs := ""
	if p.m > 0 {
		inputs = "    for (i = 0; i < $UP_INPUTS; i++) {\n        s->du[i] = $ZERO;\n    }\n"
	}
	pairs := []string{"$INPUTS\n", strings.NewReplacer("$UP_", strings.ToUpper(p.prefix)+"_", "$ZERO", p.cNumber(0)).Replace(inputs), "$ZERO", p.cNumber(0)}
	w.put(p, `
/* Starts at the operating point. */
static inline void $PRE_init($PRE_estimator *s)
{
    int i;
    for (i = 0; i < $UP_STATES; i++) {
        s->x[i] = $ZERO;
    }
$INPUTS
    for (i = 0; i < $UP_SENSORS; i++) {
        s->innovation[i] = $ZERO;
        s->used[i] = 0;
    }
    s->fault = 0;
    $PRE_publish(s);
}

/* Starts at given absolute states. */
static inline void $PRE_start($PRE_estimator *s, const $PRE_real state[$UP_STATES])
{
`, pairs...)
	w.cTable(p, "x0", strings.ToUpper(p.prefix)+"_STATES", p.x0, p.n)
	w.put(p, `
    $WIDE next[$UP_STATES];
    int i;
    $PRE_init(s);
    for (i = 0; i < $UP_STATES; i++) {
        next[i] = $TO64state[i] - x0[i];
    }
    $PRE_accept(s, next);
    $PRE_publish(s);
}

`)
}

func (w *writer) cInput(p *program) {
	w.put(p, `
/* Private: takes the input; one that is not sound leaves the last good one. */
static inline void $PRE_take_input($PRE_estimator *s, const $PRE_real u[$UP_INPUTS])
{
`)
	w.cTable(p, "u0", strings.ToUpper(p.prefix)+"_INPUTS", p.u0, p.m)
	w.put(p, `
    int i;
    for (i = 0; i < $UP_INPUTS; i++) {
        if ($PRE_sound(u[i])) {
            s->du[i] = $DEVIATION;
        }
    }
}

`)
}
