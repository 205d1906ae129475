/* resonance.h - does the lag turn with the speed, as it does near a resonance? */
#ifndef LOPSIDE_VET_RESONANCE_H
#define LOPSIDE_VET_RESONANCE_H

#include <complex.h>
#include <stdbool.h>
#include <stddef.h>

struct resonance {
    double slope; /* turn of lag per % of speed, deg; NaN: not known */
    double error; /* its standard error, deg */
};

struct resonance resonance_unknown(void);

/* The turn of lag with speed over `count` vectors (lag = argument) at `speed` (any unit, > 0), by
 * least squares, a trend in time t (s; NULL: none) taken off both, so that a machine that warms up
 * while its speed creeps is not mistaken for it. The error allows for neighbouring residuals that
 * go together (M. S. Bartlett, J. R. Stat. Soc. 98 (1935) 536-543: the first-order correlations of
 * both series). Lags must stay within 180 deg of their mean. Unknown: fewer than 12 vectors with a
 * time, 4 without, a NaN, or a speed that stands still. */
struct resonance resonance_of(const double complex *vectors, const double *speed, const double *t,
                              size_t count);

/* The same from two readings with equal weights at two speeds; `variance`: of the turn between
 * them, deg^2. */
struct resonance resonance_of_two(double complex a, double speed_a, double complex b,
                                  double speed_b, double variance);

/* The same along a curve over speed (a coast-down), from its points within 4 % of `at`; NaN vectors
 * are passed over. More than 256 points: the first ones. */
struct resonance resonance_along(const double complex *vectors, const double *speed, size_t count,
                                 double at);

/* True where the slope is no chance: beyond 4.6 standard errors, Student's t with 10 degrees of
 * freedom at 0.1 %. */
bool resonance_stands_out(const struct resonance *resonance);

#endif
