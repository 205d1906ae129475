/* repeat.h - the scatter from run to run, from runs that were repeated.
 *
 * A group is the readings of one sensor in one condition under equal weights. All are divided by
 * the as-found amplitude of their row, so that sensors can be pooled.
 */
#ifndef LOPSIDE_SOLVE_REPEAT_H
#define LOPSIDE_SOLVE_REPEAT_H

#include <complex.h>
#include <stddef.h>

/* The sheet's value (or the default) counts as this many degrees of freedom beside the repeats: two
 * sensors repeated once weigh as much as it. Our choice; without any repeat it is taken as known.
 */
#define REPEAT_PRIOR_DOF 4.0

struct repeat_pool {
    double squares;   /* sum of squared deviations from the group means */
    double explained; /* what the readings' own covariances contribute to it on average */
    double dof;       /* real degrees of freedom: 2 (m - 1) a group of m */
};

/* Adds a group of `count` vectors (SI) of covariance cov[i]; `scale` (SI, > 0) is the row's
 * as-found amplitude. A group of fewer than two adds nothing. */
void repeat_add(struct repeat_pool *pool, const double complex *vectors, const double (*cov)[3],
                size_t count, double scale);

/* Standard deviation per component as a fraction of the as-found amplitude, the sheet's `prior`
 * weighed in with REPEAT_PRIOR_DOF; *dof gets the degrees of freedom (INFINITY without repeats). */
double repeat_estimate(const struct repeat_pool *pool, double prior, double *dof);

#endif
