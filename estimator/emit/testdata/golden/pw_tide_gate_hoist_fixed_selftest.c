/*
 * Self-test of the state estimator in pw_tide_gate_hoist_fixed.h.
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
 *
 * The function returns 0 where all is well, else the number of the first bad sample,
 * counted from 1. main returns 0 or 1 as exit status; define the macro
 * PW_TIDE_GATE_HOIST_FIXED_NO_MAIN to leave it out on the target.
 * Expected values: the same estimator in double precision with the design's own numbers.
 * Tolerance: an upper bound on what rounding can do in these samples, per state.
 */
#include "pw_tide_gate_hoist_fixed.h"

enum { PW_TIDE_GATE_HOIST_FIXED_TEST_STEPS = 32 };

int pw_tide_gate_hoist_fixed_selftest(void);

int pw_tide_gate_hoist_fixed_selftest(void)
{
    static const pw_tide_gate_hoist_fixed_real inputs[PW_TIDE_GATE_HOIST_FIXED_TEST_STEPS][PW_TIDE_GATE_HOIST_FIXED_INPUTS] = {
        {
            4467313
        },
        {
            4078354
        },
        {
            4024920
        },
        {
            3885234
        },
        {
            4350268
        },
        {
            4037939
        },
        {
            4251945
        },
        {
            3967821
        },
        {
            4096201
        },
        {
            (-2147483647 - 1)
        },
        {
            3973759
        },
        {
            4043721
        },
        {
            4002830
        },
        {
            4287884
        },
        {
            4048659
        },
        {
            4316046
        },
        {
            4219347
        },
        {
            3927179
        },
        {
            3875274
        },
        {
            3856866
        },
        {
            (-2147483647 - 1)
        },
        {
            3800799
        },
        {
            4185816
        },
        {
            3983469
        },
        {
            3978812
        },
        {
            4266611
        },
        {
            3970140
        },
        {
            4323064
        },
        {
            4532749
        },
        {
            4201191
        },
        {
            4083455
        },
        {
            (-2147483647 - 1)
        }
    };
    static const pw_tide_gate_hoist_fixed_real samples[PW_TIDE_GATE_HOIST_FIXED_TEST_STEPS][PW_TIDE_GATE_HOIST_FIXED_SENSORS] = {
        {
            1114173
        },
        {
            1256859
        },
        {
            1091469
        },
        {
            6815744
        },
        {
            1138481
        },
        {
            (-2147483647 - 1)
        },
        {
            967216
        },
        {
            829633
        },
        {
            884816
        },
        {
            747584
        },
        {
            6815744
        },
        {
            552235
        },
        {
            (-2147483647 - 1)
        },
        {
            531045
        },
        {
            620097
        },
        {
            574805
        },
        {
            548942
        },
        {
            6815744
        },
        {
            629298
        },
        {
            (-2147483647 - 1)
        },
        {
            648505
        },
        {
            605020
        },
        {
            752086
        },
        {
            735506
        },
        {
            6815744
        },
        {
            551365
        },
        {
            (-2147483647 - 1)
        },
        {
            634600
        },
        {
            715216
        },
        {
            819547
        },
        {
            1005642
        },
        {
            6815744
        }
    };
    /* 0 good, 1 missing, 2 not a number */
    static const unsigned char mark[PW_TIDE_GATE_HOIST_FIXED_TEST_STEPS][PW_TIDE_GATE_HOIST_FIXED_SENSORS] = {
        {0},
        {0},
        {0},
        {0},
        {0},
        {2},
        {0},
        {0},
        {0},
        {0},
        {0},
        {0},
        {2},
        {0},
        {0},
        {0},
        {0},
        {0},
        {0},
        {2},
        {0},
        {0},
        {1},
        {0},
        {0},
        {0},
        {2},
        {0},
        {0},
        {0},
        {0},
        {0}
    };
    /* 2 where the input is not a number */
    static const unsigned char input_mark[PW_TIDE_GATE_HOIST_FIXED_TEST_STEPS][PW_TIDE_GATE_HOIST_FIXED_INPUTS] = {
        {0},
        {0},
        {0},
        {0},
        {0},
        {0},
        {0},
        {0},
        {0},
        {2},
        {0},
        {0},
        {0},
        {0},
        {0},
        {0},
        {0},
        {0},
        {0},
        {0},
        {2},
        {0},
        {0},
        {0},
        {0},
        {0},
        {0},
        {0},
        {0},
        {0},
        {0},
        {2}
    };
    /* samples that must be used */
    static const unsigned char used[PW_TIDE_GATE_HOIST_FIXED_TEST_STEPS][PW_TIDE_GATE_HOIST_FIXED_SENSORS] = {
        {1},
        {1},
        {1},
        {0},
        {1},
        {0},
        {1},
        {1},
        {1},
        {1},
        {0},
        {1},
        {0},
        {1},
        {1},
        {1},
        {1},
        {0},
        {1},
        {0},
        {1},
        {1},
        {0},
        {1},
        {0},
        {1},
        {0},
        {1},
        {1},
        {1},
        {1},
        {0}
    };
    static const pw_tide_gate_hoist_fixed_real expected[PW_TIDE_GATE_HOIST_FIXED_TEST_STEPS][PW_TIDE_GATE_HOIST_FIXED_STATES] = {
        {
            1237359, 32089
        },
        {
            1235535, -1198
        },
        {
            1135501, -143479
        },
        {
            1087900, -236274
        },
        {
            1120290, -46182
        },
        {
            1097858, -70984
        },
        {
            1029182, -49478
        },
        {
            888651, -192161
        },
        {
            862281, -113712
        },
        {
            780186, -97372
        },
        {
            746532, -62840
        },
        {
            617526, -92450
        },
        {
            587813, -3332
        },
        {
            568257, 194443
        },
        {
            590554, 310471
        },
        {
            616564, 504208
        },
        {
            614226, 591318
        },
        {
            617793, 557964
        },
        {
            619079, 508048
        },
        {
            608652, 448733
        },
        {
            616313, 420611
        },
        {
            587237, 338885
        },
        {
            607356, 473151
        },
        {
            680656, 552510
        },
        {
            688251, 533216
        },
        {
            655756, 585614
        },
        {
            664336, 564071
        },
        {
            699424, 703741
        },
        {
            794350, 946210
        },
        {
            868128, 973856
        },
        {
            990341, 980401
        },
        {
            1037760, 882521
        }
    };
    static const pw_tide_gate_hoist_fixed_real tolerance[PW_TIDE_GATE_HOIST_FIXED_STATES] = {
        7, 18
    };
    pw_tide_gate_hoist_fixed_estimator s;
    pw_tide_gate_hoist_fixed_real y[PW_TIDE_GATE_HOIST_FIXED_SENSORS];
    unsigned char missing[PW_TIDE_GATE_HOIST_FIXED_SENSORS];
    pw_tide_gate_hoist_fixed_real u[PW_TIDE_GATE_HOIST_FIXED_INPUTS];
    int k;
    int i;
    pw_tide_gate_hoist_fixed_init(&s);
    for (k = 0; k < PW_TIDE_GATE_HOIST_FIXED_TEST_STEPS; k++) {
        for (i = 0; i < PW_TIDE_GATE_HOIST_FIXED_INPUTS; i++) {
            u[i] = input_mark[k][i] == 2 ? (-2147483647 - 1) : inputs[k][i];
        }
        for (i = 0; i < PW_TIDE_GATE_HOIST_FIXED_SENSORS; i++) {
            y[i] = mark[k][i] == 2 ? (-2147483647 - 1) : samples[k][i];
            missing[i] = (unsigned char)(mark[k][i] == 1);
        }
        pw_tide_gate_hoist_fixed_step(&s, u, y, missing);
        for (i = 0; i < PW_TIDE_GATE_HOIST_FIXED_SENSORS; i++) {
            if (s.used[i] != used[k][i]) {
                return k + 1;
            }
        }
        for (i = 0; i < PW_TIDE_GATE_HOIST_FIXED_STATES; i++) {
            const int64_t off = (int64_t)s.estimate[i] - expected[k][i];
            if (!(off >= -tolerance[i] && off <= tolerance[i])) {
                return k + 1;
            }
        }
    }
    return s.fault != 0 ? PW_TIDE_GATE_HOIST_FIXED_TEST_STEPS : 0;
}

#ifndef PW_TIDE_GATE_HOIST_FIXED_NO_MAIN
int main(void)
{
    return pw_tide_gate_hoist_fixed_selftest() != 0 ? 1 : 0;
}
#endif
