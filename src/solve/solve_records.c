#include "solve/solve_records.h"

#include <math.h>
#include <stdio.h>
#include <stdlib.h>
#include <string.h>

#include "base/angle.h"
#include "base/message.h"
#include "base/status.h"
#include "solve/drill.h"
#include "solve/notes.h"
#include "solve/oppose.h"
#include "solve/parts.h"
#include "solve/sits.h"
#include "solve/trial.h"
#include "solve/zones.h"
#include "stream/outcomes.h"

int solve_records_open(struct solve_records *s, const struct option_list *files)
{
    static const char *const makes[] = {"response", "correction", "placement", "forecast",
                                        "residual", "next",       NULL};
    *s = (struct solve_records){.line = LINE_INIT};
    int status = stream_open(&s->stream, files->items, files->count, true);
    if (status != STATUS_DONE)
        return status;
    stream_makes(&s->stream, makes);
    s->slopes = calloc(s->stream.job.run_count * s->stream.job.sensor_count + 1, sizeof *s->slopes);
    return s->slopes ? STATUS_DONE : message_no_memory();
}

void solve_records_release(struct solve_records *s)
{
    line_release(&s->line);
    free(s->ruled);
    free(s->slopes);
    free(s->causes);
    free(s->matches);
    free(s->readings);
    stream_close(&s->stream);
}

/* ---- reading ---- */

/* Twice the room in an array; false: no memory. */
static bool grow(void **items, size_t *room, size_t size)
{
    size_t wanted = *room ? 2 * *room : 64;
    void *more = realloc(*items, wanted * size);
    if (!more)
        return false;
    *items = more;
    *room = wanted;
    return true;
}

static int take_reading(struct solve_records *s, const struct record *record)
{
    struct reading_record r;
    const char *why;
    const struct job *job = &s->stream.job;
    if (reading_parse(&r, job, record->json, &why) != 0)
        return record_malformed(record, why);
    int run = job_find_run(job, r.run);
    if (run < 0 || r.sensor < 0) /* an audited recording: nothing to balance */
        return STATUS_DONE;
    if (s->count == s->room && !grow((void **)&s->readings, &s->room, sizeof *s->readings))
        return message_no_memory();
    struct model_reading *own = &s->readings[s->count++];
    *own = (struct model_reading){.run = (size_t)run,
                                  .sensor = (size_t)r.sensor,
                                  .speed_rpm = r.speed_rpm,
                                  .phase = r.has_phase,
                                  .vector = r.has_phase ? r.vector : 0,
                                  .amplitude = r.amplitude,
                                  .overall = r.overall.rms,
                                  .overall_quantity = r.overall.quantity};
    memcpy(own->condition, r.condition, sizeof own->condition);
    memcpy(own->cov, r.cov, sizeof own->cov);
    return STATUS_DONE;
}

static int take_vetted(struct solve_records *s, const struct record *record)
{
    struct vetted_record r;
    const char *why;
    const struct job *job = &s->stream.job;
    if (vetted_parse(&r, job, record->json, &why) != 0)
        return record_malformed(record, why);
    if (job_find_run(job, r.run) < 0 || r.sensor < 0)
        return STATUS_DONE;
    if (s->ruled_count == s->ruled_room &&
        !grow((void **)&s->ruled, &s->ruled_room, sizeof *s->ruled))
        return message_no_memory();
    s->ruled[s->ruled_count++] = r;
    return STATUS_DONE;
}

/* Blocks of a run tell how its vectors follow the speed. */
static int take_turns(struct solve_records *s, const struct record *record)
{
    struct turns_record r;
    const char *why;
    const struct job *job = &s->stream.job;
    if (turns_parse(&r, job, record->json, &why) != 0)
        return record_malformed(record, why);
    int run = job_find_run(job, r.run);
    for (size_t i = 0; run >= 0 && i < r.count; i++)
        if (r.sensors[i] >= 0)
            slope_add(&s->slopes[(size_t)run * job->sensor_count + (size_t)r.sensors[i]],
                      r.speed_rpm, r.vectors[i]);
    turns_release(&r);
    return STATUS_DONE;
}

/* True where a finding can be a cause of what is to be done; fills `cause`. */
static bool cause_of(const struct job *job, const struct finding_record *f,
                     struct remedy_cause *cause)
{
    bool refused = f->verdict == VERDICT_REFUSE;
    *cause = (struct remedy_cause){.run = f->run[0] ? job_find_run(job, f->run) : -1,
                                   .sensor = f->sensor,
                                   .refused = refused,
                                   .value = f->value,
                                   .limit = f->limit};
    memcpy(cause->check, f->check, sizeof cause->check);
    memcpy(cause->text, f->text, sizeof cause->text);
    bool told = remedy_is_diagnosis(f->check) || !strcmp(f->check, "two-x");
    return cause->run >= 0 && (refused || (told && f->verdict == VERDICT_CAUTION));
}

