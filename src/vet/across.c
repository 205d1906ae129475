#include "vet/across.h"

#include <math.h>
#include <stdio.h>
#include <stdlib.h>
#include <string.h>

#include "base/angle.h"
#include "sheet/units.h"
#include "vet/moved.h"
#include "vet/repeats.h"
#include "vet/speeds.h"
#include "vet/trials.h"
#include "vet/when.h"
#include "vet/within.h"

/* Of the service speed: unbalance does there less than a sixteenth. Common practice. */
static const double RUNOUT_SHARE_MOST = 0.25;
static const double CHI2_99 = 9.21034; /* chi-squared with 2 degrees of freedom, 99 % */

/* The k-th run of the sheet's order where it is an ordinary run of the job, else NULL. */
static struct vet_run *ordinary(const struct vet_runs *runs, const size_t *order,
                                const struct job *job, size_t k)
{
    struct vet_run *run = &runs->items[order[k]];

    return run->index >= 0 && !facts_role(run, job)[0] ? run : NULL;
}

static bool same_weights(const struct vet_run *a, const struct vet_run *b, const struct job *job,
                         size_t *planes)
{
    size_t differ = 0;

    for (size_t p = 0; p < job->plane_count; p++) {
        double complex u = job_run_weight(job, (size_t)a->index, p);
        double complex v = job_run_weight(job, (size_t)b->index, p);
        differ += cabs(u - v) > 1e-9 * (cabs(u) + cabs(v)); /* beyond rounding of angles */
    }
    if (planes)
        *planes = differ;
    return differ == 0;
}

bool across_stands_alone(const struct vet_run *run, const struct job *job)
{
    if (run->parent >= 0 || facts_role(run, job)[0])
        return false;
    for (size_t r = 0; run->index >= 0 && r < (size_t)run->index; r++)
        if (job_run_is_bare(job, r) && !job->runs[r].role[0] &&
            !strcmp(job->runs[r].condition, run->condition))
            return false;
    return run->index < 0 || job_run_is_bare(job, (size_t)run->index);
}

size_t *across_order(const struct vet_runs *runs, const struct job *job)
{
    size_t *order = malloc((runs->count + 1) * sizeof *order), count = 0;

    for (size_t r = 0; order && r < job->run_count; r++)
        for (size_t k = 0; k < runs->count; k++)
            if (runs->items[k].index == (int)r)
                order[count++] = k;
    for (size_t k = 0; order && k < runs->count; k++)
        if (runs->items[k].index < 0)
            order[count++] = k;
    return order;
}

double across_as_found(const struct vet_runs *runs, const size_t *order, const struct job *job,
                       const char *condition, size_t sensor)
{
    double refused = NAN;

    for (size_t k = 0; k < runs->count; k++) {
        const struct vet_run *run = ordinary(runs, order, job, k);
        if (!run || strcmp(run->condition, condition) != 0 || !run->readings[sensor].present ||
            !job_run_is_bare(job, (size_t)run->index))
            continue;
        if (run->readings[sensor].use)
            return run->readings[sensor].amplitude;
        if (isnan(refused))
            refused = run->readings[sensor].amplitude;
    }
    return refused;
}

double across_target(const struct job *job, const struct vet_reading *reading, size_t sensor)
{
    const struct job_target *target = job->aim.targets ? &job->aim.targets[sensor] : NULL;

    if (!target || isnan(target->amplitude))
        return NAN;
    return cabs(units_convert(target->amplitude, target->quantity, job->sensors[sensor].quantity,
                              2 * PI * reading->speed_rpm / 60));
}

static bool share_file(const struct vet_run *a, const struct vet_run *b)
{
    for (size_t i = 0; i < a->hash_count; i++)
        for (size_t j = 0; j < b->hash_count; j++)
            if (a->hashes[i][0] && !strcmp(a->hashes[i], b->hashes[j]))
                return true;
    return false;
}

/* A recording of an audit is judged by itself, and its verdict is the one it has alone; that another
 * one is the same file is told of both, as a finding about neither. */
