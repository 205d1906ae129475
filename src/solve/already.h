/* already.h - is the machine good enough as found? */
#ifndef LOPSIDE_SOLVE_ALREADY_H
#define LOPSIDE_SOLVE_ALREADY_H

#include <stdbool.h>

#include "solve/advice.h"
#include "solve/model.h"

/* True where targets are set, nothing stays mounted, and for every row of the aim that has a target
 * the next reading as found stays within it, at the upper end of its 95 % range (the readings of the
 * runs without weights, their covariance, and the scatter from run to run). A row without such a
 * reading tells nothing: false. */
bool already_meets(const struct model *model);

/* The step `done` that says so. */
void already_step(const struct model *model, struct advice_next *next);

#endif
