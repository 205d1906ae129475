/* alias.h - is a beat what it looks like in the blocks, or a faster one folded down? */
#ifndef LOPSIDE_AVERAGE_ALIAS_H
#define LOPSIDE_AVERAGE_ALIAS_H

#include <stddef.h>

/* Blocks of `block_s` seconds see a vector that turns at f as one that turns at f + k/block_s, k = ..-1, 0, 1.., and
 * weaken it by sin(x)/x, x = pi f block_s: each k demands a line of its own place and size in the order
 * spectrum. `orders` (ascending, evenly spaced around 1) and `amplitude` (peak) are `count` lines of a spectrum
 * over whole turns, of the rectangular window that the spacing says; `turning_hz` and `size` (peak, before
 * weakening is undone) are what the blocks show; speed_hz > 0.
 *
 * Returns the turning frequency that explains the lines beside 1x best, among |k| <= 3. It is turning_hz itself unless
 * another one leaves less than a third of what that leaves, and less than a quarter of the lines' power (limits
 * of our own). So it stays where the spectrum is too coarse to tell, and where it has fewer than five lines on a side. */
double alias_turning(const double *orders, const double *amplitude, size_t count, double speed_hz,
                     double block_s, double turning_hz, double size);

#endif
