/* place_relax.h - the convex relaxation: the least worst row over convex regions, with a proven bound.
 *
 * Minimises max_r J_r(w), w_q in region q, by a logarithmic barrier and Newton's method (Boyd & Vandenberghe,
 * Convex Optimization, 2004, section 11.3). The bound does not rest on how well that went: for any point
 * and any lambda on the simplex, convexity gives
 *     min max_r J_r >= J_lambda(w) + sum_q min over region q of 2 Re(conj(slope_q) (x - w_q)).
 */
#ifndef LOPSIDE_SOLVE_PLACE_RELAX_H
#define LOPSIDE_SOLVE_PLACE_RELAX_H

#include "solve/place_form.h"
#include "solve/place_region.h"

/* form: `planes` >= 1 planes, all with some curvature in some row; region[planes] borrowed.
 * norm: J units, > 0, the size against which accuracy counts.
 * accuracy: aimed at, as part of the optimum (0: about 1e-12 norm). enough: J units; ends early, with any
 * point, once the bound is proven to reach it (INFINITY: never).
 * Writes w[planes] (inside the regions), lambda[rows] (>= 0, sum 1) and *bound.
 * Returns 0, or -1 when memory is short. */
int place_relax(const struct place_form *form, const struct place_region *region, double norm,
                double accuracy, double enough, double complex *w, double *lambda, double *bound)
    __attribute__((warn_unused_result));

/* What one relaxation counts as in nodes of the search, so that their number bounds the time. */
long place_relax_nodes(const struct place_form *form);

#endif
