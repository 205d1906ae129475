/* overall.h - the size of everything in a band, in the quantity that is shown. */
#ifndef LOPSIDE_AVERAGE_OVERALL_H
#define LOPSIDE_AVERAGE_OVERALL_H

#include <stddef.h>

#include "stream/job.h"

/* The band at a speed: from the lower of 10 Hz and half of 1x, to 1000 Hz (ISO 20816-1 measures
 * 10 Hz to 1000 Hz, and from a quarter to half of 1x on slow machines). */
void overall_band(double speed_rpm, double *from_hz, double *to_hz);

/* Root mean square of the lines of an order spectrum (`orders` of the running speed, `amplitude`
 * peak, SI of quantity `from`) that lie in the band, each turned into quantity `to` at its own
 * frequency. NaN for no lines in the band, speed not > 0, or a NaN in the band. */
double overall_rms(const double *orders, const double *amplitude, size_t count, double speed_rpm,
                   enum quantity from, enum quantity to);

/* Amplitude of the line nearest order 1, within half an order; NaN if there is none. */
double overall_one_x(const double *orders, const double *amplitude, size_t count);

#endif
