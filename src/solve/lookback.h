/* lookback.h - what the runs before a run predict for it. */
#ifndef LOPSIDE_SOLVE_LOOKBACK_H
#define LOPSIDE_SOLVE_LOOKBACK_H

#include <complex.h>
#include <stddef.h>

#include "solve/model.h"

struct lookback {
    double complex predicted, measured; /* SI peak, argument is lag */
    double complex bare;                /* with nothing mounted, as those runs tell */
    double se; /* their distance over its standard error: root of the complex variance of prediction
                  and reading, scatter from run to run included */
};

/* 1 with `out` filled; 0 where the runs of the row before `run`, with the stored responses in use,
 * do not determine everything or the row has no reading of `run`; negative: an enum regress_error.
 */
int lookback_row(const struct model_row *row, size_t planes, size_t run, struct lookback *out)
    __attribute__((warn_unused_result));

#endif
