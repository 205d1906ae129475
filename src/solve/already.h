/* already.h - is the machine good enough as found? */
#ifndef LOPSIDE_SOLVE_ALREADY_H
#define LOPSIDE_SOLVE_ALREADY_H

#include <stdbool.h>

#include "solve/advice.h"
#include "solve/model.h"
#include "solve/remedy.h"

/* True where targets are set, nothing stays mounted, and for every row of the aim that has a target
 * the next reading as found stays within it, at the upper end of its 95 % range (the readings of
 * the runs without weights, their covariance, and the scatter from run to run). A row without such
 * a reading tells nothing: false. */
bool already_meets(const struct model *model);

/* The step `done` that says so. */
void already_step(const struct model *model, struct advice_next *next);

/* The caution `overall-level`: 1x meets the target at a row of the aim, but all that vibrates there
 * as found has ALREADY_ABOVE times the target and more. Where vet found 2x far above 1x (`two-x`
 * among the causes) it says that the tacho may count another shaft. False: nothing of the kind. */
bool already_elsewhere(const struct model *model, const struct model_row *row,
                       const struct remedy_cause *causes, size_t count,
                       struct advice_finding *finding);

/* Puts that doubt into the step, once. */
void already_doubt(const struct advice_finding *finding, struct advice_next *next);

/* Against the target as a peak; common practice: what is not 1x, noise included, is ordinarily no
 * more. */
#define ALREADY_ABOVE 2.0

#endif
