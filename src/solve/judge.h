/* judge.h - a figure against its limits, and as text. */
#ifndef LOPSIDE_SOLVE_JUDGE_H
#define LOPSIDE_SOLVE_JUDGE_H

#include <stdbool.h>

#include "stream/job.h"

enum judge_verdict { ADVICE_OK, ADVICE_CAUTION, ADVICE_REFUSE };

struct judge_limits {
    bool off; /* the sheet says `none` */
    double caution, refuse;
};

/* The sheet's limits of a check over the defaults; a caution beyond the standing refusal takes the
 * refusal along, as in vet. */
struct judge_limits judge_limits_of(const struct job *job, const char *check, double caution,
                                    double refuse);

/* From a limit on it counts; *limit: the one that is crossed, else the caution's. */
enum judge_verdict judge_value(const struct judge_limits *limits, double value, double *limit);

/* A figure to so many digits, without an exponent. */
struct judge_figure {
    char text[32];
};
struct judge_figure judge_figure(double value, int digits);

#endif
