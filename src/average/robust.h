/* robust.h - sets outlier blocks aside: a burst, a knock on the sensor, a lost mark. */
#ifndef LOPSIDE_AVERAGE_ROBUST_H
#define LOPSIDE_AVERAGE_ROBUST_H

#include <complex.h>
#include <stdbool.h>
#include <stddef.h>

/* Marks in `keep` (count, written) which of the `count` block vectors are to be used. A block is
 * set aside where its distance from the median vector (the medians of both components) is more than
 * 4.88 times the median distance, the 99.9 % point of a normal deviate along one line (3.2905)
 * over its median (0.6745): the widest a steady scatter can be, whatever its direction. (Of round
 * scatter the same factor leaves 99.9999 %.) Where more than a fifth of the blocks would go, the
 * scatter is not a steady one with a few bursts: all are kept, and the checks of steadiness tell.
 * Fewer than 8 blocks: all are kept.
 *
 * Returns the number set aside; -1 when memory is out. A NaN among the vectors: all are kept. */
long robust_keep(const double complex *vectors, size_t count, bool *keep)
    __attribute__((warn_unused_result));

/* The median of `count` values, which are sorted in place; NaN for none. */
double robust_median(double *values, size_t count);

#endif
