#include "vet/moved.h"

#include <math.h>
#include <stdio.h>
#include <stdlib.h>
#include <string.h>

#include "vet/across.h"
#include "vet/suspects.h"
#include "vet/when.h"

/* Readings noted by hand carry three digits at best: an exact one is right to so much of as found,
 * common practice. */
static const double EXACT = 0.005;

/* The runs of one condition as the kernel sees them. */
struct table {
    size_t *positions; /* owned, as all below */
    double *hours;
    double complex *weights, *vectors;
    double *variance, *repeatability;
    bool *alike;
    size_t count;
};

static bool has_phase(const struct vet_run *run, const struct job *job)
{
    for (size_t i = 0; i < job->sensor_count; i++)
        if (run->readings[i].present && run->readings[i].use && run->readings[i].has_phase)
            return true;
    return false;
}

static bool belongs(const struct vet_run *run, const struct job *job, const char *condition)
{
    return run->index >= 0 && !facts_role(run, job)[0] && !strcmp(run->condition, condition) &&
           has_phase(run, job);
}

/* Gathers the condition's runs, in the order of recording where that is known. */
static void gather(struct table *t, const struct vet_runs *runs, const size_t *order,
                   const struct job *job, const char *condition)
{
    bool timed = true;

    t->count = 0;
    for (size_t k = 0; k < runs->count; k++) {
        const struct vet_run *run = &runs->items[order[k]];
        if (!belongs(run, job, condition))
            continue;
        t->positions[t->count] = order[k];
        t->hours[t->count] = when_hours(job->runs[run->index].when);
        timed = timed && !isnan(t->hours[t->count]);
        t->count++;
    }
    for (size_t i = 1; timed && i < t->count; i++) { /* insertion: runs are few, ties keep order */
        double hours = t->hours[i];
        size_t position = t->positions[i], j = i;
        for (; j > 0 && t->hours[j - 1] > hours; j--) {
            t->hours[j] = t->hours[j - 1];
            t->positions[j] = t->positions[j - 1];
        }
        t->hours[j] = hours;
        t->positions[j] = position;
    }
}

static void fill(struct table *t, const struct vet_runs *runs, const size_t *order,
                 const struct job *job, const char *condition)
{
    size_t sensors = job->sensor_count, planes = job->plane_count;

    for (size_t r = 0; r < t->count; r++) {
        const struct vet_run *run = &runs->items[t->positions[r]];
        for (size_t p = 0; p < planes; p++)
            t->weights[r * planes + p] = job_run_weight(job, (size_t)run->index, p);
        for (size_t i = 0; i < sensors; i++) {
            const struct vet_reading *g = &run->readings[i];
            bool good = g->present && g->use && g->has_phase;
            t->vectors[r * sensors + i] = good ? g->vector : CMPLX(NAN, NAN);
            t->variance[r * sensors + i] =
                0.5 * (g->cov[0] + g->cov[2] + g->widen[0] + g->widen[2]);
        }
    }
    for (size_t i = 0; i < sensors; i++) {
        double as_found = across_as_found(runs, order, job, condition, i);
        for (size_t r = 0; !(as_found > 0) && r < t->count; r++)
            as_found = cabs(t->vectors[r * sensors + i]);
        t->repeatability[i] = pow(fmax(job->aim.repeatability, EXACT) * as_found, 2);
        for (size_t j = 0; j < sensors; j++)
            t->alike[i * sensors + j] = job->sensors[i].quantity == job->sensors[j].quantity;
    }
}

static const char *name_of(const struct table *t, const struct vet_runs *runs, size_t run)
{
    return runs->items[t->positions[run]].name;
}

/* "in run 'x' (or by 30 deg in 'y')", "from run 'x' on". */
static void say_where(const struct table *t, const struct vet_runs *runs, enum suspects_kind kind,
                      const struct suspect *s, char *to, size_t room)
{
    bool onwards = s->onwards && s->run + 1 < t->count;
    bool other_onwards = s->other_onwards && s->other + 1 < t->count;
    char other[96] = "", by[24] = "";

    if (kind != SUSPECTS_SWAP)
        snprintf(by, sizeof by, "by %.0f deg ", s->other_deg);
    if (s->ambiguous && (s->other != s->run || other_onwards != onwards))
        snprintf(other, sizeof other, " (or %s%s '%s'%s)", by, other_onwards ? "from" : "in",
                 name_of(t, runs, s->other), other_onwards ? " on" : "");
    snprintf(to, room, "%s run '%s'%s%s", onwards ? "from" : "in", name_of(t, runs, s->run),
             onwards ? " on" : "", other);
}

