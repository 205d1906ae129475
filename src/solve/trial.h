/* trial.h - the size of a trial weight, and the force of a weight. */
#ifndef LOPSIDE_SOLVE_TRIAL_H
#define LOPSIDE_SOLVE_TRIAL_H

#include <stddef.h>

#define TRIAL_SHARE 0.10      /* of the static journal load, as force: common practice */
#define TRIAL_GRAVITY 9.80665 /* m/s2, CGPM 1901 */

/* Centrifugal force m r w^2, N, of `mass` kg at `radius` m and `rpm`. */
double trial_force(double mass, double radius, double rpm);

/* The mass, kg, at `radius` m whose force at `rpm` is TRIAL_SHARE of the weight of `journal_load`
 * kg. */
double trial_mass(double journal_load, double radius, double rpm);

/* The sum of at most `pieces` pieces nearest to `mass`: masses[stock] (kg, > 0), counts[stock] of
 * each
 * (-1: any number), not above `most`. 0 where no single piece may be used. Without stock: `mass`,
 * or `most` if that is less. */
double trial_round(double mass, const double *masses, const int *counts, size_t stock, int pieces,
                   double most);

#endif
