#include "track/shaft.h"

#include <math.h>
#include <string.h>

/* Eleven marks, sixth degree: passes a wander of one cycle in ten turns to 1e-3 of itself and
 * halves the variance of the scatter (from the filter's frequency response). */
#define FIT_MOST SHAFT_FIT
#define TERMS_MOST 7 /* coefficients of one fit */

/* Marks that scatter more than this are smoothed. Interpolated scatter s (rad) shortens a vector by
 * s^2/2: 0.2 deg costs 6e-6 of it, so below that the exact curve is the better one. */
#define SMOOTH_FROM_DEG 0.2

void shaft_restart(struct shaft *shaft)
{
    shaft->first = shaft->next = shaft->turn = 0;
    shaft->ended = false;
}

void shaft_hurry(struct shaft *shaft)
{
    shaft->hurried = true;
}

void shaft_end(struct shaft *shaft)
{
    shaft->ended = true;
}

/* Least squares of `terms` powers over the points (x, y), by modified Gram-Schmidt with one
 * repetition (Golub & Van Loan, Matrix Computations, 5.2.8). Fills the coefficients of the powers
 * and the leverage of a point at x = 0. Returns false where the points do not carry that many. */
static bool fit(const double *x, const double *y, size_t n, size_t terms, double *c,
                double *leverage)
{
    double q[TERMS_MOST][FIT_MOST], r[TERMS_MOST][TERMS_MOST] = {{0}}, b[TERMS_MOST];
    double power[FIT_MOST];

    for (size_t j = 0; j < terms; j++) {
        for (size_t i = 0; i < n; i++) {
            q[j][i] = j == 0 ? 1 : x[i] * power[i];
            power[i] = q[j][i];
        }
        for (size_t k = 0; k < 2 * j; k++) {
            double dot = 0;

            for (size_t i = 0; i < n; i++) {
                dot += q[k % j][i] * q[j][i];
            }
            for (size_t i = 0; i < n; i++) {
                q[j][i] -= dot * q[k % j][i];
            }
            r[k % j][j] += dot;
        }
        double norm = 0;

        for (size_t i = 0; i < n; i++) {
            norm += q[j][i] * q[j][i];
        }
        r[j][j] = sqrt(norm);
        if (!(r[j][j] > 1e-9)) {
            return false;
        }
        b[j] = 0;
        for (size_t i = 0; i < n; i++) {
            q[j][i] /= r[j][j];
            b[j] += q[j][i] * y[i];
        }
    }
    *leverage = 0;
    double zero[TERMS_MOST]; /* value of the orthogonal polynomials at x = 0 */

    for (size_t j = 0; j < terms; j++) {
        double value = j == 0;

        for (size_t k = 0; k < j; k++) {
            value -= r[k][j] * zero[k];
        }
        zero[j] = value / r[j][j];
        *leverage += zero[j] * zero[j];
    }
    for (size_t j = terms; j-- > 0;) {
        c[j] = b[j];
        for (size_t k = j + 1; k < terms; k++) {
            c[j] -= r[j][k] * c[k];
        }
        c[j] /= r[j][j];
    }
    return true;
}

static void filter_init(struct shaft_filter *filter, long half)
{
    size_t n = (size_t)(2 * half + 1);
    double x[FIT_MOST], y[FIT_MOST], c[TERMS_MOST];

    filter->half = half;
    for (size_t i = 0; i < n; i++) {
        x[i] = (double)((long)i - half) / SHAFT_AHEAD;
    }
    for (size_t i = 0; i < n; i++) {
        for (size_t k = 0; k < n; k++) {
            y[k] = k == i;
        }
        if (fit(x, y, n, TERMS_MOST, c, &filter->leverage)) {
            filter->value[i] = c[0];
            filter->slope[i] = c[1] / SHAFT_AHEAD;
            filter->bend[i] = 2 * c[2] / (SHAFT_AHEAD * SHAFT_AHEAD);
        }
    }
}

