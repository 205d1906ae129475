/* average.c - the stage `average`: the blocks of a run become one reading per sensor. */
#include "average/average.h"

#include <math.h>
#include <stdio.h>
#include <stdlib.h>
#include <string.h>

#include "average/alias.h"
#include "average/blocks.h"
#include "average/mean.h"
#include "average/overall.h"
#include "average/sweep.h"
#include "base/angle.h"
#include "base/message.h"
#include "base/stage.h"
#include "base/status.h"
#include "sheet/units.h"
#include "stream/records.h"
#include "stream/stream.h"

/* What one run has brought for one sensor. */
struct track_of {
    struct blocks blocks;            /* owned */
    struct spectrum_record spectrum; /* owned; count 0: none */
};

/* The run that is being gathered. */
struct gather {
    bool open;
    char run[NAME_ROOM], condition[NAME_ROOM];
    struct track_of *sensors; /* owned, one per sensor of the job */
    size_t sensor_count;
    struct tacho_record tacho;
    bool has_tacho;
};

static int gather_init(struct gather *g, size_t sensor_count)
{
    *g = (struct gather){0};
    g->sensors = calloc(sensor_count + 1, sizeof *g->sensors);
    g->sensor_count = sensor_count;
    return g->sensors ? STATUS_DONE : message_no_memory();
}

static void gather_clear(struct gather *g)
{
    for (size_t i = 0; i < g->sensor_count; i++) {
        blocks_clear(&g->sensors[i].blocks);
        spectrum_release(&g->sensors[i].spectrum);
        g->sensors[i].spectrum = (struct spectrum_record){0};
    }
    g->open = g->has_tacho = false;
}

static void gather_release(struct gather *g)
{
    if (!g->sensors)
        return;
    gather_clear(g);
    for (size_t i = 0; i < g->sensor_count; i++)
        blocks_release(&g->sensors[i].blocks);
    free(g->sensors);
}

static int foreign(const struct gather *g, const struct record *record, const char *run)
{
    if (g->open && !strcmp(g->run, run))
        return STATUS_DONE;
    return record_outside(record, run);
}

static int add_turns(struct gather *g, const struct record *record, const struct job *job)
{
    struct turns_record r = {0};
    const char *why = "";
    int status = STATUS_DONE;

    if (turns_parse(&r, job, record->json, &why))
        return record_malformed(record, why);
    status = foreign(g, record, r.run);
    if (status == STATUS_DONE && r.turns < 1)
        status = record_malformed(record, "no turns");
    for (size_t i = 0; status == STATUS_DONE && i < r.count; i++) {
        struct blocks *blocks = &g->sensors[r.sensors[i]].blocks;
        struct block block = {r.vectors[i], (double)r.turns, r.t_s, r.speed_rpm};
        if (isnan(creal(r.vectors[i])) && !isnan(r.amplitudes[i])) {
            block.vector = r.amplitudes[i];
            blocks->amplitudes = true;
        }
        if (blocks_add(blocks, &block))
            status = message_no_memory();
    }
    turns_release(&r);
    return status;
}

static int add_tacho(struct gather *g, const struct record *record)
{
    const char *why = "";

    if (tacho_parse(&g->tacho, record->json, &why))
        return record_malformed(record, why);
    g->has_tacho = true;
    return foreign(g, record, g->tacho.run);
}

static int add_spectrum(struct gather *g, const struct record *record, const struct job *job)
{
    struct spectrum_record r = {0};
    const char *why = "";
    int status;

    if (spectrum_parse(&r, job, record->json, &why))
        return record_malformed(record, why);
    status = foreign(g, record, r.run);
    if (status == STATUS_DONE) {
        spectrum_release(&g->sensors[r.sensor].spectrum);
        g->sensors[r.sensor].spectrum = r;
    } else {
        spectrum_release(&r);
    }
    return status;
}

/* A length as a percentage of the amplitude; 0 and NaN as they are. */
static double percentage(double size, double amplitude)
{
    return size > 0 ? 100 * size / amplitude : size;
}

