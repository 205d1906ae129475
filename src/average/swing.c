#include "average/swing.h"

#include <fftw3.h>
#include <lapacke.h>
#include <math.h>
#include <stdbool.h>
#include <stdlib.h>

#include "average/longrun.h"
#include "average/robust.h"
#include "base/angle.h"

static const double LEVEL = 0.001; /* of both tests; common practice for a search */
static const double MEDIAN_2 =
    1.67835;                       /* median of the sum of two unit exponentials (gamma, shape 2) */
static const double ONE_WAY = 0.5; /* a smaller share of the other way counts as none */
static const size_t SPAN_MOST = 4; /* steps per block, at most, in runs with gaps */
static const size_t PADDING =
    4; /* finer spectrum, so that no line falls between two of its points */
static const size_t AROUND = 12; /* whole bins on each side whose median is the floor */
static const size_t NEAR = 2;    /* of them, too near to the line */
static const double SCALLOP =
    1.1; /* what a line can lose between two points of the padded spectrum (5 %) */
static const double SLOWEST = 0.95; /* slower noise is a drift */
static const int REFINE = 40;       /* halvings of a golden section: 0.618^40 of a bin */

/* The blocks: time in units that keep the normal equations round. */
struct series {
    const double complex *z;
    const double *t;
    size_t count;
    double middle, half, step; /* of t; step: median difference */
};

/* Least squares of mean, line, and both ways of turning at f. Returns what it leaves, NaN where it
 * is singular; `slowness` is the lag-1 correlation of that. */
static double fit(const struct series *s, double f, double complex c[4], double *slowness)
{
    double complex normal[16] = {0}, side[4] = {0}, last = 0;
    double left = 0, lagged = 0;

    for (size_t k = 0; k < s->count; k++) {
        double u = s->t[k] - s->middle;
        double complex e = cexp(I * 2 * PI * f * u);
        double complex x[4] = {1, u / s->half, e, conj(e)};
        for (int i = 0; i < 4; i++) {
            for (int j = 0; j < 4; j++)
                normal[4 * i + j] += conj(x[i]) * x[j];
            side[i] += conj(x[i]) * s->z[k];
        }
    }
    if (LAPACKE_zposv(LAPACK_ROW_MAJOR, 'U', 4, 1, normal, 4, side, 1) != 0)
        return NAN;
    for (size_t k = 0; k < s->count; k++) {
        double u = s->t[k] - s->middle;
        double complex e = cexp(I * 2 * PI * f * u);
        e = s->z[k] - side[0] - side[1] * u / s->half - side[2] * e - side[3] * conj(e);
        left += creal(e * conj(e));
        lagged += creal(e * conj(last));
        last = e;
    }
    for (int i = 0; i < 4; i++)
        c[i] = side[i];
    *slowness = left > 0 ? lagged / left : 0;
    return left;
}

/* Takes mean and line off; returns the sum of squares that is left. */
static double detrend(const struct series *s, double complex *out)
{
    double complex mean = 0, slope = 0;
    double square = 0, left = 0;

    for (size_t k = 0; k < s->count; k++)
        mean += s->z[k] / (double)s->count;
    double at = 0;
    for (size_t k = 0; k < s->count; k++)
        at += s->t[k] / (double)s->count;
    for (size_t k = 0; k < s->count; k++) {
        square += (s->t[k] - at) * (s->t[k] - at);
        slope += (s->z[k] - mean) * (s->t[k] - at);
    }
    slope /= square;
    for (size_t k = 0; k < s->count; k++) {
        out[k] = s->z[k] - mean - slope * (s->t[k] - at);
        left += creal(out[k] * conj(out[k]));
    }
    return left;
}

static bool set_series(struct series *s, double *room)
{
    size_t n = s->count;

    for (size_t k = 0; k + 1 < n; k++)
        room[k] = s->t[k + 1] - s->t[k];
    s->step = robust_median(room, n - 1);
    s->middle = (s->t[0] + s->t[n - 1]) / 2;
    s->half = (s->t[n - 1] - s->t[0]) / 2;
    return s->step > 0 && s->half > 0 && 2 * s->half / s->step < (double)(SPAN_MOST * n);
}

/* ---- the spectrum ---- */

struct spectrum {
    double complex *values; /* from fftw_malloc; powers of both ways go into `sums` */
    double *sums;           /* of bins 0..size/2 */
    size_t bins, size;      /* of the even grid, and padded */
};

static int spectrum_of(const struct series *s, const double complex *flat, struct spectrum *out)
{
    fftw_plan plan;

    out->bins = (size_t)lround(2 * s->half / s->step) + 1;
    out->size = PADDING * out->bins;
    out->values = fftw_malloc(out->size * sizeof *out->values);
    out->sums = malloc((out->size / 2 + 1) * sizeof *out->sums);
    if (!out->values || !out->sums)
        return -1;
    plan = fftw_plan_dft_1d((int)out->size, out->values, out->values, FFTW_FORWARD, FFTW_ESTIMATE);
    if (!plan)
        return -1;
    for (size_t i = 0; i < out->size; i++)
        out->values[i] = 0;
    for (size_t k = 0; k < s->count; k++) {
        size_t i = (size_t)lround((s->t[k] - s->t[0]) / s->step);
        out->values[i < out->bins ? i : out->bins - 1] += flat[k];
    }
    fftw_execute(plan);
    fftw_destroy_plan(plan);
    for (size_t i = 0; i <= out->size / 2; i++) {
        double complex a = out->values[i], b = out->values[(out->size - i) % out->size];
        out->sums[i] = creal(a * conj(a)) + creal(b * conj(b));
    }
    return 0;
}

