#include "vet/trials.h"

#include <math.h>
#include <stdio.h>
#include <stdlib.h>
#include <string.h>

#include "vet/across.h"
#include "vet/effect.h"
#include "vet/ruling.h"
#include "vet/within.h"

/* What all judgements of trials share. */
struct trials {
    struct vet_runs *runs;
    const size_t *order;
    const struct job *job;
    struct findings *findings;
    size_t *sequence;     /* order, runs without weights first: they are what effects refer to */
    double *scale;        /* per plane: the largest weight of all runs */
    double complex *room; /* rows of [1, weights] */
};

static bool is_bare(const struct trials *t, size_t position)
{
    int index = t->runs->items[position].index;

    return index >= 0 && job_run_is_bare(t->job, (size_t)index);
}

static void bare_first(struct trials *t)
{
    size_t count = 0;

    for (size_t k = 0; k < t->runs->count; k++)
        if (is_bare(t, t->order[k]))
            t->sequence[count++] = t->order[k];
    for (size_t k = 0; k < t->runs->count; k++)
        if (!is_bare(t, t->order[k]))
            t->sequence[count++] = t->order[k];
}

static bool comparable(const struct trials *t, const struct vet_run *run, const char *condition)
{
    if (run->index < 0 || facts_role(run, t->job)[0] || strcmp(run->condition, condition) != 0)
        return false;
    for (size_t i = 0; i < t->job->sensor_count; i++)
        if (run->readings[i].present && run->readings[i].use && run->readings[i].has_phase)
            return true;
    return false;
}

static void add_row(struct trials *t, const struct vet_run *run, size_t row)
{
    size_t columns = t->job->plane_count + 1;

    t->room[row * columns] = 1;
    for (size_t p = 0; p + 1 < columns; p++)
        t->room[row * columns + p + 1] =
            t->scale[p] > 0 ? job_run_weight(t->job, (size_t)run->index, p) / t->scale[p] : 0;
}

/* Rank of [1, weights] of the usable runs before the k-th, and of it too with `itself`. */
static size_t rank_before(struct trials *t, size_t k, bool itself)
{
    const struct vet_run *run = &t->runs->items[t->sequence[k]];
    size_t rows = 0;

    for (size_t m = 0; m < k; m++) {
        const struct vet_run *seen = &t->runs->items[t->sequence[m]];
        if (comparable(t, seen, run->condition))
            add_row(t, seen, rows++);
    }
    if (itself)
        add_row(t, run, rows++);
    return ruling_rank(t->room, rows, t->job->plane_count + 1);
}

/* The earlier usable run whose weights differ on the fewest planes; NULL for none. */
static const struct vet_run *reference_of(const struct trials *t, size_t k)
{
    const struct vet_run *run = &t->runs->items[t->sequence[k]], *best = NULL;
    size_t fewest = t->job->plane_count + 1;

    for (size_t m = 0; m < k; m++) {
        const struct vet_run *seen = &t->runs->items[t->sequence[m]];
        size_t differ = 0;
        if (!comparable(t, seen, run->condition))
            continue;
        for (size_t p = 0; p < t->job->plane_count; p++)
            differ += cabs(job_run_weight(t->job, (size_t)run->index, p) -
                           job_run_weight(t->job, (size_t)seen->index, p)) > 1e-9 * t->scale[p];
        if (differ < fewest) {
            fewest = differ;
            best = seen;
        }
    }
    return best;
}

/* The strongest effect over the sensors; `weak` is left true where all stay under the caution. */
static int strongest(const struct trials *t, const struct vet_run *run,
                     const struct vet_run *before, struct effect *most, bool *weak)
{
    double caution = t->findings->limits->rows[CHECK_TRIAL_EFFECT].caution;
    int sensor = -1;

    for (size_t i = 0; i < t->job->sensor_count; i++) {
        const struct vet_reading *a = &before->readings[i], *b = &run->readings[i];
        double as_found = across_as_found(t->runs, t->order, t->job, run->condition, i), own[2][3];
        struct effect e;
        if (!a->present || !b->present || !a->use || !b->use || !a->has_phase || !b->has_phase)
            continue;
        for (int c = 0; c < 3; c++) {
            own[0][c] = a->cov[c] + a->widen[c];
            own[1][c] = b->cov[c] + b->widen[c];
        }
        e = effect_of(a->vector, own[0], b->vector, own[1],
                      t->job->aim.repeatability * (isnan(as_found) ? a->amplitude : as_found));
        *weak = *weak && e.amplitude_pct < caution && e.lag_deg < caution;
        if (sensor < 0 || e.errors > most->errors) {
            *most = e;
            sensor = (int)i;
        }
    }
    return sensor;
}

