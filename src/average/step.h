/* step.h - a lasting jump of the block vectors. */
#ifndef LOPSIDE_AVERAGE_STEP_H
#define LOPSIDE_AVERAGE_STEP_H

#include <complex.h>
#include <stddef.h>

struct step {
    double complex before, after; /* means on both sides */
    double size;     /* of the jump; 0: none that is significant; NaN: cannot be known */
    double t;        /* s, between the blocks on both sides; NaN where size is not > 0 */
    size_t at;       /* index of the first block behind it */
    double residual; /* sum of squares that it leaves; NaN where size is NaN */
    double straight; /* sum of squares that a mean and a straight line leave */
};

#define STEP_SIDE 5 /* blocks, at least, on each side: what is shorter is a burst */

/* The split of `count` block vectors at times t (s, ascending) into two means that leaves the
 * least, with at least STEP_SIDE blocks and 15 % of the run on each side. Significant where the
 * jump exceeds the sup-F test's 1 % point (D. W. K. Andrews, Econometrica 61 (1993) 821-856, and 71
 * (2003) 395-397: 15.5 for two restrictions and 15 % trimming, value from memory; that is a tail of
 * 0.01/23 of chi-squared, which is taken of F(2, 2 nu) here, nu the degrees of freedom that the
 * residuals' lag-1 correlation leaves) and where it leaves less than a straight line.
 *
 * size is NaN for fewer than 2*STEP_SIDE blocks or where a vector is NaN. */
struct step step_find(const double complex *vectors, const double *t, size_t count);

#endif
