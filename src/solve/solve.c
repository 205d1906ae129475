/* solve.c - the stage `solve`: readings become responses, weights, a placement and the next step.
 *
 * What is judged and answered, in order; the records themselves are solve_records.c's.
 */
#include "solve/solve.h"

#include <math.h>
#include <stdio.h>
#include <string.h>

#include "base/message.h"
#include "base/options.h"
#include "base/status.h"
#include "solve/advice.h"
#include "solve/already.h"
#include "solve/answer.h"
#include "solve/fit.h"
#include "solve/follow.h"
#include "solve/holes.h"
#include "solve/lighter.h"
#include "solve/lookback.h"
#include "solve/model.h"
#include "solve/misfit.h"
#include "solve/notes.h"
#include "solve/outlook.h"
#include "solve/ruling.h"
#include "solve/solve_records.h"
#include "solve/witness.h"

static int kernel_status(int error)
{
    if (error == 0)
        return STATUS_DONE;
    if (error == -1)
        return message_no_memory();
    message("the linear algebra failed on these readings");
    return STATUS_SYSTEM;
}

/* A row that contradicts itself is lost to the correction, its responses, too. */
static void tear(struct model_row *row, int run)
{
    row->state = MODEL_LOST;
    row->lost_run = run;
    row->torn = true;
}

/* After a refusal at one sensor the others of the condition, too, are lost that are more than
 * TURN_AGREES standard errors off: what is wrong with weights or senses is wrong for all. */
static void lose_turned(struct model *m, size_t plane)
{
    static const double TURN_AGREES = 2; /* about the 95 % point, common practice */
    for (size_t i = 0; i < m->row_count; i++) {
        struct advice_finding f, own;
        if (!follow_row(m, &m->rows[i], plane, &f) || f.verdict != ADVICE_REFUSE)
            continue;
        for (size_t k = 0; k < m->row_count; k++)
            if (m->rows[k].condition == m->rows[i].condition &&
                follow_row(m, &m->rows[k], plane, &own) &&
                (own.verdict == ADVICE_REFUSE || own.value >= TURN_AGREES))
                tear(&m->rows[k], own.run);
    }
}

/* Where a reading is left out that vet found exchanged, those it may be exchanged with go as well.
 */
static int drop_swapped(struct solve_records *s, const struct model *m, const struct model_row *row,
                        const struct advice_finding *f)
{
    bool swapped = false;
    int status = STATUS_DONE;
    for (size_t i = 0; i < s->cause_count; i++)
        swapped = swapped ||
                  (!strcmp(s->causes[i].check, "sensor-swapped") && s->causes[i].run == f->run);
    for (size_t k = 0; swapped && k < m->row_count && status == STATUS_DONE; k++) {
        const struct model_row *other = &m->rows[k];
        struct advice_finding own = *f;
        if (other->condition != row->condition ||
            m->job->sensors[other->sensor].quantity != m->job->sensors[row->sensor].quantity ||
            !model_refuse(m, other, f->run, s->readings, s->count))
            continue;
        own.sensor = (int)other->sensor;
        snprintf(own.text, sizeof own.text,
                 "run '%s' is left out here, too: sensor '%s' may have been exchanged with '%s', "
                 "whose reading does not fit the other runs",
                 m->job->runs[f->run].name, m->job->sensors[other->sensor].name,
                 m->job->sensors[row->sensor].name);
        status = solve_records_dropped(s, &own);
    }
    return status;
}

/* Takes readings out of use that do not fit the others, as long as it is known which: the model is
 * made anew without them. */
