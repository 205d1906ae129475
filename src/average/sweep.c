#include "average/sweep.h"

#include <lapacke.h>
#include <math.h>
#include <stdbool.h>
#include <stdlib.h>
#include <string.h>

#include "average/longrun.h"
#include "base/angle.h"

static const double RPM = 2 * PI / 60; /* rad/s */
static const double GROWTH = 1.4;      /* of the neighbourhood from one try to the next */
static const double AGREE = 2;         /* standard errors: 95 % of a normal deviate */
static const double GAP_MOST = 4;      /* blocks' own sweeps between w0 and the nearest block */
static const double CHI2_95 = 5.99146; /* chi-squared with 2 degrees of freedom, 95 % */
static const double CORRELATION_MOST = 0.9; /* as in longrun.c */
static const size_t NOISE_BLOCKS = 48; /* nearest in speed that tell the noise of single blocks */
static const double NOISE_LEAST = 8;   /* third differences, at least */
static const double SINGULAR = 1e-9;   /* of a pivot against the largest: rounding of the sums */
static const double SECOND_TERM = 3;   /* second over squared first term at a resonance's peak */
static const double FAR_LESS = 0.12; /* of the variance: in plain noise the least of several is only
                                        luck; from the campaign of the test */
static const double SURER_MOST =
    16; /* times smaller a variance: that few blocks agree is no proof */
static const double FREEDOM_LEAST =
    2; /* below, a scatter says nothing, and a multiple of it less */

/* A block as the fit sees it. */
struct point {
    double distance;            /* |w - w0|, rad/s */
    double offset, rate, width; /* w - w0; its change per s; its change within the block */
    double weight, turns;
    double complex z;
    size_t order; /* in time */
};

/* Scatter of single blocks as their third differences in time show it. */
struct noise {
    double variance, freedom; /* of a component; freedom 0: not known */
};

/* One local fit. */
struct local {
    double complex a;
    double late; /* size of the late answer's first term */
    double variance, freedom, h;
    size_t used;
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

/* From the blocks nearest in speed: a smooth curve has next to no third difference, and it
 * multiplies white variance by 1 + 9 + 9 + 1. Its own correlation (15, 6 and 1 over 20) leaves
 * 1/2.31 of the degrees of freedom. */
static struct noise noise_near(const struct sweep *s, const struct point *points)
{
    double sum = 0, n = 0;

