#include "desk/look.h"

#include <complex.h>
#include <math.h>
#include <stdlib.h>
#include <string.h>

#include "read/digest.h"

#define CHUNK 4096u
#define SAMPLED 16384u       /* values of a column that tell its levels */
#define TWO_LEVELS_LEAST 0.8 /* common practice; between a sine (0.59) and pulses (over 0.9) */

struct glance { /* the look while it is taken */
    struct recording recording;
    struct tracker all;   /* channels; turns where the tacho is known */
    struct tracker *each; /* owned: LOOK_EACH, one a column */
    float *chunk, *lone;  /* owned: frames of all columns; of one */
    float *sampled;       /* owned: LOOK_EACH, SAMPLED a column */
    size_t sampled_count, stride;
    size_t columns, begun; /* trackers in `each` that were initialised */
};

/* ---- levels ---- */

static int compare(const void *a, const void *b)
{
    const float x = *(const float *)a, y = *(const float *)b;
    return (x > y) - (x < y);
}

double look_extremes(float *values, size_t n)
{
    if (n == 0)
        return NAN;
    qsort(values, n, sizeof *values, compare);
    const double low = values[n / 1000], high = values[n - 1 - n / 1000];
    const double near = (high - low) / 5;
    size_t count = 0;
    for (size_t i = 0; i < n; i++)
        count += values[i] <= low + near || values[i] >= high - near;
    return near > 0 ? (double)count / (double)n : NAN;
}

/* ---- samples ---- */

static int begin_each(struct glance *glance, const struct tracker_set_up *set_up)
{
    const double rail = NAN;
    struct tracker_set_up lone = *set_up;
    lone.columns = 1;
    lone.tacho = 0;
    lone.rail = &rail;
    glance->each = calloc(glance->columns, sizeof *glance->each);
    glance->lone = malloc(CHUNK * sizeof *glance->lone);
    glance->sampled = malloc(glance->columns * SAMPLED * sizeof *glance->sampled);
    if (!glance->each || !glance->lone || !glance->sampled)
        return -1;
    for (; glance->begun < glance->columns; glance->begun++)
        if (tracker_init(&glance->each[glance->begun], &lone) != 0)
            return -1;
    return 0;
}

static int begin(struct glance *glance, const struct look_tacho *tacho, double frames)
{
    const struct tracker_set_up set_up = {.rate_hz = glance->recording.rate_hz,
                                          .frames = frames,
                                          .columns = glance->columns,
                                          .tacho = tacho->column >= 0 ? tacho->column : -1,
                                          .rail = glance->recording.rails,
                                          .edge = tacho->edge,
                                          .marks = tacho->marks,
                                          .level = tacho->level,
                                          .service_rpm = tacho->service_rpm};
    glance->chunk = malloc(CHUNK * glance->columns * sizeof *glance->chunk);
    glance->stride = (size_t)ceil(frames / SAMPLED);
    if (!glance->chunk || tracker_init(&glance->all, &set_up) != 0)
        return -1;
    return tacho->column == LOOK_EACH ? begin_each(glance, &set_up) : 0;
}

static int add_each(struct glance *glance, size_t frames, long long start)
{
    const size_t stride = glance->stride;
    const size_t first = (stride - (size_t)(start % (long long)stride)) % stride;
    for (size_t c = 0; c < glance->columns; c++) {
        size_t sampled = glance->sampled_count;
        for (size_t f = 0; f < frames; f++)
            glance->lone[f] = glance->chunk[f * glance->columns + c];
        for (size_t f = first; f < frames && sampled < SAMPLED; f += stride)
            glance->sampled[c * SAMPLED + sampled++] = glance->lone[f];
        if (tracker_add(&glance->each[c], glance->lone, frames) != 0)
            return -1;
        if (c + 1 == glance->columns)
            glance->sampled_count = sampled;
    }
    return 0;
}

/* Reads up to `most` frames; their number is in *seen. */
static int read_frames(struct glance *glance, long long most, long long *seen, struct fault *fault)
{
    while (*seen < most) {
        const long long left = most - *seen;
        size_t got = 0;
        if (recording_read(&glance->recording, glance->chunk,
                           left < (long long)CHUNK ? (size_t)left : CHUNK, &got,
                           fault) != STATUS_DONE)
            return fault->status;
        if (got == 0)
            break;
        if (tracker_add(&glance->all, glance->chunk, got) != 0 ||
            (glance->each && add_each(glance, got, *seen) != 0))
            return fault_no_memory(fault);
        *seen += (long long)got;
    }
    if (tracker_finish(&glance->all) != 0)
        return fault_no_memory(fault);
    for (size_t c = 0; c < glance->begun; c++)
        if (tracker_finish(&glance->each[c]) != 0)
            return fault_no_memory(fault);
    return STATUS_DONE;
}

/* ---- what was seen ---- */

