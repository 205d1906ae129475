/* parts.h - the unbalance of two planes as a static and a couple part.
 *
 * Weights W0, W1 (kg at radii r0, r1) make unbalances U = W r; the static part (U0 + U1)/2 stands
 * on both planes alike, the couple part (U0 - U1)/2 on the first and turned by half a turn on the
 * second. A static weight moves the couple's vibration, too, and the other way round (J. J. Yu,
 * ASME J. Eng. Gas Turbines Power 131(1), 2009, on static-couple influence coefficients): nothing
 * here leaves these cross effects out, for all is worked out of the responses of the planes
 * themselves.
 */
#ifndef LOPSIDE_SOLVE_PARTS_H
#define LOPSIDE_SOLVE_PARTS_H

#include <complex.h>
#include <stddef.h>

/* Parts (kg m) of two weights at these radii (m, > 0). */
void parts_split(const double complex w[2], const double radius[2], double complex *static_part,
                 double complex *couple_part);

/* The forms of place.h (rows x 3 x 3) for one unknown: the unbalance (kg m) that stands on both
 * planes alike; `out` is rows x 2 x 2. */
void parts_reduce(const double complex *forms, size_t rows, const double radius[2],
                  double complex *out);

#endif
