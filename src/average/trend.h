/* trend.h - does a vector move steadily over the run, as a machine does that warms up? */
#ifndef LOPSIDE_AVERAGE_TREND_H
#define LOPSIDE_AVERAGE_TREND_H

#include <complex.h>
#include <stddef.h>

/* The size, from the first to the last time, of the straight line fitted by least squares to
 * `count` vectors at times t (s, ascending); 0 where it is not significant at the 1 % level of F(2,
 * 2(n-2)) with the variance that the residuals' lag-1 correlation leaves, degrees of freedom
 * reduced by the same factor. So it is judged against the noise and slow wander that are there, not
 * against zero.
 *
 * NaN for fewer than 4 vectors, equal times, or a NaN. */
double trend_size(const double complex *vectors, const double *t, size_t count);

#endif
