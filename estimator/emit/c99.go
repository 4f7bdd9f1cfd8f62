package emit

import (
	"fmt"
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
	w.line("#if defined(__FAST_MATH__) || (defined(__FINITE_MATH_ONLY__) && __FINITE_MATH_ONLY__ > 0)\n#error \"compile without -ffast-math: samples that are not a number must be told apart\"\n#endif\n")
	w.line("typedef %s %s_real;\n", p.cType(), p.prefix)
	w.line("enum {")
	w.line("    %s_STATES = %d,\n    %s_INPUTS = %d,\n    %s_SENSORS = %d\n};\n", upper, p.n, upper, p.m, upper, p.p)
	w.cIndices(p, "Places in the arrays of states", "X", p.states)
	w.cIndices(p, "Places in the arrays of inputs", "U", p.inputs)
	w.cIndices(p, "Places in the arrays of sensors", "Y", p.sensors)
	w.cStruct(p)
	w.cHelpers(p)
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
	if p.arithmetic == Float {
		return "float"
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
	w.put(p, `
/* One estimator. The caller owns it, $PRE_init fills it. */
typedef struct {
    $PRE_real estimate[$UP_STATES];    /* absolute, $AT */
    $PRE_real innovation[$UP_SENSORS]; /* of the last sample, 0 where left out */
    unsigned char used[$UP_SENSORS]; /* 1: sample used; 0: missing or rejected */
    unsigned char fault; /* 1: a state left +-$LIMIT and all were reset; cleared by init and start */
    $PRE_real x[$UP_STATES]; /* private: deviation from the operating point */
`, "$AT", at, "$LIMIT", p.limitText())
	if p.m > 0 {
		w.put(p, "    $PRE_real du[$UP_INPUTS]; /* private: last good input, as deviation */\n")
	}
	w.put(p, "} $PRE_estimator;\n\n")
}

// put writes a block with the program's prefix for $PRE and, in upper
// case with its underscore, for $UP_.
func (w *writer) put(p *program, block string, pairs ...string) {
	w.lines(block, append([]string{"$PRE", p.prefix, "$UP_", strings.ToUpper(p.prefix) + "_"}, pairs...)...)
}

// cTable writes a constant table, one row of a matrix per group of lines.
func (w *writer) cTable(p *program, name, size string, v []float64, cols int) {
	w.put(p, "    static const $PRE_real $NAME[$SIZE] = {\n", "$NAME", name, "$SIZE", size)
	w.table(v, chunk(cols), "        ", p.cNumber)
	w.line("    };")
}

func (w *writer) cMatrix(p *program, name, rows, cols string, v []float64, nc int) {
	w.put(p, "    static const $PRE_real $NAME[$UP_$ROWS][$UP_$COLS] = {\n", "$NAME", name, "$ROWS", rows, "$COLS", cols)
	nr := len(v) / nc
	for i := range nr {
		w.WriteString("        {\n")
		w.table(row(v, i, nc), chunk(nc), "            ", p.cNumber)
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
    $PRE_real next[$UP_STATES];
    int i;
    $PRE_init(s);
    for (i = 0; i < $UP_STATES; i++) {
        next[i] = state[i] - x0[i];
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
            s->du[i] = u[i] - u0[i];
        }
    }
}

`)
}

func (w *writer) cInnovations(p *program) {
	w.put(p, `
/* Private: innovation and used flag of every sensor. */
static inline void $PRE_innovate($PRE_estimator *s, const $PRE_real y[$UP_SENSORS], const unsigned char *missing)
{
`)
	sensors := strings.ToUpper(p.prefix) + "_SENSORS"
	w.cTable(p, "y0", sensors, p.y0, p.p)
	w.cTable(p, "low", sensors, p.low, p.p)
	w.cTable(p, "high", sensors, p.high, p.p)
	if p.hasWrap {
		w.cTable(p, "wrap", sensors, p.wrap, p.p)
	}
	w.cMatrix(p, "c", "SENSORS", "STATES", p.c, p.n)
	through, loop := "", ""
	if p.hasD {
		w.cMatrix(p, "d", "SENSORS", "INPUTS", p.d, p.m)
		through = "            for (j = 0; j < $UP_INPUTS; j++) {\n                e -= d[i][j] * s->du[j];\n            }\n"
	}
	if p.hasWrap {
		loop = `            if (wrap[i] > $ZERO) {
                const $PRE_real q = e / wrap[i];
                if (q > -$TURNS && q < $TURNS) {
                    const long turns = (long)(q >= $ZERO ? q + $HALF : q - $HALF);
                    e -= wrap[i] * ($PRE_real)turns;
                } else {
                    used = 0;
                }
            }
`
	}
	names := []string{"$PRE", p.prefix, "$UP_", strings.ToUpper(p.prefix) + "_", "$ZERO", p.cNumber(0),
		"$HALF", p.cNumber(0.5), "$TURNS", p.cNumber(maxTurns)}
	fill := strings.NewReplacer(names...)
	w.lines(`
    int i;
    int j;
    for (i = 0; i < $UP_SENSORS; i++) {
        $PRE_real e = $ZERO;
        int used = 0;
        if ((missing == 0 || missing[i] == 0) && y[i] >= low[i] && y[i] <= high[i]) {
            used = 1;
            e = y[i] - y0[i];
            for (j = 0; j < $UP_STATES; j++) {
                e -= c[i][j] * s->x[j];
            }
$THROUGH
$WRAP
            if (!$PRE_sound(e)) {
                used = 0;
            }
        }
        s->innovation[i] = used ? e : $ZERO;
        s->used[i] = (unsigned char)used;
    }
}

`, append(names, "$THROUGH\n", fill.Replace(through), "$WRAP\n", fill.Replace(loop))...)
}

// cSums writes sums over inputs and sensors into acc.
func cSums(p *program, withGain bool) string {
	s := ""
	if p.m > 0 {
		s += "        for (j = 0; j < $UP_INPUTS; j++) {\n            acc += b[i][j] * s->du[j];\n        }\n"
	}
	if withGain {
		s += "        for (j = 0; j < $UP_SENSORS; j++) {\n            acc += gain[i][j] * s->innovation[j];\n        }\n"
	}
	return strings.NewReplacer("$UP_", strings.ToUpper(p.prefix)+"_").Replace(s)
}

func (p *program) cInputParam() (param, take string) {
	if p.m == 0 {
		return "", ""
	}
	upper := strings.ToUpper(p.prefix)
	return fmt.Sprintf(" const %s_real u[%s_INPUTS],", p.prefix, upper), fmt.Sprintf("    %s_take_input(s, u);\n", p.prefix)
}

const cAdvance = `
    $PRE_real next[$UP_STATES];
    int i;
    int j;
$TAKE
    for (i = 0; i < $UP_STATES; i++) {
        $PRE_real acc = $ZERO;
        for (j = 0; j < $UP_STATES; j++) {
            acc += a[i][j] * s->x[j];
        }
$SUMS
        next[i] = acc;
    }
    $PRE_accept(s, next);
`

func (w *writer) cPrediction(p *program) {
	param, take := p.cInputParam()
	w.put(p, `
/* One sample: inputs held from this sample to the next (absolute), samples
 * (absolute), and per sensor 1 where it is missing (null: none is). Afterwards
 * estimate is what the model expects at the next sample. */
static inline void $PRE_step($PRE_estimator *s,$PARAM const $PRE_real y[$UP_SENSORS], const unsigned char *missing)
{
`, "$PARAM", param)
	w.cMatrix(p, "a", "STATES", "STATES", p.a, p.n)
	if p.m > 0 {
		w.cMatrix(p, "b", "STATES", "INPUTS", p.b, p.m)
	}
	w.cMatrix(p, "gain", "STATES", "SENSORS", p.gain, p.p)
	take += fmt.Sprintf("    %s_innovate(s, y, missing);\n", p.prefix)
	w.put(p, cAdvance, "$TAKE\n", take, "$SUMS\n", cSums(p, true), "$ZERO", p.cNumber(0))
	w.put(p, "    $PRE_publish(s);\n}\n\n")
}

func (w *writer) cCurrent(p *program) {
	param, take := p.cInputParam()
	early, pass := "", ""
	note := "samples (absolute)"
	if p.hasD {
		early, pass = param, " u,"
		note = "inputs acting at this sample and samples (absolute)"
	}
	w.put(p, `
/* First half of a sample: $NOTE,
 * and per sensor 1 where it is missing (null: none is). Afterwards estimate is that of this sample, for the
 * controller to use. */
static inline void $PRE_correct($PRE_estimator *s,$PARAM const $PRE_real y[$UP_SENSORS], const unsigned char *missing)
{
`, "$PARAM", early, "$NOTE", note)
	w.cMatrix(p, "gain", "STATES", "SENSORS", p.gain, p.p)
	if !p.hasD {
		take = ""
	}
	w.put(p, `
    $PRE_real next[$UP_STATES];
    int i;
    int j;
$TAKE
    $PRE_innovate(s, y, missing);
    for (i = 0; i < $UP_STATES; i++) {
        $PRE_real acc = s->x[i];
        for (j = 0; j < $UP_SENSORS; j++) {
            acc += gain[i][j] * s->innovation[j];
        }
        next[i] = acc;
    }
    $PRE_accept(s, next);
    $PRE_publish(s);
}

`, "$TAKE\n", take)
	params, take := p.cInputParam()
	params = strings.TrimSuffix(params, ",")
	if params != "" {
		params = "," + params
	}
	w.put(p, `
/* Second half: the inputs held from this sample to the next (absolute).
 * estimate stays that of this sample. */
static inline void $PRE_predict($PRE_estimator *s$PARAMS)
{
`, "$PARAMS", params)
	w.cMatrix(p, "a", "STATES", "STATES", p.a, p.n)
	if p.m > 0 {
		w.cMatrix(p, "b", "STATES", "INPUTS", p.b, p.m)
	}
	w.put(p, cAdvance, "$TAKE\n", take, "$SUMS\n", cSums(p, false), "$ZERO", p.cNumber(0))
	call := ""
	if p.m > 0 {
		call = ", u"
	}
	w.put(p, `
}

/* Both halves, where the inputs do not wait for the estimate. */
static inline void $PRE_step($PRE_estimator *s,$PARAM const $PRE_real y[$UP_SENSORS], const unsigned char *missing)
{
    $PRE_correct(s,$PASS y, missing);
    $PRE_predict(s$CALL);
}

`, "$PARAM", param, "$PASS", pass, "$CALL", call)
}
