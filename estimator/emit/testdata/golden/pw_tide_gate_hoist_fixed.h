/*
 * State estimator in C99. Include it where it is used; it needs no library and no other file.
 *
 * Plant:      Tide gate hoist
 * Candidate:  fixed
 * Plant file SHA-256:   0f0f0f0f0f0f0f0f0f0f0f0f0f0f0f0f0f0f0f0f0f0f0f0f0f0f0f0f0f0f0f0f
 * Session file SHA-256: a5a5a5a5a5a5a5a5a5a5a5a5a5a5a5a5a5a5a5a5a5a5a5a5a5a5a5a5a5a5a5a5
 * Made by polewright 1.0. Generated: change the design, not this file.
 *
 * 2 states, 1 inputs, 1 sensors; prediction form: the estimate after sample k is of sample k+1.
 * Sample period 0.0625 s. Values going in and out are absolute.
 *
 * Cautions:
 * - Try it first at low energy, with independent limits and stops that do not depend on
 *   the estimate.
 * - Feed it the input that is really applied, after saturation and rate limits.
 * - Call it once per sample, every 0.0625 s; another rate is another estimator.
 * - Start from the first measurement, or wait out the settle time before a loop is
 *   closed on the estimate.
 * - A sample that is missing, not a number or outside its range is left out and the
 *   estimate runs on the model alone; watch the used flags.
 * - An input that is not a number is replaced by its last good value.
 * - Compilers must keep NaN comparisons (no fast-math).
 * - Local codes and licensed practice decide.
 * - Fixed point Q11.20: a signal of one unit is 1048576 counts, signals saturate at
 *   2147483647 counts; tables have 29 fraction bits. The tolerance of the self-test says
 *   how far rounding may move each state.
 * - The speed is seen through the position alone.
 */
#ifndef PW_TIDE_GATE_HOIST_FIXED_H
#define PW_TIDE_GATE_HOIST_FIXED_H

#include <stdint.h>

#if defined(__FAST_MATH__) || (defined(__FINITE_MATH_ONLY__) && __FINITE_MATH_ONLY__ > 0)
#error "compile without -ffast-math: samples that are not a number must be told apart"
#endif

typedef int32_t pw_tide_gate_hoist_fixed_real;

enum {
    PW_TIDE_GATE_HOIST_FIXED_STATES = 2,
    PW_TIDE_GATE_HOIST_FIXED_INPUTS = 1,
    PW_TIDE_GATE_HOIST_FIXED_SENSORS = 1
};

/* Places in the arrays of states. */
enum {
    PW_TIDE_GATE_HOIST_FIXED_X_GATE_POSITION = 0, /* gate position [m] */
    PW_TIDE_GATE_HOIST_FIXED_X_GATE_SPEED = 1 /* gate speed [m/s] */
};

/* Places in the arrays of inputs. */
enum {
    PW_TIDE_GATE_HOIST_FIXED_U_CABLE_FORCE = 0 /* cable force [N] */
};

/* Places in the arrays of sensors. */
enum {
    PW_TIDE_GATE_HOIST_FIXED_Y_RAIL_ENCODER = 0 /* rail encoder [m] */
};

/* One estimator. The caller owns it, pw_tide_gate_hoist_fixed_init fills it. */
typedef struct {
    pw_tide_gate_hoist_fixed_real estimate[PW_TIDE_GATE_HOIST_FIXED_STATES];    /* absolute, of the next sample, x[k+1|k] */
    pw_tide_gate_hoist_fixed_real innovation[PW_TIDE_GATE_HOIST_FIXED_SENSORS]; /* of the last sample, 0 where left out */
    unsigned char used[PW_TIDE_GATE_HOIST_FIXED_SENSORS]; /* 1: sample used; 0: missing or rejected */
    unsigned char fault; /* 1: a state left +-2147483647 and it was cut to that; cleared by init and start */
    pw_tide_gate_hoist_fixed_real x[PW_TIDE_GATE_HOIST_FIXED_STATES]; /* private: deviation from the operating point */
    pw_tide_gate_hoist_fixed_real du[PW_TIDE_GATE_HOIST_FIXED_INPUTS]; /* private: last good input, as deviation */
} pw_tide_gate_hoist_fixed_estimator;

