#include "track/tone.h"

#include <math.h>
#include <stdlib.h>
#include <string.h>

#include "base/angle.h"
#include "track/tone_line.h"

#define THIN_HZ                                                                                    \
    1000.0 /* thinned rate: machines up to 200 rev/s; more where the service speed says */
#define THIN_TURN 16.0 /* thinned samples a turn at service speed, at least */
#define SEGMENT_S 1.0  /* as long as a block of whole turns with a tacho, */
#define SEGMENT_TURNS                                                                              \
    16 /* but never fewer turns: the window's lobe is then an eighth of the line's                 \
        * own frequency wide */
#define LEAST_BLOCKS 16 /* as with a tacho, down to this many turns: */
#define LEAST_TURNS 8
#define REACH 0.02 /* speed may change that much, or a bin, from segment to segment */

int tone_init(struct tone *tone, const struct tone_set_up *set_up)
{
    double thin = THIN_HZ, look = TONE_LOOK;
    size_t n = set_up->sensors + 1;

    *tone = (struct tone){.rate_hz = set_up->rate_hz,
                          .frames = set_up->frames,
                          .sensors = set_up->sensors,
                          .service_hz = set_up->service_rpm / 60,
                          .hz = NAN,
                          .join = 1};
    if (tone->service_hz > 0) {
        thin = fmax(thin, THIN_TURN * tone->service_hz);
        look = fmax(look, fmin(40 / tone->service_hz, 6 * TONE_LOOK));
    }
    tone->step = (size_t)fmax(1, floor(tone->rate_hz / thin));
    tone->thin_hz = tone->rate_hz / (double)tone->step;
    tone->room = (size_t)ceil(look * fmin(tone->thin_hz, 2 * thin)) + 1;
    tone->derivatives = calloc(n, sizeof *tone->derivatives);
    tone->rise = calloc(5 * n, sizeof *tone->rise);
    tone->data = calloc(n * tone->room, sizeof *tone->data);
    if (!tone->derivatives || !tone->rise || !tone->data) {
        tone_release(tone);
        return -1;
    }
    tone->whole = tone->rise + n;
    tone->before = tone->whole + n;
    tone->square = tone->before + n;
    tone->mean = tone->square + n;
    for (size_t s = 0; s < tone->sensors; s++) {
        tone->derivatives[s] = set_up->derivatives[s];
    }
    return 0;
}

void tone_release(struct tone *tone)
{
    free(tone->derivatives);
    free(tone->rise);
    free(tone->data);
    free(tone->blocks);
    free(tone->amplitude);
    free(tone->rest);
    *tone = (struct tone){0};
}

/* ---- blocks ---- */

static int block_grow(struct tone *tone)
{
    size_t room = tone->block_room ? 2 * tone->block_room : 64, each = tone->sensors + 1;
    struct tone_block *blocks = realloc(tone->blocks, room * sizeof *blocks);

    tone->blocks = blocks ? blocks : tone->blocks;
    double *amplitude = blocks ? realloc(tone->amplitude, room * each * sizeof *amplitude) : NULL;

    tone->amplitude = amplitude ? amplitude : tone->amplitude;
    double *rest = amplitude ? realloc(tone->rest, room * each * sizeof *rest) : NULL;

    tone->rest = rest ? rest : tone->rest;
    tone->block_room = rest ? room : tone->block_room;
    return rest ? 0 : -1;
}

/* What averaging over the triangle leaves of a line. */
static double droop(double hz, double thin_hz)
{
    double y = PI * hz / thin_hz;

    return y > 0 ? sin(y) / y * (sin(y) / y) : 1;
}

/* One segment at the beginning of the data becomes a block, or part of the last one. */
static int take_segment(struct tone *tone)
{
    size_t n = tone->segment;
    double bin = tone->thin_hz / (double)n, step = (double)tone->step;

    tone->hz = tone_line_follow(tone->data, tone->sensors, tone->room, n, tone->hz,
                                fmax(bin, REACH * tone->hz), tone->thin_hz);
    if (tone->joined == 0) {
        if (tone->block_count == tone->block_room && block_grow(tone)) {
            return -1;
        }
        tone->blocks[tone->block_count++] = (struct tone_block){.from = step * tone->used};
    }
    struct tone_block *block = tone->blocks + tone->block_count - 1;
    double *amplitude = tone->amplitude + (tone->block_count - 1) * tone->sensors;
    double *rest = tone->rest + (tone->block_count - 1) * tone->sensors;
    double old = (double)tone->joined / (double)(tone->joined + 1);

    block->to = step * (tone->used + (double)n);
    block->turns += tone->hz * (double)n / tone->thin_hz;
    block->hz = block->turns / (block->to - block->from) * tone->rate_hz;
    for (size_t s = 0; s < tone->sensors; s++) {
        const float *x = tone->data + s * tone->room;
        double a =
            tone_line_amplitude(x, n, tone->hz, tone->thin_hz) / droop(tone->hz, tone->thin_hz);
        double mean = tone->mean[s] / tone->count;
        double r = sqrt(fmax(0, tone->square[s] / tone->count - mean * mean - a * a / 2));

        amplitude[s] = tone->joined ? old * amplitude[s] + (1 - old) * a : a;
        rest[s] = tone->joined ? sqrt(old * rest[s] * rest[s] + (1 - old) * r * r) : r;
    }
    tone->joined = (tone->joined + 1) % tone->join;
    return 0;
}