static void fill_from_mean(struct reading_record *r, const struct mean *mean)
{
    const struct unsteady *u = &mean->unsteady;

    r->vector = r->has_phase ? mean->vector : NAN;
    r->amplitude = cabs(mean->vector);
    memcpy(r->cov, mean->cov, sizeof r->cov);
    r->blocks = (long)mean->used;
    r->steady = steady_unknown();
    r->steady.amplitude_pct = 100 * mean->amplitude_sd / r->amplitude;
    r->steady.phase_deg = mean->phase_sd_deg;
    r->steady.resultant = mean->resultant;
    r->steady.drift_pct = percentage(mean->drift, r->amplitude);
    r->steady.independent = mean->independent;
    r->steady.set_aside = mean->set_aside;
    r->steady.turns = lround(mean->turns);
    r->steady.beat_pct = percentage(u->beat, r->amplitude);
    r->steady.beat_s = u->beat_s;
    r->steady.step_pct = percentage(u->step, r->amplitude);
    r->steady.step_s = u->step_s;
    r->steady.wander_pct = percentage(u->wander, r->amplitude);
}

/* The reading of a sensor from its blocks: 0 made, 1 nothing to make it of, -1 no memory. */
static int reading_of_blocks(struct reading_record *r, struct track_of *s, bool marks,
                             double *turning_hz)
{
    bool reference = marks && !s->blocks.amplitudes;
    struct mean mean;
    double *amplitudes;
    int result;

    blocks_drop_empty(&s->blocks);
    if (blocks_empty(&s->blocks))
        return 1;
    r->has_phase = reference;
    if (reference) {
        result =
            mean_of_blocks(s->blocks.vectors, s->blocks.turns, s->blocks.t, s->blocks.count, &mean);
    } else {
        amplitudes = malloc(s->blocks.count * sizeof *amplitudes);
        if (!amplitudes)
            return -1;
        for (size_t i = 0; i < s->blocks.count; i++)
            amplitudes[i] = cabs(s->blocks.vectors[i]);
        result =
            mean_of_amplitudes(amplitudes, s->blocks.turns, s->blocks.t, s->blocks.count, &mean);
        free(amplitudes);
    }
    if (result)
        return -1;
    fill_from_mean(r, &mean);
    *turning_hz = mean.unsteady.turning_hz;
    return 0;
}

/* Without phase in the blocks: the amplitude of the spectrum's line at the running speed. */
static int reading_of_spectrum(struct reading_record *r, const struct track_of *s)
{
    double turns = 0;

    r->has_phase = false;
    r->vector = NAN;
    r->amplitude = overall_one_x(s->spectrum.orders, s->spectrum.amplitude, s->spectrum.count);
    if (isnan(r->amplitude))
        return 1;
    for (size_t i = 0; i < s->blocks.count; i++)
        turns += s->blocks.turns[i];
    r->steady = steady_unknown();
    r->steady.turns = lround(turns);
    r->blocks = (long)s->blocks.count;
    return 0;
}

static void fill_speed(struct reading_record *r, const struct track_of *s, const struct gather *g)
{
    double n = (double)s->blocks.count, sum = 0, squares = 0;

    for (size_t i = 0; i < s->blocks.count; i++)
        sum += s->blocks.speed[i];
    for (size_t i = 0; i < s->blocks.count; i++)
        squares += (s->blocks.speed[i] - sum / n) * (s->blocks.speed[i] - sum / n);
    r->speed_rpm = sum / n;
    if (g->has_tacho && g->tacho.speed_rpm > 0 && !isnan(g->tacho.scatter_rpm))
        r->steady.speed_pct = 100 * g->tacho.scatter_rpm / g->tacho.speed_rpm;
    else
        r->steady.speed_pct =
            s->blocks.count > 1 ? 100 * sqrt(squares / (n - 1)) / r->speed_rpm : NAN;
}

