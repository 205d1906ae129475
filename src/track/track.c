#include "track/track.h"

#include <math.h>
#include <stdint.h>
#include <stdio.h>
#include <stdlib.h>
#include <string.h>

#include "base/message.h"
#include "base/options.h"
#include "stream/records.h"
#include "stream/stream.h"
#include "track/tone_line.h"
#include "track/tracker.h"

/* What is known of the recording that is passing through. */
struct recording {
    bool open;
    char run[NAME_ROOM];
    struct wave_record wave; /* owned while open */
    int *sensors;            /* owned: per column the sensor's index, -1 the tacho */
    int *derivatives;        /* owned: per sensor present, what tone.h wants */
    struct tracker tracker;  /* owned while open */
    double frames, got;      /* promised by the run record (0: it says nothing), and seen */
};

/* ---- a recording begins ---- */

static int note_run(struct recording *rec, struct stream *stream, const struct record *record)
{
    struct run_record run = {0};
    const char *why = "";

    if (run_parse(&run, &stream->job, record->json, &why)) {
        return record_malformed(record, why);
    }
    rec->frames = run.file_count > 0 ? (double)run.files[0].frames : 0;
    run_release(&run);
    return STATUS_DONE;
}

static int name_columns(struct recording *rec, const struct job *job, int *tacho)
{
    *tacho = -1;
    for (size_t c = 0; c < rec->wave.column_count; c++) {
        const struct wave_column *column = &rec->wave.columns[c];

        rec->sensors[c] =
            column->quantity == QUANTITY_TACHO ? -1 : job_find_sensor(job, column->name);
        if (column->quantity == QUANTITY_TACHO && *tacho < 0) {
            *tacho = (int)c;
        } else if (rec->sensors[c] < 0) {
            message("no such sensor in the job: '%s' (run '%s')", column->name, rec->wave.run);
            return STATUS_USAGE;
        }
    }
    return STATUS_DONE;
}

/* Sensors' quantities as the tracker counts them, in the order of their columns. */
static void name_derivatives(struct recording *rec, const struct job *job)
{
    for (size_t c = 0, s = 0; c < rec->wave.column_count; c++) {
        if (rec->sensors[c] >= 0) {
            enum quantity quantity = job->sensors[rec->sensors[c]].quantity;

            rec->derivatives[s++] =
                (quantity == QUANTITY_ACCELERATION) - (quantity == QUANTITY_DISPLACEMENT);
        }
    }
}

static bool sweeps(const struct recording *rec, const struct job *job)
{
    int run = job_find_run(job, rec->run);

    return run >= 0 && !strcmp(job->runs[run].role, "coast-down");
}

/* A correction by amplitudes alone takes as found and three trials; with fewer runs the tacho has
 * to be mended. An audit, whose recordings are no runs of the sheet, shows what it can. */
static bool amplitudes_serve(const struct recording *rec, const struct job *job)
{
    return job->run_count >= 4 || job_find_run(job, rec->run) < 0;
}

static int begin_tracker(struct recording *rec, const struct job *job)
{
    size_t columns = rec->wave.column_count;
    double *rail = malloc((columns + 1) * sizeof *rail);
    int tacho, status, failed;

    rec->sensors = malloc((columns + 1) * sizeof *rec->sensors);
    rec->derivatives = calloc(columns + 1, sizeof *rec->derivatives);
    if (!rec->sensors || !rec->derivatives || !rail) {
        free(rail);
        return message_no_memory();
    }
    status = name_columns(rec, job, &tacho);
    for (size_t c = 0; c < columns; c++) {
        rail[c] = rec->wave.columns[c].rail;
    }
    if (status == STATUS_DONE) {
        struct tracker_set_up set_up = {rec->wave.rate_hz,
                                        rec->frames,
                                        columns,
                                        tacho,
                                        rail,
                                        job->tacho_edge,
                                        job->tacho_marks,
                                        job->tacho_level,
                                        job->service_rpm,
                                        rec->derivatives,
                                        sweeps(rec, job)};

        name_derivatives(rec, job);
        failed = tracker_init(&rec->tracker, &set_up);
        if (!failed && !amplitudes_serve(rec, job)) {
            tracker_phase_only(&rec->tracker);
        }
        status = failed ? message_no_memory() : STATUS_DONE;
    }
    rec->open = status == STATUS_DONE;
    free(rail);
    return status;
}

