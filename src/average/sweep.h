/* sweep.h - the steady 1x vector at a given speed, from the block vectors of a coast-down. */
#ifndef LOPSIDE_AVERAGE_SWEEP_H
#define LOPSIDE_AVERAGE_SWEEP_H

#include <complex.h>
#include <stddef.h>

struct sweep {                     /* the blocks of one sensor in one run, all borrowed */
    const double *t;               /* middle of the block, s, ascending */
    const double *speed_rpm;       /* its mean speed, > 0 */
    const double *turns;           /* > 0 */
    const double complex *vectors; /* finite */
    size_t count;
};

struct sweep_fit {
    double complex vector;
    double variance; /* of each component: cov is {variance, 0, variance} */
    size_t used;     /* blocks with a weight */
    double turns;    /* in these blocks */
    double freedom;  /* residual degrees of freedom of a component */
};

enum sweep_result { SWEEP_MADE, SWEEP_OUTSIDE, SWEEP_SPARSE };

/* Fits Z(w) = a + b (w - w0) + c (w - w0)^2 around w0 to the blocks nearest in speed, with tricube
 * weights (W. S. Cleveland, J. Am. Stat. Assoc. 74 (1979) 829-836), and gives a, the vector at w0.
 *
 * The sweep within a block is allowed for twice. Its vector is the mean over the block, so that the
 * square is (w_k - w0)^2 + d_k^2/12 with d_k the change of speed within it. And a machine that
 * changes its speed answers late: to first order in the rate w' the 1x vector of a force that grows
 * with w^2 is Z + (j/2) w' (Z'' - 2 Z/w^2), for any linear machine and sensor (expansion of the
 * convolution with the impulse response about the instantaneous frequency; B. van der Pol, J. IEE
 * 93 III (1946) 153-158, calls its first term the quasi-stationary one). Both stand in the
 * regression.
 *
 * Five blocks and more are tried; the widest neighbourhood is taken whose result agrees with all
 * narrower ones (intersection of confidence intervals, A. Goldenshluger & A. Nemirovski, Math.
 * Methods Stat. 6 (1997) 135-170), or a narrower one whose variance is far less. The variance comes
 * from the residuals there, with their lag-1 correlation, widened for few degrees of freedom like
 * mean.h's, plus what the result still moved from the narrower neighbourhood beyond its own
 * scatter, plus the order of the second term of the late answer.
 *
 * Returns SWEEP_MADE; SWEEP_OUTSIDE where the speed is not among those recorded (half of a block's
 * own sweep is allowed beyond the first and the last) or lies in a gap between them; SWEEP_SPARSE
 * where fewer than SWEEP_LEAST blocks are there; -1 when memory is out. */
#define SWEEP_LEAST 5
int sweep_at(const struct sweep *sweep, double speed_rpm, struct sweep_fit *fit)
    __attribute__((warn_unused_result));

#endif
