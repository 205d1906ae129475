/* fit.h - the next step where there is something to fit, in words. */
#ifndef LOPSIDE_SOLVE_FIT_H
#define LOPSIDE_SOLVE_FIT_H

#include <stdbool.h>

#include "solve/advice.h"
#include "solve/answer.h"

/* The step `correct`, or `trim`: what is done with what is on, whether a better placement is not
 * ruled out, pieces that work against each other, holes, sensors that take no part. Each clause
 * stands whole or not at all. Needs answer_place and lighter_find. */
void fit_step(const struct answer *answer, bool trim, struct advice_next *next);

/* Puts a finding in front of the step, for whoever reads no further. */
void fit_heed(const struct advice_finding *finding, struct advice_next *next);

/* Puts behind a step `done` that the runs do not fit one set of responses, where that is so. */
void fit_doubt(const struct answer *answer, struct advice_next *next);

#endif
