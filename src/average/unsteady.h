/* unsteady.h - in which ways the blocks of a run were not steady. */
#ifndef LOPSIDE_AVERAGE_UNSTEADY_H
#define LOPSIDE_AVERAGE_UNSTEADY_H

#include <complex.h>
#include <stddef.h>

/* Each size is a length in the units of the vectors, 0 where it is not significant, NaN where there
 * are too few blocks to know. */
struct unsteady {
    double beat;       /* swing.h */
    double beat_s;     /* its period; NaN without a beat, as the next */
    double turning_hz; /* of the vector about its mean; NaN where it swings to and fro */
    double step;       /* step.h */
    double step_s;     /* when; NaN without a step */
    double
        wander; /* standard deviation of what wanders more slowly than eight periods a run (sixteen
                 * in runs of 128 blocks and more), beyond line, step and beat (longrun.h) */
};

/* Of `count` (>= 1) block vectors at times t (s, ascending). Where one jump explains more than the
 * best swing and the best line do, it is a step, and a beat is looked for in what the step leaves;
 * otherwise there is no step. Returns 0; -1 when memory is out. */
int unsteady_of_blocks(const double complex *vectors, const double *t, size_t count,
                       struct unsteady *out) __attribute__((warn_unused_result));

#endif
