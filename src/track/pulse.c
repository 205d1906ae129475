#include "track/pulse.h"

#include <math.h>
#include <stdlib.h>

enum { UNKNOWN, BELOW, ABOVE, ABOVE_FROM_START };

/* Half the hysteresis as a share of the span: common practice for comparators on tacho pulses.
 * Noise of up to 30 % peak to peak cannot fire twice; a ripple of a third of the mark's height
 * stays out. */
#define HYSTERESIS 0.15f

#define GROUP 16    /* samples looked at together where nothing happens */
#define PART 512    /* samples studied at a time */
#define SILENT 0.1f /* of the former span: below it is no pulse */

/* A pulse of two sides: so much of the samples lies within a band about their median, as wide as
 * the hysteresis on each side, and so far above the bottom of the range that the middle of the
 * range would be in the band or beside it. (Where the other side is small the middle serves: the
 * half height of the pulse itself says when it came, and an undershoot of a fifth is a
 * capacitor's.) */
#define REST_LEAST 0.6
#define REST_LOW 0.2f
#define REST_HIGH 0.75f
#define REST_LOOKED 4096 /* samples that say where the signal rests */

void pulse_init(struct pulse_finder *finder, int edge, double level)
{
    *finder = (struct pulse_finder){.sign = edge < 0 ? -1.0f : 1.0f, .level = level};
}

/* Mean of the second to fourth largest of the memory times `sign`: one spike cannot move it, and
 * smaller pulses among the marks do not lower it. */
static float typical(const float *values, float sign)
{
    float sorted[PULSE_MEMORY];

    for (size_t i = 0; i < PULSE_MEMORY; i++) {
        size_t k = i;

        for (; k > 0 && sign * sorted[k - 1] < sign * values[i]; k--) {
            sorted[k] = sorted[k - 1];
        }
        sorted[k] = values[i];
    }
    return (sorted[1] + sorted[2] + sorted[3]) / 3.0f;
}

static void set_levels(struct pulse_finder *finder)
{
    float top = typical(finder->tops, 1.0f), bottom = typical(finder->bottoms, -1.0f);
    float floor = bottom + finder->rest * (top - bottom), span = top - floor;

    finder->middle =
        isnan(finder->level) ? 0.5f * (top + floor) : finder->sign * (float)finder->level;
    finder->above = finder->middle + HYSTERESIS * span;
    finder->below = finder->middle - HYSTERESIS * span;
    if (!isnan(finder->level)) { /* a level close to an extreme still has to work */
        finder->above = fminf(finder->above, 0.5f * (finder->middle + top));
        finder->below = fmaxf(finder->below, 0.5f * (finder->middle + bottom));
    }
}

static void learn(struct pulse_finder *finder, float top, float bottom)
{
    finder->tops[finder->turn] = top;
    finder->bottoms[finder->turn] = bottom;
    finder->turn = (finder->turn + 1) % PULSE_MEMORY;
    set_levels(finder);
}

/* The signal rose at x[i]: where did it last pass the middle? */
static double rise_time(const struct pulse_finder *finder, const float *x, size_t i, size_t n,
                        size_t back)
{
    ptrdiff_t k = (ptrdiff_t)i - 1, first = -(ptrdiff_t)back;

    while (k > first && finder->sign * x[k] > finder->middle) {
        k--;
    }
    if (k < first) {
        return (double)k + 1;
    }
    return (double)k +
           edge_crossing(x + k, finder->sign, finder->middle, k > first && k + 2 < (ptrdiff_t)n);
}

/* The signal fell at x[i]: where did it pass the middle? By a straight line: only widths rest on
 * it. */
static double fall_time(const struct pulse_finder *finder, const float *x, size_t i, size_t back)
{
    ptrdiff_t k = (ptrdiff_t)i, first = -(ptrdiff_t)back;

    while (k > first && finder->sign * x[k - 1] < finder->middle) {
        k--;
    }
    if (k == first) {
        return (double)k;
    }
    double before = finder->sign * x[k - 1] - finder->middle,
           after = finder->sign * x[k] - finder->middle;

    return (double)k - 1 + (before > after ? before / (before - after) : 1);
}

static struct pulse ended(const struct pulse_finder *finder, double end)
{
    return (struct pulse){.at = finder->rose,
                          .high = end - finder->rose,
                          .low = finder->low,
                          .top = finder->extreme,
                          .bottom = finder->bottom};
}

/* The pulse that is over at x[i], by its own half height where that is to be had. */
static struct pulse refined(struct pulse_finder *finder, const float *x, size_t i, size_t n,
                            size_t back, double start)
{
    struct pulse pulse = ended(finder, finder->fell);
    struct edge_half half;
    double rise = floor(pulse.at - start), low = floor(pulse.at - pulse.low - start) + 1;
    struct edge_spot spot = {.from = -(ptrdiff_t)back,
                             .past = (ptrdiff_t)n,
                             .low = (ptrdiff_t)fmax(low, -(double)back),
                             .rise = (ptrdiff_t)rise,
                             .fall = (ptrdiff_t)i,
                             .middle = finder->middle,
                             .allowed = finder->above - finder->middle};

    if (!isnan(finder->level) || rise < -(double)back) {
        return pulse;
    }
    if (edge_find(&finder->edge, x, finder->sign, &spot, &half)) {
        pulse.low += start + half.rise - pulse.at;
        pulse.at = start + half.rise;
        finder->fell = start + half.fall;
        pulse.high = finder->fell - pulse.at;
        pulse.top = half.top;
        pulse.bottom = half.bottom;
    }
    return pulse;
}

