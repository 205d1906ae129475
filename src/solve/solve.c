/* solve.c - the stage `solve`: readings become responses, weights, a placement and the next step.
 */
#include "solve/solve.h"

#include <math.h>
#include <stdio.h>
#include <stdlib.h>
#include <string.h>

#include "base/angle.h"
#include "base/message.h"
#include "base/options.h"
#include "base/status.h"
#include "solve/advice.h"
#include "solve/answer.h"
#include "solve/model.h"
#include "solve/outlook.h"
#include "solve/ruling.h"
#include "solve/trial.h"
#include "stream/records.h"
#include "stream/stream.h"

/* vet's ruling on the readings of one run and sensor. */
struct ruled {
    bool given, use;
    double widen[3];
};

struct solve {
    struct stream stream;
    struct model_reading *readings; /* owned */
    size_t count, room;
    struct ruled *ruled; /* owned, runs x sensors */
    struct line line;
    bool said;  /* a refusal of ours says already why there is no correction */
    int status; /* the exit code that the answer calls for */
};

/* ---- reading ---- */

static int take_reading(struct solve *s, const struct record *record)
{
    struct reading_record r;
    const char *why;
    const struct job *job = &s->stream.job;
    if (reading_parse(&r, job, record->json, &why) != 0) {
        message("malformed record: %s (reading)", why);
        return STATUS_USAGE;
    }
    int run = job_find_run(job, r.run);
    if (run < 0 || r.sensor < 0) /* an audited recording: nothing to balance */
        return STATUS_DONE;
    if (s->count == s->room) {
        size_t room = s->room ? 2 * s->room : 64;
        struct model_reading *more = realloc(s->readings, room * sizeof *more);
        if (!more)
            return message_no_memory();
        s->readings = more;
        s->room = room;
    }
    struct model_reading *own = &s->readings[s->count++];
    *own = (struct model_reading){.run = (size_t)run,
                                  .sensor = (size_t)r.sensor,
                                  .speed_rpm = r.speed_rpm,
                                  .phase = r.has_phase,
                                  .vector = r.has_phase ? r.vector : 0,
                                  .amplitude = r.amplitude};
    memcpy(own->condition, r.condition, sizeof own->condition);
    memcpy(own->cov, r.cov, sizeof own->cov);
    return STATUS_DONE;
}

static int take_vetted(struct solve *s, const struct record *record)
{
    struct vetted_record r;
    const char *why;
    const struct job *job = &s->stream.job;
    if (vetted_parse(&r, job, record->json, &why) != 0) {
        message("malformed record: %s (vetted)", why);
        return STATUS_USAGE;
    }
    int run = job_find_run(job, r.run);
    if (run < 0 || r.sensor < 0)
        return STATUS_DONE;
    struct ruled *ruled = &s->ruled[(size_t)run * job->sensor_count + (size_t)r.sensor];
    ruled->given = true;
    ruled->use = r.use;
    memcpy(ruled->widen, r.widen, sizeof ruled->widen);
    return STATUS_DONE;
}

static int read_all(struct solve *s)
{
    struct record record;
    int status = STATUS_DONE;
    while (status == STATUS_DONE && stream_next_tracked(&s->stream, &record)) {
        if (!strcmp(record.kind, "reading"))
            status = take_reading(s, &record);
        else if (!strcmp(record.kind, "vetted"))
            status = take_vetted(s, &record);
        if (status == STATUS_DONE)
            status = stream_pass(&s->stream, &record);
    }
    return status == STATUS_DONE ? s->stream.status : status;
}

/* Joins the rulings to the readings. */
static int join(struct solve *s)
{
    const struct job *job = &s->stream.job;
    for (size_t i = 0; i < s->count; i++) {
        struct model_reading *r = &s->readings[i];
        const struct ruled *ruled = &s->ruled[r->run * job->sensor_count + r->sensor];
        if (!ruled->given) {
            message("no ruling on a reading, is `vet` missing in front: '%s' (sensor '%s')",
                    job->runs[r->run].name, job->sensors[r->sensor].name);
            return STATUS_USAGE;
        }
        r->use = ruled->use;
        for (int k = 0; k < 3; k++)
            r->cov[k] += ruled->widen[k];
    }
    return STATUS_DONE;
}

