#include "track/edge.h"

#include <math.h>

/* Widths in which base and top are sought: past the ripple of a few teeth. */
#define REACH 4

/* Half the samples of a parabola are a share of the width: over +-45 deg of a raised cosine a
 * parabola's vertex is right to 1e-3 of its height. At most SPAN_MOST on each side: more than
 * enough against noise. */
#define PER_WIDTH 8
#define SPAN_MOST 128
#define THIN 3

/* About the half height, what noise may do: as in pulse.c. */
#define HYSTERESIS 0.15

/* The cubic between two samples is given up where an outer step goes back by a 20th of the edge's:
 * on a pulse of four samples it sees one end of the edge only and is late or early; the straight
 * line is not, by symmetry. */
#define BACKWARD 20

/* Of the height, below its half: a coil's signal rests about half way, and widths must not be now
 * the pulse's, now that of the time between pulses. */
#define RESTING 0.1

/* Learning: change of height, as a share, up to which two pulses are of one kind; weight of the
 * latest pulse; mean square change of overshoot that means something (0.1 % of the height); and the
 * largest share that any shape asks for (a raised cosine of four samples: 1.7). */
#define ALIKE 0.1
#define MEMORY (1 / 32.0)
#define TRUST 1e-6
#define OVERSHOOT_MOST 2

/* A side is flat where so large a share of its samples lies within a band below its extreme, as
 * wide as the hysteresis, and beyond the toes: ripple of a third of the height has 0.47, a raised
 * cosine less, a tape 0.8 and more. A line through fewer than FLAT_SAMPLES is no better than the
 * extreme; through twice as many it counts in full. The toe is so many lengths of the flank between
 * its hysteresis; a raised cosine ends after 2.1. */
#define FLAT_BAND 0.15
#define FLAT_LEAST 0.55
#define FLAT_FULL 0.75
#define FLAT_SAMPLES 8.0
#define FLAT_ENOUGH 64 /* of more samples some are passed over: it saves time */
#define TOE 3

/* Samples of the flank on each side of its middle: so few that least squares take noise off. */
#define FLANK_LEAST 3

struct parabola {
    double value, slope, bend, mean;
};

/* The extreme of one side: the parabola's value in the middle, and what its vertex adds. */
struct extreme {
    ptrdiff_t at;
    double value, over;
    bool fine; /* so many samples that the vertex is right whatever the shape */
};

static long limit(long value, long least, long most)
{
    return value < least ? least : value > most ? most : value;
}

double edge_crossing(const float *x, float sign, double level, bool outer)
{
    double y0 = sign * x[0] - level, y1 = sign * x[1] - level;
    double straight = y1 > y0 ? -y0 / (y1 - y0) : 0.5, at = straight;

    if (!outer) {
        return straight;
    }
    double ym = sign * x[-1] - level, y2 = sign * x[2] - level;
    double share = 1 + BACKWARD * fmin(y0 - ym, y2 - y1) / (y1 - y0);
    double c1 = y1 - ym / 3 - y0 / 2 - y2 / 6, c2 = (ym + y1) / 2 - y0;
    double c3 = (y2 - ym) / 6 + (y0 - y1) / 2;

    if (!(share > 0)) {
        return straight;
    }
    for (int k = 0; k < 3; k++) {
        double value = y0 + at * (c1 + at * (c2 + at * c3));
        double slope = c1 + at * (2 * c2 + at * 3 * c3);

        if (!(slope > 0.25 * (y1 - y0))) {
            break;
        }
        at = fmin(1, fmax(0, at - value / slope));
    }
    return straight + fmin(1, share) * (at - straight);
}

/* Least squares over x[-m..m], times the sign: value + slope*k + bend*k^2. */
static struct parabola parabola(const float *x, float sign, long m)
{
    double n = 2.0 * (double)m + 1, k2 = (double)(m * (m + 1)) * n / 3;
    double k4 = k2 * (3.0 * (double)(m * (m + 1)) - 1) / 5;
    double s0 = 0, s1 = 0, s2 = 0;

    for (long k = -m; k <= m; k++) {
        double y = sign * x[k];

        s0 += y;
        s1 += (double)k * y;
        s2 += (double)(k * k) * y;
    }
    double bend = (s2 - k2 / n * s0) / (k4 - k2 * k2 / n);

    return (struct parabola){(s0 - bend * k2) / n, s1 / k2, bend, s0 / n};
}

/* The cubic term that the parabola lacks; its slope is corrected. By the orthogonal polynomials of
 * evenly spaced samples: k^3 - c*k is at right angles to 1, k and k^2. */
static double cubic(const float *x, float sign, long m, struct parabola *p)
{
    double c = (3.0 * (double)(m * (m + 1)) - 1) / 5, sum = 0, squares = 0;

    for (long k = -m; k <= m; k++) {
        double q = (double)k * ((double)(k * k) - c);

        sum += q * sign * x[k];
        squares += q * q;
    }
    p->slope -= sum / squares * c;
    return sum / squares;
}

