#include "track/window.h"

#include <math.h>
#include <stdlib.h>

#define LEAST_TURNS 4
#define LEAST_BLOCKS 16
#define MOST_BLOCKS 2000
#define SWEPT_S 0.25

long window_length(double rate_hz, double period, double frames, bool sweeps)
{
    double turns = (sweeps ? SWEPT_S : 1) * rate_hz / period, all = frames / period - 1;

    if (frames > 0) {
        turns = fmin(turns, floor(all / LEAST_BLOCKS));
        turns = fmax(turns, ceil(all / MOST_BLOCKS));
    }
    return (long)fmin(1e9, fmax(LEAST_TURNS, round(turns)));
}

void window_init(struct windows *windows, size_t sensors)
{
    *windows = (struct windows){.sensors = sensors, .length = LEAST_TURNS};
}

void window_release(struct windows *windows)
{
    free(windows->blocks);
    free(windows->sums);
    *windows = (struct windows){0};
}

bool window_ramps(const struct windows *windows, const struct shaft_turn *turn)
{
    return turn->first || turn->last || windows->turn % windows->length == 0;
}

static int window_open(struct windows *windows, double from)
{
    if (windows->count == windows->room) {
        size_t room = windows->room ? 2 * windows->room : 64;
        struct window_block *blocks = realloc(windows->blocks, room * sizeof *blocks);

        if (!blocks) {
            return -1;
        }
        windows->blocks = blocks;
        struct vector_sums *sums =
            realloc(windows->sums, room * (windows->sensors + 1) * sizeof *sums);

        if (!sums) {
            return -1;
        }
        windows->sums = sums;
        windows->room = room;
    }
    windows->blocks[windows->count] = (struct window_block){.from = from, .to = from};
    for (size_t s = 0; s < windows->sensors; s++) {
        windows->sums[windows->count * windows->sensors + s] = (struct vector_sums){0};
    }
    windows->count++;
    windows->open = true;
    return 0;
}

/* Adds `sign` times the sums to the last block. */
static void window_sum(struct windows *windows, const struct vector_sums *sums, double sign)
{
    struct vector_sums *own = windows->sums + (windows->count - 1) * windows->sensors;

    for (size_t s = 0; s < windows->sensors; s++) {
        own[s].re += sign * sums[s].re;
        own[s].im += sign * sums[s].im;
        own[s].mean += sign * sums[s].mean;
        own[s].square += sign * sums[s].square;
    }
}

/* The stretch is over: a remainder of less than half a block goes to the block before it. */
static void window_remainder(struct windows *windows)
{
    struct window_block *last = windows->blocks + windows->count - 1;

    if (windows->count < windows->stretch + 2 ||
        (last->turns >= LEAST_TURNS && 2 * last->turns >= windows->length)) {
        return;
    }
    last[-1].to = last->to;
    last[-1].turns += last->turns;
    windows->count--;
    window_sum(windows, windows->sums + windows->count * windows->sensors, 1);
}

int window_turn(struct windows *windows, const struct shaft_turn *turn,
                const struct vector_sums *full, const struct vector_sums *ramped)
{
    double middle = (turn->t0 + turn->t1) / 2;

    if (turn->first) {
        windows->turn = 0;
        windows->stretch = windows->count;
        windows->open = false;
    }
    bool border = windows->turn % windows->length == 0;

    if (windows->open) {
        struct window_block *block = windows->blocks + windows->count - 1;

        block->turns++;
        block->to = middle;
        window_sum(windows, full, 1);
        if (border || turn->last) {
            window_sum(windows, ramped, -1);
            windows->open = false;
        }
    }
    if (border && !turn->last) {
        if (window_open(windows, middle)) {
            return -1;
        }
        window_sum(windows, ramped, 1);
    }
    if (turn->last && windows->count > windows->stretch) {
        window_remainder(windows);
    }
    windows->turn++;
    return 0;
}

double complex window_vector(const struct windows *windows, size_t block, size_t sensor,
                             double *rest)
{
    const struct vector_sums *sums = windows->sums + block * windows->sensors + sensor;
    double turns = (double)windows->blocks[block].turns;
    double re = 2 * sums->re / turns, im = 2 * sums->im / turns, mean = sums->mean / turns;

    *rest = sqrt(fmax(0, sums->square / turns - mean * mean - (re * re + im * im) / 2));
    if (isnan(sums->square)) {
        *rest = NAN;
    }
    return CMPLX(re, im);
}
