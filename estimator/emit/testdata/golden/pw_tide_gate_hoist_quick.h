/*
 * State estimator in C99. Include it where it is used; it needs no library and no other file.
 *
 * Plant:      Tide gate hoist
 * Candidate:  quick
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
 * - The speed is seen through the position alone.
 */
#ifndef PW_TIDE_GATE_HOIST_QUICK_H
#define PW_TIDE_GATE_HOIST_QUICK_H

#if defined(__FAST_MATH__) || (defined(__FINITE_MATH_ONLY__) && __FINITE_MATH_ONLY__ > 0)
#error "compile without -ffast-math: samples that are not a number must be told apart"
#endif

typedef double pw_tide_gate_hoist_quick_real;

enum {
    PW_TIDE_GATE_HOIST_QUICK_STATES = 2,
    PW_TIDE_GATE_HOIST_QUICK_INPUTS = 1,
    PW_TIDE_GATE_HOIST_QUICK_SENSORS = 1
};

/* Places in the arrays of states. */
enum {
    PW_TIDE_GATE_HOIST_QUICK_X_GATE_POSITION = 0, /* gate position [m] */
    PW_TIDE_GATE_HOIST_QUICK_X_GATE_SPEED = 1 /* gate speed [m/s] */
};

/* Places in the arrays of inputs. */
enum {
    PW_TIDE_GATE_HOIST_QUICK_U_CABLE_FORCE = 0 /* cable force [N] */
};

/* Places in the arrays of sensors. */
enum {
    PW_TIDE_GATE_HOIST_QUICK_Y_RAIL_ENCODER = 0 /* rail encoder [m] */
};

/* One estimator. The caller owns it, pw_tide_gate_hoist_quick_init fills it. */
typedef struct {
    pw_tide_gate_hoist_quick_real estimate[PW_TIDE_GATE_HOIST_QUICK_STATES];    /* absolute, of the next sample, x[k+1|k] */
    pw_tide_gate_hoist_quick_real innovation[PW_TIDE_GATE_HOIST_QUICK_SENSORS]; /* of the last sample, 0 where left out */
    unsigned char used[PW_TIDE_GATE_HOIST_QUICK_SENSORS]; /* 1: sample used; 0: missing or rejected */
    unsigned char fault; /* 1: a state left +-1e300 and all were reset; cleared by init and start */
    pw_tide_gate_hoist_quick_real x[PW_TIDE_GATE_HOIST_QUICK_STATES]; /* private: deviation from the operating point */
    pw_tide_gate_hoist_quick_real du[PW_TIDE_GATE_HOIST_QUICK_INPUTS]; /* private: last good input, as deviation */
} pw_tide_gate_hoist_quick_estimator;

/* True for a number within the limit; false for NaN and infinities. */
static inline int pw_tide_gate_hoist_quick_sound(pw_tide_gate_hoist_quick_real v)
{
    return v >= -1.0000000000000001e+300 && v <= 1.0000000000000001e+300;
}

/* Takes a new state over, or resets all to the operating point where one is
 * not sound. */
static inline void pw_tide_gate_hoist_quick_accept(pw_tide_gate_hoist_quick_estimator *s, const pw_tide_gate_hoist_quick_real next[PW_TIDE_GATE_HOIST_QUICK_STATES])
{
    int i;
    int sound = 1;
    for (i = 0; i < PW_TIDE_GATE_HOIST_QUICK_STATES; i++) {
        if (!pw_tide_gate_hoist_quick_sound(next[i])) {
            sound = 0;
        }
    }
    for (i = 0; i < PW_TIDE_GATE_HOIST_QUICK_STATES; i++) {
        s->x[i] = sound ? next[i] : 0.0;
    }
    if (!sound) {
        s->fault = 1;
    }
}

/* Writes the absolute estimate. */
static inline void pw_tide_gate_hoist_quick_publish(pw_tide_gate_hoist_quick_estimator *s)
{
    static const pw_tide_gate_hoist_quick_real x0[PW_TIDE_GATE_HOIST_QUICK_STATES] = {
        1.25, 0.0
    };
    int i;
    for (i = 0; i < PW_TIDE_GATE_HOIST_QUICK_STATES; i++) {
        s->estimate[i] = x0[i] + s->x[i];
    }
}

/* Starts at the operating point. */
static inline void pw_tide_gate_hoist_quick_init(pw_tide_gate_hoist_quick_estimator *s)
{
    int i;
    for (i = 0; i < PW_TIDE_GATE_HOIST_QUICK_STATES; i++) {
        s->x[i] = 0.0;
    }
    for (i = 0; i < PW_TIDE_GATE_HOIST_QUICK_INPUTS; i++) {
        s->du[i] = 0.0;
    }
    for (i = 0; i < PW_TIDE_GATE_HOIST_QUICK_SENSORS; i++) {
        s->innovation[i] = 0.0;
        s->used[i] = 0;
    }
    s->fault = 0;
    pw_tide_gate_hoist_quick_publish(s);
}

/* Starts at given absolute states. */
static inline void pw_tide_gate_hoist_quick_start(pw_tide_gate_hoist_quick_estimator *s, const pw_tide_gate_hoist_quick_real state[PW_TIDE_GATE_HOIST_QUICK_STATES])
{
    static const pw_tide_gate_hoist_quick_real x0[PW_TIDE_GATE_HOIST_QUICK_STATES] = {
        1.25, 0.0
    };
    pw_tide_gate_hoist_quick_real next[PW_TIDE_GATE_HOIST_QUICK_STATES];
    int i;
    pw_tide_gate_hoist_quick_init(s);
    for (i = 0; i < PW_TIDE_GATE_HOIST_QUICK_STATES; i++) {
        next[i] = state[i] - x0[i];
    }
    pw_tide_gate_hoist_quick_accept(s, next);
    pw_tide_gate_hoist_quick_publish(s);
}

