/* smooth.h - the value of a smooth complex curve at 0, from blurred points with noise. */
#ifndef LOPSIDE_AVERAGE_SMOOTH_H
#define LOPSIDE_AVERAGE_SMOOTH_H

#include <complex.h>
#include <stddef.h>

struct smooth_point {
    double x;
    double complex
        blur; /* b, real part >= 0, in x^2: the point shows exp(b d^2/dx^2) of the curve */
    double complex z;
    size_t order; /* in time: neighbours have neighbouring numbers */
};

struct smooth {
    double complex value; /* of the curve at 0 */
    double complex slope; /* there, per unit of x */
    double variance;      /* of each component of `value`, to be read with chi-squared */
    double noise;         /* variance of each component of a point's noise */
};

/* The curve is a Gaussian process with the covariance exp(-u^2/(2 l^2)) over a straight line (C. E.
 * Rasmussen, C. K. I. Williams, Gaussian Processes for Machine Learning, MIT 2006, ch. 2 and 5.2).
 * Blurring two points turns the covariance into l/sqrt(L) exp(-u^2/(2 L)), L = l^2 + 2 (b_1 +
 * conj(b_2)). The length l (0.06 of `reach` to three times it), the size of the curve over the
 * noise (1 to 10,000) and the noise's correlation from one point to the next in time (0, 0.5, 0.85)
 * are averaged over with the weights that the points give them, times weights of our choice that
 * hold white noise for likelier than slow (smooth.c), so that their being unknown is part of the
 * variance. The variance of each is widened by what F(2, 2(count-1)) is wider than chi-squared,
 * since the size of the noise is known from the points alone; and by 15 % where the length is
 * `reach` or less, since curves seldom bend alike everywhere (UNEVEN in smooth.c; from a
 * simulation).
 *
 * `count` (2 ... SMOOTH_MOST) points with |x| <= reach, reach > 0. Returns 0; 1 where the points
 * cannot carry a curve (NaN among them); -1 when memory is out. */
#define SMOOTH_MOST 48
int smooth_at_zero(const struct smooth_point *points, size_t count, double reach,
                   struct smooth *out) __attribute__((warn_unused_result));

#endif
