/* outlook.h - what lies ahead with the placed weights: forecasts and residual unbalance. */
#ifndef LOPSIDE_SOLVE_OUTLOOK_H
#define LOPSIDE_SOLVE_OUTLOOK_H

#include "solve/answer.h"

/* Fills forecasts and residuals of an answer for its placed_weights (all zero before answer_place:
 * as mounted). The 95 % range of the next reading holds the posterior of the vibration, the scatter
 * from run to run and what a reading is usually off by. ANSWER_OK or ANSWER_NO_MEMORY. */
int outlook_fill(struct answer *answer) __attribute__((warn_unused_result));

#endif
