/* shape.h - does a column look like a tacho at all, or like vibration that was plugged in for it?
 *
 * A tacho stands at one of two levels, or at rest between short pulses; vibration is spread over
 * its whole range. A few thousand samples spread over the recording decide. Memory: SHAPE_KEPT
 * floats. */
#ifndef LOPSIDE_TRACK_SHAPE_H
#define LOPSIDE_TRACK_SHAPE_H

#include <stdbool.h>
#include <stddef.h>

#define SHAPE_KEPT 8192 /* when they are full every other one is dropped and the stride doubled */

struct shape {
    size_t stride, skip, count;
    float kept[SHAPE_KEPT];
};

void shape_init(struct shape *shape);
void shape_add(struct shape *shape, const float *x, size_t n);

/* Kurtosis m4/m2^2 of the samples (1.5 for a sine, 3 for Gaussian noise, about 1/d for pulses of
 * duty d) and the share of them in the middle third of the range (0.22 for a sine: 2/pi*asin(1/3)).
 * NaN, NaN where there are fewer than 64 samples or no range. */
void shape_figures(const struct shape *shape, double *kurtosis, double *middle);

/* False where the column is spread as vibration is: kurtosis within 1.3 to 4 and more than a tenth
 * in the middle third. Two levels at any duty have next to none there; short pulses, bipolar ones
 * too, have a kurtosis far above. Both limits are common sense about ranges, not from a source. */
bool shape_pulsed(const struct shape *shape);

#endif
