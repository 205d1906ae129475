#include "track/teeth.h"

#include <math.h>
#include <stdlib.h>
#include <string.h>

#include "base/angle.h"

#define HELD 128     /* turns of pulses: those of the vote and those that the curve waits for */
#define NEAR 0.25    /* of a spacing: how far from its place a mark is still this mark */
#define REGULAR 0.15 /* of a spacing: mean scatter of a place in the first turns, at most */
#define TERMS (2 * SHAFT_RIPPLE_ORDERS + 1)

int teeth_init(struct teeth *teeth, int per_turn)
{
    *teeth = (struct teeth){0};
    if (per_turn < TEETH_LEAST || per_turn > TEETH_MOST) {
        return 0;
    }
    teeth->per_turn = per_turn;
    teeth->room = (long)HELD * per_turn;
    teeth->at = calloc((size_t)teeth->room, sizeof *teeth->at);
    teeth->learnt = calloc((size_t)(TEETH_LEARN * per_turn), sizeof *teeth->learnt);
    if (!teeth->at || !teeth->learnt) {
        teeth_release(teeth);
        return -1;
    }
    return 0;
}

void teeth_release(struct teeth *teeth)
{
    free(teeth->at);
    free(teeth->learnt);
    *teeth = (struct teeth){0};
}

void teeth_pulse(struct teeth *teeth, double at)
{
    if (teeth->per_turn > 0) {
        teeth->at[teeth->next++ % teeth->room] = at;
    }
}

void teeth_break(struct teeth *teeth)
{
    teeth->marks = 0;
}

/* Number of the first pulse held that is not before t. */
static long first_from(const struct teeth *teeth, double t)
{
    long low = teeth->next > teeth->room ? teeth->next - teeth->room : 0, high = teeth->next;

    while (low < high) {
        long middle = low + (high - low) / 2;

        if (teeth->at[middle % teeth->room] < t) {
            low = middle + 1;
        } else {
            high = middle;
        }
    }
    return low;
}

/* ---- harmonics of the turn ---- */

static size_t orders_of(const struct teeth *teeth)
{
    size_t orders = (size_t)teeth->per_turn / 4;

    return orders < SHAFT_RIPPLE_ORDERS ? orders : SHAFT_RIPPLE_ORDERS;
}

/* 1, cos, sin, cos of twice, ... of s turns. */
static void powers(double s, size_t terms, double *power)
{
    double c = cos((2 * PI) * s), sine = sin((2 * PI) * s);

    power[0] = 1;
    power[1] = c;
    power[2] = sine;
    for (size_t k = 3; k + 1 < terms; k += 2) {
        power[k] = c * power[k - 2] - sine * power[k - 1];
        power[k + 1] = sine * power[k - 2] + c * power[k - 1];
    }
}

/* Least squares of the harmonics over d at s, by the normal equations and Cholesky's factors, which
 * is safe here: between points this dense the harmonics are nearly orthogonal. */
static bool fit(const double *s, const double *d, size_t n, size_t terms, double *x)
{
    double a[TERMS][TERMS] = {{0}}, power[TERMS];

    memset(x, 0, terms * sizeof *x);
    for (size_t i = 0; i < n; i++) {
        powers(s[i], terms, power);
        for (size_t k = 0; k < terms; k++) {
            for (size_t l = 0; l <= k; l++) {
                a[k][l] += power[k] * power[l];
            }
            x[k] += power[k] * d[i];
        }
    }
    for (size_t k = 0; k < terms; k++) {
        for (size_t l = 0; l <= k; l++) {
            for (size_t m = 0; m < l; m++) {
                a[k][l] -= a[k][m] * a[l][m];
            }
            a[k][l] = l < k ? a[k][l] / a[l][l] : a[k][l];
        }
        if (!(a[k][k] > 0.1 * (double)n)) { /* marks that leave a harmonic open */
            return false;
        }
        a[k][k] = sqrt(a[k][k]);
        for (size_t m = 0; m < k; m++) {
            x[k] -= a[k][m] * x[m];
        }
        x[k] /= a[k][k];
    }
    for (size_t k = terms; k-- > 0;) {
        for (size_t m = k + 1; m < terms; m++) {
            x[k] -= a[m][k] * x[m];
        }
        x[k] /= a[k][k];
    }
    return true;
}

/* ---- where the marks stand ---- */

/* The turn at time t, 0 at the second of the four marks and 1 at the third: Lagrange's cubic. */
static double cubic(const double *mark, double t)
{
    double sum = 0;

    for (int i = 0; i < 4; i++) {
        double term = i - 1;

        for (int k = 0; k < 4; k++) {
            term *= k == i ? 1 : (t - mark[k]) / (mark[i] - mark[k]);
        }
        sum += term;
    }
    return sum;
}