/* True within +-2147483647. INT32_MIN stands for "not a number". */
static inline int pw_tide_gate_hoist_fixed_sound(int64_t v)
{
    return v >= -2147483647 && v <= 2147483647;
}

/* The nearest value that 32 bits hold. */
static inline int32_t pw_tide_gate_hoist_fixed_clamp(int64_t v)
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
static inline int64_t pw_tide_gate_hoist_fixed_scaled(int64_t sum)
{
    return sum >= 0 ? (sum + (int64_t)268435456) >> 29 : -((-sum + (int64_t)268435456) >> 29);
}

/* Takes a new state over; one that does not fit saturates. */
static inline void pw_tide_gate_hoist_fixed_accept(pw_tide_gate_hoist_fixed_estimator *s, const int64_t next[PW_TIDE_GATE_HOIST_FIXED_STATES])
{
    int i;
    for (i = 0; i < PW_TIDE_GATE_HOIST_FIXED_STATES; i++) {
        if (!pw_tide_gate_hoist_fixed_sound(next[i])) {
            s->fault = 1;
        }
        s->x[i] = pw_tide_gate_hoist_fixed_clamp(next[i]);
    }
}

/* Writes the absolute estimate. */
static inline void pw_tide_gate_hoist_fixed_publish(pw_tide_gate_hoist_fixed_estimator *s)
{
    static const pw_tide_gate_hoist_fixed_real x0[PW_TIDE_GATE_HOIST_FIXED_STATES] = {
        1310720, 0
    };
    int i;
    for (i = 0; i < PW_TIDE_GATE_HOIST_FIXED_STATES; i++) {
        s->estimate[i] = pw_tide_gate_hoist_fixed_clamp((int64_t)x0[i] + s->x[i]);
    }
}

/* Starts at the operating point. */
static inline void pw_tide_gate_hoist_fixed_init(pw_tide_gate_hoist_fixed_estimator *s)
{
    int i;
    for (i = 0; i < PW_TIDE_GATE_HOIST_FIXED_STATES; i++) {
        s->x[i] = 0;
    }
    for (i = 0; i < PW_TIDE_GATE_HOIST_FIXED_INPUTS; i++) {
        s->du[i] = 0;
    }
    for (i = 0; i < PW_TIDE_GATE_HOIST_FIXED_SENSORS; i++) {
        s->innovation[i] = 0;
        s->used[i] = 0;
    }
    s->fault = 0;
    pw_tide_gate_hoist_fixed_publish(s);
}

/* Starts at given absolute states. */
static inline void pw_tide_gate_hoist_fixed_start(pw_tide_gate_hoist_fixed_estimator *s, const pw_tide_gate_hoist_fixed_real state[PW_TIDE_GATE_HOIST_FIXED_STATES])
{
    static const pw_tide_gate_hoist_fixed_real x0[PW_TIDE_GATE_HOIST_FIXED_STATES] = {
        1310720, 0
    };
    int64_t next[PW_TIDE_GATE_HOIST_FIXED_STATES];
    int i;
    pw_tide_gate_hoist_fixed_init(s);
    for (i = 0; i < PW_TIDE_GATE_HOIST_FIXED_STATES; i++) {
        next[i] = (int64_t)state[i] - x0[i];
    }
    pw_tide_gate_hoist_fixed_accept(s, next);
    pw_tide_gate_hoist_fixed_publish(s);
}

/* Private: takes the input; one that is not sound leaves the last good one. */
static inline void pw_tide_gate_hoist_fixed_take_input(pw_tide_gate_hoist_fixed_estimator *s, const pw_tide_gate_hoist_fixed_real u[PW_TIDE_GATE_HOIST_FIXED_INPUTS])
{
    static const pw_tide_gate_hoist_fixed_real u0[PW_TIDE_GATE_HOIST_FIXED_INPUTS] = {
        4194304
    };
    int i;
    for (i = 0; i < PW_TIDE_GATE_HOIST_FIXED_INPUTS; i++) {
        if (pw_tide_gate_hoist_fixed_sound(u[i])) {
            s->du[i] = pw_tide_gate_hoist_fixed_clamp((int64_t)u[i] - u0[i]);
        }
    }
}

