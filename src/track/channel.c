#include "track/channel.h"

#include <math.h>
#include <stdlib.h>
#include <string.h>

typedef float lanes __attribute__((vector_size(16)));
typedef int masks __attribute__((vector_size(16)));

#define COARSE 64    /* steps between the extremes, below which flat crests are ordinary */
#define SAME 0.99999 /* correlation: two sensors on one machine differ by more than that */
#define STRIDE 61 /* frames: a prime, so that no common blade count or mains period locks to it */

void channel_init(struct channel *channel, double rail)
{
    *channel = (struct channel){.rail = rail,
                                .min = INFINITY,
                                .max = -INFINITY,
                                .step = INFINITY,
                                .previous = NAN,
                                .high = {.extreme = -INFINITY},
                                .low = {.extreme = -INFINITY}};
}

/* a where mask, else b */
static lanes pick(masks mask, lanes a, lanes b)
{
    return (lanes)((mask & (masks)a) | (~mask & (masks)b));
}

static float size_of_step(float a, float b)
{
    float d = fabsf(a - b);

    return d > 0 ? d : INFINITY;
}

/* Smallest, largest, and smallest step of neighbours within x[0..n-1]. */
static void extremes(const float *x, size_t n, float *min, float *max, float *step)
{
    float i0 = INFINITY;
    lanes low = {i0, i0, i0, i0}, high = -low, least = low, zero = {0};
    lanes none = low;
    size_t i = 0;

    for (; i + 5 <= n; i += 4) {
        lanes a, b;

        memcpy(&a, x + i, sizeof a);
        memcpy(&b, x + i + 1, sizeof b);
        lanes d = a - b;

        d = (lanes)((masks)d & 0x7fffffff);
        d = pick(d > zero, d, none);
        low = pick(a < low, a, low);
        high = pick(a > high, a, high);
        least = pick(d < least, d, least);
    }
    for (size_t k = 0; k < 4; k++) {
        *min = low[k] < *min ? low[k] : *min;
        *max = high[k] > *max ? high[k] : *max;
        *step = least[k] < *step ? least[k] : *step;
    }
    for (; i < n; i++) {
        *min = x[i] < *min ? x[i] : *min;
        *max = x[i] > *max ? x[i] : *max;
        *step = i + 1 < n ? fminf(*step, size_of_step(x[i], x[i + 1])) : *step;
    }
}

static void held_end(struct channel_held *held)
{
    if (held->run >= CHANNEL_HOLD) {
        held->crests++;
        held->samples += held->run;
    }
    held->run = 0;
}

static void held_add(struct channel_held *held, const float *x, size_t n, float sign, float extreme)
{
    if (extreme > held->extreme) {
        *held = (struct channel_held){.extreme = extreme};
    } else if (extreme < held->extreme) {
        held_end(held);
        return;
    }
    float own = sign * held->extreme;

    for (size_t i = 0; i < n; i++) {
        if (x[i] == own) {
            held->run++;
        } else if (held->run) {
            held_end(held);
        }
    }
}

void channel_add(struct channel *channel, const float *x, size_t n)
{
    float min = INFINITY, max = -INFINITY, step = channel->step;

    if (n == 0) {
        return;
    }
    extremes(x, n, &min, &max, &step);
    if (!isnan(channel->previous)) {
        step = fminf(step, size_of_step(channel->previous, x[0]));
    }
    channel->step = step;
    channel->previous = x[n - 1];
    channel->min = fminf(channel->min, min);
    channel->max = fmaxf(channel->max, max);
    held_add(&channel->high, x, n, 1, max);
    held_add(&channel->low, x, n, -1, -min);
    channel->samples += (long long)n;

    float near = (float)channel->rail - (isfinite(step) ? step : 0);

    if (max >= near || -min >= near) { /* never where the rail is unknown */
        for (size_t i = 0; i < n; i++) {
            channel->at_rail += fabsf(x[i]) >= near;
        }
    }
}

long long channel_railed(const struct channel *channel)
{
    struct channel_held high = channel->high, low = channel->low;
    long long held = 0;

    held_end(&high);
    held_end(&low);
    if (channel->max - channel->min >= COARSE * channel->step) {
        held += high.crests >= CHANNEL_CRESTS ? high.samples : 0;
        held += low.crests >= CHANNEL_CRESTS ? low.samples : 0;
    }
    return held > channel->at_rail ? held : channel->at_rail;
}

double channel_resolution(const struct channel *channel)
{
    return isfinite(channel->step) ? (double)channel->step : 0;
}

int channel_pairs_init(struct channel_pairs *pairs, size_t columns)
{
    *pairs = (struct channel_pairs){.columns = columns};
    /* the work per frame stays the same however many columns there are */
    pairs->stride = STRIDE * (1 + columns / 8 * (columns / 8));
    pairs->shift = calloc(columns + 1, sizeof *pairs->shift);
    pairs->sums = calloc(columns * (columns + 1) + 1, sizeof *pairs->sums);
    if (!pairs->shift || !pairs->sums) {
        channel_pairs_release(pairs);
        return -1;
    }
    return 0;
}

void channel_pairs_release(struct channel_pairs *pairs)
{
    free(pairs->shift);
    free(pairs->sums);
    *pairs = (struct channel_pairs){0};
}

void channel_pairs_add(struct channel_pairs *pairs, const float *const *planes, size_t n)
{
    size_t columns = pairs->columns, i = pairs->skip;

    for (; i < n; i += pairs->stride) {
        if (pairs->count == 0) {
            for (size_t c = 0; c < columns; c++) {
                pairs->shift[c] = planes[c][i];
            }
        }
        for (size_t c = 0; c < columns; c++) {
            double x = planes[c][i] - pairs->shift[c];

            pairs->sums[c] += x;
            for (size_t d = 0; d <= c; d++) {
                pairs->sums[columns + c * columns + d] += x * (planes[d][i] - pairs->shift[d]);
            }
        }
        pairs->count++;
    }
    pairs->skip = i - n;
}

static double covariance(const struct channel_pairs *pairs, size_t a, size_t b)
{
    size_t columns = pairs->columns, high = a > b ? a : b, low = a > b ? b : a;

    return pairs->sums[columns + high * columns + low] / pairs->count -
           pairs->sums[a] / pairs->count * (pairs->sums[b] / pairs->count);
}

int channel_pairs_same(const struct channel_pairs *pairs, size_t column)
{
    double own = covariance(pairs, column, column);

    for (size_t c = 0; pairs->count >= 16 && c < pairs->columns; c++) {
        double other = covariance(pairs, c, c), both = covariance(pairs, column, c);

        if (c != column && own > 0 && other > 0 && both * both > SAME * SAME * own * other) {
            return (int)c;
        }
    }
    return -1;
}