static int sift(struct solve_records *s, struct model *m)
{
    int status = STATUS_DONE;
    bool again = true;
    while (again && status == STATUS_DONE) {
        again = false;
        for (size_t i = 0; i < m->row_count && status == STATUS_DONE; i++) {
            struct advice_finding f;
            if (!misfit_judge(m, &m->rows[i], &f) || f.verdict != ADVICE_REFUSE ||
                m->rows[i].culprit < 0 ||
                !model_refuse(m, &m->rows[i], m->rows[i].culprit, s->readings, s->count))
                continue;
            again = true;
            status = solve_records_dropped(s, &f);
            if (status == STATUS_DONE)
                status = drop_swapped(s, m, &m->rows[i], &f);
        }
        if (!again || status != STATUS_DONE)
            continue;
        model_release(m);
        status = kernel_status(model_init(m, &s->stream.job, s->readings, s->count));
    }
    return status;
}

/* True where nothing but `trial-effect` refuses the reading. */
static bool only_too_small(const struct solve_records *s, const struct model_reading *r)
{
    bool small = false;
    for (size_t i = 0; i < s->cause_count; i++) {
        const struct remedy_cause *c = &s->causes[i];
        if (!c->refused || c->run != (int)r->run)
            continue;
        bool own = !strcmp(c->check, "trial-effect");
        if (!own && strcmp(c->check, "prediction") != 0) /* that one is of this comparison */
            return false;
        small = small || own;
    }
    return small && !r->use;
}

/* Whether a run that was refused as too small contradicts the fit of any sensor. */
static bool run_contradicts(const struct solve_records *s, const struct model *m, size_t run)
{
    struct advice_finding f;
    for (size_t i = 0; i < s->count; i++)
        for (size_t k = 0; k < m->row_count && s->readings[i].run == run; k++)
            if (only_too_small(s, &s->readings[i]) &&
                witness_refused(m, &m->rows[k], &s->readings[i], &f) && f.verdict == ADVICE_REFUSE)
                return true;
    return false;
}

/* Readings that did not make the fit, and the corrected run, against what it predicts: a run that
 * contradicts it loses all sensors that it is more than a caution off at. */
static int judge_witnesses(struct solve_records *s, struct model *m)
{
    struct advice_finding f;
    int status = STATUS_DONE, run = advice_corrected_run(m);
    if (run == -2)
        return message_no_memory();
    for (size_t i = 0; i < m->row_count && run >= 0 && status == STATUS_DONE; i++) {
        int contrary = witness_contrary(m, &m->rows[i], (size_t)run, &f);
        if (contrary < 0)
            return kernel_status(contrary);
        if (contrary == 0 || m->rows[i].state != MODEL_GOOD)
            continue;
        tear(&m->rows[i], run);
        status = solve_records_finding(s, &f);
    }
    for (size_t i = 0; i < s->count && status == STATUS_DONE; i++)
        for (size_t k = 0; k < m->row_count && status == STATUS_DONE; k++) {
            if (!only_too_small(s, &s->readings[i]) ||
                !witness_refused(m, &m->rows[k], &s->readings[i], &f))
                continue;
            status = solve_records_finding(s, &f);
            if (run_contradicts(s, m, s->readings[i].run))
                tear(&m->rows[k], f.run);
        }
    return status;
}

/* Findings about the rows; a refused row is lost to the correction. */
static int judge_rows(struct solve_records *s, struct model *m)
{
    int status = STATUS_DONE;
    for (size_t i = 0; i < m->row_count && status == STATUS_DONE; i++) {
        struct advice_finding f[2];
        size_t count = 0;
        count += misfit_judge(m, &m->rows[i], &f[count]);
        count += notes_stored(m, &m->rows[i], &f[count]);
        for (size_t k = 0; k < count && status == STATUS_DONE; k++) {
            if (f[k].verdict == ADVICE_REFUSE) {
                m->rows[i].state = MODEL_LOST;
                m->rows[i].lost_run = f[k].run;
                m->rows[i].torn = f[k].run < 0;
            }
            status = solve_records_finding(s, &f[k]);
        }
    }
    for (size_t p = 0; p < m->job->plane_count && status == STATUS_DONE; p++) {
        struct advice_finding f;
        if (!follow_worst(m, p, &f))
            continue;
        if (f.verdict == ADVICE_REFUSE)
            lose_turned(m, p);
        status = solve_records_finding(s, &f);
    }
    for (size_t i = 0; i < s->cause_count; i++)
        for (size_t k = 0; k < m->row_count; k++)
            if (m->rows[k].state == MODEL_GOOD && witness_moved(m, &m->rows[k], &s->causes[i]))
                tear(&m->rows[k], s->causes[i].run);
    if (status == STATUS_DONE)
        status = judge_witnesses(s, m);
    for (size_t p = 0; p < m->job->plane_count && status == STATUS_DONE; p++) {
        struct advice_finding f;
        if (notes_turned(m, p, &f))
            status = solve_records_finding(s, &f);
    }
    for (size_t i = 0; i < m->job->sensor_count && status == STATUS_DONE; i++) {
        struct advice_finding f;
        if (notes_runout(m, i, &f))
            status = solve_records_finding(s, &f);
    }
    return status;
}