/* Reads the turn in the middle of the four marks, where all its pulses and no others came. */
static void learn(struct teeth *teeth)
{
    const double *mark = teeth->mark;
    double near = NEAR * (mark[2] - mark[1]) / teeth->per_turn;
    long from = first_from(teeth, mark[1] + near), to = first_from(teeth, mark[2] - near);
    double *place = teeth->learnt + teeth->turns * teeth->per_turn;

    if (to - from != teeth->per_turn - 1) {
        return;
    }
    place[0] = 0;
    for (long i = from; i < to; i++) {
        place[i - from + 1] = cubic(mark, teeth->at[i % teeth->room]);
    }
    teeth->turns++;
}

void teeth_mark(struct teeth *teeth, double at, bool real)
{
    if (teeth->per_turn == 0 || teeth->turns >= TEETH_LEARN) {
        return;
    }
    if (!real) {
        teeth->marks = 0;
        return;
    }
    memmove(teeth->mark, teeth->mark + 1, 3 * sizeof *teeth->mark);
    teeth->mark[3] = at;
    teeth->marks++;
    if (teeth->marks >= 4) {
        learn(teeth);
    }
}

static int ascending(const void *a, const void *b)
{
    double x = *(const double *)a, y = *(const double *)b;

    return (x > y) - (x < y);
}

/* The medians of the places; false where one of them scatters too much to be a place. */
static bool settle(struct teeth *teeth)
{
    double values[TEETH_LEARN];

    for (int j = 0; j < teeth->per_turn; j++) {
        double off = 0;

        for (long i = 0; i < teeth->turns; i++) {
            values[i] = teeth->learnt[i * teeth->per_turn + j];
        }
        qsort(values, (size_t)teeth->turns, sizeof *values, ascending);
        teeth->place[j] = (values[teeth->turns / 2] + values[(teeth->turns - 1) / 2]) / 2;
        for (long i = 0; i < teeth->turns; i++) {
            off += fabs(values[i] - teeth->place[j]);
        }
        if (off > REGULAR / teeth->per_turn * (double)teeth->turns) {
            return false;
        }
    }
    return true;
}

/* The place of mark j, counted on over the turns. */
static double place_of(const struct teeth *teeth, int j)
{
    return teeth->place[j % teeth->per_turn] + j / teeth->per_turn;
}

/* Sees whether the marks (but the odd one, if there is one) are those of an even wheel of `slots`,
 * and fills where they are then, on the mean as near to where they seem to be as can be. */
static bool wheel(const struct teeth *teeth, int odd, int slots, double tolerance, double *place)
{
    int slot = 0, n = teeth->per_turn, first = odd < 0 ? 0 : odd + 1, count = n - (odd >= 0);
    double off = 0, start = place_of(teeth, first);

    for (int i = 0, j = first; i < count; i++, j++) {
        int next = i + 1 < count ? j + 1 : first + n;
        double spacing = (place_of(teeth, next) - place_of(teeth, j)) * slots;
        double whole = round(spacing);

        if (whole < 1 || fabs(spacing - whole) > fmin(tolerance * whole, NEAR)) {
            return false;
        }
        place[j % n] = start + (double)slot / slots - j / n;
        off += (place_of(teeth, j) - j / n - place[j % n]) / count;
        slot += (int)whole;
    }
    for (int j = 0; j < n; j++) {
        place[j] = j == odd ? teeth->place[j] : place[j] + off;
    }
    return slot == slots;
}

/* Whether what the marks are off is small, or smooth. */
static bool ripples(const struct teeth *teeth, const double *place, double even, double smooth)
{
    double s[TEETH_MOST], d[TEETH_MOST], x[TERMS], power[TERMS], most = 0, all = 0, left = 0;
    size_t count = 0, terms = 2 * orders_of(teeth) + 1;

    for (int j = 0; j < teeth->per_turn; j++) {
        if (j != teeth->odd && (j > 0 || teeth->odd < 0)) {
            s[count] = teeth->place[j];
            d[count] = place[j] - teeth->place[j]; /* their mean is zero, but for the reference */
            most = fmax(most, fabs(d[count++]));
        }
    }
    if (most * teeth->per_turn <= even) {
        return true;
    }
    if (count <= terms || !fit(s, d, count, terms, x)) {
        return false;
    }
    for (size_t i = 0; i < count; i++) {
        double rest = d[i];

        powers(s[i], terms, power);
        for (size_t k = 0; k < terms; k++) {
            rest -= x[k] * power[k];
        }
        left += rest * rest / (double)(count - terms);
        all += d[i] * d[i];
    }
    return all - left * (double)(count - terms) >= smooth * left * (double)(terms - 1);
}