static void say_what(const struct job *job, enum suspects_kind kind, const struct suspect *s,
                     char *to, size_t room)
{
    const char *a = job->sensors[s->sensor].name, *b = job->sensors[s->with].name;

    if (kind == SUSPECTS_TAPE)
        snprintf(to, room, "all lags had shifted by %.0f deg", s->angle_deg);
    else if (kind == SUSPECTS_SWAP)
        snprintf(to, room, "'%s' and '%s' had been exchanged", a, b);
    else
        snprintf(to, room, "'%s' had been turned by %.0f deg", a, s->angle_deg);
}

static void report(const struct table *t, const struct vet_runs *runs, const struct job *job,
                   const char *condition, enum suspects_kind kind, const struct suspect *s,
                   bool hidden, struct findings *findings)
{
    static const enum check checks[] = {CHECK_TAPE_MOVED, CHECK_SENSOR_SWAPPED,
                                        CHECK_SENSOR_TURNED};
    static const char *const things[] = {"a shift of all lags", "an exchange of sensors",
                                         "a turned sensor"};
    enum check check = checks[kind];
    char where[160], what[128];

    if (!s->likely && (hidden || !s->spare))
        return; /* nothing was judged */
    if (!s->likely) {
        findings_rule(findings, check, RULING_OK, -1, -1, 1, findings->limits->rows[check].caution,
                      "", "the runs of condition '%s' do not call for %s", condition, things[kind]);
        return;
    }
    say_where(t, runs, kind, s, where, sizeof where);
    say_what(job, kind, s, what, sizeof what);
    findings_add(findings, check, (int)t->positions[s->run],
                 kind == SUSPECTS_TURN ? (int)s->sensor : -1, s->better,
                 "the runs would fit %g times better if %s %s", findings_figure(s->better), what,
                 where);
}

/* *hidden is set where something may have been moved without a trace. */
static void check_condition(struct table *t, struct vet_runs *runs, const size_t *order,
                            const struct job *job, const char *condition, bool *hidden,
                            struct findings *findings)
{
    struct suspects_set set;
    bool here = false, likely = false;

    gather(t, runs, order, job, condition);
    if (t->count < 2)
        return; /* nothing to compare */
    fill(t, runs, order, job, condition);
    set = (struct suspects_set){t->count,   job->sensor_count, job->plane_count, t->weights,
                                t->vectors, t->variance,       t->repeatability, t->alike};
    for (int kind = SUSPECTS_TAPE; kind <= SUSPECTS_TURN; kind++) {
        struct suspect suspect;
        if (kind == SUSPECTS_SWAP && job->sensor_count < 2)
            continue;
        if (suspects_find(&set, (enum suspects_kind)kind, &suspect)) {
            findings->failed = true;
            return;
        }
        here = here || suspect.hidden || (kind == SUSPECTS_TAPE && !suspect.spare);
        likely = likely || (kind == SUSPECTS_TAPE && suspect.likely);
        report(t, runs, job, condition, (enum suspects_kind)kind, &suspect, here, findings);
    }
    *hidden = *hidden || (here && !likely);
}

static bool table_init(struct table *t, size_t runs, size_t sensors, size_t planes)
{
    *t = (struct table){0};
    t->positions = malloc((runs + 1) * sizeof *t->positions);
    t->hours = malloc((runs + 1) * sizeof *t->hours);
    t->weights = malloc((runs * planes + 1) * sizeof *t->weights);
    t->vectors = malloc((runs * sensors + 1) * sizeof *t->vectors);
    t->variance = malloc((runs * sensors + 1) * sizeof *t->variance);
    t->repeatability = malloc((sensors + 1) * sizeof *t->repeatability);
    t->alike = malloc((sensors * sensors + 1) * sizeof *t->alike);
    return t->positions && t->hours && t->weights && t->vectors && t->variance &&
           t->repeatability && t->alike;
}

static void table_release(struct table *t)
{
    free(t->alike);
    free(t->repeatability);
    free(t->variance);
    free(t->vectors);
    free(t->weights);
    free(t->hours);
    free(t->positions);
}

void moved_check(struct vet_runs *runs, const size_t *order, const struct job *job,
                 struct findings *findings)
{
    size_t named = 0; /* runs of the job's sheet; those of an audit are not compared */
    bool hidden = false;
    struct table t;

    while (named < runs->count && runs->items[order[named]].index >= 0)
        named++;
    if (named == 0)
        return;
    if (!table_init(&t, named, job->sensor_count, job->plane_count))
        findings->failed = true;
    for (size_t k = 0; !findings->failed && k < named; k++)
        if (across_first_of_condition(runs, order, job, k))
            check_condition(&t, runs, order, job, runs->items[order[k]].condition, &hidden,
                            findings);
    if (!findings->failed && hidden)
        findings_rule(findings, CHECK_TAPE_MOVED, RULING_OK, -1, -1, NAN, NAN, "",
                      "not checkable with these runs: a second trial at another angle, or as found "
                      "repeated after the trial, would show a moved tape, a swapped or turned "
                      "sensor, a wrong counting sense");
    table_release(&t);
}