/* ---- writing ---- */

static int put(struct solve *s)
{
    return stream_write(&s->stream, &s->line);
}

static int write_responses(struct solve *s, const struct model *m)
{
    int status = STATUS_DONE;
    for (size_t i = 0; i < m->row_count && !m->amplitudes;
         i++) { /* their phase would be no phase */
        const struct model_row *row = &m->rows[i];
        for (size_t p = 0; p < m->job->plane_count && status == STATUS_DONE; p++) {
            if (row->count == 0 || !row->posterior.known[p + 1])
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

static int write_finding(struct solve *s, const struct advice_finding *f)
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
    return put(s);
}

static const char *relative_to(const struct job *job)
{
    return job->aim.mounted >= 0 ? job->runs[job->aim.mounted].name : "as found";
}

static int write_corrections(struct solve *s, const struct answer *a)
{
    int status = STATUS_DONE;
    size_t n = 2 * a->planes;
    for (size_t p = 0; p < a->planes && status == STATUS_DONE; p++) {
        const double *e = a->ellipse + 2 * p * n + 2 * p;
        struct correction_record r = {
            .plane = (int)p,
            .mass = cabs(a->weights[p]),
            .angle_deg = angle_of(a->weights[p]),
            .least_squares = {cabs(a->classical[p]), angle_of(a->classical[p])},
            .ellipse = {e[0], e[1], e[n + 1]}};
        snprintf(r.relative_to, sizeof r.relative_to, "%s", relative_to(&s->stream.job));
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

static double signed_mass(const struct job_plane *plane, double mass)
{
    return plane->work == WORK_REMOVE ? -mass : mass;
}

static int write_placements(struct solve *s, const struct answer *a)
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
        for (size_t k = 0; k < item->piece_count; k++)
            r.pieces[k] = signed_mass(plane, item->pieces[k]);
        r.force_n = trial_force(item->mass, plane->radius_m, job->service_rpm);
        snprintf(r.relative_to, sizeof r.relative_to, "%s", relative_to(job));
        placement_print(&r, job, &s->line);
        status = put(s);
    }
    return status;
}

static int write_outlook(struct solve *s, const struct answer *a)
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
        line_close(line, '}');
    }
    line_close(line, ']');
    free(trials);
}

static void line_others(struct line *line, const struct answer *a)
{
    const struct job *job = a->model->job;
    const struct place_result *place = &a->placement;
    line_real(line, "gap", place->gap);
    line_real(line, "of_nothing", sqrt(fmax(0, place->best.objective) / place->nothing));
    line_open(line, "others", '[');
    for (int k = 0; k < 2 && !isnan(place->next[k].objective); k++) {
        line_open(line, NULL, '{');
        line_real(line, "of_nothing", sqrt(fmax(0, place->next[k].objective) / place->nothing));
        line_open(line, "items", '[');
        for (size_t i = 0; i < place->next[k].count; i++) {
            const struct place_item *item = &place->next[k].items[i];
            const struct job_plane *plane = &job->planes[item->plane];
            line_open(line, NULL, '{');
            line_text(line, "plane", plane->name);
            line_integer(line, "position", position_number(plane, item->position));
            line_real(line, "angle_deg", item->angle_deg);
            line_real(line, "sheet_deg", job_sheet_angle(job, item->angle_deg));
            line_real(line, "mass", signed_mass(plane, item->mass));
            line_close(line, '}');
        }
        line_close(line, ']');
        line_close(line, '}');
    }
    line_close(line, ']');
}

