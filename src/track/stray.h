/* stray.h - lines between the orders: what does not turn with the shaft. */
#ifndef LOPSIDE_TRACK_STRAY_H
#define LOPSIDE_TRACK_STRAY_H

#include <stddef.h>

#define STRAY_MOST 5   /* lines that are given: a page has no room for more */
#define STRAY_TURNS 16 /* of a stretch, at least: else nothing lies between the orders */

/* Sums over `averaged` stretches of `turns` whole turns (even), as seen through a Hann window. All
 * powers are squared amplitudes (peak, corrected for the window's mean). */
struct stray_spectrum {
    const double *power;  /* borrowed; power[k] at order k/turns, without what the shaft does: */
    const double *locked; /* borrowed; locked[m] at order m/2, through whole turns alone; as many as
                           * lie below order count/turns, and one at it */
    size_t count, turns;
    long averaged;
};

struct stray {
    double order;     /* interpolated */
    double amplitude; /* peak */
};

/* The largest lines that stand at no multiple of half an order, largest first; `square`: the mean
 * square of the whole signal. A line is a maximum
 * - that noise as large as what lies about it would show in one spectrum of some thousand;
 * - that is a bin or more from every multiple of half an order (a line at 0.46 orders is none of
 *   the shaft's where a bin is less than 0.04), and, where it stands within four bins of one, at
 *   least a third as large as what stands there (else it is its skirt);
 * - that has at least 2 % of the amplitude the signal would have as one line.
 * The amplitude is from the power of all bins of the line, less the noise beneath it, which is
 * right wherever it falls between two bins and where the speed wanders (for the window's noise
 * bandwidth of 1.5 bins: Harris, Proc. IEEE 66 (1978) 51-83); the order is that power's centre.
 * Returns how many, at most STRAY_MOST; 0 where turns < STRAY_TURNS, averaged < 1 or count < 32. */
size_t stray_find(const struct stray_spectrum *spectrum, double square, struct stray *out);

#endif