void shaft_init(struct shaft *shaft)
{
    *shaft = (struct shaft){0};
    filter_init(&shaft->exact, TERMS_MOST / 2);
    filter_init(&shaft->smooth, FIT_MOST / 2);
}

static double mark_at(const struct shaft *shaft, long m)
{
    return shaft->at[m % SHAFT_ROOM];
}

/* Gathers up to `most` real marks nearest to mark m, no further than `reach`. */
static size_t gather(const struct shaft *shaft, long m, size_t most, long reach, double period,
                     double *x, double *y)
{
    size_t n = 0;

    for (long d = 0; d <= reach && n < most; d++) {
        for (int side = 0; side < (d ? 2 : 1) && n < most; side++) {
            long k = side ? m - d : m + d;

            if (k < shaft->first || k >= shaft->next || !shaft->real[k % SHAFT_ROOM]) {
                continue;
            }
            x[n] = (double)(k - m) / (double)SHAFT_AHEAD;
            y[n++] = mark_at(shaft, k) - mark_at(shaft, m) - (double)(k - m) * period;
        }
    }
    return n;
}

static double period_at(const struct shaft *shaft, long m)
{
    long from = m - 3 > shaft->first ? m - 3 : shaft->first;
    long to = m + 3 < shaft->next - 1 ? m + 3 : shaft->next - 1;

    return to > from ? (mark_at(shaft, to) - mark_at(shaft, from)) / (double)(to - from) : 1;
}

/* The same as knot_fit where no mark in the filter's reach is missing. */
static bool knot_filter(const struct shaft *shaft, const struct shaft_filter *filter, long m,
                        struct shaft_knot *knot)
{
    long half = filter->half;
    double here = mark_at(shaft, m);

    if (m - half < shaft->first || m + half >= shaft->next) {
        return false;
    }
    *knot = (struct shaft_knot){here, 0, 0};
    for (long k = -half; k <= half; k++) {
        double off = mark_at(shaft, m + k) - here;

        if (!shaft->real[(m + k) % SHAFT_ROOM]) {
            return false;
        }
        knot->at += filter->value[k + half] * off;
        knot->slope += filter->slope[k + half] * off;
        knot->bend += filter->bend[k + half] * off;
    }
    return true;
}

/* Fits around mark m over `most` marks with `terms` powers; fewer where the marks are fewer. */
static bool knot_fit(const struct shaft *shaft, long m, size_t most, size_t terms,
                     struct shaft_knot *knot, double *residual)
{
    double x[FIT_MOST], y[FIT_MOST], c[TERMS_MOST] = {0}, leverage = 1;
    double period = period_at(shaft, m);
    size_t n = gather(shaft, m, most, SHAFT_AHEAD, period, x, y);

    terms = terms < n ? terms : n;
    if (terms == 0 || !fit(x, y, n, terms, c, &leverage)) {
        return false;
    }
    knot->at = mark_at(shaft, m) + c[0];
    knot->slope = period + c[1] / SHAFT_AHEAD;
    knot->bend = 2 * c[2] / (SHAFT_AHEAD * SHAFT_AHEAD);
    *residual = leverage < 0.99 ? -c[0] / period / sqrt(1 - leverage) : NAN;
    return true;
}

/* Adds mark m, with its neighbours on both sides known, to the scatter. */
static void judge(struct shaft *shaft, long m)
{
    struct shaft_knot knot;
    double residual;

    if (m < shaft->first || !shaft->real[m % SHAFT_ROOM]) {
        return;
    }
    if (knot_filter(shaft, &shaft->smooth, m, &knot)) {
        residual = (mark_at(shaft, m) - knot.at) / knot.slope / sqrt(1 - shaft->smooth.leverage);
    } else if (m - FIT_MOST / 2 < shaft->first ||
               !knot_fit(shaft, m, FIT_MOST, TERMS_MOST, &knot, &residual) || isnan(residual)) {
        return;
    }
    shaft->squares += residual * residual;
    shaft->scattered++;
}