/* The corrected run against what the runs before it predict: each row, and the worst as a finding.
 */
static int write_lookback(struct solve_records *s, const struct model *m, int run)
{
    const struct model_row *worst = NULL;
    struct lookback look;
    double se = -1;
    int status = STATUS_DONE;
    for (size_t i = 0; run >= 0 && i < m->row_count && status == STATUS_DONE; i++) {
        const struct model_row *row = &m->rows[i];
        int found = m->amplitudes ? 0 : lookback_row(row, m->job->plane_count, (size_t)run, &look);
        if (found < 0)
            return kernel_status(found);
        if (found == 0)
            continue;
        status = solve_records_compared(s, m, row, run, &look);
        if (look.se > se) {
            se = look.se;
            worst = row;
        }
    }
    struct advice_finding f;
    if (!worst || status != STATUS_DONE)
        return status;
    notes_prediction(m, worst, (size_t)run, se, &f);
    return solve_records_finding(s, &f);
}

/* Findings that can refuse the placement; `refused` gets the worst of them. */
static int judge_forces(struct solve_records *s, const struct answer *a,
                        struct advice_finding *refused)
{
    int status = STATUS_DONE;
    for (size_t p = 0; p < a->planes && status == STATUS_DONE; p++) {
        struct advice_finding f;
        if (a->placed_weights[p] == 0 || !advice_force(a, p, &f))
            continue;
        if (f.verdict == ADVICE_REFUSE)
            *refused = f;
        status = solve_records_finding(s, &f);
    }
    return status;
}

/* The machine has been corrected already: is it done? `next` is filled if so. */
static int look_back(struct answer *a, int run, struct advice_next *next)
{
    int status = kernel_status(outlook_fill(a));
    if (status == STATUS_DONE && run >= 0 && advice_is_done(a, run)) {
        advice_done_step(a, run, true, next);
        fit_doubt(a, next);
    }
    return status;
}

static bool has_targets(const struct answer *a)
{
    for (size_t r = 0; r < a->rows; r++)
        if (!isnan(a->row[r]->target))
            return true;
    return false;
}

static int note_removed(struct solve_records *s, const struct advice_next *next)
{
    struct advice_finding f;
    if (!strcmp(next->step, "done") || !notes_removed(&s->stream.job, &f))
        return STATUS_DONE;
    return solve_records_finding(s, &f);
}

/* A correction that made it worse is told at the answer, too. */
static int note_worse(struct solve_records *s, const struct model *m, int run,
                      struct advice_next *next)
{
    struct advice_finding f;
    int worse = run >= 0 ? witness_worse(m, (size_t)run, &f) : 0;
    if (worse < 0)
        return kernel_status(worse);
    if (worse == 0)
        return STATUS_DONE;
    fit_heed(&f, next);
    return solve_records_finding(s, &f);
}

static int note_holes(struct solve_records *s, const struct answer *a)
{
    struct advice_finding f;
    return a->placed && holes_overlap(a, &f) ? solve_records_finding(s, &f) : STATUS_DONE;
}