static int take_finding(struct solve_records *s, const struct finding_record *f)
{
    struct remedy_cause cause;
    if (!cause_of(&s->stream.job, f, &cause))
        return STATUS_DONE;
    if (s->cause_count == s->cause_room &&
        !grow((void **)&s->causes, &s->cause_room, sizeof *s->causes))
        return message_no_memory();
    s->causes[s->cause_count++] = cause;
    return STATUS_DONE;
}

static int read_finding(struct solve_records *s, const struct record *record)
{
    struct finding_record r;
    const char *why;
    if (finding_parse(&r, &s->stream.job, record->json, &why) != 0)
        return record_malformed(record, why);
    return take_finding(s, &r);
}

static int read_all(struct solve_records *s)
{
    struct record record;
    int status = STATUS_DONE;
    while (status == STATUS_DONE && stream_next_tracked(&s->stream, &record)) {
        if (!strcmp(record.kind, "reading"))
            status = take_reading(s, &record);
        else if (!strcmp(record.kind, "vetted"))
            status = take_vetted(s, &record);
        else if (!strcmp(record.kind, "turns"))
            status = take_turns(s, &record);
        else if (!strcmp(record.kind, "finding"))
            status = read_finding(s, &record);
        if (status == STATUS_DONE)
            status = stream_pass(&s->stream, &record);
    }
    return status == STATUS_DONE ? s->stream.status : status;
}

/* The ruling on a reading; a coast-down has one for each of its conditions. NULL: none. */
static const struct vetted_record *ruling_on(const struct solve_records *s,
                                             const struct model_reading *r)
{
    const char *run = s->stream.job.runs[r->run].name;
    for (size_t i = 0; i < s->ruled_count; i++) {
        const struct vetted_record *v = &s->ruled[i];
        if ((size_t)v->sensor == r->sensor && !strcmp(v->run, run) &&
            (!v->condition[0] || !strcmp(v->condition, r->condition)))
            return v;
    }
    return NULL;
}

/* Joins the rulings to the readings. */
static int join(struct solve_records *s)
{
    const struct job *job = &s->stream.job;
    for (size_t i = 0; i < s->count; i++) {
        struct model_reading *r = &s->readings[i];
        const struct vetted_record *ruled = ruling_on(s, r);
        if (!ruled) {
            message("no ruling on a reading, is `vet` missing in front: '%s' (sensor '%s')",
                    job->runs[r->run].name, job->sensors[r->sensor].name);
            return STATUS_USAGE;
        }
        r->use = ruled->use;
        r->by_speed = ruled->by_speed;
        for (int k = 0; k < 3; k++)
            r->cov[k] += ruled->widen[k];
    }
    return STATUS_DONE;
}

int solve_records_read(struct solve_records *s)
{
    int status = read_all(s);
    return status == STATUS_DONE ? join(s) : status;
}

int solve_records_bring(struct solve_records *s)
{
    const struct job *job = &s->stream.job;
    for (size_t i = 0; i < s->count; i++) {
        const struct model_reading *r = &s->readings[i];
        bool first = true; /* once a sensor and condition */
        for (size_t k = 0; k < i && first; k++)
            first = s->readings[k].sensor != r->sensor ||
                    strcmp(s->readings[k].condition, r->condition) != 0;
        if (s->match_count == s->match_room &&
            !grow((void **)&s->matches, &s->match_room, sizeof *s->matches))
            return message_no_memory();
        if (first && slope_bring(job, s->readings, s->count, s->slopes, r->sensor, r->condition,
                                 &s->matches[s->match_count]))
            s->match_count++;
    }
    return STATUS_DONE;
}

/* ---- writing ---- */

static int put(struct solve_records *s)
{
    return stream_write(&s->stream, &s->line);
}

int solve_records_responses(struct solve_records *s, const struct model *m)
{
    int status = STATUS_DONE;
    for (size_t i = 0; i < m->row_count && !m->amplitudes;
         i++) { /* their phase would be no phase */
        const struct model_row *row = &m->rows[i];
        for (size_t p = 0; p < m->job->plane_count && status == STATUS_DONE; p++) {
            if (row->count == 0 || row->torn || !row->posterior.known[p + 1])
                continue;
            struct response_record r = {.sensor = (int)row->sensor,
                                        .plane = (int)p,
                                        .vector = row->posterior.mean[p + 1],
                                        .speed_rpm = row->speed_rpm};
            memcpy(r.condition, m->conditions[row->condition], sizeof r.condition);
            posterior_marginal(&row->posterior, p + 1, r.cov);
            response_print(&r, m->job, &s->line);
            status = put(s);
        }
    }
    return status;
}

