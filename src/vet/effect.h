/* effect.h - how much a trial weight changed a reading. */
#ifndef LOPSIDE_VET_EFFECT_H
#define LOPSIDE_VET_EFFECT_H

#include <complex.h>

struct effect {
    double errors; /* size of the change over its standard error; infinite where that is 0 */
    double
        amplitude_pct; /* change of amplitude, % of the reading before; infinite where that is 0 */
    double lag_deg;    /* change of lag, 0..180; 0 where one of both is 0 */
};

/* The change from `before` to `after` (SI peak vectors) with their covariances {var re, cov, var
 * im} and the run-to-run standard deviation per component of either, `repeatability` (SI). The
 * standard error is the root of the complex variance (both components) of the change. No change at
 * all: 0 errors. */
struct effect effect_of(double complex before, const double before_cov[3], double complex after,
                        const double after_cov[3], double repeatability);

#endif
