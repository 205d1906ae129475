/* beat.h - does a vector swing at a steady rate, as a neighbour of nearly the same speed makes it?
 */
#ifndef LOPSIDE_VET_BEAT_H
#define LOPSIDE_VET_BEAT_H

#include <complex.h>
#include <stddef.h>

struct beat {
    double swing;    /* amplitude of the swing, in the unit of the vectors; 0: none stands out */
    double turning;  /* Hz: how fast the swing turns the vector; a line at frequency f does so with
                        1x - f; NaN: the swing does not turn one way, or it is not known which */
    double period;   /* s */
    double duration; /* s, from the first block to the last, ends included */
    double step;     /* s, a block */
    double rest;     /* root mean square of the vectors, mean and trend taken off */
};

/* The largest line in `count` block vectors at times t (s, ascending, about evenly spaced), their
 * mean and trend taken off. It counts where it makes three periods or more in the run and stands
 * out from the rest at the 0.1 % level of R. A. Fisher's test of the largest periodogram value
 * (Proc. R. Soc. A 125 (1929) 54-59; its first term, for vectors: n (1-g)^(n-1)). Faster than half
 * a period a block it cannot be told from a slower one; what averaging over a block takes away is
 * put back. Swing NaN: fewer than 12 vectors, a NaN, or times that do not grow. At most
 * BEAT_COUNT_MOST vectors, the first ones, are looked at. */
struct beat beat_of(const double complex *vectors, const double *t, size_t count);

#define BEAT_COUNT_MOST 512

/* A beat that was measured elsewhere, with the duration of `own`; `own` where there is none, and
 * where the block vectors do not scatter enough for it, averaging over a block allowed for (a swing
 * of two blocks a period can be any size in a fit of both its senses). */
struct beat beat_join(const struct beat *measured, struct beat own);

/* What the swing leaves in the mean, as a variance per component: that of a turning vector's mean
 * over the run at a random start, at the worst ratio of period to run. 0 where there is no swing.
 */
double beat_variance(const struct beat *beat);

#endif
