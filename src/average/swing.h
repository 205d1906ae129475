/* swing.h - a periodic swing of the block vectors: a beat. */
#ifndef LOPSIDE_AVERAGE_SWING_H
#define LOPSIDE_AVERAGE_SWING_H

#include <complex.h>
#include <stddef.h>

struct swing {
    double size; /* farthest from the mean that it takes the vector; 0: none that is significant;
                  * NaN: cannot be known */
    double period_s;   /* NaN where size is not > 0, as the next */
    double turning_hz; /* how fast, and which way, the vector turns about its mean; NaN where it
                        * swings to and fro: then the machine's own 1x grows and shrinks */
    double complex forth,
        back; /* vectors that turn with +1/period and -1/period, at t = 0, in block means */
    double
        residual; /* sum of squares that a mean, a straight line and the swing leave; NaN: no fit */
};

#define SWING_LEAST 16 /* blocks; with fewer every noise has some period */

/* Looks for a line in the spectrum of `count` block vectors at times t (s, ascending, nearly even;
 * `t` are the middles of blocks that follow each other). A line at frequency f turns the vector as
 * forth*exp(j 2 pi f t) + back*exp(-j 2 pi f t) about a mean and a straight line. Something that
 * vibrates at f_n beside the running speed f_s adds a vector that turns at f_s - f_n, one way only;
 * a machine whose own 1x swings does both.
 *
 * Seen are periods of two blocks up to half of the run. A faster one folds into that range and is
 * weakened, by sin(x)/x with x = pi f D in blocks of D seconds (which is undone for what lies in
 * the range); the mean over whole periods of it is nothing. A slower one is drift (trend.h), or
 * wander (longrun.h).
 *
 * Significant where it passes two tests: the 0.1 % point of F(4, 2(n-4)) against everything that it
 * leaves, times the 2n frequencies looked at (R. A. Fisher, Proc. R. Soc. A 125 (1929) 54-59, in
 * its sum-bounded form), the line's power divided by the shape of first-order noise with the lag-1
 * correlation that is left, so that slow noise has no beats; and the same level against the median
 * of the spectrum around it.
 *
 * size is NaN for fewer than SWING_LEAST blocks, times that span more than four times their number
 * of median steps, and where a vector is NaN. Returns 0; -1 when memory is out. */
int swing_find(const double complex *vectors, const double *t, size_t count, struct swing *swing)
    __attribute__((warn_unused_result));

/* What the swing adds to the block mean at time t. */
double complex swing_at(const struct swing *swing, double t);

#endif
