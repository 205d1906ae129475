/* forecast.h - probabilities and quantiles of the amplitude of a vector that is not exactly known.
 */
#ifndef LOPSIDE_SOLVE_FORECAST_H
#define LOPSIDE_SOLVE_FORECAST_H

#include <complex.h>

/* P(|z| <= radius) for z about `mean` with covariance `cov` = [var re, cov, var im]: normal for dof
 * = INFINITY, else bivariate t with dof > 2 degrees of freedom (cov is then its squared scale).
 * With no variance at all it is 0 or 1. NaN in gives NaN. Computed by quadrature: the tangential
 * component outside (Simpson), the radial one conditional on it by erfc; t as a scale mixture of
 * normals. Error below 1e-5. */
double forecast_within(double complex mean, const double cov[3], double dof, double radius);

/* The radius with P(|z| <= radius) = p, 0 < p < 1, by bisection. */
double forecast_quantile(double complex mean, const double cov[3], double dof, double p);

#endif
