/* place_region.c - see place_region.h. */
#include "solve/place_region.h"

#include <math.h>
#include <stdlib.h>
#include <string.h>

#include "base/angle.h"

static int by_value(const void *a, const void *b)
{
    double x = *(const double *)a, y = *(const double *)b;
    return (x > y) - (x < y);
}

static int by_place(const void *a, const void *b)
{
    double complex x = *(const double complex *)a, y = *(const double complex *)b;
    if (creal(x) != creal(y)) {
        return creal(x) < creal(y) ? -1 : 1;
    }
    return (cimag(x) > cimag(y)) - (cimag(x) < cimag(y));
}

static double cross(double complex a, double complex b, double complex c)
{
    return cimag(conj(b - a) * (c - a));
}

/* Monotone chain (Andrew 1979); points is sorted in place, hull has room for count + 1. */
static size_t hull_of(double complex *points, size_t count, double size, double complex *hull)
{
    qsort(points, count, sizeof *points, by_place);
    size_t kept = 0;
    for (size_t i = 0; i < count; i++) {
        if (kept == 0 || cabs(points[i] - points[kept - 1]) > 1e-13 * size) {
            points[kept++] = points[i];
        }
    }
    if (kept < 3) {
        memcpy(hull, points, kept * sizeof *hull);
        return kept;
    }
    double flat = 1e-13 * size * size;
    size_t n = 0;
    for (size_t i = 0; i < kept; i++) {
        while (n >= 2 && cross(hull[n - 2], hull[n - 1], points[i]) <= flat) {
            n--;
        }
        hull[n++] = points[i];
    }
    size_t lower = n + 1;
    for (size_t i = kept - 1; i-- > 0;) {
        while (n >= lower && cross(hull[n - 2], hull[n - 1], points[i]) <= flat) {
            n--;
        }
        hull[n++] = points[i];
    }
    return n - 1;
}

/* The corner that lies furthest along a direction: the best positions are filled first. */
static double complex furthest(const double complex *e, size_t count, const double *cap,
                               double total, double complex direction, double *along)
{
    double complex sum = 0;
    for (size_t i = 0; i < count; i++) {
        along[i] = creal(conj(direction) * e[i]);
    }
    while (total > 0 && count > 0) {
        size_t best = 0;
        for (size_t i = 1; i < count; i++) {
            best = along[i] > along[best] ? i : best;
        }
        if (along[best] <= 0) {
            break;
        }
        double m = fmin(cap[best], total);
        sum += m * e[best];
        total -= m;
        along[best] = -1;
    }
    return sum;
}

/* Directions at which the ranking changes: two positions swap, or one starts to count. */
static size_t turning_points(const double complex *e, size_t count, bool swaps, double *at)
{
    size_t n = 0;
    for (size_t i = 0; i < count; i++) {
        double a = carg(e[i]);
        at[n++] = fmod(a + 2.5 * PI, 2 * PI);
        at[n++] = fmod(a + 1.5 * PI, 2 * PI);
        for (size_t j = 0; swaps && j < i; j++) {
            double half = 0.5 * (a + carg(e[j]));
            at[n++] = fmod(half + 2 * PI, 2 * PI);
            at[n++] = fmod(half + 3 * PI, 2 * PI);
        }
    }
    qsort(at, n, sizeof *at, by_value);
    return n;
}

void place_region_disc(struct place_region *region, double radius)
{
    *region = (struct place_region){.disc = true, .radius = radius};
}

int place_region_polygon(struct place_region *region, const double complex *e, size_t count,
                         const double *cap, double total)
{
    *region = (struct place_region){0};
    bool swaps = false;
    for (size_t i = 0; i < count; i++) {
        swaps = swaps || cap[i] < total;
    }
    size_t most = 2 * count + count * count;
    double *at = malloc((most + 1) * sizeof *at);
    double complex *points = malloc((most + count + 2) * sizeof *points);
    double complex *hull = malloc(2 * (most + count + 3) * sizeof *hull);
    double *along = malloc((count + 1) * sizeof *along);
    int result = -1;
    if (at != NULL && points != NULL && hull != NULL && along != NULL) {
        size_t n = 0;
        points[n++] = 0;
        if (swaps) {
            size_t turns = turning_points(e, count, swaps, at);
            for (size_t i = 0; i < turns; i++) {
                double next = i + 1 < turns ? at[i + 1] : at[0] + 2 * PI;
                double complex way = cexp(I * 0.5 * (at[i] + next));
                points[n++] = furthest(e, count, cap, total, way, along);
            }
        } else {
            for (size_t i = 0; i < count; i++) {
                points[n++] = total * e[i];
            }
        }
        region->count = hull_of(points, n, total, hull);
        region->corners = hull;
        hull = NULL;
        result = 0;
    }
    free(along);
    free(hull);
    free(points);
    free(at);
    return result;
}

double place_region_least(const struct place_region *region, double complex g)
{
    if (region->disc) {
        return -region->radius * cabs(g);
    }
    double least = INFINITY;
    for (size_t i = 0; i < region->count; i++) {
        least = fmin(least, creal(conj(g) * region->corners[i]));
    }
    return least;
}

bool place_region_holds(const struct place_region *region, double complex x)
{
    if (region->disc) {
        return cabs(x) < region->radius;
    }
    for (size_t i = 0; i < region->count; i++) {
        if (!(cross(region->corners[i], region->corners[(i + 1) % region->count], x) > 0)) {
            return false;
        }
    }
    return region->count > 2;
}

/* One basic solution: i and j carry the rest, those priced above 1 are full. */
static bool split_by(const double complex *e, size_t count, const double *cap, double complex w,
                     size_t i, size_t j, double *m)
{
    double det = cimag(conj(e[i]) * e[j]);
    if (fabs(det) < 1e-9) {
        return false;
    }
    double complex price = I * (e[i] - e[j]) / det; /* Re(conj(price) e) = 1 at i and j */
    double complex rest = w;
    for (size_t l = 0; l < count; l++) {
        bool full = l != i && l != j && creal(conj(price) * e[l]) > 1;
        if (full && isinf(cap[l])) {
            return false;
        }
        m[l] = full ? cap[l] : 0;
        rest -= m[l] * e[l];
    }
    m[i] = cimag(conj(rest) * e[j]) / det;
    m[j] = cimag(conj(e[i]) * rest) / det;
    double slack = 1e-9 * cabs(w);
    if (!(m[i] >= -slack && m[j] >= -slack && m[i] <= cap[i] + slack && m[j] <= cap[j] + slack)) {
        return false;
    }
    m[i] = fmin(fmax(m[i], 0), cap[i]);
    m[j] = fmin(fmax(m[j], 0), cap[j]);
    return true;
}

bool place_region_split(const double complex *e, size_t count, const double *cap, double complex w,
                        double *m)
{
    double size = cabs(w);
    memset(m, 0, count * sizeof *m);
    if (size == 0) {
        return true;
    }
    for (size_t i = 0; i < count; i++) {
        if (cabs(w - size * e[i]) <= 1e-9 * size && size <= cap[i] * (1 + 1e-9)) {
            m[i] = fmin(size, cap[i]);
            return true;
        }
    }
    /* At the optimum of a linear programme prices and masses agree, so the first that fits is best. */
    for (size_t i = 0; i < count; i++) {
        for (size_t j = 0; j < i; j++) {
            if (split_by(e, count, cap, w, i, j, m)) {
                return true;
            }
        }
    }
    memset(m, 0, count * sizeof *m);
    return false;
}

void place_region_release(struct place_region *region)
{
    free(region->corners);
    *region = (struct place_region){0};
}
