/* correct.h - the ideal weights: least squares, least expected vibration, and how far they are
 * known.
 *
 * A row is a sensor in a condition; `rows` posteriors share the planes. scale[r] (1/SI) makes the
 * rows comparable. W[p] is the equivalent weight to add, kg at the plane's radius against rotation.
 */
#ifndef LOPSIDE_SOLVE_CORRECT_H
#define LOPSIDE_SOLVE_CORRECT_H

#include <complex.h>
#include <stddef.h>

#include "solve/posterior.h"

enum correct_error { CORRECT_OK = 0, CORRECT_NO_MEMORY = -1, CORRECT_FAILED = -2 };

/* The classical influence-coefficient answer: minimises sum (scale |Z0 + A W|)^2 of the means
 * (Goodman 1964). The shortest one where the responses are of lower rank. */
int correct_least_squares(const struct posterior *rows, const double *scale, size_t count,
                          size_t planes, double complex *w) __attribute__((warn_unused_result));

/* Covariance of that answer: `cov` is (2 planes) x (2 planes), row-major, of [re W0, im W0, re W1
 * ...]. First-order propagation of the posterior through the least squares, the residual's part
 * included, with the responses' variance weighed by the second moment of W, not by its estimate
 * alone: close to the border of what can be told this widens the region as Fieller's theorem asks
 * (J. R. Stat. Soc. B 16 (1954) 175-185). */
int correct_covariance(const struct posterior *rows, const double *scale, size_t count,
                       size_t planes, const double complex *w, double *cov)
    __attribute__((warn_unused_result));

/* Minimises x^H F x, x = [1, W], for a Hermitian positive semidefinite F of (planes+1)^2, row-major
 * (see posterior_forms): the least expected squared vibration where F is the sum over rows. */
int correct_quadratic(const double complex *form, size_t planes, double complex *w)
    __attribute__((warn_unused_result));

/* x^H F x for x = [1, W]. */
double correct_value(const double complex *form, size_t planes, const double complex *w);

/* Condition number of the responses, rows divided by se[r] (SI, > 0), columns brought to unit
 * length. INFINITY with fewer rows than planes or a zero response. `weak` (planes, kg) is the
 * pattern of weights that is seen least, its largest part 1. */
int correct_condition(const struct posterior *rows, const double *se, size_t count, size_t planes,
                      double *condition, double complex *weak) __attribute__((warn_unused_result));

#endif
