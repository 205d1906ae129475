#include "track/shape.h"

#include <math.h>

#define STRIDE 7 /* samples; few pulses are shorter than that and none stands still against it */
#define LEAST 64 /* samples that say anything about a shape */
#define FLATTEST 1.3    /* kurtosis: two levels at about even duty have 1.0, a sine 1.5 */
#define PEAKIEST 4      /* kurtosis: Gaussian noise has 3, pulses of a fifth of the turn 3.3 */
#define MIDDLE_MOST 0.1 /* share of the samples; a sine has 0.22 */

void shape_init(struct shape *shape)
{
    shape->stride = STRIDE;
    shape->skip = 0;
    shape->count = 0;
}

static void halve(struct shape *shape)
{
    for (size_t i = 0; i < SHAPE_KEPT / 2; i++)
        shape->kept[i] = shape->kept[2 * i];
    shape->count = SHAPE_KEPT / 2;
    shape->stride *= 2;
}

void shape_add(struct shape *shape, const float *x, size_t n)
{
    size_t i = shape->skip;

    while (i < n) {
        if (shape->count == SHAPE_KEPT)
            halve(shape);
        shape->kept[shape->count++] = x[i];
        i += shape->stride;
    }
    shape->skip = i - n;
}

void shape_figures(const struct shape *shape, double *kurtosis, double *middle)
{
    double sum = 0, m2 = 0, m4 = 0, min = INFINITY, max = -INFINITY;
    size_t between = 0;

    *kurtosis = *middle = NAN;
    for (size_t i = 0; i < shape->count; i++) {
        sum += shape->kept[i];
        min = fmin(min, shape->kept[i]);
        max = fmax(max, shape->kept[i]);
    }
    if (shape->count < LEAST || !(max > min))
        return;
    for (size_t i = 0; i < shape->count; i++) {
        double d = shape->kept[i] - sum / (double)shape->count, square = d * d;
        m2 += square;
        m4 += square * square;
        between += shape->kept[i] > min + (max - min) / 3 && shape->kept[i] < max - (max - min) / 3;
    }
    *kurtosis = m4 * (double)shape->count / (m2 * m2);
    *middle = (double)between / (double)shape->count;
}

bool shape_pulsed(const struct shape *shape)
{
    double kurtosis, middle;

    shape_figures(shape, &kurtosis, &middle);
    return !(kurtosis > FLATTEST && kurtosis < PEAKIEST && middle > MIDDLE_MOST);
}