/* The highest point from a period of half the run to one of two blocks. */
static size_t highest(const struct spectrum *p)
{
    size_t best = 2 * PADDING;

    for (size_t i = best; i <= p->size / 2; i++)
        if (p->sums[i] > p->sums[best])
            best = i;
    return best;
}

/* True where the line stands out from the median of what is around it. */
static bool stands_out(const struct spectrum *p, size_t peak, double *room)
{
    size_t bin = (peak + PADDING / 2) / PADDING, last = p->bins / 2, used = 0;
    size_t from = bin > AROUND + 1 ? bin - AROUND : 1,
           to = bin + AROUND < last ? bin + AROUND : last;
    double floor, x;

    for (size_t i = from; i <= to; i++)
        if (i + NEAR < bin || i > bin + NEAR)
            room[used++] = p->sums[i * PADDING];
    if (used < 4)
        return true; /* too few to know better than the other test */
    floor = robust_median(room, used) / MEDIAN_2;
    x = p->sums[peak] / floor;
    return (1 + x) * exp(-x) * 2 * (double)p->bins < LEVEL; /* tail of gamma, shape 2 */
}

/* ---- the line ---- */

static double refine(const struct series *s, double f, double width)
{
    double low = f - width, high = f + width, golden = (sqrt(5) - 1) / 2;
    double complex c[4];
    double r;
    double a = high - golden * (high - low), b = low + golden * (high - low);
    double at_a = fit(s, a, c, &r), at_b = fit(s, b, c, &r);

    for (int i = 0; i < REFINE; i++) {
        if (at_a < at_b) {
            high = b;
            b = a;
            at_b = at_a;
            a = high - golden * (high - low);
            at_a = fit(s, a, c, &r);
        } else {
            low = a;
            a = b;
            at_a = at_b;
            b = low + golden * (high - low);
            at_b = fit(s, b, c, &r);
        }
    }
    return (low + high) / 2;
}

/* Tail of F(4, 2 b) at x, b whole. */
static double tail(double x, size_t b)
{
    return longrun_f_tail(x, 2, b);
}

/* How much more power than on the average slow noise of lag-1 correlation r has at frequency f; at
 * least 1. */
static double redness(const struct series *s, double r, double f)
{
    r += 3 / (double)s->count; /* what fitting four terms has taken from it (Kendall 1954) */
    if (!(r > 0))
        return 1;
    r = fmin(r, SLOWEST);
    return fmax(1, (1 - r * r) / (1 - 2 * r * cos(2 * PI * f * s->step) + r * r));
}

/* True where a line whose power is `gain` over a rest of `left` passes the first test. */
static bool significant(double gain, double left, size_t count)
{
    size_t freedom = count - 4;

    if (!(gain > 0))
        return false;
    return left <= 0 ||
           tail(gain / 2 / (left / (double)freedom), freedom) * 2 * (double)count <= LEVEL;
}

static void judge(const struct series *s, const struct spectrum *p, double total, double *room,
                  struct swing *swing)
{
    size_t peak = highest(p);
    double width = 1 / (s->step * (double)p->size), most = 0.5 / s->step;
    double f = (double)peak * width;
    double complex c[4] = {0};
    double weakened, large, small, slow, gain;

    f = f < most ? f : most * (1 - 1e-6); /* at the very end both ways are one */
    swing->size = 0;
    swing->residual = fit(s, f, c, &slow);
    gain = fmin((total - swing->residual) * SCALLOP, total);
    if (!significant(gain, total - gain, s->count) || !stands_out(p, peak, room))
        return;
    f = refine(s, f, width);
    f = f < most ? f : most * (1 - 1e-6);
    swing->residual = fit(s, f, c, &slow);
    gain = (total - swing->residual) / redness(s, slow, f);
    if (!significant(gain, swing->residual, s->count))
        return;
    weakened = sin(PI * f * s->step) / (PI * f * s->step);
    large = fmax(cabs(c[2]), cabs(c[3]));
    small = fmin(cabs(c[2]), cabs(c[3]));
    swing->size = (small < ONE_WAY * large ? large : large + small) / weakened;
    swing->period_s = 1 / f;
    if (small < ONE_WAY * large)
        swing->turning_hz = cabs(c[2]) > cabs(c[3]) ? f : -f;
    swing->forth = c[2] * cexp(-I * 2 * PI * f * s->middle);
    swing->back = c[3] * cexp(I * 2 * PI * f * s->middle);
}

int swing_find(const double complex *vectors, const double *t, size_t count, struct swing *swing)
{
    struct series s = {.z = vectors, .t = t, .count = count};
    struct spectrum p = {0};
    double complex *flat;
    double *room, total;
    int result = 0;

    *swing = (struct swing){.size = NAN, .period_s = NAN, .turning_hz = NAN, .residual = NAN};
    if (count < SWING_LEAST)
        return 0;
    flat = malloc(count * sizeof *flat);
    room = malloc((count + 2 * AROUND) * sizeof *room);
    if (!flat || !room)
        result = -1;
    if (result == 0 && set_series(&s, room)) {
        total = detrend(&s, flat);
        result = isnan(total) ? 0 : spectrum_of(&s, flat, &p);
        if (result == 0 && p.sums)
            judge(&s, &p, total, room, swing);
    }
    fftw_free(p.values);
    free(p.sums);
    free(room);
    free(flat);
    return result;
}

double complex swing_at(const struct swing *swing, double t)
{
    double complex e;

    if (!(swing->size > 0))
        return 0;
    e = cexp(I * 2 * PI * t / swing->period_s);
    return swing->forth * e + swing->back * conj(e);
}
