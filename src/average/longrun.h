/* longrun.h - how much more the mean of blocks scatters than uncorrelated blocks would let it. */
#ifndef LOPSIDE_AVERAGE_LONGRUN_H
#define LOPSIDE_AVERAGE_LONGRUN_H

#include <complex.h>
#include <stddef.h>

/* The variance of the mean of `count` successive block vectors of so many `components` (2; 1 where
 * they lie on one line), over variance/count, such that a 95 % region with chi-squared holds the
 * truth 95 times in 100. NaN where a vector is NaN; longrun_few() for fewer than 6 blocks or blocks
 * without any scatter; the larger of two estimates otherwise:
 *  - colour.h, for noise of one block's or a few blocks' memory;
 *  - the mean power of the first B = 2, 4, 8 (16) cosine sums (E. Lazarus, D. J. Lewis, J. H.
 * Stock, M. W. Watson, J. Bus. Econ. Stat. 36 (2018) 541-559, "EWC"), where it exceeds the power of
 * the rest at the 10 % level of F(2B, 2(n-1-B)), widened by what F(2, 2B) is wider than
 * chi-squared; F(B, n-1-B) and F(1, B) for one component. This sees slow drift that hides below
 * larger white scatter. */
double longrun_factor(const double complex *vectors, size_t count, int components);

/* The same where nothing is known of the blocks' order: what F(2, 2(n-1)), or F(1, n-1) for one
 * component, is wider than chi-squared for fewer than 6 of `count` = n >= 2; 1 - 2.5/n from there,
 * the least that longrun_factor takes. */
double longrun_few(size_t count, int components);

/* Standard deviation, of both components together, of the slow part of `count` vectors whose mean
 * and line have been taken off: the power of the first B = 2, 4, 8 (16) cosine sums beyond that of
 * the rest, the largest that is significant at the 1 % level of F(2B, 2(n-1-B)). 0 where none is;
 * NaN for fewer than 12 vectors or where one is NaN. */
double longrun_wander(const double complex *vectors, size_t count);

/* P(F > x) of Snedecor's F with 2a and 2b degrees of freedom, a whole and >= 1, b > 0, x >= 0: the
 * finite sum of the incomplete beta function (Abramowitz & Stegun 1964, 26.6.4). */
double longrun_f_tail(double x, size_t a, double b);

/* The point that F with 2 and 2b degrees of freedom exceeds with probability p. */
double longrun_f2_point(double p, double b);

#endif
