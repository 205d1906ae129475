/* chebyshev.h - the weights that make the largest row smallest.
 *
 * Minimises max_r J_r(W), J_r = x^H F_r x with x = [1, W], F_r Hermitian positive semidefinite of
 * (planes+1)^2, row-major (see place.h). A convex problem: the barrier method for min t, J_r <= t,
 * with Newton steps (Boyd & Vandenberghe, Convex Optimization, 2004, section 11.3), whose duality
 * gap, rows/tau, is brought below 1e-12 of the value at the start.
 */
#ifndef LOPSIDE_SOLVE_CHEBYSHEV_H
#define LOPSIDE_SOLVE_CHEBYSHEV_H

#include <complex.h>
#include <stddef.h>

enum chebyshev_error { CHEBYSHEV_OK = 0, CHEBYSHEV_NO_MEMORY = -1, CHEBYSHEV_FAILED = -2 };

/* `w` (planes, kg) holds a start on entry (the least squares) and the answer on return; a start
 * that is exact (largest row below 1e-20 of the largest with nothing added) is left. *largest: max
 * J. */
int chebyshev_solve(const double complex *forms, size_t rows, size_t planes, double complex *w,
                    double *largest) __attribute__((warn_unused_result));

#endif