static void note_pulses(struct look_column *column, const struct tracker *tracker)
{
    column->pulses = tracker_regular(tracker);
    column->reference = tracker_reference(tracker);
    column->speed_rpm = column->pulses ? tracker_speed(tracker) : NAN;
}

/* The mean 1x vector of a sensor over the blocks, each with its turns, as an amplitude. The sensors
 * are the columns but the tacho, in their order. */
static double amplitude(const struct tracker *tracker, size_t column)
{
    const struct windows *windows = &tracker->windows;
    const size_t sensor = column - ((int)column > tracker->tacho);
    double complex sum = 0;
    double turns = 0, rest;
    for (size_t b = 0; b < windows->count; b++) {
        sum += (double)windows->blocks[b].turns * window_vector(windows, b, sensor, &rest);
        turns += (double)windows->blocks[b].turns;
    }
    return turns > 0 ? cabs(sum) / turns : NAN;
}

static void note(struct look *look, struct glance *glance, int tacho)
{
    for (size_t c = 0; c < look->count; c++) {
        const struct channel *channel = &glance->all.channels[c];
        struct look_column *column = &look->columns[c];
        *column = (struct look_column){.min = channel->min,
                                       .max = channel->max,
                                       .rail = glance->recording.rails[c],
                                       .resolution = channel_resolution(channel),
                                       .railed = channel_railed(channel),
                                       .same_as = channel_pairs_same(&glance->all.pairs, c),
                                       .speed_rpm = NAN,
                                       .once = NAN};
        if (tacho == (int)c)
            note_pulses(column, &glance->all);
        else if (tacho >= 0 && tracker_regular(&glance->all) && tracker_reference(&glance->all))
            column->once = amplitude(&glance->all, c);
        if (glance->each) {
            note_pulses(column, &glance->each[c]);
            column->two_levels = look_extremes(&glance->sampled[c * SAMPLED],
                                               glance->sampled_count) >= TWO_LEVELS_LEAST;
        }
    }
}

static int take(struct look *look, struct glance *glance, const struct recording_wish *wish,
                const struct look_tacho *tacho, struct fault *fault)
{
    if (recording_open(&glance->recording, wish, fault) != STATUS_DONE)
        return fault->status;
    glance->columns = wish->column_count;
    *look = (struct look){.rate_hz = glance->recording.rate_hz,
                          .frames = glance->recording.frames,
                          .count = wish->column_count};
    const double frames = fmin((double)look->frames, ceil(LOOK_SECONDS * look->rate_hz));
    look->columns = calloc(look->count, sizeof *look->columns);
    if (!look->columns || begin(glance, tacho, frames) != 0)
        return fault_no_memory(fault);
    if (read_frames(glance, (long long)frames, &look->seen, fault) != STATUS_DONE)
        return fault->status;
    note(look, glance, tacho->column);
    return STATUS_DONE;
}

static int keep_hashes(struct look *look, const struct recording_wish *wish, struct fault *fault)
{
    look->sha256 = calloc(wish->path_count, sizeof *look->sha256);
    if (!look->sha256)
        return fault_no_memory(fault);
    look->file_count = wish->path_count;
    for (size_t i = 0; i < wish->path_count; i++)
        memcpy(look->sha256[i], wish->digests[i]->sha256, sizeof look->sha256[i]);
    return STATUS_DONE;
}

static void release(struct glance *glance)
{
    for (size_t c = 0; c < glance->begun; c++)
        tracker_release(&glance->each[c]);
    free(glance->each);
    free(glance->sampled);
    free(glance->lone);
    free(glance->chunk);
    tracker_release(&glance->all);
    recording_close(&glance->recording);
}

int look_at(struct look *look, const struct recording_wish *wish, const struct look_tacho *tacho,
            struct fault *fault)
{
    struct glance glance = {.stride = 1};
    struct recording_wish whole = *wish;
    *look = (struct look){0};
    const struct digest **digests = calloc(wish->path_count, sizeof *digests);
    struct digest_queue *queue = digest_queue_new(wish->paths, wish->path_count);
    if (!digests || !queue)
        fault_no_memory(fault);
    for (size_t i = 0; fault->status == STATUS_DONE && i < wish->path_count; i++) {
        digests[i] = digest_queue_wait(queue, i);
        if (digests[i]->fault.status != STATUS_DONE)
            *fault = digests[i]->fault;
    }
    whole.digests = digests;
    if (fault->status == STATUS_DONE && (take(look, &glance, &whole, tacho, fault) != STATUS_DONE ||
                                         keep_hashes(look, &whole, fault) != STATUS_DONE))
        look_release(look);
    release(&glance);
    digest_queue_free(queue);
    free(digests);
    return fault->status;
}

void look_release(struct look *look)
{
    free(look->sha256);
    free(look->columns);
    *look = (struct look){0};
}