static void fill_overall(struct reading_record *r, const struct track_of *s, const struct job *job)
{
    const struct job_sensor *sensor = &job->sensors[r->sensor];

    r->overall.quantity = sensor->show.quantity;
    overall_band(r->speed_rpm, &r->overall.from_hz, &r->overall.to_hz);
    r->overall.rms = overall_rms(s->spectrum.orders, s->spectrum.amplitude, s->spectrum.count,
                                 r->speed_rpm, sensor->quantity, sensor->show.quantity);
}

/* The frequency of what turns the vector about its mean. */
static void fill_neighbour(struct reading_record *r, const struct track_of *s, double turning_hz)
{
    double speed_hz = r->speed_rpm / 60;
    double block_s =
        r->steady.turns > 0 ? (double)r->steady.turns / (double)r->blocks / speed_hz : NAN;
    double x = PI * turning_hz * block_s;

    if (isnan(turning_hz) || isnan(block_s))
        return;
    turning_hz = alias_turning(s->spectrum.orders, s->spectrum.amplitude, s->spectrum.count,
                               speed_hz, block_s, turning_hz,
                               r->steady.beat_pct / 100 * r->amplitude * fabs(sin(x) / x));
    r->steady.neighbour_hz = speed_hz - turning_hz;
}

/* ---- coast-downs ---- */

static int write_curve(const struct gather *g, int sensor, struct stream *stream, struct line *line)
{
    const struct track_of *s = &g->sensors[sensor];
    struct curve_record r = {.sensor = sensor,
                             .speed_rpm = s->blocks.speed,
                             .vectors = s->blocks.vectors,
                             .count = s->blocks.count};

    memcpy(r.run, g->run, sizeof r.run);
    curve_print(&r, &stream->job, line);
    return stream_write(stream, line);
}

/* Why a listed speed has no reading. */
static int write_no_reading(const struct gather *g, double speed_rpm, const char *why,
                            struct stream *stream, struct line *line)
{
    struct finding_record r = {.stage = "average",
                               .check = "coast-down",
                               .verdict = VERDICT_CAUTION,
                               .sensor = -1,
                               .value = speed_rpm,
                               .limit = NAN,
                               .unit = "rpm",
                               .basis = "what was recorded"};

    memcpy(r.run, g->run, sizeof r.run);
    snprintf(r.text, sizeof r.text, "no reading at %.10g rpm: %s", speed_rpm, why);
    finding_print(&r, &stream->job, line);
    return stream_write(stream, line);
}

static void explain_no_reading(const struct track_of *s, enum sweep_result result, char *why,
                               size_t room)
{
    double least = INFINITY, most = 0;

    for (size_t k = 0; k < s->blocks.count; k++) {
        least = fmin(least, s->blocks.speed[k]);
        most = fmax(most, s->blocks.speed[k]);
    }
    if (result == SWEEP_SPARSE)
        snprintf(why, room, "the run has only %zu blocks with a vector; record more of it",
                 s->blocks.count);
    else if (least <= most)
        snprintf(why, room, "the run went from %.0f to %.0f rpm and not steadily through it", least,
                 most);
    else
        snprintf(why, room, "the run has no blocks");
}

static int write_swept(const struct gather *g, int sensor, double speed_rpm,
                       const struct sweep_fit *fit, struct stream *stream, struct line *line)
{
    struct reading_record r = {.sensor = sensor,
                               .speed_rpm = speed_rpm,
                               .has_phase = true,
                               .vector = fit->vector,
                               .amplitude = cabs(fit->vector),
                               .cov = {fit->variance, 0, fit->variance},
                               .blocks = (long)fit->used,
                               .steady = steady_unknown(),
                               .overall = {.rms = NAN}};

    memcpy(r.run, g->run, sizeof r.run);
    /* The sheet has seen to it that the name fits. */
    (void)job_speed_condition(g->condition, speed_rpm, r.condition);
    r.steady.turns = lround(fit->turns);
    r.steady.independent = fit->freedom;
    r.overall.quantity = stream->job.sensors[sensor].show.quantity;
    reading_print(&r, &stream->job, line);
    return stream_write(stream, line);
}