static void same_in_audit(const struct vet_runs *runs, const size_t *order, size_t k,
                          struct findings *findings)
{
    const struct vet_run *run = &runs->items[order[k]];

    for (size_t m = 0; m < k; m++) {
        const struct vet_run *seen = &runs->items[order[m]];
        if (seen->index < 0 && seen->parent < 0 && share_file(run, seen)) {
            findings_instead(findings, "one of the two names is wrong, or it was copied");
            findings_rule(findings, CHECK_SAME_RECORDING, RULING_CAUTION, -1, -1, 1, 0, "",
                          "recordings '%s' and '%s' have the same content (SHA-256)", seen->name,
                          run->name);
            return;
        }
    }
}

void across_same_recording(struct vet_runs *runs, const size_t *order, const struct job *job,
                           struct findings *findings)
{
    for (size_t k = 0; k < runs->count; k++) {
        struct vet_run *run = &runs->items[order[k]];
        const struct vet_run *other = NULL;
        enum ruling ruling;
        if (run->index < 0 && run->parent < 0)
            same_in_audit(runs, order, k, findings);
        if (run->index < 0 || run->hash_count == 0)
            continue;
        for (size_t m = 0; m < runs->count && !other; m++) {
            const struct vet_run *seen = &runs->items[order[m]];
            if (m != k && seen->index >= 0 && share_file(run, seen) &&
                (m < k || !same_weights(run, seen, job, NULL)))
                other = seen;
        }
        ruling = other ? findings_add(findings, CHECK_SAME_RECORDING, (int)order[k], -1, 1,
                                      "run '%s' has the same recording (SHA-256)", other->name)
                       : findings_add(findings, CHECK_SAME_RECORDING, (int)order[k], -1, 0,
                                      "no other run has this recording");
        if (ruling == RULING_REFUSE)
            within_refuse(run, job);
    }
}

/* Readings of the run: all, and those with phase. */
static size_t count_phase(const struct vet_run *run, const struct job *job, size_t *phase)
{
    size_t present = 0;

    *phase = 0;
    for (size_t i = 0; i < job->sensor_count; i++) {
        present += run->readings[i].present;
        *phase += run->readings[i].present && run->readings[i].has_phase;
    }
    return present;
}

/* One finding for the run, about the sensor where only one of several has no phase. */
static void refer(struct vet_run *run, int position, const struct job *job, enum ruling ruling,
                  struct findings *findings)
{
    size_t phase, present = count_phase(run, job, &phase);
    int sensor = -1;
    char hint[200];

    for (size_t i = 0; present - phase == 1 && present > 1 && i < job->sensor_count; i++)
        if (run->readings[i].present && !run->readings[i].has_phase)
            sensor = (int)i;
    if (run->hand)
        findings_instead(findings,
                         ruling == RULING_REFUSE
                             ? "note the lag, too, or leave the run out"
                             : "amplitudes alone may serve; note the lag, too, if you can");
    else if (!job->has_tacho)
        findings_instead(findings, "name the tacho's channel under [tacho]");
    else
        within_hint_marks(run, job, hint, sizeof hint, findings);
    ruling = findings_rule(findings, CHECK_PHASE_REFERENCE, ruling, position, sensor, 1, 0, "",
                           "lag cannot be read: %s",
                           run->hand         ? "only an amplitude was noted"
                           : !job->has_tacho ? "the sheet has no [tacho]"
                           : run->marks > 0  ? "the marks of a turn cannot be told apart"
                                             : "there are no tacho marks");
    for (size_t i = 0; ruling == RULING_REFUSE && i < job->sensor_count; i++)
        if (run->readings[i].present && !run->readings[i].has_phase)
            run->readings[i].use = false;
}

void across_phase_reference(struct vet_runs *runs, const size_t *order, const struct job *job,
                            struct findings *findings)
{
    bool any = job->plane_count > 1; /* the amplitudes alone serve one plane only */
    size_t phase;