static struct shaft_knot knot_at(const struct shaft *shaft, long m)
{
    struct shaft_knot knot;
    double unused;
    bool inside = m - FIT_MOST / 2 >= shaft->first && m + FIT_MOST / 2 < shaft->next;
    bool smooth = shaft_jitter(shaft) > SMOOTH_FROM_DEG;

    if (knot_filter(shaft, smooth ? &shaft->smooth : &shaft->exact, m, &knot)) {
        return knot;
    }
    /* towards the ends of a stretch scatter is met by a lower degree, which passes less of it on */
    if (knot_fit(shaft, m, smooth ? FIT_MOST : TERMS_MOST, smooth && !inside ? 5 : TERMS_MOST,
                 &knot, &unused)) {
        return knot;
    }
    return (struct shaft_knot){mark_at(shaft, m), period_at(shaft, m), 0};
}

void shaft_push(struct shaft *shaft, double at, bool real)
{
    size_t place = (size_t)(shaft->next % SHAFT_ROOM);

    shaft->at[place] = at;
    shaft->real[place] = real;
    shaft->next++;
    judge(shaft, shaft->next - 1 - FIT_MOST / 2);
    if (shaft->next - shaft->first > SHAFT_ROOM) {
        shaft->first++;
    }
}

static void join(const struct shaft_knot *a, const struct shaft_knot *b, struct shaft_turn *turn)
{
    double span = b->at - a->at, d0 = span / a->slope, d1 = span / b->slope;
    double a0 = -a->bend * d0 * d0 * d0 / span, a1 = -b->bend * d1 * d1 * d1 / span;

    turn->t0 = a->at;
    turn->t1 = b->at;
    turn->ripple = NULL;
    memset(turn->c, 0, sizeof turn->c);
    /* Slopes this far from the mean of the turn are no rotor's: keep to a straight line. */
    if (!(d0 > 0.4 && d0 < 2.5 && d1 > 0.4 && d1 < 2.5 && fabs(a0) < 2 && fabs(a1) < 2)) {
        turn->c[1] = 1;
        return;
    }
    turn->c[1] = d0;
    turn->c[2] = a0 / 2;
    turn->c[3] = 10 - 6 * d0 - 4 * d1 - 1.5 * a0 + 0.5 * a1;
    turn->c[4] = -15 + 8 * d0 + 7 * d1 + 1.5 * a0 - a1;
    turn->c[5] = 6 - 3 * d0 - 3 * d1 - 0.5 * a0 + 0.5 * a1;
}

bool shaft_next(struct shaft *shaft, struct shaft_turn *turn)
{
    long m = shaft->turn;

    long ahead = shaft->ended     ? 0
                 : shaft->hurried ? SHAFT_HURRIED
                 : m == 0         ? SHAFT_START
                                  : SHAFT_AHEAD;

    if (shaft->next - 1 < m + 1 + ahead) {
        return false;
    }
    if (m == 0) {
        shaft->knot = knot_at(shaft, 0);
    }
    struct shaft_knot end = knot_at(shaft, m + 1);

    if (!(end.at > shaft->knot.at)) { /* scatter larger than a turn: no curve to be had */
        end.at = shaft->knot.at + fmax(1e-3, period_at(shaft, m));
    }
    join(&shaft->knot, &end, turn);
    turn->first = m == 0;
    turn->last = shaft->ended && m + 2 == shaft->next;
    shaft->knot = end;
    shaft->turn++;
    return true;
}

double shaft_begin(const struct shaft *shaft)
{
    double first = mark_at(shaft, shaft->first);

    if (shaft->turn > 0) {
        return shaft->knot.at;
    }
    return shaft->next > 1 ? first - 0.5 * (mark_at(shaft, 1) - first) : first;
}

double shaft_jitter(const struct shaft *shaft)
{
    return shaft->scattered < 8 ? NAN : 360 * sqrt(shaft->squares / (double)shaft->scattered);
}
