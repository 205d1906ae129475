#include "average/robust.h"

#include <math.h>
#include <stdlib.h>

static const double DISTANCE_MOST = 3.2905 / 0.6745; /* see the header */
static const double SHARE_MOST = 0.2; /* common practice: trimming of up to a fifth */
static const size_t COUNT_LEAST = 8;  /* with fewer, a median distance is no spread */

static int ascending(const void *a, const void *b)
{
    double x = *(const double *)a, y = *(const double *)b;

    return (x > y) - (x < y);
}

double robust_median(double *values, size_t count)
{
    if (count == 0)
        return NAN;
    qsort(values, count, sizeof *values, ascending);
    return count % 2 ? values[count / 2] : 0.5 * (values[count / 2 - 1] + values[count / 2]);
}

/* The median vector; NaN where a component is. `room` holds `count` values. */
static double complex median_vector(const double complex *vectors, size_t count, double *room)
{
    double re, im;

    for (size_t i = 0; i < count; i++) {
        if (isnan(creal(vectors[i])) || isnan(cimag(vectors[i])))
            return NAN;
        room[i] = creal(vectors[i]);
    }
    re = robust_median(room, count);
    for (size_t i = 0; i < count; i++)
        room[i] = cimag(vectors[i]);
    im = robust_median(room, count);
    return CMPLX(re, im);
}

long robust_keep(const double complex *vectors, size_t count, bool *keep)
{
    double *room;
    double complex middle;
    double limit;
    long aside = 0;

    for (size_t i = 0; i < count; i++)
        keep[i] = true;
    if (count < COUNT_LEAST)
        return 0;
    room = malloc(count * sizeof *room);
    if (!room)
        return -1;
    middle = median_vector(vectors, count, room);
    for (size_t i = 0; i < count; i++)
        room[i] = cabs(vectors[i] - middle);
    limit = DISTANCE_MOST * robust_median(room, count);
    free(room);
    if (!(limit > 0)) /* no spread at all, or NaN */
        return 0;
    for (size_t i = 0; i < count; i++) {
        keep[i] = cabs(vectors[i] - middle) <= limit;
        aside += !keep[i];
    }
    if ((double)aside > SHARE_MOST * (double)count) {
        for (size_t i = 0; i < count; i++)
            keep[i] = true;
        aside = 0;
    }
    return aside;
}
