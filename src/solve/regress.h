/* regress.h - the complex linear regression of one row: readings on [1, equivalent weights].
 *
 * y[i] = Z0 + sum_p A[p] x[i][p] + scatter, scatter of covariance cov[i]. The covariances need not
 * be circular, so the least squares is done on stacked real and imaginary parts (Goodman, ASME J.
 * Eng. Ind. 86 (1964) 273-279, for the complex unweighted form). LAPACK's singular value
 * decomposition does the algebra and judges the rank.
 */
#ifndef LOPSIDE_SOLVE_REGRESS_H
#define LOPSIDE_SOLVE_REGRESS_H

#include <complex.h>
#include <stdbool.h>
#include <stddef.h>

#include "solve/posterior.h"

struct regress_data {
    size_t count, planes;
    const double complex *y; /* count readings, SI peak, argument is lag */
    const double complex *x; /* count x planes equivalent weights, kg; row-major */
    const double (
        *cov)[3]; /* count: [var re, cov, var im] of each reading, scatter between runs included */
    double scale; /* SI, > 0: an amplitude of the row's size. Variances below (1e-9 scale)^2
                     count as that, so that exact readings weigh alike */
    /* What is known of responses beforehand, each independent of the readings: as many as
     * `prior_count` (0: none), no plane twice. A response enters as one more reading: of its effect
     * at the mass that the runs use. */
    size_t prior_count;
    const size_t *prior_plane;    /* which response */
    const double complex *prior;  /* SI per kg */
    const double (*prior_cov)[3]; /* [var re, cov, var im], (SI per kg)^2 */
};

enum regress_error {
    REGRESS_OK = 0,
    REGRESS_NO_MEMORY = -1,
    REGRESS_FAILED = -2,
    REGRESS_NAN = -3
};

/* Fits the row. `p` (uninitialised) becomes the posterior, flat where there is no prior, new; its
 * dof is infinite. With rank < unknowns the solution is the shortest one (columns at unit length)
 * and known[] tells which unknowns it determines. */
int regress_fit(const struct regress_data *data, struct posterior *p)
    __attribute__((warn_unused_result));

/* Rank of [1, x] for these runs where the responses of planes with held[p] are known beforehand
 * (held NULL: none): those count as found; columns at unit length; singular values below 1e-6 of
 * the largest count as zero (a weight is not known to six digits). Negative: an error. */
int regress_rank(size_t count, size_t planes, const double complex *x, const bool *held)
    __attribute__((warn_unused_result));

/* The largest residual over its standard error (root of its complex variance) and which reading has
 * it. NaN where no run is spare: each residual is then zero whatever the readings. */
double regress_misfit(const struct regress_data *data, const struct posterior *p, size_t *which);

#endif
