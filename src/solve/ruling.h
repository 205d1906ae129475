/* ruling.h - may the readings that are left carry a correction? */
#ifndef LOPSIDE_SOLVE_RULING_H
#define LOPSIDE_SOLVE_RULING_H

#include <stdbool.h>
#include <stddef.h>

#include "solve/model.h"

enum ruling_kind {
    RULING_TRIAL,  /* as found alone: a trial weight comes next */
    RULING_SOLVE,  /* the rows in MODEL_GOOD carry a correction */
    RULING_REPEAT, /* refused readings are missing: exit 4 */
    RULING_MISSING /* a run is missing: exit 5 */
};

struct ruling {
    enum ruling_kind kind;
    const struct model_row *row; /* borrowed: the row that decided a REPEAT or MISSING; NULL: all */
    bool named;                  /* REPEAT: the row's sensor is named by the aim */
};

/* Lost: a sensor that the aim names, or every sensor of a condition (a run that the regression
 * needs), or the slow roll of a probe of the aim. Otherwise the job goes on with what is left; rows
 * that are not in the aim decide nothing.
 */
struct ruling ruling_of(const struct model *model);

/* A row takes part in the correction. */
bool ruling_counts(const struct model_row *row);

#endif
