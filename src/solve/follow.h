/* follow.h - whether effects follow the turn of the weights, in words. */
#ifndef LOPSIDE_SOLVE_FOLLOW_H
#define LOPSIDE_SOLVE_FOLLOW_H

#include <stdbool.h>
#include <stddef.h>

#include "solve/advice.h"
#include "solve/model.h"

/* Turn of a plane's effect against the turn of its weight, in one row: caution at 3 standard
 * errors, refused at 6 if they are 20 deg apart as well, since the sign of the answer hangs on it.
 * In order without a figure (value NaN) where the trials stand so that a mirror could not be seen.
 * False: no two trials. */
bool follow_row(const struct model *model, const struct model_row *row, size_t plane,
                struct advice_finding *finding);

/* The worst of them over all rows. */
bool follow_worst(const struct model *model, size_t plane, struct advice_finding *finding);

#endif
