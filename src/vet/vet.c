/* vet.c - the stage `vet`: may these readings carry a correction? */
#include "vet/vet.h"

#include <math.h>
#include <stdio.h>
#include <stdlib.h>
#include <string.h>

#include "base/message.h"
#include "base/stage.h"
#include "base/status.h"
#include "stream/records.h"
#include "stream/stream.h"
#include "vet/across.h"
#include "vet/answer.h"
#include "vet/beat.h"
#include "vet/facts.h"
#include "vet/findings.h"
#include "vet/limits.h"
#include "vet/orders.h"
#include "vet/within.h"

/* A sensor's blocks of one run, as far as the kernels look. */
struct blocks {
    double complex vectors[BEAT_COUNT_MOST];
    double t[BEAT_COUNT_MOST], speed[BEAT_COUNT_MOST];
    size_t count;
};

/* Everything the stage holds. */
struct vet {
    struct stream stream;
    struct line line;
    struct limits limits;
    struct findings findings;
    struct vet_runs runs;
    int open;                    /* position of the run that is being read; -1: none */
    double *nothing;             /* per sensor NaN: no as-found amplitude to refer to */
    struct blocks *blocks;       /* owned, per sensor: of the run that is being read */
    struct curve_record *curves; /* owned, per sensor: likewise, where it is a coast-down */
    long refusals;
    struct finding first; /* the first refusal */
};

static struct vet_run *current(struct vet *v, const char *run)
{
    struct vet_run *last = v->open >= 0 ? &v->runs.items[v->open] : NULL;

    return last && !strcmp(last->name, run) ? last : NULL;
}

static int add_run(struct vet *v, const struct record *record)
{
    struct run_record r = {0};
    struct vet_run *run;
    const char *why = "";

    if (run_parse(&r, &v->stream.job, record->json, &why))
        return record_malformed(record, why);
    v->open = facts_add(&v->runs, v->stream.job.sensor_count);
    run = v->open >= 0 ? &v->runs.items[v->open] : NULL;
    if (run && r.file_count) {
        run->hashes = calloc(r.file_count, sizeof *run->hashes);
        run->hash_count = run->hashes ? r.file_count : 0;
    }
    if (!run || run->hash_count != r.file_count) {
        run_release(&r);
        return message_no_memory();
    }
    memcpy(run->name, r.run, sizeof run->name);
    memcpy(run->condition, r.condition, sizeof run->condition);
    /* Recordings of an audit are not compared with each other, whatever the sheet holds. */
    run->index = v->stream.job.audit || v->stream.job.plane_count == 0
                     ? -1
                     : job_find_run(&v->stream.job, r.run);
    run->hand = r.job_run && r.job_run->hand_count > 0;
    for (size_t i = 0; i < r.file_count; i++)
        memcpy(run->hashes[i], r.files[i].sha256, sizeof run->hashes[i]);
    run_release(&r);
    return STATUS_DONE;
}

static int add_turns(struct vet *v, const struct record *record)
{
    struct turns_record r = {0};
    struct vet_run *run;
    const char *why = "";

    if (turns_parse(&r, &v->stream.job, record->json, &why))
        return record_malformed(record, why);
    run = current(v, r.run);
    if (run)
        run->turns_seen += r.turns;
    for (size_t i = 0; run && i < r.count; i++) {
        struct blocks *b = &v->blocks[r.sensors[i]];
        if (b->count == BEAT_COUNT_MOST || isnan(creal(r.vectors[i])))
            continue;
        b->vectors[b->count] = r.vectors[i];
        b->speed[b->count] = r.speed_rpm;
        b->t[b->count++] = r.t_s;
    }
    turns_release(&r);
    return run ? STATUS_DONE : record_outside(record, r.run);
}

static int add_curve(struct vet *v, const struct record *record)
{
    struct curve_record r = {0};
    const char *why = "";

    if (curve_parse(&r, &v->stream.job, record->json, &why))
        return record_malformed(record, why);
    if (!current(v, r.run)) {
        curve_release(&r);
        return record_outside(record, r.run);
    }
    curve_release(&v->curves[r.sensor]);
    v->curves[r.sensor] = r;
    return STATUS_DONE;
}

