package emit

import (
	"fmt"
	"strings"
)

// cInnovations writes the function that compares samples with the model.
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
	turns := ""
	if p.arithmetic != Fixed {
		turns = p.cNumber(maxTurns)
	}
	names := []string{"$PRE", p.prefix, "$UP_", strings.ToUpper(p.prefix) + "_", "$ZERO", p.cNumber(0),
		"$HALF", p.cNumber(0.5), "$TURNS", turns}
	block := cInnovationLoop
	if p.arithmetic == Fixed {
		through = strings.ReplaceAll(through, "d[i][j]", "(int64_t)d[i][j]")
		if p.hasWrap {
			loop = cFixedWrap
		}
		names = append(names, "$ONE", p.one(p.tableBits))
		block = cFixedInnovations
	}
	fill := strings.NewReplacer(names...)
	w.lines(block, append(names, "$THROUGH\n", fill.Replace(through), "$WRAP\n", fill.Replace(loop))...)
}

const cInnovationLoop = `
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

`

// cSums writes sums over inputs and sensors into acc.
func cSums(p *program, withGain bool) string {
	s := ""
	if p.m > 0 {
		s += "        for (j = 0; j < $UP_INPUTS; j++) {\n            acc += $TO64b[i][j] * s->du[j];\n        }\n"
	}
	if withGain {
		s += "        for (j = 0; j < $UP_SENSORS; j++) {\n            acc += $TO64gain[i][j] * s->innovation[j];\n        }\n"
	}
	wide := ""
	if p.arithmetic == Fixed {
		wide = "(int64_t)"
	}
	return strings.NewReplacer("$UP_", p.upper(), "$TO64", wide).Replace(s)
}

func (p *program) cInputParam() (param, take string) {
	if p.m == 0 {
		return "", ""
	}
	upper := strings.ToUpper(p.prefix)
	return fmt.Sprintf(" const %s_real u[%s_INPUTS],", p.prefix, upper), fmt.Sprintf("    %s_take_input(s, u);\n", p.prefix)
}

const cAdvance = `
    $WIDE next[$UP_STATES];
    int i;
    int j;
$TAKE
    for (i = 0; i < $UP_STATES; i++) {
        $WIDE acc = $ZERO;
        for (j = 0; j < $UP_STATES; j++) {
            acc += $TO64a[i][j] * s->x[j];
        }
$SUMS
        next[i] = $SCALED;
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
    $WIDE next[$UP_STATES];
    int i;
    int j;
$TAKE
    $PRE_innovate(s, y, missing);
    for (i = 0; i < $UP_STATES; i++) {
        $WIDE acc = $TO64$LIFTED;
        for (j = 0; j < $UP_SENSORS; j++) {
            acc += $TO64gain[i][j] * s->innovation[j];
        }
        next[i] = $SCALED;
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