    for (size_t k = 0; k < runs->count; k++) {
        const struct vet_run *run = ordinary(runs, order, job, k);
        if (run && count_phase(run, job, &phase) > 0)
            any = any || phase > 0;
    }
    for (size_t k = 0; k < runs->count; k++) {
        struct vet_run *run = ordinary(runs, order, job, k);
        if (run && !run->unreadable && count_phase(run, job, &phase) != phase)
            refer(run, (int)order[k], job, any ? RULING_REFUSE : RULING_CAUTION, findings);
    }
}

static int ascending(const void *a, const void *b)
{
    double x = *(const double *)a, y = *(const double *)b;

    return (x > y) - (x < y);
}

static double median(double *values, size_t count)
{
    qsort(values, count, sizeof *values, ascending);
    return count % 2 ? values[count / 2] : 0.5 * (values[count / 2 - 1] + values[count / 2]);
}

/* Readings of coast-downs stand at the speed that was asked for. */
static bool matched(const struct vet_run *run, const char *condition)
{
    return run && run->parent < 0 && !strcmp(run->condition, condition);
}

/* Judges one condition's speeds once; true where a run was refused and the rest is to be judged
 * again. `room` holds one value per run. */
static bool match_once(struct vet_runs *runs, const size_t *order, const struct job *job,
                       const char *condition, double *room, struct findings *findings)
{
    double least = INFINITY, most = -INFINITY, sum = 0, middle, furthest = -1, spread;
    size_t count = 0, worst = 0;
    enum ruling ruling;
    double limit;

    for (size_t k = 0; k < runs->count; k++) {
        const struct vet_run *run = ordinary(runs, order, job, k);
        double speed = matched(run, condition) ? facts_speed(run, job, true) : NAN;
        if (isnan(speed))
            continue;
        room[count++] = speed;
        sum += speed;
        least = fmin(least, speed);
        most = fmax(most, speed);
    }
    if (count < 2)
        return false;
    middle = median(room, count);
    for (size_t k = 0; k < runs->count; k++) {
        const struct vet_run *run = ordinary(runs, order, job, k);
        double speed = matched(run, condition) ? facts_speed(run, job, true) : NAN;
        if (fabs(speed - middle) >= furthest * (1 - 1e-12)) { /* of two alike the later */
            furthest = fabs(speed - middle);
            worst = order[k];
        }
    }
    spread = 100 * (most - least) / (sum / (double)count);
    ruling = limits_judge(findings->limits, CHECK_SPEED_MATCH, spread, &limit);
    ruling =
        findings_add(findings, CHECK_SPEED_MATCH, ruling == RULING_REFUSE ? (int)worst : -1, -1,
                     spread, "runs of condition '%s' turned at %.0f to %.0f rpm, %g %% apart%s",
                     condition, least, most, findings_figure(spread),
                     ruling == RULING_CAUTION ? ", which makes their readings less sure" : "");
    if (ruling == RULING_REFUSE)
        within_refuse(&runs->items[worst], job);
    return ruling == RULING_REFUSE;
}

bool across_first_of_condition(const struct vet_runs *runs, const size_t *order,
                               const struct job *job, size_t k)
{
    const struct vet_run *run = ordinary(runs, order, job, k);

    for (size_t m = 0; run && m < k; m++) {
        const struct vet_run *seen = ordinary(runs, order, job, m);
        if (seen && !strcmp(seen->condition, run->condition))
            return false;
    }
    return run != NULL;
}

void across_speed_match(struct vet_runs *runs, const size_t *order, const struct job *job,
                        struct findings *findings)
{
    double *room = malloc((runs->count + 1) * sizeof *room);

    if (!room) {
        findings->failed = true;
        return;
    }
    for (size_t k = 0; k < runs->count; k++) {
        if (!across_first_of_condition(runs, order, job, k))
            continue;
        while (match_once(runs, order, job, runs->items[order[k]].condition, room, findings))
            continue;
    }
    free(room);
}

static bool usable(const struct vet_run *run, size_t sensor)
{
    const struct vet_reading *r = &run->readings[sensor];

    return r->present && r->use && r->has_phase;
}