static int add_channel(struct vet *v, const struct record *record)
{
    struct channel_record r;
    struct vet_run *run;
    const char *why = "";

    if (channel_parse(&r, &v->stream.job, record->json, &why))
        return record_malformed(record, why);
    run = current(v, r.run);
    if (!run)
        return record_outside(record, r.run);
    if (r.sensor >= 0)
        run->channels[r.sensor] =
            (struct vet_channel){true, r.min, r.max, r.resolution, r.railed, r.samples, r.same_as};
    return STATUS_DONE;
}

static int add_tacho(struct vet *v, const struct record *record)
{
    struct tacho_record r;
    struct vet_run *run;
    const char *why = "";

    if (tacho_parse(&r, record->json, &why))
        return record_malformed(record, why);
    run = current(v, r.run);
    if (!run)
        return record_outside(record, r.run);
    run->has_tacho = true;
    run->reference = r.reference;
    run->pulses = r.pulses;
    run->marks = r.marks;
    run->missed = r.missed;
    run->extra = r.extra;
    run->jitter_deg = r.jitter_deg;
    run->tacho_rpm = r.speed_rpm;
    return STATUS_DONE;
}

static int add_spectrum(struct vet *v, const struct record *record)
{
    const struct job *job = &v->stream.job;
    struct spectrum_record r = {0};
    struct vet_run *run;
    const char *why = "";

    if (spectrum_parse(&r, job, record->json, &why))
        return record_malformed(record, why);
    run = current(v, r.run);
    if (run) {
        int derivatives =
            (int)job->sensors[r.sensor].quantity - (int)job->sensors[r.sensor].show.quantity;
        struct orders o = orders_of(r.orders, r.amplitude, r.count, derivatives);
        struct vet_reading *to = &run->readings[r.sensor];
        to->line_count = 0;
        to->two_x = o.two_x;
        to->half_order = o.half_order;
        to->neighbour = o.neighbour;
        to->neighbour_order = o.neighbour_order;
        for (size_t i = 0; i < r.line_count && to->line_count < ORDERS_LINES_MOST; i++) {
            to->lines[to->line_count][0] = r.lines[2 * i];
            to->lines[to->line_count++][1] = r.lines[2 * i + 1];
        }
    }
    spectrum_release(&r);
    return run ? STATUS_DONE : record_outside(record, r.run);
}

static void take_steady(struct vet_reading *to, const struct steady *steady)
{
    to->amplitude_pct = steady->amplitude_pct;
    to->phase_deg = steady->phase_deg;
    to->drift_pct = steady->drift_pct;
    to->speed_pct = steady->speed_pct;
    to->set_aside = steady->set_aside;
    to->turns = steady->turns;
    to->independent = steady->independent;
    to->wander_pct = steady->wander_pct;
    to->step_pct = steady->step_pct;
    to->step_s = steady->step_s;
    /* A beat that was measured on all blocks; turning as the neighbour does, where that is known.
     */
    to->beat = (struct beat){
        .swing = steady->beat_pct / 100 * to->amplitude,
        .turning = isnan(steady->neighbour_hz) ? NAN : to->speed_rpm / 60 - steady->neighbour_hz,
        .period = steady->beat_s,
        .duration = NAN,
        .step = NAN,
        .rest = NAN};
}

static int add_reading(struct vet *v, const struct record *record)
{
    struct reading_record r;
    struct vet_reading *to;
    const char *why = "";
    int at;

    if (reading_parse(&r, &v->stream.job, record->json, &why))
        return record_malformed(record, why);
    if (!current(v, r.run))
        return record_outside(record, r.run);
    at = facts_at_condition(&v->runs, v->open, r.condition, v->stream.job.sensor_count);
    if (at < 0)
        return message_no_memory();
    to = &v->runs.items[at].readings[r.sensor];
    if (to->present)
        return record_malformed(record, "a second reading of a sensor in one run");
    to->present = to->use = true;
    to->has_phase = r.has_phase;
    to->vector = r.vector;
    to->amplitude = r.amplitude;
    memcpy(to->cov, r.cov, sizeof to->cov);
    to->blocks = r.blocks;
    to->speed_rpm = r.speed_rpm;
    take_steady(to, &r.steady);
    to->overall_rms = r.overall.rms;
    to->overall_quantity = r.overall.quantity;
    return STATUS_DONE;
}

