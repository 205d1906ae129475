/* turn.h - does the effect turn as the weight is turned?
 *
 * In a linear machine a trial weight that is moved by t degrees against rotation turns its effect
 * by t degrees of lag. Where it turns the other way, angles were counted in the wrong sense.
 */
#ifndef LOPSIDE_SOLVE_TURN_H
#define LOPSIDE_SOLVE_TURN_H

#include <complex.h>
#include <stdbool.h>
#include <stddef.h>

struct turn_figure {
    double se;         /* |turn of the effect - turn of the weight| over its standard error */
    double effect_deg; /* turn of the effect, -180..180 */
    double weight_deg; /* turn of the weight, -180..180 */
    size_t from, to;   /* the two readings */
    bool told;         /* some pair was turned far enough from 0 and 180 deg: a mirror would show */
};

/* Readings y[count] (SI) under weights x[count x planes] (kg), their covariances cov; looks at
 * plane `plane` alone: runs with no other weight, against the mean of the runs with none, two by
 * two. Gives the pair with the largest figure among those whose weight was turned by 20 deg or
 * more; `told` where some pair's turn is 20 deg or more off 180 as well, at which a mirror looks
 * like the thing itself. Where no pair was turned so far, all figures are 0 and `told` is false.
 * False where there is no pair at all. First-order variance of an angle: half the complex variance
 * over the squared amplitude. */
bool turn_worst(size_t count, size_t planes, const double complex *y, const double complex *x,
                const double (*cov)[3], size_t plane, struct turn_figure *worst);

#endif