static int begin(struct recording *rec, struct stream *stream, const struct record *record)
{
    const char *why = "";

    if (wave_parse(&rec->wave, record->json, &why)) {
        return record_malformed(record, why);
    }
    if (!(rec->wave.rate_hz > 0) || rec->wave.column_count == 0) {
        return record_malformed(record, "no rate, or no columns");
    }
    strcpy(rec->run, rec->wave.run);
    rec->got = 0;
    return begin_tracker(rec, &stream->job);
}

/* ---- its samples ---- */

/* Hands whole frames to the tracker; `carry` keeps the floats of a frame that a piece ends within.
 */
static int feed(struct recording *rec, const float *x, size_t floats, float *carry, size_t *carried)
{
    size_t columns = rec->wave.column_count;
    int failed = 0;

    while (*carried > 0 && floats > 0) {
        carry[(*carried)++] = *x++;
        floats--;
        if (*carried == columns) {
            failed = tracker_add(&rec->tracker, carry, 1);
            *carried = 0;
        }
    }
    if (!failed && floats >= columns) {
        failed = tracker_add(&rec->tracker, x, floats / columns);
    }
    while (*carried < floats % columns) {
        carry[*carried] = x[floats / columns * columns + *carried];
        (*carried)++;
    }
    return failed ? message_no_memory() : STATUS_DONE;
}

static int samples(struct recording *rec, struct stream *stream, const struct record *record)
{
    char run[NAME_ROOM];
    long frames;
    const char *why = "";
    size_t frame = rec->wave.column_count * sizeof(float);

    if (block_parse(run, &frames, record->json, &why)) {
        return record_malformed(record, why);
    }
    if (!rec->open || strcmp(run, rec->run)) {
        return record_malformed(record, "no wave record before it");
    }
    float *carry = malloc(frame); /* a frame that is cut by the input buffer's end */
    size_t carried = 0, left = (size_t)frames * frame;
    int status = carry ? STATUS_DONE : message_no_memory();

    while (status == STATUS_DONE && left > 0) {
        const float *x;
        size_t length = 0;

        status = stream_samples(stream, left, &x, &length);
        if (status != STATUS_DONE) {
            break;
        }
        left -= length;
        status = feed(rec, x, length / sizeof(float), carry, &carried);
    }
    rec->got += (double)frames;
    free(carry);
    return status;
}

/* ---- its results ---- */

static int print_channels(const struct recording *rec, struct stream *stream, struct line *line)
{
    int status = STATUS_DONE;

    for (size_t c = 0; status == STATUS_DONE && c < rec->wave.column_count; c++) {
        const struct channel *channel = &rec->tracker.channels[c];
        int same = channel_pairs_same(&rec->tracker.pairs, c);
        struct channel_record record = {.sensor = rec->sensors[c],
                                        .min = channel->min,
                                        .max = channel->max,
                                        .resolution = channel_resolution(channel),
                                        .railed = channel_railed(channel),
                                        .samples = channel->samples,
                                        .same_as = same < 0                 ? -1
                                                   : rec->sensors[same] < 0 ? -2
                                                                            : rec->sensors[same]};

        strcpy(record.run, rec->run);
        channel_print(&record, &stream->job, line);
        status = stream_write(stream, line);
    }
    return status;
}

/* A record with room for all sensors of the recording. */
static int begin_turns(const struct recording *rec, struct turns_record *record)
{
    size_t count = rec->tracker.sensors;

    *record = (struct turns_record){.count = count};
    record->sensors = malloc((count + 1) * sizeof *record->sensors);
    record->vectors = malloc((count + 1) * sizeof *record->vectors);
    record->rest = malloc((count + 1) * sizeof *record->rest);
    record->amplitudes = malloc((count + 1) * sizeof *record->amplitudes);
    if (!record->sensors || !record->vectors || !record->rest || !record->amplitudes) {
        turns_release(record);
        return message_no_memory();
    }
    strcpy(record->run, rec->run);
    for (size_t c = 0, s = 0; c < rec->wave.column_count; c++) {
        if (rec->sensors[c] >= 0) {
            record->sensors[s++] = rec->sensors[c];
        }
    }
    return STATUS_DONE;
}