static void drop(struct tone *tone, size_t n)
{
    for (size_t s = 0; s < tone->sensors; s++) {
        float *x = tone->data + s * tone->room;

        memmove(x, x + n, (tone->fill - n) * sizeof *x);
    }
    tone->fill -= n;
    tone->used += (double)n;
}

static double samples_of(double hz, double turns, double thin_hz)
{
    return ceil(turns / hz * thin_hz);
}

/* The line is searched for in what is held; how long segments are follows from it. */
static int look(struct tone *tone)
{
    struct tone_line line;
    double all = tone->frames / (double)tone->step;

    tone->looked = true;
    if (tone_line_search(&line, &tone->found, tone->data, tone->sensors, tone->room, tone->fill,
                         tone->derivatives, tone->thin_hz, tone->service_hz)) {
        return -1;
    }
    if (!tone->found) {
        return 0;
    }
    tone->hz = line.hz;
    tone->rival = line.rival;
    tone->rival_hz = line.rival_hz;
    tone->fine_hz = tone->thin_hz / (double)tone->fill / 2;
    double n = fmax(SEGMENT_S * tone->thin_hz, samples_of(line.hz, SEGMENT_TURNS, tone->thin_hz));

    if (all > 0) {
        n = fmax(fmin(n, floor(all / LEAST_BLOCKS)),
                 samples_of(line.hz, LEAST_TURNS, tone->thin_hz));
        tone->join = (size_t)fmax(1, ceil(all / n / TONE_BLOCKS));
    }
    tone->segment = (size_t)fmin(n, (double)tone->room);
    return 0;
}

/* Segments as long as there are whole ones. Those of the first seconds share one mean square. */
static int advance(struct tone *tone)
{
    if (!tone->looked && look(tone)) {
        return -1;
    }
    while (tone->found && tone->fill >= tone->segment) {
        if (take_segment(tone)) {
            return -1;
        }
        drop(tone, tone->segment);
    }
    if (!tone->found) {
        drop(tone, tone->fill);
    }
    for (size_t s = 0; s < tone->sensors; s++) {
        tone->square[s] = tone->mean[s] = 0;
    }
    tone->count = 0;
    return 0;
}

/* ---- samples ---- */

/* A step is complete: its falling half joins the rising half of the one before. */
static int step_over(struct tone *tone)
{
    double step = (double)tone->step;

    for (size_t s = 0; s < tone->sensors; s++) {
        double fall = tone->whole[s] - tone->rise[s];

        if (tone->primed) {
            tone->data[s * tone->room + tone->fill] = (float)((tone->before[s] + fall) / step);
        }
        tone->before[s] = tone->rise[s];
        tone->rise[s] = tone->whole[s] = 0;
    }
    tone->fill += tone->primed;
    tone->primed = true;
    tone->at = 0;
    if (tone->fill == tone->room || (tone->found && tone->fill >= tone->segment)) {
        return advance(tone);
    }
    return 0;
}

static void take_samples(struct tone *tone, const float *const *planes, size_t from, size_t n)
{
    for (size_t s = 0; s < tone->sensors; s++) {
        const float *x = planes[s] + from;
        double whole = 0, rise = 0, square = 0;

        for (size_t i = 0; i < n; i++) {
            double y = x[i];

            whole += y;
            rise += y * ((double)(tone->at + i) + 0.5);
            square += y * y;
        }
        tone->whole[s] += whole;
        tone->rise[s] += rise / (double)tone->step;
        tone->mean[s] += whole;
        tone->square[s] += square;
    }
    tone->at += n;
    tone->count += (double)n;
}

int tone_add(struct tone *tone, const float *const *planes, size_t n)
{
    for (size_t i = 0; i < n;) {
        size_t need = tone->step - tone->at, take = n - i < need ? n - i : need;

        take_samples(tone, planes, i, take);
        i += take;
        if (tone->at == tone->step && step_over(tone)) {
            return -1;
        }
    }
    return 0;
}

int tone_finish(struct tone *tone)
{
    return tone->looked ? 0 : advance(tone);
}

bool tone_turn(struct tone *tone, double end, struct shaft_turn *turn)
{
    double hz = tone->hz, from = tone->turned;

    if (!tone->found) {
        return false;
    }
    while (tone->block < tone->block_count && tone->blocks[tone->block].to <= from) {
        tone->block++;
    }
    if (tone->block < tone->block_count) {
        hz = tone->blocks[tone->block].hz;
    }
    double to = from + tone->rate_hz / hz;

    if (!(to <= end)) {
        return false;
    }
    *turn = (struct shaft_turn){.t0 = from, .t1 = to, .c = {0, 1}, .first = from <= 0};
    tone->turned = to;
    return true;
}

double tone_speed(const struct tone *tone)
{
    double turns = 0, time = 0;

    for (size_t b = 0; b < tone->block_count; b++) {
        turns += tone->blocks[b].turns;
        time += tone->blocks[b].to - tone->blocks[b].from;
    }
    return time > 0 ? 60 * tone->rate_hz * turns / time : NAN;
}

double tone_scatter(const struct tone *tone)
{
    double mean = tone_speed(tone), sum = 0;

    for (size_t b = 0; b < tone->block_count; b++) {
        double off = 60 * tone->blocks[b].hz - mean;

        sum += off * off;
    }
    return tone->block_count > 1 ? sqrt(sum / (double)(tone->block_count - 1)) : NAN;
}