/* An unreadable recording, as `read` says. */
static int add_finding(struct vet *v, const struct record *record)
{
    struct finding_record r;
    struct vet_run *run;
    const char *why = "";

    if (finding_parse(&r, &v->stream.job, record->json, &why))
        return record_malformed(record, why);
    run = current(v, r.run);
    if (run && r.verdict == VERDICT_REFUSE && !strcmp(r.check, "readable"))
        run->unreadable = true;
    return STATUS_DONE;
}

/* Notes what a refusal was for, on the readings that it judges. */
static void note(struct vet *v, const struct finding *f)
{
    if (v->refusals++ == 0)
        v->first = *f;
    for (size_t k = f->run < 0 ? v->runs.count : (size_t)f->run; k < v->runs.count; k++) {
        struct vet_run *run = &v->runs.items[k];
        if ((int)k != f->run && run->parent != f->run)
            continue;
        for (size_t i = 0; i < v->stream.job.sensor_count; i++)
            if ((f->sensor < 0 || f->sensor == (int)i || run->refused) &&
                run->readings[i].reason < 0)
                run->readings[i].reason = (int)f->check;
    }
}

/* Writes the findings gathered so far and forgets them. */
static int write_findings(struct vet *v)
{
    static const enum verdict verdicts[] = {VERDICT_OK, VERDICT_CAUTION, VERDICT_REFUSE};
    int status = v->findings.failed ? message_no_memory() : STATUS_DONE;

    for (size_t i = 0; status == STATUS_DONE && i < v->findings.count; i++) {
        const struct finding *f = &v->findings.items[i];
        const struct check_row *row = &v->limits.rows[f->check];
        struct finding_record r = {.stage = "vet",
                                   .verdict = verdicts[f->ruling],
                                   .sensor = f->sensor,
                                   .value = f->value,
                                   .limit = f->limit};
        strncpy(r.check, row->name, sizeof r.check - 1);
        strncpy(r.unit, f->unit, sizeof r.unit - 1);
        strncpy(r.basis, row->basis, sizeof r.basis - 1);
        if (f->run >= 0 && v->runs.items[f->run].parent >= 0) /* say which speed is meant */
            snprintf(r.text, sizeof r.text, "%s: %.*s", v->runs.items[f->run].condition,
                     (int)(sizeof r.text - NAME_ROOM - 2), f->text);
        else
            memcpy(r.text, f->text, sizeof r.text);
        if (f->run >= 0)
            memcpy(r.run, v->runs.items[f->run].name, sizeof r.run);
        if (f->ruling == RULING_REFUSE)
            note(v, f);
        finding_print(&r, &v->stream.job, &v->line);
        status = stream_write(&v->stream, &v->line);
    }
    findings_clear(&v->findings);
    return status;
}

/* What blocks and curves tell, once all of the run has come. */
static void judge_blocks(struct vet *v)
{
    struct vet_run *run = &v->runs.items[v->open];
    const struct job *job = &v->stream.job;

    for (size_t i = 0; i < job->sensor_count; i++) {
        struct blocks *b = &v->blocks[i];
        struct vet_reading *r = &run->readings[i];
        r->beat = beat_join(&r->beat, beat_of(b->vectors, b->t, b->count));
        r->resonance = resonance_of(b->vectors, b->speed, b->t, b->count);
        b->count = 0;
        for (size_t k = (size_t)v->open + 1; k < v->runs.count; k++) {
            struct vet_reading *at = &v->runs.items[k].readings[i];
            const struct curve_record *c = &v->curves[i];
            if (at->present) /* what was made of the curve */
                at->resonance = resonance_along(c->vectors, c->speed_rpm, c->count, at->speed_rpm);
        }
        curve_release(&v->curves[i]);
    }
}

