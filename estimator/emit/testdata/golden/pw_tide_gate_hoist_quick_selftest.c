/*
 * Self-test of the state estimator in pw_tide_gate_hoist_quick.h.
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
 *
 * The function returns 0 where all is well, else the number of the first bad sample,
 * counted from 1. main returns 0 or 1 as exit status; define the macro
 * PW_TIDE_GATE_HOIST_QUICK_NO_MAIN to leave it out on the target.
 * Expected values: the same estimator in double precision with the design's own numbers.
 * Tolerance: an upper bound on what rounding can do in these samples, per state.
 */
#include "pw_tide_gate_hoist_quick.h"

enum { PW_TIDE_GATE_HOIST_QUICK_TEST_STEPS = 32 };

int pw_tide_gate_hoist_quick_selftest(void);

int pw_tide_gate_hoist_quick_selftest(void)
{
    static const pw_tide_gate_hoist_quick_real inputs[PW_TIDE_GATE_HOIST_QUICK_TEST_STEPS][PW_TIDE_GATE_HOIST_QUICK_INPUTS] = {
        {
            4.2603619999999998
        },
        {
            3.889421
        },
        {
            3.838463
        },
        {
            3.7052480000000001
        },
        {
            4.148739
        },
        {
            3.8508789999999999
        },
        {
            4.0549710000000001
        },
        {
            3.7840090000000002
        },
        {
            3.9064420000000002
        },
        {
            4.0000000000000002e+300
        },
        {
            3.7896719999999999
        },
        {
            3.8563930000000002
        },
        {
            3.817396
        },
        {
            4.089245
        },
        {
            3.8611019999999998
        },
        {
            4.1161019999999997
        },
        {
            4.0238829999999997
        },
        {
            3.74525
        },
        {
            3.6957490000000002
        },
        {
            3.678194
        },
        {
            4.0000000000000002e+300
        },
        {
            3.6247240000000001
        },
        {
            3.991905
        },
        {
            3.7989320000000002
        },
        {
            3.7944909999999998
        },
        {
            4.0689570000000002
        },
        {
            3.7862209999999998
        },
        {
            4.122795
        },
        {
            4.3227659999999997
        },
        {
            4.0065679999999997
        },
        {
            3.8942860000000001
        },
        {
            4.0000000000000002e+300
        }
    };
    static const pw_tide_gate_hoist_quick_real samples[PW_TIDE_GATE_HOIST_QUICK_TEST_STEPS][PW_TIDE_GATE_HOIST_QUICK_SENSORS] = {
        {
            1.0625579999999999
        },
        {
            1.198634
        },
        {
            1.0409060000000001
        },
        {
            6.5
        },
        {
            1.0857399999999999
        },
        {
            4.0000000000000002e+300
        },
        {
            0.92240869999999997
        },
        {
            0.7911994
        },
        {
            0.84382630000000003
        },
        {
            0.71295120000000001
        },
        {
            6.5
        },
        {
            0.52665200000000001
        },
        {
            4.0000000000000002e+300
        },
        {
            0.50644389999999995
        },
        {
            0.59137010000000001
        },
        {
            0.54817680000000002
        },
        {
            0.52351170000000002
        },
        {
            6.5
        },
        {
            0.60014529999999999
        },
        {
            4.0000000000000002e+300
        },
        {
            0.61846230000000002
        },
        {
            0.57699180000000005
        },
        {
            0.71724469999999996
        },
        {
            0.70143299999999997
        },
        {
            6.5
        },
        {
            0.52582260000000003
        },
        {
            4.0000000000000002e+300
        },
        {
            0.60520160000000001
        },
        {
            0.6820832
        },
        {
            0.78158059999999996
        },
        {
            0.9590552
        },
        {
            6.5
        }
    };
    /* 0 good, 1 missing, 2 not a number */
    static const unsigned char mark[PW_TIDE_GATE_HOIST_QUICK_TEST_STEPS][PW_TIDE_GATE_HOIST_QUICK_SENSORS] = {
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
    static const unsigned char input_mark[PW_TIDE_GATE_HOIST_QUICK_TEST_STEPS][PW_TIDE_GATE_HOIST_QUICK_INPUTS] = {
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
    static const unsigned char used[PW_TIDE_GATE_HOIST_QUICK_TEST_STEPS][PW_TIDE_GATE_HOIST_QUICK_SENSORS] = {
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
    static const pw_tide_gate_hoist_quick_real expected[PW_TIDE_GATE_HOIST_QUICK_TEST_STEPS][PW_TIDE_GATE_HOIST_QUICK_STATES] = {
        {
            1.1800379062499999, 0.030602437499999829
        },
        {
            1.1782979223632812, -0.0011426689453125846
        },
        {
            1.0828981730117797, -0.13683227467346187
        },
        {
            1.0375021558446884, -0.22532878359222405
        },
        {
            1.0683915528926105, -0.044042369896858953
        },
        {
            1.0469987797740568, -0.067695461882904207
        },
        {
            0.98150398852993792, -0.047186203971022939
        },
        {
            0.84748315392943918, -0.18325873826365899
        },
        {
            0.82233489079529853, -0.10844388811307586
        },
        {
            0.74404319188455248, -0.09286121053276826
        },
        {
            0.71194836622625446, -0.059928357187310377
        },
        {
            0.58891801862206472, -0.088166598653157777
        },
        {
            0.56058210620624238, -0.0031772784770292273
        },
        {
            0.5419323197823892, 0.18543593273397255
        },
        {
            0.5631961016347683, 0.2960881819372343
        },
        {
            0.58800068242433146, 0.48085012979291719
        },
        {
            0.58577177827308258, 0.56392542104979348
        },
        {
            0.58917336708869472, 0.53211679885029861
        },
        {
            0.59039956782770842, 0.48451219658096856
        },
        {
            0.58045583011401902, 0.42794528005142041
        },
        {
            0.58776144833612864, 0.4011260996434155
        },
        {
            0.56003267813002167, 0.32318559942538805
        },
        {
            0.57921990309410842, 0.45123172996470917
        },
        {
            0.64912367358731227, 0.52691449567684834
        },
        {
            0.65636720456711528, 0.50851476532041406
        },
        {
            0.62537742177700006, 0.55848529733730357
        },
        {
            0.63356037786058161, 0.53794077972589061
        },
        {
            0.66702234495094415, 0.67113998705657485
        },
        {
            0.75755074924693244, 0.90237598168157773
        },
        {
            0.82791157273261484, 0.9287411548722142
        },
        {
            0.94446281607397953, 0.9349836693158321
        },
        {
            0.98968504540621904, 0.84163800663285826
        }
    };
    static const pw_tide_gate_hoist_quick_real tolerance[PW_TIDE_GATE_HOIST_QUICK_STATES] = {
        6.3374337374655274e-15, 1.7611577422541486e-14
    };
    volatile pw_tide_gate_hoist_quick_real zero = 0.0; /* zero / zero is not a number */
    pw_tide_gate_hoist_quick_estimator s;
    pw_tide_gate_hoist_quick_real y[PW_TIDE_GATE_HOIST_QUICK_SENSORS];
    unsigned char missing[PW_TIDE_GATE_HOIST_QUICK_SENSORS];
    pw_tide_gate_hoist_quick_real u[PW_TIDE_GATE_HOIST_QUICK_INPUTS];
    int k;
    int i;
    pw_tide_gate_hoist_quick_init(&s);
    for (k = 0; k < PW_TIDE_GATE_HOIST_QUICK_TEST_STEPS; k++) {
        for (i = 0; i < PW_TIDE_GATE_HOIST_QUICK_INPUTS; i++) {
            u[i] = input_mark[k][i] == 2 ? zero / zero : inputs[k][i];
        }
        for (i = 0; i < PW_TIDE_GATE_HOIST_QUICK_SENSORS; i++) {
            y[i] = mark[k][i] == 2 ? zero / zero : samples[k][i];
            missing[i] = (unsigned char)(mark[k][i] == 1);
        }
        pw_tide_gate_hoist_quick_step(&s, u, y, missing);
        for (i = 0; i < PW_TIDE_GATE_HOIST_QUICK_SENSORS; i++) {
            if (s.used[i] != used[k][i]) {
                return k + 1;
            }
        }
        for (i = 0; i < PW_TIDE_GATE_HOIST_QUICK_STATES; i++) {
            const pw_tide_gate_hoist_quick_real off = s.estimate[i] - expected[k][i];
            if (!(off >= -tolerance[i] && off <= tolerance[i])) {
                return k + 1;
            }
        }
    }
    return s.fault != 0 ? PW_TIDE_GATE_HOIST_QUICK_TEST_STEPS : 0;
}

#ifndef PW_TIDE_GATE_HOIST_QUICK_NO_MAIN
int main(void)
{
    return pw_tide_gate_hoist_quick_selftest() != 0 ? 1 : 0;
}
#endif
