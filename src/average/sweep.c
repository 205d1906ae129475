#include "average/sweep.h"

#include <math.h>
#include <stdbool.h>
#include <stdlib.h>

#include "average/smooth.h"
#include "base/angle.h"

static const double RPM = 2 * PI / 60;   /* rad/s */
static const double GAP_MOST = 4;        /* blocks' own sweeps between w0 and the nearest block */
static const double REACH_LEAST = 0.002; /* of w0: no resonance is as narrow (a damping of 0.1 %) */

/* A block as the fit sees it. */
struct point {
    double distance;            /* |w - w0|, rad/s */
    double offset, rate, width; /* w - w0; its change per s; its change within the block */
    double turns;
    double complex z;
    size_t order; /* in time */
};

/* ---- the points ---- */

/* Rate of the speed at block k: a straight line through up to two neighbours on each side, rad/s2.
 */
static double rate_at(const struct sweep *s, size_t k)
{
    size_t from = k < 2 ? 0 : k - 2, to = k + 2 < s->count ? k + 2 : s->count - 1;
    double n = (double)(to - from + 1), t = 0, w = 0, tt = 0, tw = 0;

    for (size_t i = from; i <= to; i++) {
        t += s->t[i] / n;
        w += s->speed_rpm[i] / n;
    }
    for (size_t i = from; i <= to; i++) {
        tt += (s->t[i] - t) * (s->t[i] - t);
        tw += (s->t[i] - t) * (s->speed_rpm[i] - w);
    }
    return tt > 0 ? tw / tt * RPM : 0;
}

static int by_distance(const void *a, const void *b)
{
    const struct point *x = a, *y = b;

    if (x->distance != y->distance)
        return x->distance < y->distance ? -1 : 1;
    return x->order < y->order ? -1 : 1;
}

static void set_points(const struct sweep *s, double speed_rpm, struct point *points)
{
    for (size_t k = 0; k < s->count; k++) {
        struct point *p = &points[k];
        p->offset = (s->speed_rpm[k] - speed_rpm) * RPM;
        p->distance = fabs(p->offset);
        p->rate = rate_at(s, k);
        p->width = p->rate * s->turns[k] * 60 / s->speed_rpm[k];
        p->turns = s->turns[k];
        p->z = s->vectors[k];
        p->order = k;
    }
    qsort(points, s->count, sizeof *points, by_distance);
}

/* True where blocks lie on both sides of w0 or reach it, the nearest not far. Points are sorted. */
static bool is_inside(const struct point *points, size_t count)
{
    bool below = false, above = false;

    for (size_t k = 0; k < count; k++) {
        double reach = fabs(points[k].width) / 2;
        below |= points[k].offset <= reach;
        above |= points[k].offset >= -reach;
    }
    if (!below || !above)
        return false;
    for (size_t k = 0; k < count && k < SWEEP_LEAST; k++)
        if (points[k].distance <= GAP_MOST * fabs(points[k].width) + 1e-9)
            return true;
    return points[0].distance <=
           points[count < SWEEP_LEAST ? count - 1 : SWEEP_LEAST - 1].distance / 2;
}

/* ---- the fit ---- */

/* What a block may be off by since its 1x changes while it is demodulated: see the header. */
static double leak(const struct point *p, double complex slope)
{
    return cabs(slope * p->width) / (4 * PI * p->turns);
}

static int fit_nearest(const struct point *points, size_t count, double w0, struct sweep_fit *fit)
{
    struct smooth_point seen[SMOOTH_MOST];
    struct smooth smooth;
    double reach = fmax(points[count - 1].distance, REACH_LEAST * w0), off;
    int result;

    for (size_t k = 0; k < count; k++)
        seen[k] = (struct smooth_point){
            .x = points[k].offset,
            .blur = CMPLX(points[k].width * points[k].width / 24, points[k].rate / 2),
            .z = points[k].z,
            .order = points[k].order};
    result = smooth_at_zero(seen, count, reach, &smooth);
    if (result)
        return result < 0 ? -1 : SWEEP_SPARSE;
    off = leak(&points[0], smooth.slope);
    *fit = (struct sweep_fit){
        .vector = smooth.value, .variance = smooth.variance + off * off / 2, .used = count};
    fit->freedom = fmin((double)count, fmax(1, smooth.noise / fit->variance));
    for (size_t k = 0; k < count; k++)
        fit->turns += points[k].turns;
    return SWEEP_MADE;
}

int sweep_at(const struct sweep *sweep, double speed_rpm, struct sweep_fit *fit)
{
    struct point *points;
    int result = SWEEP_OUTSIDE;

    if (sweep->count < SWEEP_LEAST)
        return SWEEP_SPARSE;
    points = malloc(sweep->count * sizeof *points);
    if (!points)
        return -1;
    set_points(sweep, speed_rpm, points);
    if (is_inside(points, sweep->count))
        result = fit_nearest(points, sweep->count < SMOOTH_MOST ? sweep->count : SMOOTH_MOST,
                             speed_rpm * RPM, fit);
    free(points);
    return result;
}