/* Passes over whole groups of samples in which the state cannot change; returns where it stopped.
 */
static size_t pass_over(struct pulse_finder *finder, const float *x, size_t i, size_t n)
{
    while (i + GROUP <= n) {
        float high = finder->sign * x[i], low = high;

        for (size_t k = 1; k < GROUP; k++) {
            float y = finder->sign * x[i + k];

            high = y > high ? y : high;
            low = y < low ? y : low;
        }
        if (finder->state == BELOW && high <= finder->above) {
            finder->extreme = low < finder->extreme ? low : finder->extreme;
        } else if (finder->state >= ABOVE && low >= finder->below) {
            finder->extreme = high > finder->extreme ? high : finder->extreme;
        } else {
            break;
        }
        i += GROUP;
    }
    return i;
}

size_t pulse_find(struct pulse_finder *finder, const float *x, size_t n, size_t back, double start,
                  struct pulse *pulses)
{
    size_t count = 0;

    if (!finder->live) {
        return 0;
    }
    for (size_t i = 0; i < n; i++) {
        i = i % GROUP == 0 ? pass_over(finder, x, i, n) : i;
        if (i == n) {
            break;
        }
        float y = finder->sign * x[i];

        if (finder->state == UNKNOWN) {
            finder->state = y > finder->below ? ABOVE_FROM_START : BELOW;
            finder->extreme = y;
            finder->fell = start + (double)i;
        } else if (finder->state == BELOW && y > finder->above) {
            finder->rose = start + rise_time(finder, x, i, n, back);
            finder->low = finder->rose - finder->fell;
            finder->bottom = finder->extreme;
            finder->extreme = y;
            finder->state = ABOVE;
        } else if (finder->state >= ABOVE && y < finder->below) {
            finder->fell = start + fall_time(finder, x, i, back);
            if (finder->state == ABOVE) {
                pulses[count++] = refined(finder, x, i, n, back, start);
                learn(finder, finder->extreme, finder->bottom);
            }
            finder->extreme = y;
            finder->state = BELOW;
        } else if (finder->state == BELOW ? y < finder->extreme : y > finder->extreme) {
            finder->extreme = y;
        }
    }
    return count;
}

/* Learns the shape of the pulses in x, so that the first of them are timed as well as the rest. */
static void study(struct pulse_finder *finder, const float *x, size_t n)
{
    struct pulse_finder trial = *finder;
    struct pulse pulses[PART / 2 + 1];

    if (!isnan(finder->level)) {
        return;
    }
    trial.state = UNKNOWN;
    for (size_t at = 0; at < n; at += PART) {
        (void)pulse_find(&trial, x + at, n - at < PART ? n - at : PART, at, (double)at, pulses);
    }
    finder->edge = trial.edge;
}

static int ascending(const void *a, const void *b)
{
    float x = *(const float *)a, y = *(const float *)b;

    return (x > y) - (x < y);
}

/* Where the signal rests between the two sides of its pulses, as a share of its range; 0: they have
 * one side. */
static float resting(const float *x, float sign, size_t n, float bottom, float span)
{
    float seen[REST_LOOKED];
    size_t stride = 1 + n / REST_LOOKED, count = 0, near = 0;

    for (size_t i = 0; i < n; i += stride) {
        seen[count++] = (sign * x[i] - bottom) / span;
    }
    qsort(seen, count, sizeof *seen, ascending);
    float rest = seen[count / 2];

    for (size_t i = 0; i < count; i++) {
        near += fabsf(seen[i] - rest) < HYSTERESIS;
    }
    return (double)near >= REST_LEAST * (double)count && rest > REST_LOW && rest < REST_HIGH ? rest
                                                                                             : 0;
}

bool pulse_levels(struct pulse_finder *finder, const float *x, size_t n)
{
    float top = -INFINITY, bottom = INFINITY;

    for (size_t i = 0; i < n; i++) {
        float y = finder->sign * x[i];

        top = y > top ? y : top;
        bottom = y < bottom ? y : bottom;
    }
    if (!(top > bottom) || !isfinite(top - bottom)) {
        return false;
    }
    for (size_t i = 0; i < PULSE_MEMORY; i++) {
        finder->tops[i] = top;
        finder->bottoms[i] = bottom;
    }
    finder->rest = isnan(finder->level) ? resting(x, finder->sign, n, bottom, top - bottom) : 0;
    set_levels(finder);
    finder->live = true;
    study(finder, x, n);
    return true;
}

bool pulse_renew(struct pulse_finder *finder, const float *x, size_t n)
{
    struct pulse_finder trial = *finder;

    if (!pulse_levels(&trial, x, n) ||
        trial.tops[0] - trial.bottoms[0] <
            SILENT * (typical(finder->tops, 1.0f) - typical(finder->bottoms, -1.0f))) {
        return false;
    }
    trial.state = UNKNOWN;
    *finder = trial;
    return true;
}

size_t pulse_finish(struct pulse_finder *finder, double end, struct pulse *pulse)
{
    if (finder->state != ABOVE) {
        return 0;
    }
    *pulse = ended(finder, end);
    finder->state = UNKNOWN;
    return 1;
}