/* One listed speed, all sensors; `told` where the missing reading has been explained. */
static int read_speed(struct gather *g, double speed_rpm, struct stream *stream, struct line *line)
{
    bool reference = !g->has_tacho || g->tacho.reference, told = false;
    int status = STATUS_DONE;

    for (size_t i = 0; status == STATUS_DONE && i < g->sensor_count; i++) {
        struct track_of *s = &g->sensors[i];
        struct sweep sweep = {s->blocks.t, s->blocks.speed, s->blocks.turns, s->blocks.vectors,
                              s->blocks.count};
        struct sweep_fit fit;
        char why[200] = "its marks carry no phase; use one mark a turn";
        bool phase = reference && !s->blocks.amplitudes && !blocks_empty(&s->blocks);
        int result = SWEEP_SPARSE;
        if (s->blocks.count == 0)
            continue;
        if (phase)
            result = sweep_at(&sweep, speed_rpm, &fit);
        if (result < 0)
            status = message_no_memory();
        else if (result == SWEEP_MADE)
            status = write_swept(g, (int)i, speed_rpm, &fit, stream, line);
        else if (!told) {
            if (phase)
                explain_no_reading(s, (enum sweep_result)result, why, sizeof why);
            status = write_no_reading(g, speed_rpm, why, stream, line);
            told = true;
        }
    }
    return status;
}

static int finish_coast_down(struct gather *g, const struct job_run *run, struct stream *stream,
                             struct line *line)
{
    int status = STATUS_DONE;

    for (size_t i = 0; status == STATUS_DONE && i < g->sensor_count; i++) {
        blocks_drop_empty(&g->sensors[i].blocks);
        if (!blocks_empty(&g->sensors[i].blocks) && !g->sensors[i].blocks.amplitudes)
            status = write_curve(g, (int)i, stream, line);
    }
    for (size_t i = 0; status == STATUS_DONE && i < run->speed_count; i++)
        status = read_speed(g, run->speeds_rpm[i], stream, line);
    return status;
}

/* ---- the stage ---- */

static int finish_steady(struct gather *g, struct stream *stream, struct line *line)
{
    bool reference = !g->has_tacho || g->tacho.reference;
    int status = STATUS_DONE;

    for (size_t i = 0; status == STATUS_DONE && i < g->sensor_count; i++) {
        struct track_of *s = &g->sensors[i];
        struct reading_record r = {.sensor = (int)i};
        double turning_hz = NAN;
        int made = s->blocks.count ? reading_of_blocks(&r, s, reference, &turning_hz) : 1;
        if (made == 1 && s->blocks.count)
            made = reading_of_spectrum(&r, s);
        if (made < 0)
            status = message_no_memory();
        if (made != 0)
            continue;
        memcpy(r.run, g->run, sizeof r.run);
        memcpy(r.condition, g->condition, sizeof r.condition);
        fill_speed(&r, s, g);
        fill_neighbour(&r, s, turning_hz);
        fill_overall(&r, s, &stream->job);
        reading_print(&r, &stream->job, line);
        status = stream_write(stream, line);
    }
    return status;
}

/* Writes the readings of the run gathered so far, and forgets it. */
static int finish_run(struct gather *g, struct stream *stream, struct line *line)
{
    for (size_t i = 0; i < g->sensor_count; i++)
        blocks_end(&g->sensors[i].blocks);
    int index = g->open ? job_find_run(&stream->job, g->run) : -1, status = STATUS_DONE;
    const struct job_run *run = index < 0 ? NULL : &stream->job.runs[index];

    if (run && run->speed_count > 0)
        status = finish_coast_down(g, run, stream, line);
    else if (g->open)
        status = finish_steady(g, stream, line);
    gather_clear(g);
    return status;
}