/* Private: innovation and used flag of every sensor. */
static inline void pw_tide_gate_hoist_fixed_innovate(pw_tide_gate_hoist_fixed_estimator *s, const pw_tide_gate_hoist_fixed_real y[PW_TIDE_GATE_HOIST_FIXED_SENSORS], const unsigned char *missing)
{
    static const pw_tide_gate_hoist_fixed_real y0[PW_TIDE_GATE_HOIST_FIXED_SENSORS] = {
        1310720
    };
    static const pw_tide_gate_hoist_fixed_real low[PW_TIDE_GATE_HOIST_FIXED_SENSORS] = {
        -524288
    };
    static const pw_tide_gate_hoist_fixed_real high[PW_TIDE_GATE_HOIST_FIXED_SENSORS] = {
        3145728
    };
    static const pw_tide_gate_hoist_fixed_real c[PW_TIDE_GATE_HOIST_FIXED_SENSORS][PW_TIDE_GATE_HOIST_FIXED_STATES] = {
        {
            536870912, 0
        }
    };
    int i;
    int j;
    for (i = 0; i < PW_TIDE_GATE_HOIST_FIXED_SENSORS; i++) {
        int64_t e = 0;
        int used = 0;
        if ((missing == 0 || missing[i] == 0) && y[i] >= low[i] && y[i] <= high[i]) {
            used = 1;
            e = ((int64_t)y[i] - y0[i]) * (int64_t)536870912;
            for (j = 0; j < PW_TIDE_GATE_HOIST_FIXED_STATES; j++) {
                e -= (int64_t)c[i][j] * s->x[j];
            }
            e = pw_tide_gate_hoist_fixed_scaled(e);
            if (!pw_tide_gate_hoist_fixed_sound(e)) {
                used = 0;
            }
        }
        s->innovation[i] = used ? (int32_t)e : 0;
        s->used[i] = (unsigned char)used;
    }
}

/* One sample: inputs held from this sample to the next (absolute), samples
 * (absolute), and per sensor 1 where it is missing (null: none is). Afterwards
 * estimate is what the model expects at the next sample. */
static inline void pw_tide_gate_hoist_fixed_step(pw_tide_gate_hoist_fixed_estimator *s, const pw_tide_gate_hoist_fixed_real u[PW_TIDE_GATE_HOIST_FIXED_INPUTS], const pw_tide_gate_hoist_fixed_real y[PW_TIDE_GATE_HOIST_FIXED_SENSORS], const unsigned char *missing)
{
    static const pw_tide_gate_hoist_fixed_real a[PW_TIDE_GATE_HOIST_FIXED_STATES][PW_TIDE_GATE_HOIST_FIXED_STATES] = {
        {
            536870912, 33554432
        },
        {
            -134217728, 469762048
        }
    };
    static const pw_tide_gate_hoist_fixed_real b[PW_TIDE_GATE_HOIST_FIXED_STATES][PW_TIDE_GATE_HOIST_FIXED_INPUTS] = {
        {
            67108864
        },
        {
            268435456
        }
    };
    static const pw_tide_gate_hoist_fixed_real gain[PW_TIDE_GATE_HOIST_FIXED_STATES][PW_TIDE_GATE_HOIST_FIXED_SENSORS] = {
        {
            293601280
        },
        {
            285212672
        }
    };
    int64_t next[PW_TIDE_GATE_HOIST_FIXED_STATES];
    int i;
    int j;
    pw_tide_gate_hoist_fixed_take_input(s, u);
    pw_tide_gate_hoist_fixed_innovate(s, y, missing);
    for (i = 0; i < PW_TIDE_GATE_HOIST_FIXED_STATES; i++) {
        int64_t acc = 0;
        for (j = 0; j < PW_TIDE_GATE_HOIST_FIXED_STATES; j++) {
            acc += (int64_t)a[i][j] * s->x[j];
        }
        for (j = 0; j < PW_TIDE_GATE_HOIST_FIXED_INPUTS; j++) {
            acc += (int64_t)b[i][j] * s->du[j];
        }
        for (j = 0; j < PW_TIDE_GATE_HOIST_FIXED_SENSORS; j++) {
            acc += (int64_t)gain[i][j] * s->innovation[j];
        }
        next[i] = pw_tide_gate_hoist_fixed_scaled(acc);
    }
    pw_tide_gate_hoist_fixed_accept(s, next);
    pw_tide_gate_hoist_fixed_publish(s);
}

#endif