/* True where the run's weights already pull as hard as they should. */
static bool pulls(const struct trials *t, const struct vet_run *run)
{
    double rpm = t->job->service_rpm > 0 ? t->job->service_rpm : facts_speed(run, t->job, false);
    double force = within_force(&t->job->runs[run->index], t->job, rpm), limit;

    if (t->findings->limits->rows[CHECK_WEIGHT_FORCE].off)
        return false;
    return limits_judge(t->findings->limits, CHECK_WEIGHT_FORCE,
                        100 * force / within_journal_load(t->job), &limit) != RULING_OK;
}

static void judge(struct trials *t, size_t k)
{
    const struct check_row *row = &t->findings->limits->rows[CHECK_TRIAL_EFFECT];
    struct vet_run *run = &t->runs->items[t->sequence[k]];
    const struct vet_run *before = reference_of(t, k);
    bool weak = !isnan(row->caution);
    struct effect e = {0, 0, 0};
    int sensor = before ? strongest(t, run, before, &e, &weak) : -1;
    enum ruling ruling;
    char errors[48], change[100];

    if (sensor < 0)
        return;
    ruling = e.errors < row->refuse ? RULING_REFUSE : weak ? RULING_CAUTION : RULING_OK;
    if (isfinite(e.errors))
        snprintf(errors, sizeof errors, "%g standard errors", findings_figure(e.errors));
    else
        snprintf(errors, sizeof errors, "exact readings"); /* by hand, with repeatability 0 % */
    if (isfinite(e.amplitude_pct))
        snprintf(change, sizeof change, "the amplitude changed by %g %% and the lag by %g deg",
                 findings_figure(e.amplitude_pct), findings_figure(e.lag_deg));
    else
        snprintf(change, sizeof change, "the amplitude grew from nothing");
    if (pulls(t, run))
        findings_instead(t->findings,
                         "the weight pulls hard already: put it at another angle, or repeat the "
                         "runs, so that less scatter hides its effect");
    ruling = findings_rule(t->findings, CHECK_TRIAL_EFFECT, ruling, (int)t->sequence[k], sensor,
                           ruling == RULING_CAUTION ? e.amplitude_pct : e.errors,
                           ruling == RULING_CAUTION ? row->caution : row->refuse,
                           ruling == RULING_CAUTION ? "%" : "s.e.", "against '%s' %s, %s",
                           before->name, change, errors);
    if (ruling == RULING_REFUSE)
        within_refuse(run, t->job);
}

/* Rank over the ordinary runs of run `of`'s condition that have no weights or stand before it; and
 * of it too with `itself`. */
static size_t rank_in_sheet(const struct job *job, size_t of, bool itself, double complex *room)
{
    size_t rows = 0, columns = job->plane_count + 1;

    for (size_t r = 0; r < job->run_count; r++) {
        if (r == of ? !itself
                    : (r > of && !job_run_is_bare(job, r)) || job->runs[r].role[0] ||
                          strcmp(job->runs[r].condition, job->runs[of].condition) != 0)
            continue;
        room[rows * columns] = 1;
        for (size_t p = 0; p < job->plane_count; p++) {
            double largest = 0;
            for (size_t q = 0; q < job->run_count; q++)
                largest = fmax(largest, cabs(job_run_weight(job, q, p)));
            room[rows * columns + p + 1] = largest > 0 ? job_run_weight(job, r, p) / largest : 0;
        }
        rows++;
    }
    return ruling_rank(room, rows, columns);
}

bool trials_is_trial(const struct job *job, size_t run)
{
    double complex *room;
    bool trial;

    if (job_run_is_bare(job, run))
        return false;
    room = malloc(job->run_count * (job->plane_count + 1) * sizeof *room);
    trial = !room || rank_in_sheet(job, run, true, room) > rank_in_sheet(job, run, false, room);

    free(room);
    return trial;
}

void trials_effect(struct vet_runs *runs, const size_t *order, const struct job *job,
                   struct findings *findings)
{
    struct trials t = {runs, order, job, findings, NULL, NULL, NULL};

    t.scale = calloc(job->plane_count + 1, sizeof *t.scale);
    t.room = malloc((runs->count + 1) * (job->plane_count + 1) * sizeof *t.room);
    t.sequence = malloc((runs->count + 1) * sizeof *t.sequence);
    if (!t.scale || !t.room || !t.sequence)
        findings->failed = true;
    else
        bare_first(&t);
    for (size_t r = 0; !findings->failed && r < job->run_count; r++)
        for (size_t p = 0; p < job->plane_count; p++)
            t.scale[p] = fmax(t.scale[p], cabs(job_run_weight(job, r, p)));
    for (size_t k = 0; !findings->failed && k < runs->count; k++) {
        const struct vet_run *run = &runs->items[t.sequence[k]];
        /* A trial is a run that tells something new: its weights raise the rank. */
        if (comparable(&t, run, run->condition) && !is_bare(&t, t.sequence[k]) &&
            rank_before(&t, k, true) > rank_before(&t, k, false))
            judge(&t, k);
    }
    free(t.sequence);
    free(t.room);
    free(t.scale);
}