/* Nothing more is fitted: the outlook is of what run `run` carries, which stays on. */
static int stay_with(struct answer *a, int run)
{
    const struct model *m = a->model;
    if (a->base == run)
        return STATUS_DONE;
    answer_release(a);
    int status = kernel_status(answer_init_at(a, m, run));
    return status == STATUS_DONE ? kernel_status(answer_correct(a)) : status;
}

/* Correction, placement, forecast; the planes are known to be told apart. */
static int give_answer(struct solve_records *s, struct answer *a)
{
    struct advice_next next = {0};
    struct advice_finding refused = {0};
    int run = advice_corrected_run(a->model);
    int status = run == -2 ? message_no_memory() : write_lookback(s, a->model, run);
    if (status == STATUS_DONE)
        status = kernel_status(answer_correct(a));
    if (status == STATUS_DONE)
        status = look_back(a, run, &next);
    if (status == STATUS_DONE && !next.step)
        status = kernel_status(answer_place(a));
    if (status == STATUS_DONE && a->placed)
        status = kernel_status(lighter_find(a));
    if (status == STATUS_DONE && a->placed)
        status = judge_forces(s, a, &refused);
    if (status != STATUS_DONE)
        return status;
    if (refused.check) {
        advice_refused_step(&refused, &next);
        return solve_records_next(s, &next, NULL, STATUS_UNSOLVED);
    }
    bool as_good, trim = run >= 0 && run == a->model->job->aim.mounted; /* else all comes off */
    bool again = !trim && answer_corrected_by(a, run, &as_good);
    if (!next.step && again && as_good && !has_targets(a))
        advice_done_step(a, run, false, &next);
    if (!next.step && !answer_helps(a)) {
        if (!trim || has_targets(a)) {
            advice_useless_step(a, &next);
            return solve_records_next(s, &next, NULL, STATUS_UNSOLVED);
        }
        advice_done_step(a, run, false, &next);
    }
    if (!next.step) {
        fit_step(a, trim || again, &next);
        status = note_worse(s, a->model, run, &next);
    }
    if (status != STATUS_DONE)
        return status;
    if (!strcmp(next.step, "done"))
        status = stay_with(a, run);
    if (status == STATUS_DONE)
        status = kernel_status(outlook_fill(a));
    if (status == STATUS_DONE)
        status = note_removed(s, &next);
    if (status == STATUS_DONE)
        status = solve_records_corrections(s, a);
    if (status == STATUS_DONE)
        status = solve_records_parts(s, a);
    if (status == STATUS_DONE && strcmp(next.step, "done") != 0)
        status = solve_records_placements(s, a);
    if (status == STATUS_DONE && strcmp(next.step, "done") != 0)
        status = note_holes(s, a);
    if (status == STATUS_DONE)
        status = solve_records_outlook(s, a);
    struct advice_finding missed;
    if (status == STATUS_DONE && strcmp(next.step, "done") != 0 && notes_target(a, &missed))
        status = solve_records_finding(s, &missed);
    return status == STATUS_DONE ? solve_records_next(s, &next, a, STATUS_DONE) : status;
}

static const struct model_row *lost_row(const struct model *m)
{
    for (size_t i = 0; i < m->row_count; i++)
        if (m->rows[i].in_aim && m->rows[i].state == MODEL_LOST)
            return &m->rows[i];
    return NULL;
}

static void repeat_step(const struct solve_records *s, const struct model *m,
                        const struct ruling *ruling, struct advice_next *next)
{
    advice_repeat_step(m, ruling, next);
    if (ruling->row && ruling->row->torn)
        remedy_lead(m, s->causes, s->cause_count, next);
    else
        remedy_step(m, s->causes, s->cause_count, next);
}