/* Ends the run that is being read: its own findings stand behind its last record. */
static int finish_run(struct vet *v)
{
    struct vet_run *run = v->open >= 0 ? &v->runs.items[v->open] : NULL;

    if (!run)
        return STATUS_DONE;
    judge_blocks(v);
    within_run(run, v->open, &v->stream.job, &v->findings);
    facts_hand_down(&v->runs, v->open, v->stream.job.sensor_count);
    if (across_stands_alone(run, &v->stream.job))
        within_vectors(run, v->open, v->nothing, &v->stream.job, &v->findings);
    v->open = -1;
    return write_findings(v);
}

static int take(struct vet *v, const struct record *record)
{
    const char *kind = record->kind;
    int status = STATUS_DONE;

    if (!strcmp(kind, "run")) {
        status = finish_run(v);
        if (status == STATUS_DONE)
            status = add_run(v, record);
    } else if (!strcmp(kind, "turns")) {
        status = add_turns(v, record);
    } else if (!strcmp(kind, "curve")) {
        status = add_curve(v, record);
    } else if (!strcmp(kind, "channel")) {
        status = add_channel(v, record);
    } else if (!strcmp(kind, "tacho")) {
        status = add_tacho(v, record);
    } else if (!strcmp(kind, "spectrum")) {
        status = add_spectrum(v, record);
    } else if (!strcmp(kind, "reading")) {
        status = add_reading(v, record);
    } else if (!strcmp(kind, "finding")) {
        status = add_finding(v, record);
    }
    return status == STATUS_DONE ? stream_pass(&v->stream, record) : status;
}

static int judge_vectors(struct vet *v, const size_t *order)
{
    const struct job *job = &v->stream.job;
    double *as_found = malloc((job->sensor_count + 1) * sizeof *as_found);

    if (!as_found)
        return message_no_memory();
    for (size_t k = 0; k < v->runs.count; k++) {
        struct vet_run *run = &v->runs.items[order[k]];
        if (across_stands_alone(run, &v->stream.job))
            continue;
        for (size_t i = 0; i < job->sensor_count; i++)
            as_found[i] = across_as_found(&v->runs, order, job, run->condition, i);
        within_vectors(run, (int)order[k], as_found, job, &v->findings);
    }
    free(as_found);
    return STATUS_DONE;
}

static int write_vetted(struct vet *v, const size_t *order)
{
    int status = STATUS_DONE;

    for (size_t k = 0; k < v->runs.count; k++) {
        const struct vet_run *run = &v->runs.items[order[k]];
        for (size_t i = 0; status == STATUS_DONE && i < v->stream.job.sensor_count; i++) {
            const struct vet_reading *from = &run->readings[i];
            struct vetted_record r = {.sensor = (int)i, .use = from->use};
            if (!from->present)
                continue;
            memcpy(r.run, run->name, sizeof r.run);
            if (run->parent >= 0)
                memcpy(r.condition, run->condition, sizeof r.condition);
            memcpy(r.widen, from->widen, sizeof r.widen);
            r.by_speed = from->by_speed;
            vetted_print(&r, &v->stream.job, &v->line);
            status = stream_write(&v->stream, &v->line);
        }
    }
    return status;
}

/* The one line where the job goes on although something was refused. */
static void say_goes_on(const struct vet *v)
{
    const struct finding *f = &v->first;
    const struct vet_run *run = f->run >= 0 ? &v->runs.items[f->run] : NULL;

    if (v->refusals == 0 || !run || run->index < 0)
        return;
    message("goes on without what it refused: '%s' (%s%s%s%s, refusal 1 of %ld)", run->name,
            f->sensor >= 0 ? "sensor '" : "",
            f->sensor >= 0 ? v->stream.job.sensors[f->sensor].name : "",
            f->sensor >= 0 ? "': " : "", v->limits.rows[f->check].name, v->refusals);
}

/* The one line about what was lost. */
static int say_lost(const struct vet *v, const struct vet_run *run, size_t sensor)
{
    int reason = run->readings[sensor].reason;
    const struct finding *f = &v->first;

    if (v->refusals > 0 && reason >= 0 && f->run >= 0 && &v->runs.items[f->run] == run &&
        (int)f->check == reason) { /* the finding itself says it best */
        message("refused, %s: '%s' (%s)", f->text, run->name, v->limits.rows[reason].name);
        return STATUS_REFUSED;
    }
    message("readings are not fit to balance on: '%s' (sensor '%s': %s)", run->name,
            v->stream.job.sensors[sensor].name,
            reason >= 0                     ? v->limits.rows[reason].name
            : run->readings[sensor].present ? "refused"
                                            : "no reading");
    return STATUS_REFUSED;
}