/* d' C^-1 d with C the sum of both covariances; infinite for a difference without any. */
static double distance(double complex d, const double a[3], const double b[3])
{
    double re = a[0] + b[0], both = a[1] + b[1], im = a[2] + b[2];
    double det = re * im - both * both, x = creal(d), y = cimag(d);

    if (!(det > 0))
        return cabs(d) > 0 ? INFINITY : 0;
    return (im * x * x - 2 * both * x * y + re * y * y) / det;
}

size_t across_repeats_of(const struct vet_runs *runs, const size_t *order, const struct job *job,
                         size_t k, size_t sensor, size_t *members)
{
    const struct vet_run *run = ordinary(runs, order, job, k);
    size_t count = 0;

    for (size_t m = 0; run && usable(run, sensor) && m < runs->count; m++) {
        const struct vet_run *other = ordinary(runs, order, job, m);
        if (!other || !usable(other, sensor) || strcmp(other->condition, run->condition) != 0 ||
            !same_weights(run, other, job, NULL))
            continue;
        if (m < k)
            return 0;
        members[count++] = order[m];
    }
    return count;
}

static double complex median_vector(const struct vet_runs *runs, const size_t *members,
                                    size_t count, size_t sensor, double *room)
{
    double re;

    for (size_t i = 0; i < count; i++)
        room[i] = creal(runs->items[members[i]].readings[sensor].vector);
    re = median(room, count);
    for (size_t i = 0; i < count; i++)
        room[i] = cimag(runs->items[members[i]].readings[sensor].vector);
    return CMPLX(re, median(room, count));
}

/* ", 25 min before" where both runs tell when they were recorded, else nothing. */
static void say_hours(const struct job *job, const struct vet_run *run, const struct vet_run *other,
                      char *to, size_t room)
{
    double hours =
        when_hours(job->runs[run->index].when) - when_hours(job->runs[other->index].when);

    bool short_time = fabs(hours) < 2;

    to[0] = '\0';
    if (fabs(hours) > 0)
        snprintf(to, room, ", %.0f %s %s", fabs(hours) * (short_time ? 60 : 1),
                 short_time ? "min" : "h", hours > 0 ? "before" : "after");
}

/* Compares a member with the other one (two) or the median (more); true where it is refused. */
static bool judge_repeat(const struct vet_runs *runs, const struct job *job, const size_t *members,
                         size_t count, size_t which, size_t sensor, double complex middle,
                         double floor, struct findings *findings)
{
    char hours[40];
    const struct vet_run *run = &runs->items[members[which]];
    const struct vet_run *other = &runs->items[members[which == 0]];
    const struct vet_reading *r = &run->readings[sensor], *o = &other->readings[sensor];
    double complex d = r->vector - (count == 2 ? o->vector : middle);
    double scale = fmax(fmax(r->amplitude, o->amplitude), isnan(floor) ? 0 : floor);
    double value = scale > 0 ? 100 * cabs(d) / scale : 0, limit;
    enum ruling ruling = limits_judge(findings->limits, CHECK_REPEAT, value, &limit);
    bool beyond = distance(d, r->cov, o->cov) > CHI2_99;

    if (!beyond) {
        ruling = RULING_OK;
        limit = findings->limits->rows[CHECK_REPEAT].caution;
    }
    if (count == 2 && which == 0 && ruling != RULING_REFUSE)
        return false; /* one finding for the pair, unless both are refused */
    say_hours(job, run, other, hours, sizeof hours);
    ruling = findings_rule(
        findings, CHECK_REPEAT, ruling, (int)members[which], (int)sensor, value, limit, "%",
        "%s %g %% from %s%s%s%s", beyond ? "stands" : "within its own uncertainty stands",
        findings_figure(value), count == 2 ? "its repeat '" : "the median of its repeats",
        count == 2 ? other->name : "", count == 2 ? "'" : "", count == 2 ? hours : "");
    return ruling == RULING_REFUSE;
}