static int solve_rows(struct solve_records *s, const struct model *m)
{
    struct answer answer;
    struct advice_next next;
    struct advice_finding f;
    int status = kernel_status(answer_init(&answer, m));
    if (status != STATUS_DONE)
        return status;
    bool judged = advice_conditioning(&answer, &f);
    if (judged)
        status = solve_records_finding(s, &f);
    if (status == STATUS_DONE && judged && f.verdict == ADVICE_REFUSE) {
        struct ruling ruling = {RULING_REPEAT, lost_row(m), false};
        if (isinf(answer.condition) && ruling.row) {
            repeat_step(s, m, &ruling, &next);
            status = solve_records_next(s, &next, NULL, STATUS_REFUSED);
        } else {
            advice_refused_step(&f, &next);
            status = solve_records_next(s, &next, NULL, STATUS_UNSOLVED);
        }
    } else if (status == STATUS_DONE) {
        status = give_answer(s, &answer);
    }
    answer_release(&answer);
    return status;
}

static bool any_refused(const struct solve_records *s)
{
    for (size_t i = 0; i < s->cause_count; i++)
        if (s->causes[i].refused)
            return true;
    return false;
}

/* As found meets the aim: nothing is to be fitted, unless what the tacho counts is not this shaft.
 */
static int already(struct solve_records *s, const struct model *m)
{
    struct advice_next next;
    int status = STATUS_DONE;
    already_step(m, &next);
    for (size_t i = 0; i < m->row_count && status == STATUS_DONE; i++) {
        struct advice_finding f;
        if (!already_elsewhere(m, &m->rows[i], s->causes, s->cause_count, &f))
            continue;
        already_doubt(&f, &next);
        status = solve_records_finding(s, &f);
    }
    return status == STATUS_DONE ? solve_records_next(s, &next, NULL, STATUS_DONE) : status;
}

/* All records are read: fit, judge, answer. */
static int conclude(struct solve_records *s)
{
    struct model model;
    struct advice_next next;
    if (s->stream.job.audit ||
        s->stream.job.run_count == 0) /* an audit: nothing is to be balanced */
        return STATUS_DONE;
    int status = solve_records_bring(s);
    for (size_t i = 0; i < s->match_count && status == STATUS_DONE; i++) {
        struct advice_finding f;
        notes_speed(&s->stream.job, &s->matches[i], &f);
        status = solve_records_finding(s, &f);
    }
    if (status == STATUS_DONE)
        status = kernel_status(model_init(&model, &s->stream.job, s->readings, s->count));
    if (status != STATUS_DONE)
        return status;
    status = sift(s, &model);
    if (status == STATUS_DONE)
        status = judge_rows(s, &model);
    if (status == STATUS_DONE)
        status = solve_records_responses(s, &model);
    struct ruling ruling = {RULING_REPEAT, NULL, false};
    if (status == STATUS_DONE)
        ruling = ruling_of(&model);
    if (ruling.kind == RULING_MISSING && model.row_count == 0 && any_refused(s))
        ruling.kind = RULING_REPEAT;
    if (status == STATUS_DONE && ruling.kind != RULING_REPEAT && already_meets(&model)) {
        status = already(s, &model);
    } else if (status == STATUS_DONE) {
        switch (ruling.kind) {
        case RULING_TRIAL:
            advice_trial_step(&model, &next);
            status = solve_records_next(s, &next, NULL, STATUS_DONE);
            break;
        case RULING_REPEAT:
            if (ruling.row && ruling.row->unrolled)
                notes_runout_step(&model, ruling.row, &next);
            else
                repeat_step(s, &model, &ruling, &next);
            status = solve_records_next(s, &next, NULL, STATUS_REFUSED);
            break;
        case RULING_MISSING:
            advice_missing_step(&model, &ruling, &next);
            status = solve_records_next(s, &next, NULL, STATUS_UNSOLVED);
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
    struct solve_records s;
    int status = solve_records_open(&s, files);
    if (status == STATUS_DONE)
        status = solve_records_read(&s);
    if (status == STATUS_DONE)
        status = conclude(&s);
    if (status == STATUS_DONE)
        status = stream_finish(&s.stream);
    if (status == STATUS_DONE)
        status = s.status;
    if (status == STATUS_DONE && s.dropped > 0)
        message("goes on without what it refused: %s, refusal 1 of %ld)", s.first, s.dropped);
    solve_records_release(&s);
    return status;
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