    for (size_t k = 0; k < s->count && k < NOISE_BLOCKS; k++) {
        const double complex *z = &s->vectors[points[k].order];
        double complex d;
        if (points[k].order < 3)
            continue;
        d = z[0] - 3 * z[-1] + 3 * z[-2] - z[-3];
        sum += creal(d * conj(d));
        n++;
    }
    if (n < NOISE_LEAST)
        return (struct noise){0};
    return (struct noise){sum / n / 40, n / 2.31};
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

/* ---- one fit ---- */

/* The three regressors of a point, speeds in units of h. */
static void regressors(const struct point *p, double w0, double h, double complex x[3])
{
    double square = p->offset * p->offset + p->width * p->width / 12;

    x[0] = 1 - I * p->rate / (w0 * w0);
    x[1] = p->offset / h;
    x[2] = (square + I * p->rate) / (h * h);
}

/* Tricube weights out to h, just beyond the last of `count` points. */
static double set_weights(struct point *points, size_t count)
{
    double h = points[count - 1].distance * 1.1;

    for (size_t k = 0; k < count; k++) {
        double u = h > 0 ? points[k].distance / h : 0;
        double v = 1 - u * u * u;
        points[k].weight = v * v * v;
    }
    return h > 0 ? h : 1;
}

/* Solves the normal equations of the first `terms` regressors: coefficients, and the inverse of the
 * normal matrix. False where it is singular. */
static bool solve(const struct point *points, size_t count, double w0, double h, int terms,
                  double complex coefficients[3], double complex inverse[3][3])
{
    double complex normal[9] = {0}, sides[12] = {0};
    double largest = 0;

    for (size_t k = 0; k < count; k++) {
        double complex x[3];
        regressors(&points[k], w0, h, x);
        for (int i = 0; i < terms; i++) {
            for (int j = 0; j < terms; j++)
                normal[3 * i + j] += points[k].weight * conj(x[i]) * x[j];
            sides[4 * i] += points[k].weight * conj(x[i]) * points[k].z;
        }
    }
    for (int i = 0; i < terms; i++) {
        sides[4 * i + 1 + i] = 1;
        largest = fmax(largest, creal(normal[4 * i]));
    }
    if (LAPACKE_zposv(LAPACK_ROW_MAJOR, 'U', terms, 1 + terms, normal, 3, sides, 4) != 0)
        return false;
    for (int i = 0; i < terms; i++) {
        double pivot = creal(normal[4 * i]);
        if (!(pivot * pivot > SINGULAR * largest))
            return false;
        coefficients[i] = sides[4 * i];
        for (int j = 0; j < terms; j++)
            inverse[i][j] = sides[4 * i + 1 + j];
    }
    return true;
}

/* (1+r)/(1-r) of the lag-1 correlation of residuals of blocks that follow each other in time. */
static double slow_factor(const struct point *points, const double complex *residuals, size_t count)
{
    double sum = 0, power = 0, r;
    size_t pairs = 0;

    for (size_t k = 0; k < count; k++) {
        power += creal(residuals[k] * conj(residuals[k]));
        for (size_t l = 0; l < count; l++) {
            if (points[l].order != points[k].order + 1)
                continue;
            sum += creal(residuals[k] * conj(residuals[l]));
            pairs++;
        }
    }
    if (pairs < 12 || !(power > 0)) /* fewer: a correlation of residuals says nothing */
        return 1;
    r = sum / (double)pairs / (power / (double)count) +
        3 / (double)count; /* three terms were fitted */
    if (r < 1 / sqrt(2 * (double)pairs))
        return 1;
    r = fmin(r, CORRELATION_MOST);
    return (1 + r) / (1 - r);
}

static bool fit_terms(struct point *points, size_t count, double w0, int terms,
                      const struct noise *noise, double complex *residuals, struct local *local)
{
    double complex c[3] = {0}, inverse[3][3] = {{0}}, spread = 0, mean_rate = 0;
    double h = set_weights(points, count), weights = 0, used = 0, squares = 0;
    double complex inner[3][3] = {{0}};

    if (!solve(points, count, w0, h, terms, c, inverse))
        return false;
    for (size_t k = 0; k < count; k++) {
        double complex x[3], e = points[k].z;
        double w = points[k].weight;
        regressors(&points[k], w0, h, x);
        for (int i = 0; i < terms; i++) {
            e -= c[i] * x[i];
            for (int j = 0; j < terms; j++)
                inner[i][j] += w * w * conj(x[i]) * x[j];
        }
        residuals[k] = sqrt(w) * e;
        squares += creal(residuals[k] * conj(residuals[k]));
        weights += w;
        mean_rate += w * points[k].rate;
    }
    for (int i = 0; i < terms; i++)
        for (int j = 0; j < terms; j++) {
            used += creal(inverse[i][j] * inner[j][i]);
            spread += inverse[0][i] * inner[i][j] * conj(inverse[0][j]);
        }
    if (!(weights - used > 1e-6 * weights))
        return false;
    double factor = slow_factor(points, residuals, count);
    double pieces = weights - used; /* as if each block counted by its weight */
    double variance = squares / (2 * pieces) * factor;
    local->freedom = fmax(pieces / factor, FREEDOM_LEAST);
    if (noise->freedom > 0 && noise->variance > variance) {
        variance = noise->variance;
        local->freedom = noise->freedom;
    }
    local->variance = variance * creal(spread);
    local->a = c[0];
    local->late = cabs(mean_rate / weights * (c[2] / (h * h) - c[0] / (w0 * w0)));
    local->used = count;
    local->h = h;
    return true;
}

/* The highest order that the points can carry. */
static bool fit_local(struct point *points, size_t count, double w0, const struct noise *noise,
                      double complex *residuals, struct local *local)
{
    for (int terms = 3; terms >= 1; terms--)
        if (fit_terms(points, count, w0, terms, noise, residuals, local))
            return true;
    return false;
}

/* ---- the neighbourhood ---- */

static double widened(const struct local *l)
{
    return l->variance * 2 * longrun_f2_point(0.05, l->freedom) / CHI2_95;
}

/* True where `l` agrees with an earlier, narrower fit. */
static bool agrees(const struct local *l, const struct local *earlier)
{
    return cabs(l->a - earlier->a) <= AGREE * sqrt(2 * widened(earlier));
}

#define TRIES_MOST 24 /* 5 * 1.4^24: beyond any recording's blocks */

/* Adds to the variance what the data cannot show: movement between neighbourhoods, and lateness. */
static double honest(const struct local *l, const struct local *narrower)
{
    double variance = widened(l), size = cabs(l->a);

    if (narrower) {
        double moved = cabs(l->a - narrower->a);
        variance += fmax(0, moved * moved / 2 - (narrower->variance - l->variance));
    }
    if (size > 0) {
        double second = SECOND_TERM * l->late * l->late / size;
        variance += second * second / 2;
    }
    return variance;
}

/* The fit to use of `count` that agree, the narrowest first, and its variance: the widest, unless a
 * narrower one has far less to fear, as near a resonance, where the widest holds more bend than
 * noise.
 */
static const struct local *choose(const struct local *tries, size_t count, double *variance)
{
    const struct local *best = &tries[count - 1];

    *variance = honest(best, count > 1 ? best - 1 : NULL);
    double limit = FAR_LESS * *variance, floor = *variance / SURER_MOST;
    for (size_t i = count - 1; i-- > 1;) {
        double own = honest(&tries[i], &tries[i - 1]);
        if (own < limit) {
            limit = *variance = own;
            best = &tries[i];
        }
    }
    *variance = fmax(*variance, floor);
    return best;
}

int sweep_at(const struct sweep *sweep, double speed_rpm, struct sweep_fit *fit)
{
    struct local tries[TRIES_MOST] = {0};
    size_t count = 0, reach = SWEEP_LEAST;
    struct point *points;
    struct noise noise;
    double complex *residuals;
    int result = SWEEP_MADE;

    if (sweep->count < SWEEP_LEAST)
        return SWEEP_SPARSE;
    points = malloc(sweep->count * (sizeof *points + sizeof *residuals));
    if (!points)
        return -1;
    residuals = (double complex *)(points + sweep->count);
    set_points(sweep, speed_rpm, points);
    noise = noise_near(sweep, points);
    if (!is_inside(points, sweep->count))
        result = SWEEP_OUTSIDE;
    while (result == SWEEP_MADE && count < TRIES_MOST) {
        struct local *l = &tries[count];
        bool good = fit_local(points, reach, speed_rpm * RPM, &noise, residuals, l);
        for (size_t i = 0; good && i < count; i++)
            good = agrees(l, &tries[i]);
        if (!good && count > 0)
            break;
        count += good;
        if (reach == sweep->count)
            break;
        reach = (size_t)ceil((double)reach * GROWTH);
        reach = reach < sweep->count ? reach : sweep->count;
    }
    if (result == SWEEP_MADE && count == 0)
        result = SWEEP_SPARSE;
    if (result == SWEEP_MADE) {
        double variance;
        const struct local *l = choose(tries, count, &variance);
        *fit = (struct sweep_fit){
            .vector = l->a, .variance = variance, .used = l->used, .freedom = l->freedom};
        for (size_t k = 0; k < l->used; k++)
            fit->turns += points[k].turns;
    }
    free(points);
    return result;
}
