/* colour.h - how far the mean of blocks may be off, where nobody knows how slow their noise is. */
#ifndef LOPSIDE_AVERAGE_COLOUR_H
#define LOPSIDE_AVERAGE_COLOUR_H

#include <complex.h>
#include <stddef.h>

#define COLOUR_CHI2_95 5.99146 /* chi-squared with 2 degrees of freedom, 95 %: -2 ln 0.05 */

/* The variance of each component of the mean of `count` (>= 2) successive block vectors, made such
 * that |error|^2 over it stays below chi-squared's 95 % point 95 times in 100. `components`: 2, or
 * 1 where the vectors lie on one line.
 *
 * The noise is one of a few: white, or first-order with a lag-1 correlation r of 0.3, 0.5, 0.7 or
 * 0.85, before the blocks are seen with the weights in colour.c. The powers P_j in the n-1 cosine
 * sums are as good as independent in each, with means in the ratio of
 *     s_j = (1 - r^2) / (1 + r^2 - 2 r cos(pi j/n)),
 * and the mean has the variance s_0/n in these units, s_0 = (1+r)/(1-r) - 2r(1-r^n)/(n(1-r)^2)
 * (G. E. P. Box, G. M. Jenkins, Time Series Analysis, 1970, ch. 3; exact). With the size unknown
 * (prior 1/size) the weight of a noise becomes prior * prod(1/s_j) * Q^-(n-1), Q = sum(P_j/s_j),
 * and |error|^2 exceeds x with the probability (1 + x n/(s_0 Q))^-(n-1); with one component both
 * powers are halved, and the latter is Snedecor's F(2, n-1) for Student's t, safe by 4 % or less of
 * x. The result is the 95 % point of the weighted sum of these, over chi-squared's, times 1
 * - 1.9/n: in white noise the region then holds the truth 94 to 96 times in 100, and not more
 * than 97.5 times for those who read it with Hotelling's T2 on n-1 degrees of freedom, from 16
 * blocks (chosen by the simulation in tests/unit/test_average_mean.c).
 *
 * So a slow wander in few blocks, of which r and size are hardly known, is held for as uncertain
 * as it is; and a swing that comes round within the run, which has little power in the slowest
 * sums, for less than its correlation would say.
 *
 * More than 256 blocks are first averaged in runs of equal length; up to 0.8 % at the end may be
 * left out. NaN where a vector is NaN; 0 where all are equal. */
double colour_variance(const double complex *vectors, size_t count, int components);

/* The power in cosine sum j = 1, 2 ... count-1; those of all j add up to the sum of squares about
 * the mean. */
double colour_cosine_power(const double complex *vectors, size_t count, size_t j);

#endif
