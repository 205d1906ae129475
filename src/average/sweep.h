/* sweep.h - the steady 1x vector at a given speed, from the block vectors of a coast-down. */
#ifndef LOPSIDE_AVERAGE_SWEEP_H
#define LOPSIDE_AVERAGE_SWEEP_H

#include <complex.h>
#include <stddef.h>

struct sweep {                     /* the blocks of one sensor in one run, all borrowed */
    const double *t;               /* middle of the block, s, ascending */
    const double *speed_rpm;       /* its mean speed, > 0 */
    const double *turns;           /* > 0 */
    const double complex *vectors; /* finite */
    size_t count;
};

struct sweep_fit {
    double complex vector;
    double variance; /* of each component: cov is {variance, 0, variance} */
    size_t used;     /* blocks that the curve rests on, the nearest: at most SMOOTH_MOST */
    double turns;    /* in these blocks */
    double freedom;  /* so many blocks' noise averages to that variance: 1..used */
};

enum sweep_result { SWEEP_MADE, SWEEP_OUTSIDE, SWEEP_SPARSE };

/* The vector at w0 of a smooth curve Z(w) through the blocks nearest in speed, up to SMOOTH_MOST
 * (smooth.h).
 *
 * The sweep blurs what a block shows, in two ways. A machine that changes its speed answers late:
 * an unbalance is the second derivative of a displacement that turns with the shaft, and passing
 * exp(j phi(t)) of rate phi'' = w' through any linear machine and sensor gives exp((j/2) w'
 * d^2/dw^2) Z (the convolution with the impulse response about the instantaneous frequency, to all
 * orders where w' is steady over the machine's memory; B. van der Pol, J. IEE 93 III (1946)
 * 153-158, calls its first term the quasi-stationary one; here lag counts positive). And its vector
 * is the mean over the block, within which the speed changes by d: exp((d^2/24) d^2/dw^2) Z, to the
 * fourth order in d.
 *
 * The variance is the curve's, whatever its bend, size and noise may be as the blocks tell, plus
 * what demodulation over n turns leaves of the twofold running speed while Z changes by D within
 * the block: D/(4 pi n) (one integration by parts). To be read with chi-squared, like mean.h's.
 *
 * Returns SWEEP_MADE; SWEEP_OUTSIDE where the speed is not among those recorded (half of a block's
 * own sweep is allowed beyond the first and the last) or lies in a gap between them; SWEEP_SPARSE
 * where fewer than SWEEP_LEAST blocks are there, or where those that are cannot carry a curve; -1
 * when memory is out. */
#define SWEEP_LEAST 5
int sweep_at(const struct sweep *sweep, double speed_rpm, struct sweep_fit *fit)
    __attribute__((warn_unused_result));

#endif