/* STATUS_REFUSED where what is left cannot answer. An audit has nothing to answer. */
static int conclude(const struct vet *v, const size_t *order)
{
    size_t run_lost = 0, sensor_lost = 0;

    switch (answer_possible(&v->runs, order, &v->stream.job, &run_lost, &sensor_lost)) {
    case 1:
        say_goes_on(v);
        return STATUS_DONE;
    case 0:
        return say_lost(v, &v->runs.items[run_lost], sensor_lost);
    default:
        return message_no_memory();
    }
}

/* What rests on several runs, in front of `end`; *verdict receives the exit code it asks for. */
static int finish_all(struct vet *v, int *verdict)
{
    size_t *order;
    int status = finish_run(v);

    if (status != STATUS_DONE)
        return status;
    order = across_order(&v->runs, &v->stream.job);
    if (!order)
        return message_no_memory();
    status = judge_vectors(v, order);
    if (status == STATUS_DONE && across_runs(&v->runs, order, &v->stream.job, &v->findings))
        status = message_no_memory();
    if (status == STATUS_DONE)
        status = write_findings(v);
    if (status == STATUS_DONE)
        status = write_vetted(v, order);
    if (status == STATUS_DONE)
        status = stream_finish(&v->stream);
    if (status == STATUS_DONE)
        *verdict = conclude(v, order);
    free(order);
    return status;
}

static int begin(struct vet *v, const struct option_list *files)
{
    static const char *const makes[] = {"vetted", NULL};
    int status = stream_open(&v->stream, files->items, files->count, true);

    if (status != STATUS_DONE)
        return status;
    stream_makes(&v->stream, makes);
    limits_init(&v->limits, &v->stream.job);
    findings_init(&v->findings, &v->limits);
    v->nothing = malloc((v->stream.job.sensor_count + 1) * sizeof *v->nothing);
    v->blocks = calloc(v->stream.job.sensor_count + 1, sizeof *v->blocks);
    v->curves = calloc(v->stream.job.sensor_count + 1, sizeof *v->curves);
    if (!v->nothing || !v->blocks || !v->curves)
        return message_no_memory();
    for (size_t i = 0; i < v->stream.job.sensor_count; i++)
        v->nothing[i] = NAN;
    return STATUS_DONE;
}

static void release(struct vet *v)
{
    for (size_t i = 0; v->curves && i < v->stream.job.sensor_count; i++)
        curve_release(&v->curves[i]);
    free(v->curves);
    facts_release(&v->runs);
    free(v->blocks);
    free(v->nothing);
    findings_release(&v->findings);
    line_release(&v->line);
    stream_close(&v->stream);
}

static int loop(const struct option_list *files)
{
    struct vet v = {.line = LINE_INIT, .open = -1};
    struct record record;
    int verdict = STATUS_DONE;
    int status = begin(&v, files);

    while (status == STATUS_DONE && stream_next_tracked(&v.stream, &record))
        status = take(&v, &record);
    if (status == STATUS_DONE)
        status = v.stream.status;
    if (status == STATUS_DONE)
        status = finish_all(&v, &verdict);
    release(&v);
    return status == STATUS_DONE ? verdict : status;
}

int stage_vet(int argc, char **argv)
{
    static const struct option options[] = {{0}};
    static const struct usage usage = {
        "vet",
        "[FILE...]",
        "findings: may these readings carry a correction?",
        options,
        0,
        (size_t)-1,
        "Reads records from the files, one after another, or from standard input, and adds a "
        "finding\n"
        "for every check and its ruling on every reading. Exit code 4: a refusal leaves too "
        "little\n"
        "to answer the job. The limits of the checks stand in the sheet's section [limits].\n"};

    return stage_run(&usage, argc, argv, loop);
}