static int print_turns(const struct recording *rec, struct stream *stream, struct line *line)
{
    const struct windows *windows = &rec->tracker.windows;
    struct turns_record record;
    bool regular = tracker_regular(&rec->tracker), reference = tracker_reference(&rec->tracker);
    int status = begin_turns(rec, &record);

    for (size_t b = 0; regular && status == STATUS_DONE && b < windows->count; b++) {
        const struct window_block *block = &windows->blocks[b];

        record.t_s = (block->from + block->to) / 2 / rec->wave.rate_hz;
        record.turns = block->turns;
        record.speed_rpm =
            60 * rec->wave.rate_hz * (double)block->turns / (block->to - block->from);
        for (size_t s = 0; s < windows->sensors; s++) {
            record.vectors[s] = window_vector(windows, b, s, &record.rest[s]);
            record.amplitudes[s] = reference ? NAN : cabs(record.vectors[s]);
            record.vectors[s] = reference ? record.vectors[s] : CMPLX(NAN, NAN);
        }
        turns_print(&record, &stream->job, line);
        status = stream_write(stream, line);
    }
    turns_release(&record);
    return status;
}

/* Without a usable tacho: amplitudes of the line that is taken for the shaft's. */
static int print_tone(const struct recording *rec, struct stream *stream, struct line *line)
{
    const struct tone *tone = &rec->tracker.tone;
    struct turns_record record;
    int status = begin_turns(rec, &record);

    for (size_t b = 0; status == STATUS_DONE && b < tone->block_count; b++) {
        const struct tone_block *block = &tone->blocks[b];

        record.t_s = (block->from + block->to) / 2 / rec->wave.rate_hz;
        record.turns = lround(block->turns);
        record.speed_rpm = 60 * block->hz;
        for (size_t s = 0; s < record.count; s++) {
            record.vectors[s] = CMPLX(NAN, NAN);
            record.amplitudes[s] = tone->amplitude[b * tone->sensors + s];
            record.rest[s] = tone->rest[b * tone->sensors + s];
        }
        turns_print(&record, &stream->job, line);
        status = stream_write(stream, line);
    }
    turns_release(&record);
    return status;
}

/* What the speed rests on, for people. */
static int print_tone_finding(const struct recording *rec, struct stream *stream, struct line *line)
{
    const struct tone *tone = &rec->tracker.tone;
    double speed = tone_speed(tone), sd = tone_scatter(tone) / sqrt((double)tone->block_count);
    bool doubtful = tone->rival > 0;
    const char *none = rec->tracker.tacho < 0 ? "no tacho" : "the tacho's channel gives no marks";
    struct finding_record record = {.stage = "track",
                                    .check = "speed-from-spectrum",
                                    .verdict = doubtful ? VERDICT_CAUTION : VERDICT_OK,
                                    .sensor = -1,
                                    .value = doubtful ? 100 * tone->rival : NAN,
                                    .limit = doubtful ? 100 * TONE_LINE_RIVAL : NAN,
                                    .unit = "%",
                                    .basis = "common practice"};

    if (!tone->found) {
        return STATUS_DONE; /* vet says that there is neither tacho nor reading */
    }
    sd = fmax(isnan(sd) ? 0 : sd,
              60 * tone->fine_hz / 10); /* a line's middle, to a fifth of a bin */
    strcpy(record.run, rec->run);
    if (doubtful) {
        snprintf(record.text, sizeof record.text,
                 "%s: the speed was read from the spectrum as %.4g rpm (standard deviation %.1g), "
                 "but another line at %.4g Hz has %.0f %% of its size: state the service speed and "
                 "make sure that it is this line",
                 none, speed, sd, tone->rival_hz, 100 * tone->rival);
    } else {
        snprintf(record.text, sizeof record.text,
                 "%s: the speed was read from the spectrum as %.4g rpm (standard deviation %.1g); "
                 "amplitudes only",
                 none, speed, sd);
    }
    finding_print(&record, &stream->job, line);
    return stream_write(stream, line);
}

