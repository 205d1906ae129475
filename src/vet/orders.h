/* orders.h - what else than 1x an order spectrum shows. */
#ifndef LOPSIDE_VET_ORDERS_H
#define LOPSIDE_VET_ORDERS_H

#include <stddef.h>

#define ORDERS_LINES_MOST 8 /* lines that are kept: more than a spectrum names */

struct orders {
    double two_x, half_order, neighbour; /* % of 1x; NaN where the spectrum cannot tell */
    double neighbour_order;              /* where the largest line beside multiples of 1/2 stands */
};

/* Sizes against 1x of the 2x, of the largest of 0.5x, 1.5x, 2.5x, and of the largest line that
 * belongs to no multiple of half an order. `orders` ascending, evenly spaced at first (lines behind
 * the first gap are not looked at for neighbours), `amplitude` peak in the sensor's quantity;
 * `derivatives`: how often that is differentiated for the quantity shown (negative: integrated),
 * which multiplies each line by order^derivatives against 1x. Whole orders are looked for
 * within 1.5 spacings; a neighbour's power is that of three lines, since it falls between them.
 * Lines below half of 1x are not looked at: integrated noise grows there without bound. Spacing
 * above 0.1 orders: no neighbour can be told. */
struct orders orders_of(const double *orders, const double *amplitude, size_t count,
                        int derivatives);

/* The largest of `count` lines, {Hz, peak in the sensor's quantity} each, as they are in the
 * quantity shown (`derivatives` as above) against what they would be at the running speed,
 * `speed_hz`: its amplitude, comparable with that of 1x, and *hz its frequency. Lines below half of
 * the speed are not looked at. 0 and *hz NaN: there is none, or no speed. */
double orders_line(const double (*lines)[2], size_t count, double speed_hz, int derivatives,
                   double *hz);

#endif