int solve_records_finding(struct solve_records *s, const struct advice_finding *f)
{
    static const enum verdict verdicts[] = {VERDICT_OK, VERDICT_CAUTION, VERDICT_REFUSE};
    s->said = s->said || (f->verdict == ADVICE_REFUSE && advice_is_final(f));
    struct finding_record r = {.stage = "solve",
                               .verdict = verdicts[f->verdict],
                               .sensor = f->sensor,
                               .value = isfinite(f->value) ? f->value : NAN,
                               .limit = f->limit};
    snprintf(r.check, sizeof r.check, "%s", f->check);
    snprintf(r.unit, sizeof r.unit, "%s", f->unit);
    snprintf(r.basis, sizeof r.basis, "%s", f->basis);
    snprintf(r.text, sizeof r.text, "%s", f->text);
    if (f->run >= 0)
        snprintf(r.run, sizeof r.run, "%s", s->stream.job.runs[f->run].name);
    finding_print(&r, &s->stream.job, &s->line);
    int status = take_finding(s, &r);
    return status == STATUS_DONE ? put(s) : status;
}

int solve_records_dropped(struct solve_records *s, const struct advice_finding *f)
{
    const struct job *job = &s->stream.job;
    if (s->dropped++ == 0)
        snprintf(s->first, sizeof s->first, "'%s' (sensor '%s': %s", job->runs[f->run].name,
                 job->sensors[f->sensor].name, f->check);
    return solve_records_finding(s, f);
}

int solve_records_compared(struct solve_records *s, const struct model *m,
                           const struct model_row *row, int run, const struct lookback *look)
{
    struct compared_record r = {.run = run,
                                .sensor = (int)row->sensor,
                                .predicted = look->predicted,
                                .measured = look->measured,
                                .se = look->se};
    memcpy(r.condition, m->conditions[row->condition], sizeof r.condition);
    compared_print(&r, m->job, &s->line);
    return put(s);
}

static const char *relative_to(const struct answer *a)
{
    return a->base >= 0 ? a->model->job->runs[a->base].name : "as found";
}

static double signed_mass(const struct job_plane *plane, double mass)
{
    return plane->work == WORK_REMOVE ? -mass : mass;
}

int solve_records_corrections(struct solve_records *s, const struct answer *a)
{
    int status = STATUS_DONE;
    size_t n = 2 * a->planes;
    for (size_t p = 0; p < a->planes && status == STATUS_DONE; p++) {
        const double *e = a->ellipse + 2 * p * n + 2 * p;
        const struct job_plane *plane = &a->model->job->planes[p];
        double sign = signed_mass(plane, 1); /* what is removed is negative, at its own place */
        struct correction_record r = {.plane = (int)p,
                                      .mass = signed_mass(plane, cabs(a->weights[p])),
                                      .angle_deg = angle_of(sign * a->weights[p]),
                                      .least_squares = {signed_mass(plane, cabs(a->classical[p])),
                                                        angle_of(sign * a->classical[p])},
                                      .ellipse = {e[0], e[1], e[n + 1]}};
        snprintf(r.relative_to, sizeof r.relative_to, "%s", relative_to(a));
        correction_print(&r, &s->stream.job, &s->line);
        status = put(s);
    }
    return status;
}

/* The number of the k-th free position of a plane; 0: any angle. */
static int position_number(const struct job_plane *plane, int k)
{
    for (size_t i = 0; k >= 0 && i < plane->position_count; i++)
        if (!plane->positions[i].taken && k-- == 0)
            return plane->positions[i].number;
    return 0;
}