static void repeat_sensor(struct vet_runs *runs, const size_t *order, const struct job *job,
                          size_t sensor, size_t *members, double *room, struct findings *findings)
{
    for (size_t k = 0; k < runs->count; k++) {
        size_t count = across_repeats_of(runs, order, job, k, sensor, members);
        double complex middle;
        double floor;
        if (count < 2)
            continue;
        middle = median_vector(runs, members, count, sensor, room);
        floor = across_as_found(runs, order, job, runs->items[order[k]].condition, sensor);
        for (size_t i = 0; i < count; i++) /* room: who is refused, once all have been compared */
            room[i] = judge_repeat(runs, job, members, count, i, sensor, middle, floor, findings);
        for (size_t i = 0; i < count; i++)
            if (room[i] > 0)
                runs->items[members[i]].readings[sensor].use = false;
    }
}

void across_repeat(struct vet_runs *runs, const size_t *order, const struct job *job,
                   struct findings *findings)
{
    size_t *members = malloc((runs->count + 1) * sizeof *members);
    double *room = malloc((runs->count + 1) * sizeof *room);

    if (!members || !room)
        findings->failed = true;
    for (size_t i = 0; members && room && i < job->sensor_count; i++)
        repeat_sensor(runs, order, job, i, members, room, findings);
    free(room);
    free(members);
}

void across_low_level(struct vet_runs *runs, const size_t *order, const struct job *job,
                      struct findings *findings)
{
    for (size_t k = 0; job->aim.targets && k < runs->count; k++) {
        const struct vet_run *run = ordinary(runs, order, job, k);
        if (!run || !job_run_is_bare(job, (size_t)run->index))
            continue;
        for (size_t i = 0; i < job->sensor_count; i++) {
            const struct vet_reading *r = &run->readings[i];
            double share;
            if (!r->present || !r->use)
                continue;
            share = r->amplitude / across_target(job, r, i);
            if (!isnan(share))
                findings_add(findings, CHECK_LOW_LEVEL, (int)order[k], (int)i, share <= 1,
                             "1x is %g %% of the target", findings_figure(100 * share));
        }
    }
}

void across_runout(struct vet_runs *runs, const size_t *order, const struct job *job,
                   struct findings *findings)
{
    double service = job->service_rpm;

    for (size_t k = 0; !(service > 0) && k < runs->count; k++) {
        const struct vet_run *run = ordinary(runs, order, job, k);
        service = run ? facts_speed(run, job, false) : NAN;
    }
    for (size_t k = 0; k < runs->count; k++) {
        struct vet_run *run = &runs->items[order[k]];
        double speed = facts_speed(run, job, false), share = speed / service;
        enum ruling ruling = share < RUNOUT_SHARE_MOST ? RULING_OK : RULING_REFUSE;
        if (strcmp(facts_role(run, job), "runout") != 0 || isnan(share))
            continue;
        findings_instead(findings, "take the slow roll slower, or correct the sheet");
        ruling = findings_rule(findings, CHECK_SERVICE_SPEED, ruling, (int)order[k], -1,
                               100 * share, 100 * RUNOUT_SHARE_MOST, "%",
                               "runout was taken at %.0f rpm, %g %% of the service speed%s", speed,
                               findings_figure(100 * share),
                               ruling == RULING_OK ? "" : ", where unbalance shows");
        if (ruling == RULING_REFUSE)
            within_refuse(run, job);
    }
}

int across_runs(struct vet_runs *runs, const size_t *order, const struct job *job,
                struct findings *findings)
{
    across_same_recording(runs, order, job, findings);
    across_phase_reference(runs, order, job, findings);
    across_runout(runs, order, job, findings);
    across_speed_match(runs, order, job, findings);
    moved_check(runs, order, job, findings);
    repeats_trend(runs, order, job, findings);
    repeats_resonance(runs, order, job, findings);
    across_repeat(runs, order, job, findings);
    trials_effect(runs, order, job, findings);
    across_low_level(runs, order, job, findings);
    speeds_widen(runs, order, job,
                 findings); /* last: what is assumed widens, and refuses no trial */
    return findings->failed ? -1 : 0;
}