/* Takes the marks for evenly spaced where they may be: all of a wheel, those of one with one or two
 * teeth missing, or a wheel with another mark among its teeth, which by the spacing before it makes
 * itself or the next mark the reference; or a few marks, or these with one missing. */
static bool even_out(struct teeth *teeth)
{
    double place[TEETH_MOST] = {0};
    int n = teeth->per_turn;
    bool even = false;

    for (int k = 0; !even && k < 2; k++) {
        teeth->odd = k ? n - 1 : 0;
        for (int slots = n - 1; !even && slots <= n + 2; slots++) {
            even = slots >= TEETH_WHEEL && wheel(teeth, teeth->odd, slots, TEETH_TOLERANCE, place);
        }
    }
    if (even) {
        even = ripples(teeth, place, TEETH_EVEN, TEETH_SMOOTH);
    } else {
        teeth->odd = -1;
        for (int slots = n; !even && slots <= n + 1 && slots < TEETH_WHEEL; slots++) {
            even = wheel(teeth, -1, slots, TEETH_SWING, place) &&
                   ripples(teeth, place, TEETH_EVEN_FEW, TEETH_SMOOTH_FEW);
        }
    }
    for (int j = 0; even && j < n; j++) {
        if (j > 0 || teeth->odd < 0) {
            teeth->ripple[j] = place[j] - teeth->place[j];
            teeth->place[j] = place[j];
            teeth->seen[j] = teeth->turns;
        }
    }
    return even;
}

static bool ready(struct teeth *teeth)
{
    if (!teeth->decided && teeth->turns >= TEETH_TURNS) {
        teeth->decided = true;
        if (!settle(teeth) || !even_out(teeth)) {
            teeth->per_turn = 0;
        }
    }
    return teeth->decided && teeth->per_turn > 0;
}

/* ---- the ripple of one turn ---- */

/* Finds the turn's marks, the nearest pulse for each, and takes them into the means. */
static void match(struct teeth *teeth, const struct shaft_turn *turn)
{
    double off[TEETH_MOST];
    bool came[TEETH_MOST] = {false};
    const double *c = turn->c;
    double span = turn->t1 - turn->t0, spacing = 1.0 / teeth->per_turn;
    long end = first_from(teeth, turn->t1 - NEAR * spacing * span);
    int j = 0;

    for (long i = first_from(teeth, turn->t0 - NEAR * spacing * span); i < end; i++) {
        double share = (teeth->at[i % teeth->room] - turn->t0) / span;
        double curve =
            share * (c[1] + share * (c[2] + share * (c[3] + share * (c[4] + share * c[5]))));

        while (j + 1 < teeth->per_turn && fabs(teeth->place[j + 1] - teeth->ripple[j + 1] - curve) <
                                              fabs(teeth->place[j] - teeth->ripple[j] - curve)) {
            j++;
        }
        double difference = teeth->place[j] - curve - teeth->ripple[j];

        if (fabs(difference) < NEAR * spacing && !(came[j] && fabs(difference) > fabs(off[j]))) {
            came[j] = true;
            off[j] = difference;
        }
    }
    for (j = 1; j < teeth->per_turn; j++) {
        if (came[j]) {
            teeth->seen[j] += teeth->seen[j] < TEETH_MEMORY;
            teeth->ripple[j] += off[j] / (double)teeth->seen[j];
        }
    }
}

void teeth_bend(struct teeth *teeth, struct shaft_turn *turn)
{
    double s[TEETH_MOST], d[TEETH_MOST], x[TERMS];
    size_t count = 0;

    if (teeth->per_turn == 0 || !ready(teeth)) {
        return;
    }
    size_t orders = orders_of(teeth);

    match(teeth, turn);
    for (int j = teeth->odd < 0 ? 0 : 1; j < teeth->per_turn; j++) {
        if (j != teeth->odd) {
            s[count] = teeth->place[j] - teeth->ripple[j];
            d[count++] = teeth->ripple[j];
        }
    }
    if (!fit(s, d, count, 2 * orders + 1, x)) {
        return;
    }
    teeth->fitted = (struct shaft_ripple){.orders = orders};
    for (size_t k = 0; k < orders; k++) {
        teeth->fitted.cosine[k] = x[2 * k + 1];
        teeth->fitted.sine[k] = x[2 * k + 2];
        teeth->fitted.mean -= x[2 * k + 1]; /* nothing at the turn's ends */
    }
    turn->ripple = &teeth->fitted;
}