int solve_records_placements(struct solve_records *s, const struct answer *a)
{
    int status = STATUS_DONE;
    const struct job *job = &s->stream.job;
    for (size_t i = 0; i < a->placement.best.count && status == STATUS_DONE; i++) {
        const struct place_item *item = &a->placement.best.items[i];
        const struct job_plane *plane = &job->planes[item->plane];
        struct placement_record r = {.plane = (int)item->plane,
                                     .position = position_number(plane, item->position),
                                     .angle_deg = item->angle_deg,
                                     .mass = signed_mass(plane, item->mass),
                                     .piece_count = item->piece_count};
        if (plane->work == WORK_REMOVE && plane->hole_m > 0)
            r.piece_count = 1; /* one hole, as deep as all of it needs */
        for (size_t k = 0; k < r.piece_count; k++) {
            double piece = r.piece_count == 1 ? item->mass : item->pieces[k];
            r.pieces[k] = signed_mass(plane, piece);
            r.depths_m[k] = drill_depth(plane->hole_m, plane->density, piece);
        }
        double sits = sits_equivalent(job, item->plane, item->angle_deg);
        r.force_n = trial_force(item->mass, plane->radius_m, job->service_rpm);
        r.sits = sits != 0;
        r.total_mass = r.mass + sits_mass(job, item->plane, item->angle_deg);
        r.total_force_n = trial_force(fabs(r.mass + sits), plane->radius_m, job->service_rpm);
        snprintf(r.relative_to, sizeof r.relative_to, "%s", relative_to(a));
        placement_print(&r, job, &s->line);
        status = put(s);
    }
    return status;
}

static int write_zone(struct solve_records *s, const struct answer *a,
                      const struct answer_forecast *f)
{
    struct advice_finding finding;
    const struct answer_zone *z = &f->zone;
    if (!notes_zone(a, f, &finding))
        return STATUS_DONE;
    struct zone_record r = {.sensor = (int)f->row->sensor,
                            .quantity = z->quantity,
                            .before = z->before,
                            .after = z->after,
                            .zone_before = zones_of(z->before, z->limits),
                            .zone_after = zones_of(z->after, z->limits),
                            .overall = z->overall,
                            .basis = ZONES_BASIS};
    memcpy(r.condition, a->model->conditions[f->row->condition], sizeof r.condition);
    memcpy(r.limits, z->limits, sizeof r.limits);
    zone_print(&r, &s->stream.job, &s->line);
    int status = put(s);
    return status == STATUS_DONE ? solve_records_finding(s, &finding) : status;
}

int solve_records_parts(struct solve_records *s, const struct answer *a)
{
    const struct job_plane *planes = s->stream.job.planes;
    if (a->planes != 2)
        return STATUS_DONE;
    double radius[2] = {planes[0].radius_m, planes[1].radius_m};
    struct parts_record r = {
        .static_alone = a->static_alone, .left_alone = a->left_alone, .left = a->left};
    parts_split(a->full, radius, &r.static_part, &r.couple_part);
    parts_print(&r, &s->stream.job, &s->line);
    return put(s);
}

int solve_records_outlook(struct solve_records *s, const struct answer *a)
{
    int status = STATUS_DONE;
    for (size_t i = 0; i < a->forecast_count && status == STATUS_DONE; i++) {
        const struct answer_forecast *f = &a->forecasts[i];
        struct forecast_record r = {.sensor = (int)f->row->sensor,
                                    .before = f->before,
                                    .after = f->after,
                                    .after_95 = {f->range[0], f->range[1]},
                                    .target = f->row->target,
                                    .chance = f->chance,
                                    .speed_rpm = f->row->speed_rpm};
        memcpy(r.condition, a->model->conditions[f->row->condition], sizeof r.condition);
        forecast_print(&r, &s->stream.job, &s->line);
        status = put(s);
        if (status == STATUS_DONE)
            status = write_zone(s, a, f);
    }
    for (size_t p = 0; p < a->planes && a->has_residual && status == STATUS_DONE; p++) {
        const struct answer_residual *from = &a->residuals[p];
        struct residual_record r = {(int)p,         from->before,      from->after,
                                    from->after_95, from->permissible, ""};
        snprintf(r.basis, sizeof r.basis, "%s", a->basis);
        residual_print(&r, &s->stream.job, &s->line);
        status = put(s);
    }
    return status;
}

static void line_trials(struct line *line, const struct job *job)
{
    struct advice_trial *trials = calloc(job->plane_count + 1, sizeof *trials);
    if (!trials) {
        line->text.failed = 1;
        return;
    }
    advice_trials(job, trials);
    line_open(line, "trials", '[');
    for (size_t p = 0; p < job->plane_count; p++) {
        line_open(line, NULL, '{');
        line_text(line, "plane", job->planes[p].name);
        line_real(line, "mass", trials[p].mass);
        line_real(line, "wanted_mass", trials[p].wanted);
        line_real(line, "force_n", trials[p].force);
        if (trials[p].sensor >= 0) {
            line_text(line, "sensor", job->sensors[trials[p].sensor].name);
            line_real(line, "effect", trials[p].effect);
        }
        line_close(line, '}');
    }
    line_close(line, ']');
    free(trials);
}

