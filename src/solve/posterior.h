/* posterior.h - what the regression knows of one row (one sensor in one condition).
 *
 * The unknowns of a row are b = [Z0, A[0] ... A[P-1]]: the vibration with nothing added (SI peak,
 * lag) and the responses per kg. Their joint distribution is normal, or t with `dof` degrees of
 * freedom, about `mean`; `cov` covers the real vector [re b0, im b0, re b1, im b1 ...] without
 * regard to circularity.
 */
#ifndef LOPSIDE_SOLVE_POSTERIOR_H
#define LOPSIDE_SOLVE_POSTERIOR_H

#include <complex.h>
#include <stdbool.h>
#include <stddef.h>

struct posterior {
    size_t unknowns;      /* P + 1 */
    size_t rank;          /* unknowns that the runs determine */
    double complex *mean; /* owned, unknowns; the shortest solution where rank < unknowns */
    double *cov;          /* owned, (2 unknowns) x (2 unknowns), row-major */
    bool *known;          /* owned, unknowns: this one is determined by the runs */
    double dof;           /* of the variance; INFINITY: taken as known */
};

/* Room for that many unknowns, all zero. 0, or -1 when memory is out. */
int posterior_init(struct posterior *p, size_t unknowns) __attribute__((warn_unused_result));
void posterior_release(struct posterior *p); /* safe on a zeroed struct */

/* Moves the origin: Z0 becomes Z0 + sum A[p]*weights[p], the vibration with `weights` (kg, P of
 * them) on the rotor. 0, or -1 when memory is out. */
int posterior_rebase(struct posterior *p, const double complex *weights)
    __attribute__((warn_unused_result));

/* The vibration with `weights` (kg, P of them) added: its mean, and the covariance [var re, cov,
 * var im] of what is not known about it. */
double complex posterior_predict(const struct posterior *p, const double complex *weights,
                                 double cov[3]);

/* Covariance [var re, cov, var im] of unknown k alone. */
void posterior_marginal(const struct posterior *p, size_t k, double cov[3]);

/* Ratio of the variance of the t distribution to its squared scale: dof/(dof-2); 1 for the normal.
 */
double posterior_inflation(const struct posterior *p);

/* The forms of place.h for this row, times scale^2: form = E[conj(b) b^T], certain = conj(m) m^T;
 * both unknowns x unknowns, row-major, so that x^H form x = scale^2 E|b^T x|^2. `certain` may be
 * NULL. */
void posterior_forms(const struct posterior *p, double scale, double complex *form,
                     double complex *certain);

#endif