/* Private: takes the input; one that is not sound leaves the last good one. */
static inline void pw_tide_gate_hoist_quick_take_input(pw_tide_gate_hoist_quick_estimator *s, const pw_tide_gate_hoist_quick_real u[PW_TIDE_GATE_HOIST_QUICK_INPUTS])
{
    static const pw_tide_gate_hoist_quick_real u0[PW_TIDE_GATE_HOIST_QUICK_INPUTS] = {
        4.0
    };
    int i;
    for (i = 0; i < PW_TIDE_GATE_HOIST_QUICK_INPUTS; i++) {
        if (pw_tide_gate_hoist_quick_sound(u[i])) {
            s->du[i] = u[i] - u0[i];
        }
    }
}

/* Private: innovation and used flag of every sensor. */
static inline void pw_tide_gate_hoist_quick_innovate(pw_tide_gate_hoist_quick_estimator *s, const pw_tide_gate_hoist_quick_real y[PW_TIDE_GATE_HOIST_QUICK_SENSORS], const unsigned char *missing)
{
    static const pw_tide_gate_hoist_quick_real y0[PW_TIDE_GATE_HOIST_QUICK_SENSORS] = {
        1.25
    };
    static const pw_tide_gate_hoist_quick_real low[PW_TIDE_GATE_HOIST_QUICK_SENSORS] = {
        -0.5
    };
    static const pw_tide_gate_hoist_quick_real high[PW_TIDE_GATE_HOIST_QUICK_SENSORS] = {
        3.0
    };
    static const pw_tide_gate_hoist_quick_real c[PW_TIDE_GATE_HOIST_QUICK_SENSORS][PW_TIDE_GATE_HOIST_QUICK_STATES] = {
        {
            1.0, 0.0
        }
    };
    int i;
    int j;
    for (i = 0; i < PW_TIDE_GATE_HOIST_QUICK_SENSORS; i++) {
        pw_tide_gate_hoist_quick_real e = 0.0;
        int used = 0;
        if ((missing == 0 || missing[i] == 0) && y[i] >= low[i] && y[i] <= high[i]) {
            used = 1;
            e = y[i] - y0[i];
            for (j = 0; j < PW_TIDE_GATE_HOIST_QUICK_STATES; j++) {
                e -= c[i][j] * s->x[j];
            }
            if (!pw_tide_gate_hoist_quick_sound(e)) {
                used = 0;
            }
        }
        s->innovation[i] = used ? e : 0.0;
        s->used[i] = (unsigned char)used;
    }
}

/* One sample: inputs held from this sample to the next (absolute), samples
 * (absolute), and per sensor 1 where it is missing (null: none is). Afterwards
 * estimate is what the model expects at the next sample. */
static inline void pw_tide_gate_hoist_quick_step(pw_tide_gate_hoist_quick_estimator *s, const pw_tide_gate_hoist_quick_real u[PW_TIDE_GATE_HOIST_QUICK_INPUTS], const pw_tide_gate_hoist_quick_real y[PW_TIDE_GATE_HOIST_QUICK_SENSORS], const unsigned char *missing)
{
    static const pw_tide_gate_hoist_quick_real a[PW_TIDE_GATE_HOIST_QUICK_STATES][PW_TIDE_GATE_HOIST_QUICK_STATES] = {
        {
            1.0, 0.0625
        },
        {
            -0.25, 0.875
        }
    };
    static const pw_tide_gate_hoist_quick_real b[PW_TIDE_GATE_HOIST_QUICK_STATES][PW_TIDE_GATE_HOIST_QUICK_INPUTS] = {
        {
            0.125
        },
        {
            0.5
        }
    };
    static const pw_tide_gate_hoist_quick_real gain[PW_TIDE_GATE_HOIST_QUICK_STATES][PW_TIDE_GATE_HOIST_QUICK_SENSORS] = {
        {
            0.546875
        },
        {
            0.53125
        }
    };
    pw_tide_gate_hoist_quick_real next[PW_TIDE_GATE_HOIST_QUICK_STATES];
    int i;
    int j;
    pw_tide_gate_hoist_quick_take_input(s, u);
    pw_tide_gate_hoist_quick_innovate(s, y, missing);
    for (i = 0; i < PW_TIDE_GATE_HOIST_QUICK_STATES; i++) {
        pw_tide_gate_hoist_quick_real acc = 0.0;
        for (j = 0; j < PW_TIDE_GATE_HOIST_QUICK_STATES; j++) {
            acc += a[i][j] * s->x[j];
        }
        for (j = 0; j < PW_TIDE_GATE_HOIST_QUICK_INPUTS; j++) {
            acc += b[i][j] * s->du[j];
        }
        for (j = 0; j < PW_TIDE_GATE_HOIST_QUICK_SENSORS; j++) {
            acc += gain[i][j] * s->innovation[j];
        }
        next[i] = acc;
    }
    pw_tide_gate_hoist_quick_accept(s, next);
    pw_tide_gate_hoist_quick_publish(s);
}

#endif
