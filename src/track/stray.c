#include "track/stray.h"

#include <math.h>
#include <stdbool.h>
#include <stdlib.h>

#define BINS_LEAST 32
#define FIRST 5              /* bin: slow drift lies below */
#define REACH 12             /* bins on either side from which the noise is judged, but the */
#define LOBE 2               /* bins of the line itself */
#define SIZE_LEAST 0.02      /* of the signal's amplitude as one line; common sense, no source */
#define LEAST_BIN 0.7        /* of a line's power in its highest bin: 1.42 dB less between two */
#define BANDWIDTH 1.5        /* bins, of a Hann window (Harris, table I) */
#define OWN 1                /* bins from an order that is the shaft's */
#define SKIRT 4              /* bins from an order where its skirt may reach, and the power */
#define SKIRT_SHARE (1. / 9) /* of the order's that a line must have there */
#define VALLEY 0.5           /* of the line's power: it must fall below on both sides */
#define WIDEST 8             /* bins that a line may have on either side where the speed wanders */
#define RARE 4.75            /* normal quantile of 1e-6: one in a thousand for a thousand bins */
#define CAUTIOUS 1.5         /* for the noise of the median of some twenty bins */

static int ascending(const void *a, const void *b)
{
    double x = *(const double *)a, y = *(const double *)b;

    return (x > y) - (x < y);
}

/* Median of the powers about bin k but the line's own. */
static double middle(const struct stray_spectrum *spectrum, size_t k)
{
    double values[2 * REACH + 1];
    size_t n = 0, from = k > REACH + 2 ? k - REACH : 2;

    for (size_t i = from; i <= k + REACH && i < spectrum->count; i++) {
        if (i + LOBE < k || i > k + LOBE) {
            values[n++] = spectrum->power[i];
        }
    }
    qsort(values, n, sizeof *values, ascending);
    return n > 0 ? values[n / 2] : 0;
}

/* How far noise averaged over `averaged` spectra may rise above its median: the sum of squares is
 * chi-square with twice as many degrees of freedom (Wilson & Hilferty, Proc. Nat. Acad. Sci. 17
 * (1931) 684-688, for its quantiles). */
static double highest_noise(long averaged)
{
    double ninth = 1 / (9 * (double)averaged);

    return CAUTIOUS * pow((1 - ninth + RARE * sqrt(ninth)) / (1 - ninth), 3);
}

/* The bin at the foot of the line at bin k, downwards or up: where the power rises again, or has
 * fallen to the noise. */
static size_t foot(const struct stray_spectrum *spectrum, size_t k, bool up, double noise)
{
    const double *power = spectrum->power;
    size_t i = k;

    for (int n = 0; n < WIDEST && i > 1 && i + 1 < spectrum->count; n++) {
        size_t next = up ? i + 1 : i - 1;

        if (power[next] > power[i] || (n >= LOBE && power[next] < 2 * noise)) {
            break;
        }
        i = next;
    }
    return i;
}

/* Whether the line at bin k, centred at `at` (bins), is the shaft's, or its skirt. */
static bool is_shafts(const struct stray_spectrum *spectrum, size_t k, double at)
{
    double half = (double)spectrum->turns / 2, order = round(at / half);
    double off = fabs(at - order * half);

    return off < OWN || (off <= SKIRT && order * half <= (double)spectrum->count &&
                         spectrum->power[k] < SKIRT_SHARE * spectrum->locked[(size_t)order]);
}

/* Fills the line about the maximum at bin k; false where it is none. */
static bool read_line(const struct stray_spectrum *spectrum, size_t k, double noise,
                      struct stray *line)
{
    const double *power = spectrum->power;
    size_t from = foot(spectrum, k, false, noise), to = foot(spectrum, k, true, noise);
    double sum = 0, moment = 0;

    if (power[from] > VALLEY * power[k] || power[to] > VALLEY * power[k]) {
        return false;
    }
    for (size_t i = from; i <= to; i++) {
        double p = fmax(0, power[i] - noise);

        sum += p;
        moment += p * ((double)i - (double)k);
    }
    double at = (double)k + moment / sum;

    line->order = at / (double)spectrum->turns;
    line->amplitude = sqrt(sum / BANDWIDTH / (double)spectrum->averaged);
    return !is_shafts(spectrum, k, at);
}

/* Into its place among the largest. */
static void insert(struct stray *lines, size_t *n, const struct stray *line)
{
    size_t i = *n < STRAY_MOST ? (*n)++ : STRAY_MOST;

    for (; i > 0 && line->amplitude > lines[i - 1].amplitude; i--) {
        if (i < STRAY_MOST) {
            lines[i] = lines[i - 1];
        }
    }
    if (i < STRAY_MOST) {
        lines[i] = *line;
    }
}

size_t stray_find(const struct stray_spectrum *spectrum, double square, struct stray *out)
{
    const double *power = spectrum->power;
    size_t n = 0;

    if (spectrum->turns < STRAY_TURNS || spectrum->averaged < 1 || spectrum->count < BINS_LEAST) {
        return 0;
    }
    double least = SIZE_LEAST * SIZE_LEAST * 2 * square, rise = highest_noise(spectrum->averaged);

    for (size_t k = FIRST; k + 1 < spectrum->count; k++) {
        struct stray line;

        if (!(power[k] > power[k - 1] && power[k] >= power[k + 1] &&
              power[k] > LEAST_BIN * least * (double)spectrum->averaged)) {
            continue;
        }
        double noise = middle(spectrum, k);

        if (power[k] > rise * noise && read_line(spectrum, k, noise, &line) &&
            line.amplitude * line.amplitude >= least) {
            insert(out, &n, &line);
        }
    }
    return n;
}