/* The closing record, and the line on standard error where there is no answer. */
static int write_next(struct solve *s, const struct advice_next *next, const struct answer *a,
                      int status)
{
    struct next_record r;
    if (status == STATUS_UNSOLVED && !s->said) {
        struct advice_finding f;
        advice_no_correction(next, &f);
        int written = write_finding(s, &f);
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
    line_end(&s->line);
    if (status != STATUS_DONE)
        message("%s", next->reason);
    s->status = status;
    return put(s);
}

/* ---- the answer ---- */

static int kernel_status(int error)
{
    if (error == 0)
        return STATUS_DONE;
    if (error == -1)
        return message_no_memory();
    message("the linear algebra failed on these readings");
    return STATUS_SYSTEM;
}

/* Findings about the rows; a refused row is lost to the correction. */
static int judge_rows(struct solve *s, struct model *m)
{
    int status = STATUS_DONE;
    for (size_t i = 0; i < m->row_count && status == STATUS_DONE; i++) {
        struct advice_finding f;
        if (!advice_linearity(m, &m->rows[i], &f))
            continue;
        if (f.verdict == ADVICE_REFUSE) {
            m->rows[i].state = MODEL_LOST;
            m->rows[i].lost_run = f.run;
        }
        status = write_finding(s, &f);
    }
    for (size_t p = 0; p < m->job->plane_count && status == STATUS_DONE; p++) {
        struct advice_finding f;
        if (advice_turn(m, p, &f))
            status = write_finding(s, &f);
    }
    return status;
}

/* Findings that can refuse the placement; `refused` gets the worst of them. */
static int judge_forces(struct solve *s, const struct answer *a, struct advice_finding *refused)
{
    int status = STATUS_DONE;
    for (size_t p = 0; p < a->planes && status == STATUS_DONE; p++) {
        struct advice_finding f;
        if (a->placed_weights[p] == 0 || !advice_force(a, p, &f))
            continue;
        if (f.verdict == ADVICE_REFUSE)
            *refused = f;
        status = write_finding(s, &f);
    }
    return status;
}

/* The machine has been corrected already: is it done? `next` is filled if so. */
static int look_back(struct answer *a, int run, struct advice_next *next)
{
    int status = kernel_status(outlook_fill(a));
    if (status == STATUS_DONE && run >= 0 && advice_is_done(a, run))
        advice_done_step(a, run, true, next);
    return status;
}

static bool has_targets(const struct answer *a)
{
    for (size_t r = 0; r < a->rows; r++)
        if (!isnan(a->row[r]->target))
            return true;
    return false;
}

/* Correction, placement, forecast; the planes are known to be told apart. */
static int give_answer(struct solve *s, struct answer *a)
{
    struct advice_next next = {0};
    struct advice_finding refused = {0};
    int run = advice_corrected_run(a->model);
    int status = run == -2 ? message_no_memory() : kernel_status(answer_correct(a));
    if (status == STATUS_DONE)
        status = look_back(a, run, &next);
    if (status == STATUS_DONE && !next.step)
        status = kernel_status(answer_place(a));
    if (status == STATUS_DONE && a->placed)
        status = judge_forces(s, a, &refused);
    if (status != STATUS_DONE)
        return status;
    if (refused.check) {
        advice_refused_step(&refused, &next);
        return write_next(s, &next, NULL, STATUS_UNSOLVED);
    }
    bool trim = run >= 0 && run == a->model->job->aim.mounted; /* else everything comes off */
    if (!next.step && !answer_helps(a)) {
        if (!trim || has_targets(a)) {
            advice_useless_step(a, &next);
            return write_next(s, &next, NULL, STATUS_UNSOLVED);
        }
        advice_done_step(a, run, false, &next);
    }
    if (!next.step)
        advice_fit_step(a, trim, &next);
    status = kernel_status(outlook_fill(a));
    if (status == STATUS_DONE)
        status = write_corrections(s, a);
    if (status == STATUS_DONE && strcmp(next.step, "done") != 0)
        status = write_placements(s, a);
    if (status == STATUS_DONE)
        status = write_outlook(s, a);
    return status == STATUS_DONE ? write_next(s, &next, a, STATUS_DONE) : status;
}

static const struct model_row *lost_row(const struct model *m)
{
    for (size_t i = 0; i < m->row_count; i++)
        if (m->rows[i].in_aim && m->rows[i].state == MODEL_LOST)
            return &m->rows[i];
    return NULL;
}

static int solve_rows(struct solve *s, const struct model *m)
{
    struct answer answer;
    struct advice_next next;
    struct advice_finding f;
    int status = kernel_status(answer_init(&answer, m));
    if (status != STATUS_DONE)
        return status;
    bool judged = advice_conditioning(&answer, &f);
    if (judged)
        status = write_finding(s, &f);
    if (status == STATUS_DONE && judged && f.verdict == ADVICE_REFUSE) {
        struct ruling ruling = {RULING_REPEAT, lost_row(m), false};
        if (isinf(answer.condition) && ruling.row) {
            advice_repeat_step(m, &ruling, &next);
            status = write_next(s, &next, NULL, STATUS_REFUSED);
        } else {
            advice_refused_step(&f, &next);
            status = write_next(s, &next, NULL, STATUS_UNSOLVED);
        }
    } else if (status == STATUS_DONE) {
        status = give_answer(s, &answer);
    }
    answer_release(&answer);
    return status;
}

/* All records are read: fit, judge, answer. */
static int conclude(struct solve *s)
{
    struct model model;
    struct advice_next next;
    if (s->stream.job.audit || s->stream.job.run_count == 0) /* an audit: nothing is to be balanced */
        return STATUS_DONE;
    int status = kernel_status(model_init(&model, &s->stream.job, s->readings, s->count));
    if (status != STATUS_DONE)
        return status;
    status = write_responses(s, &model);
    if (status == STATUS_DONE)
        status = judge_rows(s, &model);
    if (status == STATUS_DONE) {
        struct ruling ruling = ruling_of(&model);
        switch (ruling.kind) {
        case RULING_TRIAL:
            advice_trial_step(&model, &next);
            status = write_next(s, &next, NULL, STATUS_DONE);
            break;
        case RULING_REPEAT:
            advice_repeat_step(&model, &ruling, &next);
            status = write_next(s, &next, NULL, STATUS_REFUSED);
            break;
        case RULING_MISSING:
            advice_missing_step(&model, &ruling, &next);
            status = write_next(s, &next, NULL, STATUS_UNSOLVED);
            break;
        case RULING_SOLVE:
            status = solve_rows(s, &model);
            break;
        }
    }
    model_release(&model);
    return status;
}

static int run(const struct option_list *files)
{
    struct solve s = {.line = LINE_INIT};
    int status = stream_open(&s.stream, files->items, files->count, true);
    if (status != STATUS_DONE) {
        stream_close(&s.stream);
        return status;
    }
    s.ruled = calloc(s.stream.job.run_count * s.stream.job.sensor_count + 1, sizeof *s.ruled);
    status = s.ruled ? read_all(&s) : message_no_memory();
    if (status == STATUS_DONE)
        status = join(&s);
    if (status == STATUS_DONE)
        status = conclude(&s);
    if (status == STATUS_DONE)
        status = stream_finish(&s.stream);
    line_release(&s.line);
    free(s.ruled);
    free(s.readings);
    stream_close(&s.stream);
    return status == STATUS_DONE ? s.status : status;
}

int stage_solve(int argc, char **argv)
{
    static const struct option options[] = {{0}};
    static const struct usage usage = {
        "solve",
        "[FILE...]",
        "readings become responses, a correction, a placement and the next step",
        options,
        0,
        (size_t)-1,
        "Reads records from the files, one after another, or from standard input. Before `end` "
        "stand\n"
        "the responses, findings, the ideal correction, what to fit now, a forecast of the next\n"
        "reading, the residual against the tolerance, and the next step. Exits 4 where refused\n"
        "readings are needed, 5 where no correction exists.\n"};
    struct option_list files = {0};
    int status;

    message_stage("solve");
    switch (options_parse(&usage, argc, argv, &files)) {
    case OPTIONS_STOP:
        status = STATUS_DONE;
        break;
    case OPTIONS_GO:
        status = run(&files);
        break;
    default:
        status = STATUS_USAGE;
    }
    option_list_release(&files);
    return status;
}