static void vertex(const float *x, float sign, long m, struct extreme *extreme)
{
    struct parabola p = parabola(x + extreme->at, sign, m);

    extreme->fine = m > 1;
    extreme->value = p.value;
    extreme->over = 0;
    if (p.bend < 0 && fabs(p.slope) <= -2 * p.bend * (double)m) {
        extreme->over = -p.slope * p.slope / (4 * p.bend);
    } else if (extreme->fine) {
        extreme->value = p.mean;
    }
}

/* The largest mean of the samples within m, its middle within a..b; steps of m over THIN do to
 * find it, and so nearly m. */
static bool largest(const float *x, float sign, ptrdiff_t a, ptrdiff_t b, long m,
                    struct extreme *extreme)
{
    ptrdiff_t step = 1 + m / THIN, reach = m / step * step;
    double sum = 0, best = -INFINITY;

    if (a > b) {
        return false;
    }
    for (ptrdiff_t k = a - reach; k <= a + reach; k += step) {
        sum += sign * x[k];
    }
    for (ptrdiff_t k = a;; k += step) {
        if (sum > best) {
            best = sum;
            extreme->at = k;
        }
        if (k + step > b) {
            break;
        }
        sum += sign * (x[k + step + reach] - x[k - reach]);
    }
    if (!isfinite(best) || !isfinite(sum)) {
        return false;
    }
    vertex(x, sign, reach, extreme);
    return true;
}

/* Adds to what was learnt of a side the change since the latest pulse of the same height: marks
 * and scratches may alternate. */
static void learn(struct edge_side *side, const struct extreme *extreme, double span)
{
    size_t kept = side->count < EDGE_KEPT ? side->count : EDGE_KEPT;

    for (size_t back = 1; back <= kept; back++) {
        size_t k = (side->count - back) % EDGE_KEPT;
        double change = (extreme->value - side->value[k]) / span;
        double bent = (extreme->over - side->over[k]) / span;

        if (fabs(change) < ALIKE) {
            side->cross += MEMORY * (change * bent - side->cross);
            side->square += MEMORY * (bent * bent - side->square);
            break;
        }
    }
    side->value[side->count % EDGE_KEPT] = extreme->value;
    side->over[side->count % EDGE_KEPT] = extreme->over;
    side->count++;
}

/* The height of a side, `span` being about that of the whole pulse. */
static double height(struct edge_side *side, const struct extreme *extreme, double span)
{
    if (extreme->fine) {
        return extreme->value + extreme->over;
    }
    learn(side, extreme, span);
    double share = -side->cross / (side->square + MEMORY * TRUST);

    return extreme->value + fmin(OVERSHOOT_MOST, fmax(0, share)) * extreme->over;
}

/* The edge through the half height between x[base] and x[top]: x[from..to] is what lies within the
 * hysteresis, and x[at] the last sample below the level; false where there is none. */
struct flank {
    ptrdiff_t from, at, to;
};

static bool flank_of(const float *x, float sign, ptrdiff_t base, ptrdiff_t rise, ptrdiff_t top,
                     const struct edge_half *half, struct flank *flank)
{
    double level = (half->top + half->bottom) / 2;
    double allowed = HYSTERESIS * (half->top - half->bottom);
    ptrdiff_t k = rise;

    while (k > base && sign * x[k] > level - allowed) {
        k--;
    }
    flank->from = k;
    while (k < top && sign * x[k] <= level + allowed) {
        k++;
    }
    flank->to = k;
    while (k > base && sign * x[k] > level) {
        k--;
    }
    flank->at = k;
    return k < top && sign * x[k] <= level && sign * x[k + 1] > level;
}

/* Where a side is flat, noise and tilt apart, a straight line through its samples, drawn on to the
 * flank, is better than an extreme. `all` samples x[0], x[step] ... lie outwards from the flank;
 * `skip` of them are its toe, and as many the next flank's, where the side `ends` with one. Between
 * flat and not the two are mixed, so that no small change of shape makes a jump. */
static double level_off(const float *x, float sign, int step, long all, long skip, bool ends,
                        double extreme, double band)
{
    long n = ends ? all - skip : all;
    double count = 0, sk = 0, sy = 0, skk = 0, sky = 0;

    long thin = 1 + all / FLAT_ENOUGH;

    for (long k = skip; k < n; k += thin) {
        double y = sign * x[step * k], at = (double)k;

        if (y > extreme - band) {
            count++;
            sk += at;
            sy += y;
            skk += at * at;
            sky += at * y;
        }
    }
    double share = (count * (double)thin / (double)all - FLAT_LEAST) / (FLAT_FULL - FLAT_LEAST);
    double weight = fmin(1, fmin(share, count / FLAT_SAMPLES - 1));

    if (n <= skip || !(weight > 0)) {
        return extreme;
    }
    double slope = (count * sky - sk * sy) / (count * skk - sk * sk);

    return extreme + weight * ((sy - slope * sk) / count - extreme);
}

