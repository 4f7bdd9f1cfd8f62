package emit

import (
	"fmt"
	"math"

	"polewright/estimator"
)

// roundTo rounds to a number of fraction bits, halves away from zero.
func roundTo(v float64, bits int) float64 {
	return math.Ldexp(math.Round(math.Ldexp(v, bits)), -bits)
}

// chooseTableBits takes the most fraction bits, at most 30, with which no sum of
// the emitted code can leave 64 bits, whatever the signals: a row of entries
// that sum up to s in size, times signals of 31 bits, needs s·2^bits < 2^32;
// half of that is used, which leaves room for rounding.
func (p *program) chooseTableBits() error {
	most := 0.0
	for i := range p.n {
		sum := size(row(p.a, i, p.n)) + size(row(p.b, i, p.m))
		gain := size(row(p.gain, i, p.p))
		if p.form == estimator.Current {
			most = max(most, sum, 1+gain)
		} else {
			most = max(most, sum+gain)
		}
	}
	for s := range p.p {
		most = max(most, 2+size(row(p.c, s, p.n))+size(row(p.d, s, p.m)))
	}
	for bits := 30; bits >= 1; bits-- {
		if math.Ldexp(most, bits) < 0x1p31 {
			p.tableBits = bits
			return nil
		}
	}
	return fmt.Errorf("%w: a row of the tables sums up to %g, too much for fixed point", ErrValue, most)
}

// size is Σ |vᵢ|.
func size(v []float64) float64 {
	sum := 0.0
	for _, x := range v {
		sum += math.Abs(x)
	}
	return sum
}

// cFixedHelpers are the counterparts of cHelpers in fixed point.
func (w *writer) cFixedHelpers(p *program) {
	w.put(p, `
/* True within +-2147483647. INT32_MIN stands for "not a number". */
static inline int $PRE_sound(int64_t v)
{
    return v >= -2147483647 && v <= 2147483647;
}

/* The nearest value that 32 bits hold. */
static inline int32_t $PRE_clamp(int64_t v)
{
    if (v > 2147483647) {
        return 2147483647;
    }
    if (v < -2147483647) {
        return -2147483647;
    }
    return (int32_t)v;
}

/* Takes the fraction bits of the tables off a sum, to the nearest. */
static inline int64_t $PRE_scaled(int64_t sum)
{
    return sum >= 0 ? (sum + $HALF) >> $BITS : -((-sum + $HALF) >> $BITS);
}

/* Takes a new state over; one that does not fit saturates. */
static inline void $PRE_accept($PRE_estimator *s, const int64_t next[$UP_STATES])
{
    int i;
    for (i = 0; i < $UP_STATES; i++) {
        if (!$PRE_sound(next[i])) {
            s->fault = 1;
        }
        s->x[i] = $PRE_clamp(next[i]);
    }
}

/* Writes the absolute estimate. */
static inline void $PRE_publish($PRE_estimator *s)
{
`, "$HALF", p.one(p.tableBits-1), "$BITS", fmt.Sprint(p.tableBits))
	w.cTable(p, "x0", p.upper()+"STATES", p.x0, p.n)
	w.put(p, `
    int i;
    for (i = 0; i < $UP_STATES; i++) {
        s->estimate[i] = $PRE_clamp((int64_t)x0[i] + s->x[i]);
    }
}

`)
}

// one is 2^bits as a C constant of 64 bits.
func (p *program) one(bits int) string {
	return fmt.Sprintf("(int64_t)%d", int64(1)<<bits)
}

const cFixedInnovations = `
    int i;
    int j;
    for (i = 0; i < $UP_SENSORS; i++) {
        int64_t e = 0;
        int used = 0;
        if ((missing == 0 || missing[i] == 0) && y[i] >= low[i] && y[i] <= high[i]) {
            used = 1;
            e = ((int64_t)y[i] - y0[i]) * $ONE;
            for (j = 0; j < $UP_STATES; j++) {
                e -= (int64_t)c[i][j] * s->x[j];
            }
$THROUGH
            e = $PRE_scaled(e);
$WRAP
            if (!$PRE_sound(e)) {
                used = 0;
            }
        }
        s->innovation[i] = used ? (int32_t)e : 0;
        s->used[i] = (unsigned char)used;
    }
}

`

// cFixedWrap divides 32-bit numbers only: the division of 64-bit numbers is a
// library call on small targets.
const cFixedWrap = `            if (wrap[i] > 0 && $PRE_sound(e)) {
                const uint32_t period = (uint32_t)wrap[i];
                const uint32_t size = (uint32_t)(e >= 0 ? e : -e);
                const uint32_t turns = (size + period / 2) / period;
                const int64_t rest = (int64_t)size - (int64_t)turns * wrap[i];
                e = e >= 0 ? rest : -rest;
            }
`