/* The readings that were taken by hand stand behind their run. */
static int hand_readings(const struct job_run *run, struct stream *stream, struct line *line)
{
    int status = STATUS_DONE;

    for (size_t i = 0; status == STATUS_DONE && i < run->hand_count; i++) {
        const struct job_hand *hand = &run->hand[i];
        struct reading_record r = {.sensor = (int)hand->sensor,
                                   .speed_rpm = run->speed_rpm,
                                   .has_phase = hand->has_phase,
                                   .vector = hand->has_phase ? hand->vector : NAN,
                                   .amplitude = hand->amplitude,
                                   .steady = steady_unknown(),
                                   .overall = {.rms = NAN}};
        memcpy(r.run, run->name, sizeof r.run);
        memcpy(r.condition, run->condition, sizeof r.condition);
        r.overall.quantity = stream->job.sensors[hand->sensor].show.quantity;
        overall_band(r.speed_rpm, &r.overall.from_hz, &r.overall.to_hz);
        reading_print(&r, &stream->job, line);
        status = stream_write(stream, line);
    }
    return status;
}

/* Opens the run of a `run` record. */
static int begin_run(struct gather *g, struct stream *stream, const struct record *record)
{
    struct run_record r = {0};
    const char *why = "";

    if (run_parse(&r, &stream->job, record->json, &why))
        return record_malformed(record, why);
    memcpy(g->run, r.run, sizeof g->run);
    memcpy(g->condition, r.condition, sizeof g->condition);
    g->open = true;
    run_release(&r);
    return STATUS_DONE;
}

static int take(struct gather *g, struct stream *stream, const struct record *record,
                struct line *line)
{
    int status = STATUS_DONE;
    bool run = !strcmp(record->kind, "run");

    if (run)
        status = finish_run(g, stream, line);
    if (status == STATUS_DONE && run)
        status = begin_run(g, stream, record);
    else if (!strcmp(record->kind, "turns"))
        status = add_turns(g, record, &stream->job);
    else if (!strcmp(record->kind, "tacho"))
        status = add_tacho(g, record);
    else if (!strcmp(record->kind, "spectrum"))
        status = add_spectrum(g, record, &stream->job);
    if (status == STATUS_DONE)
        status = stream_pass(stream, record);
    if (status == STATUS_DONE && run) {
        int index = job_find_run(&stream->job, g->run);
        if (index >= 0 && stream->job.runs[index].hand_count)
            status = hand_readings(&stream->job.runs[index], stream, line);
    }
    return status;
}

static int loop(const struct option_list *files)
{
    struct stream stream = {0};
    struct gather gather = {0};
    struct line line = LINE_INIT;
    struct record record;
    static const char *const makes[] = {"reading", "curve", NULL};
    int status = stream_open(&stream, files->items, files->count, true);

    if (status == STATUS_DONE)
        stream_makes(&stream, makes);
    if (status == STATUS_DONE)
        status = gather_init(&gather, stream.job.sensor_count);
    while (status == STATUS_DONE && stream_next_tracked(&stream, &record))
        status = take(&gather, &stream, &record, &line);
    if (status == STATUS_DONE)
        status = stream.status;
    if (status == STATUS_DONE)
        status = finish_run(&gather, &stream, &line);
    if (status == STATUS_DONE)
        status = stream_finish(&stream);
    line_release(&line);
    gather_release(&gather);
    stream_close(&stream);
    return status;
}

int stage_average(int argc, char **argv)
{
    static const struct option options[] = {{0}};
    static const struct usage usage = {
        "average",
        "[FILE...]",
        "blocks of turns become one reading per sensor and run",
        options,
        0,
        (size_t)-1,
        "Reads records from the files, one after another, or from standard input. Behind the last\n"
        "record of each run stand its readings: the mean vector of the blocks, outlier blocks set\n"
        "aside, with the covariance of that mean, and how steady it was.\n"};

    return stage_run(&usage, argc, argv, loop);
}