/* When a cubic of least squares over x[middle-m .. middle+m] passes the level; NaN: outside. */
static double smoothed(const float *x, float sign, double level, ptrdiff_t middle, ptrdiff_t m)
{
    struct parabola p = parabola(x + middle, sign, m);
    double cube = cubic(x + middle, sign, m, &p), t = 0;

    for (int k = 0; k < 4; k++) {
        double value = p.value + t * (p.slope + t * (p.bend + t * cube));
        double slope = p.slope + t * (2 * p.bend + t * 3 * cube);

        t -= slope > 0 ? (value - level) / slope : 0;
    }
    return fabs(t) <= (double)m ? (double)middle + t : NAN;
}

/* When the flank passes the level: over many samples by least squares, first of all of them, then
 * of those evenly about the time found, so that their noise averages out; else between the two
 * samples about it. */
static double passing(const float *x, float sign, double level, const struct flank *flank,
                      bool outer)
{
    double at = (double)flank->at + edge_crossing(x + flank->at, sign, level, outer);
    ptrdiff_t m = (flank->to - flank->from) / 2, middle = flank->from + m;

    for (int pass = 0; pass < 2 && m >= FLANK_LEAST; pass++) {
        double better = smoothed(x, sign, level, middle, m);

        if (isnan(better)) {
            break;
        }
        at = better;
        middle = lround(at);
        m = middle - flank->from < flank->to - middle ? middle - flank->from : flank->to - middle;
    }
    return at;
}

/* When the signal fell through the level for the last time before x[fall]. By a straight line: only
 * widths rest on it. */
static double falling(const float *x, float sign, ptrdiff_t top, ptrdiff_t fall, double level)
{
    ptrdiff_t k = fall;

    while (k - 1 > top && sign * x[k - 1] < level) {
        k--;
    }
    double before = sign * x[k - 1] - level, after = sign * x[k] - level;

    return before > 0 && after < 0 ? (double)k - 1 + before / (before - after) : (double)k;
}

/* How long the signal stays clearly on one side of the middle, on the side where that is shorter. A
 * signal that rests about the middle between two pulses is on neither; where the edge starts from
 * there, the upper side counts. */
static ptrdiff_t width_of(const float *x, float sign, const struct edge_spot *spot)
{
    ptrdiff_t up = spot->rise + 1, down = spot->rise, width = 0;

    while (up < spot->fall && sign * x[up] <= spot->middle + spot->allowed) {
        up++;
    }
    ptrdiff_t far = spot->rise - REACH * (up - spot->rise);

    far = far > spot->low ? far : spot->low;
    while (down > far && sign * x[down] >= spot->middle - spot->allowed) {
        down--;
    }
    bool rests = down == far && far > spot->low;

    while (up + width < spot->fall && sign * x[up + width] >= spot->middle + spot->allowed / 2 &&
           (rests || (down - width > spot->low &&
                      sign * x[down - width] <= spot->middle - spot->allowed / 2))) {
        width++;
    }
    return width + up - spot->rise;
}

/* Base and top where their sides are flat, once the flank is known; then the flank anew. */
static bool level_sides(const float *x, float sign, const struct edge_spot *spot, ptrdiff_t first,
                        ptrdiff_t last, struct flank *flank, struct edge_half *half)
{
    double span = half->top - half->bottom;
    long toe = TOE * (flank->to - flank->from);
    ptrdiff_t base = flank->from, top = flank->to;

    half->bottom = -level_off(x + base, -sign, -1, base - first + 1, toe, first == spot->low,
                              -half->bottom, FLAT_BAND * span);
    half->top = level_off(x + top, sign, 1, last - top + 1, toe, last == spot->fall - 1, half->top,
                          FLAT_BAND * span);
    return flank_of(x, sign, first, spot->rise, last, half, flank);
}

bool edge_find(struct edge *edge, const float *x, float sign, const struct edge_spot *spot,
               struct edge_half *half)
{
    ptrdiff_t width = width_of(x, sign, spot), rise = spot->rise;
    struct extreme base, top;
    struct flank flank;
    long m = limit((width + PER_WIDTH / 2) / PER_WIDTH, 1, SPAN_MOST);
    ptrdiff_t first = limit(rise - REACH * width, spot->low, rise);
    ptrdiff_t last = limit(rise + 1 + REACH * width, rise, spot->fall - 1);

    first = first < spot->from + m ? spot->from + m : first;
    last = last > spot->past - 1 - m ? spot->past - 1 - m : last;
    ptrdiff_t foot = rise > spot->past - 1 - m ? spot->past - 1 - m : rise;

    if (!largest(x, -sign, first, foot, m, &base) || !largest(x, sign, rise + 1, last, m, &top) ||
        !(top.value + base.value > 0)) {
        return false;
    }
    half->bottom = -height(&edge->base, &base, top.value + base.value);
    half->top = height(&edge->top, &top, top.value + base.value);
    if (!flank_of(x, sign, base.at, rise, top.at, half, &flank) ||
        !level_sides(x, sign, spot, first, last, &flank, half)) {
        return false;
    }
    double level = (half->top + half->bottom) / 2, span = half->top - half->bottom;

    half->rise =
        passing(x, sign, level, &flank, flank.at > spot->from && flank.at + 2 < spot->past);
    half->fall = falling(x, sign, top.at, spot->fall, level - RESTING * span);
    return half->fall > half->rise;
}
