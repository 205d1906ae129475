/* orders.h - what else than 1x an order spectrum shows. */
#ifndef LOPSIDE_VET_ORDERS_H
#define LOPSIDE_VET_ORDERS_H

#include <stddef.h>

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

#endif
