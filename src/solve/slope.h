/* slope.h - readings of runs that turned at slightly different speeds, brought to one.
 *
 * Within a run the speed wanders a little, and near a resonance the 1x vector follows it. The slope
 * of the block vectors over speed then tells what a reading would have been at the mean speed of
 * its condition's runs. That is done for a sensor in a condition only where it helps, and for all
 * of its runs or for none.
 */
#ifndef LOPSIDE_SOLVE_SLOPE_H
#define LOPSIDE_SOLVE_SLOPE_H

#include <complex.h>
#include <stdbool.h>
#include <stddef.h>

#include "solve/model.h"

struct slope { /* running sums over the blocks of one sensor in one run; all zero to begin with */
    size_t count;
    double mean_rpm, sxx, least, most;
    double complex mean, sxz;
    double szz;
};

/* Takes a block: its speed, its vector (SI peak). A NaN is left out. */
void slope_add(struct slope *slope, double rpm, double complex vector);

/* What a reading changes by from speed `from` to speed `to` (rpm), and the complex variance of
 * that. False: fewer than 16 blocks, a speed that is not known, or further than the run's own range
 * of speeds. Neighbouring blocks are rarely independent: the variance is that of a quarter as many.
 */
bool slope_shift(const struct slope *slope, double from, double to, double complex *shift,
                 double *variance);

struct slope_match { /* what was done to a sensor in a condition */
    size_t sensor;
    const char *condition; /* borrowed from the readings */
    double rpm;            /* the speed that all are brought to */
    double largest;        /* shift, SI peak */
};

/* Brings the usable readings of `sensor` in `condition` to their mean speed, cov widened by what
 * that costs instead of by_speed, where the shifts together are more than 3 standard errors and 1 %
 * of the readings; slopes is runs x sensors. False: nothing was changed. Runs with a role are left
 * alone. */
bool slope_bring(const struct job *job, struct model_reading *readings, size_t count,
                 const struct slope *slopes, size_t sensor, const char *condition,
                 struct slope_match *match);

#endif