static int print_tone_tacho(const struct recording *rec, struct stream *stream, struct line *line)
{
    const struct tone *tone = &rec->tracker.tone;
    struct tacho_record record = {.jitter_deg = NAN,
                                  .speed_rpm = tone_speed(tone),
                                  .scatter_rpm = tone_scatter(tone),
                                  .pulses = true};

    strcpy(record.run, rec->run);
    tacho_print(&record, line);
    return stream_write(stream, line);
}

/* A scratch that comes every turn is no damage to the count of marks, but people should know. */
static int print_scratch_finding(const struct recording *rec, struct stream *stream,
                                 struct line *line)
{
    const struct marks *marks = &rec->tracker.marks;
    struct finding_record record = {.stage = "track",
                                    .check = "tacho-scratch",
                                    .verdict = VERDICT_CAUTION,
                                    .sensor = -1,
                                    .value = marks->scratches,
                                    .limit = 0,
                                    .unit = "",
                                    .basis = "common practice"};

    if (marks->scratches == 0 || !tracker_reference(&rec->tracker)) {
        return STATUS_DONE;
    }
    strcpy(record.run, rec->run);
    snprintf(
        record.text, sizeof record.text,
        "%s smaller than the mark %s with it every turn (%ld pulses): told apart and left out; "
        "lag is read from the larger one",
        marks->scratches == 1 ? "another pulse" : "two other pulses",
        marks->scratches == 1 ? "comes" : "come", marks->beside);
    finding_print(&record, &stream->job, line);
    return stream_write(stream, line);
}

static int print_tacho(const struct recording *rec, struct stream *stream, struct line *line)
{
    const struct tracker *tracker = &rec->tracker;
    struct tacho_record record = {.marks = tracker->marks.count,
                                  .missed = tracker->marks.missed + tracker->marks.between,
                                  .extra = marks_extra(&tracker->marks),
                                  .jitter_deg = shaft_jitter(&tracker->shaft),
                                  .speed_rpm = tracker_speed(tracker),
                                  .scatter_rpm = tracker_scatter(tracker),
                                  .reference = tracker_reference(tracker),
                                  .pulses = tracker_pulsed(tracker)};

    strcpy(record.run, rec->run);
    tacho_print(&record, line);
    return stream_write(stream, line);
}

/* Frequencies and amplitudes of what does not turn with the shaft, in pairs. */
static size_t name_lines(const struct recording *rec, size_t sensor, double *lines)
{
    struct stray strays[STRAY_MOST];
    size_t count = spectrum_strays(&rec->tracker.spectrum, sensor, strays);

    for (size_t i = 0; i < count; i++) {
        lines[2 * i] = strays[i].order * rec->wave.rate_hz;
        lines[2 * i + 1] = strays[i].amplitude;
    }
    return count;
}

/* Without a tacho a harmonic of the shaft may wander between the orders: no line is named there. */
static int print_spectra(const struct recording *rec, struct stream *stream, struct line *line)
{
    const struct tracker *tracker = &rec->tracker;
    bool tacho = tracker->tacho >= 0;
    double orders[SPECTRUM_LINES], amplitude[SPECTRUM_LINES], lines[2 * STRAY_MOST];
    struct spectrum_record record = {
        .orders = orders, .amplitude = amplitude, .lines = lines, .lines_known = tacho};
    int status = STATUS_DONE;

    strcpy(record.run, rec->run);
    for (size_t c = 0, s = 0; status == STATUS_DONE && c < rec->wave.column_count; c++) {
        if (rec->sensors[c] < 0) {
            continue;
        }
        record.sensor = rec->sensors[c];
        record.count = spectrum_lines(&tracker->spectrum, s, orders, amplitude);
        record.line_count = tacho ? name_lines(rec, s, lines) : 0;
        s++;
        if (record.count > 0 && (tacho ? tracker_regular(tracker) : tracker->tone.found)) {
            spectrum_print(&record, &stream->job, line);
            status = stream_write(stream, line);
        }
    }
    return status;
}