static void line_other(struct line *line, const struct answer *a, const struct place_choice *choice,
                       bool unopposed)
{
    const struct job *job = a->model->job;
    struct outcome_weight items[64];
    size_t count = choice->count < 64 ? choice->count : 64;
    for (size_t i = 0; i < count; i++) {
        const struct place_item *item = &choice->items[i];
        const struct job_plane *plane = &job->planes[item->plane];
        items[i] = (struct outcome_weight){item->plane, position_number(plane, item->position),
                                           signed_mass(plane, item->mass), item->angle_deg};
    }
    line_open(line, NULL, '{');
    line_real(line, "of_nothing", sqrt(fmax(0, choice->objective) / a->placement.nothing));
    if (unopposed)
        line_boolean(line, "unopposed", true);
    outcomes_weights(line, "items", job, items, count);
    line_close(line, '}');
}

/* First, what does without pieces that work against each other where the
 * placement has such. */
static void line_others(struct line *line, const struct answer *a)
{
    const struct place_result *place = &a->placement;
    line_real(line, "gap", place->gap);
    line_boolean(line, "fewest_proven", !place->cut);
    line_real(line, "of_nothing", sqrt(fmax(0, place->best.objective) / place->nothing));
    line_open(line, "others", '[');
    if (a->has_unopposed)
        line_other(line, a, &a->unopposed.best, true);
    for (int k = 0; k < 2 && !isnan(place->next[k].objective); k++)
        if (!a->has_unopposed || !oppose_same(&place->next[k], &a->unopposed.best))
            line_other(line, a, &place->next[k], false);
    line_close(line, ']');
}

/* Planes that are added to, in w; the others are set to zero: holes do not become one. */
static bool mergeable(const struct job *job, double complex *w)
{
    bool any = false;
    for (size_t p = 0; p < job->plane_count; p++) {
        if (job->planes[p].work == WORK_REMOVE)
            w[p] = 0;
        any = any || job->planes[p].work != WORK_REMOVE;
    }
    return any;
}

/* Weights that are not zero, as they stand. */
static void line_complex(struct line *line, const char *key, const struct job *job,
                         const double complex *w)
{
    struct outcome_weight items[64];
    size_t count = 0;
    for (size_t p = 0; p < job->plane_count && count < 64; p++)
        if (w[p] != 0) {
            double sign = signed_mass(&job->planes[p], 1);
            items[count++] =
                (struct outcome_weight){p, 0, sign * cabs(w[p]), angle_of(sign * w[p])};
        }
    outcomes_weights(line, key, job, items, count);
}

/* The same answer with what is on taken off or left; and one weight for all that is then on a plane
 * that is added to. */
static void line_alternatives(struct line *line, const struct answer *a)
{
    const struct job *job = a->model->job;
    int run = a->base >= 0 ? a->base : a->model->last_run;
    if (run < 0 || job_run_is_bare(job, (size_t)run))
        return;
    double complex *w = calloc(a->planes + 1, sizeof *w);
    if (!w) {
        line->text.failed = 1;
        return;
    }
    bool left = a->base < 0; /* the other answer leaves them on */
    for (size_t p = 0; p < a->planes; p++)
        w[p] = a->weights[p] + a->mounted[p] - (left ? job_run_weight(job, (size_t)run, p) : 0);
    line_open(line, "instead", '{');
    line_text(line, "relative_to", left ? job->runs[run].name : "as found");
    line_complex(line, "weights", job, w);
    line_close(line, '}');
    for (size_t p = 0; p < a->planes; p++)
        w[p] = a->mounted[p] + a->placed_weights[p];
    if (!left && mergeable(job, w))
        line_complex(line, "merged", job, w);
    free(w);
}

/* The closing record, and the line on standard error where there is no answer. */
int solve_records_next(struct solve_records *s, const struct advice_next *next,
                       const struct answer *a, int status)
{
    struct next_record r;
    if (status == STATUS_UNSOLVED && !s->said) {
        struct advice_finding f;
        advice_no_correction(next, &f);
        int written = solve_records_finding(s, &f);
        if (written != STATUS_DONE)
            return written;
    }
    snprintf(r.step, sizeof r.step, "%s", next->step);
    snprintf(r.text, sizeof r.text, "%s", next->text);
    next_begin(&r, &s->line);
    if (!strcmp(next->step, "trial"))
        line_trials(&s->line, &s->stream.job);
    if (a && a->placed && a->placement.best.count > 0)
        line_others(&s->line, a);
    if (a)
        line_alternatives(&s->line, a);
    line_end(&s->line);
    if (status != STATUS_DONE)
        message("%s", next->reason);
    s->status = status;
    return put(s);
}