static void drop(struct recording *rec)
{
    tracker_release(&rec->tracker);
    wave_release(&rec->wave);
    free(rec->sensors);
    free(rec->derivatives);
    rec->sensors = rec->derivatives = NULL;
    rec->open = false;
}

/* Ends the recording that is open, if one is, and writes its records. */
static int finish(struct recording *rec, struct stream *stream)
{
    struct line line = LINE_INIT;
    int status = STATUS_DONE;

    if (!rec->open) {
        return STATUS_DONE;
    }
    if (rec->frames > 0 && rec->got != rec->frames) {
        message("ended early: '%s' (%.0f of %.0f frames)", rec->run, rec->got, rec->frames);
        status = STATUS_SYSTEM;
    } else if (tracker_finish(&rec->tracker)) {
        status = message_no_memory();
    }
    if (status == STATUS_DONE) {
        status = print_channels(rec, stream, &line);
    }
    bool tacho = !tracker_toned(&rec->tracker);

    if (status == STATUS_DONE) {
        status = tacho ? print_turns(rec, stream, &line) : print_tone(rec, stream, &line);
    }
    if (status == STATUS_DONE) {
        status = tacho ? print_tacho(rec, stream, &line) : print_tone_tacho(rec, stream, &line);
    }
    if (status == STATUS_DONE) {
        status = print_spectra(rec, stream, &line);
    }
    if (status == STATUS_DONE && tacho) {
        status = print_scratch_finding(rec, stream, &line);
    }
    if (status == STATUS_DONE && !tacho) {
        status = print_tone_finding(rec, stream, &line);
    }
    line_release(&line);
    drop(rec);
    return status;
}

/* ---- the stage ---- */

static int take(struct recording *rec, struct stream *stream, const struct record *record)
{
    int status = STATUS_DONE;

    if (!strcmp(record->kind, "block")) {
        return samples(rec, stream, record);
    }
    if (!strcmp(record->kind, "run") || !strcmp(record->kind, "wave")) {
        status = finish(rec, stream);
    }
    if (status == STATUS_DONE && !strcmp(record->kind, "wave")) {
        return begin(rec, stream, record);
    }
    if (status == STATUS_DONE && !strcmp(record->kind, "run")) {
        status = note_run(rec, stream, record);
    }
    return status == STATUS_DONE ? stream_pass(stream, record) : status;
}

int stage_track(int argc, char **argv)
{
    static const struct option options[] = {{.name = NULL}};
    static const struct usage usage = {
        "track",
        "[FILE...]",
        "samples become one vector per sensor per block of turns, and the tacho's health",
        options,
        0,
        SIZE_MAX,
        NULL};
    struct option_list files = {0};
    struct stream stream;
    struct recording rec = {0};
    struct record record;

    message_stage("track");
    switch (options_parse(&usage, argc, argv, &files)) {
    case OPTIONS_STOP:
        return STATUS_DONE;
    case OPTIONS_MISUSE:
        return STATUS_USAGE;
    case OPTIONS_GO:
        break;
    }
    static const char *const makes[] = {"channel", "turns", "tacho", "spectrum", NULL};
    int status = stream_open(&stream, files.items, files.count, true);

    if (status == STATUS_DONE) {
        stream_makes(&stream, makes);
    }
    while (status == STATUS_DONE && stream_next(&stream, &record)) {
        status = take(&rec, &stream, &record);
    }
    if (status == STATUS_DONE) {
        status = stream.status;
    }
    if (status == STATUS_DONE) {
        status = finish(&rec, &stream);
    }
    drop(&rec);
    if (status == STATUS_DONE) {
        status = stream_finish(&stream);
    }
    stream_close(&stream);
    option_list_release(&files);
    return status;
}
