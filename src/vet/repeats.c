#include "vet/repeats.h"

#include <math.h>
#include <stdlib.h>

#include "base/angle.h"
#include "vet/across.h"
#include "vet/resonance.h"
#include "vet/when.h"
#include "vet/within.h"

static const double CHANCE = 0.01; /* of a line in mere scatter, common practice */

static double scale_of(const struct vet_runs *runs, const size_t *order, const struct job *job,
                       const struct vet_run *run, size_t sensor)
{
    double floor = across_as_found(runs, order, job, run->condition, sensor);

    return fmax(run->readings[sensor].amplitude, isnan(floor) ? 0 : floor);
}

/* Vectors and times of the members; false where a time is not known. */
static bool over_time(const struct vet_runs *runs, const size_t *members, size_t count,
                      const struct job *job, size_t sensor, double *hours, double complex *vectors)
{
    bool known = true;

    for (size_t i = 0; i < count; i++) {
        const struct vet_run *run = &runs->items[members[i]];
        hours[i] = when_hours(job->runs[run->index].when);
        vectors[i] = run->readings[sensor].vector;
        known = known && !isnan(hours[i]);
    }
    return known;
}

static void trend_of(struct vet_runs *runs, const size_t *order, const struct job *job,
                     const size_t *members, size_t count, size_t sensor, double *hours,
                     double complex *vectors, struct findings *findings)
{
    const struct vet_run *run = &runs->items[members[0]];
    struct when_trend trend;
    double value, first = INFINITY, last = -INFINITY;

    if (count < 3 || !over_time(runs, members, count, job, sensor, hours, vectors))
        return;
    trend = when_trend_of(hours, vectors, count);
    if (!(trend.chance < CHANCE))
        return;
    for (size_t i = 0; i < count; i++) {
        first = fmin(first, hours[i]);
        last = fmax(last, hours[i]);
    }
    value = 100 * cabs(trend.move) / scale_of(runs, order, job, run, sensor);
    findings_add(
        findings, CHECK_REPEAT, -1, (int)sensor, value,
        "'%s' and its repeats moved steadily with the time of recording, by %g %% in %.3g h",
        run->name, findings_figure(value), last - first);
}

void repeats_trend(struct vet_runs *runs, const size_t *order, const struct job *job,
                   struct findings *findings)
{
    size_t *members = malloc((runs->count + 1) * sizeof *members);
    double *hours = malloc((runs->count + 1) * sizeof *hours);
    double complex *vectors = malloc((runs->count + 1) * sizeof *vectors);

    if (!members || !hours || !vectors)
        findings->failed = true;
    for (size_t i = 0; !findings->failed && i < job->sensor_count; i++) {
        for (size_t k = 0; k < runs->count; k++) {
            size_t count = across_repeats_of(runs, order, job, k, i, members);
            trend_of(runs, order, job, members, count, i, hours, vectors, findings);
        }
    }
    free(vectors);
    free(hours);
    free(members);
}

/* Variance of a reading's lag, deg^2: one component across the vector over its square. */
static double lag_variance(const struct vet_reading *r, double repeatability)
{
    double own = 0.5 * (r->cov[0] + r->cov[2] + r->widen[0] + r->widen[2]);

    return (own + repeatability * repeatability) / (r->amplitude * r->amplitude) *
           (180 / PI * 180 / PI);
}

static void turn_of(struct vet_runs *runs, const size_t *order, const struct job *job,
                    const size_t *members, size_t count, size_t sensor, struct findings *findings)
{
    const struct check_row *row = &findings->limits->rows[CHECK_NEAR_RESONANCE];
    const struct vet_run *slow = &runs->items[members[0]], *fast = slow;
    const struct vet_reading *a, *b;
    struct resonance found;
    double scale, repeatability;

    for (size_t i = 1; i < count; i++) {
        const struct vet_run *run = &runs->items[members[i]];
        if (run->readings[sensor].speed_rpm < slow->readings[sensor].speed_rpm)
            slow = run;
        if (run->readings[sensor].speed_rpm > fast->readings[sensor].speed_rpm)
            fast = run;
    }
    a = &slow->readings[sensor];
    b = &fast->readings[sensor];
    scale = scale_of(runs, order, job, slow, sensor);
    if (fmin(a->amplitude, b->amplitude) < WITHIN_LAG_SHARE * scale)
        return;
    repeatability = job->aim.repeatability * scale;
    found = resonance_of_two(a->vector, a->speed_rpm, b->vector, b->speed_rpm,
                             lag_variance(a, repeatability) + lag_variance(b, repeatability));
    if (!(found.error <= row->caution / 3))
        return;
    findings_add(
        findings, CHECK_NEAR_RESONANCE, -1, (int)sensor, fabs(found.slope),
        "from '%s' at %.0f rpm to '%s' at %.0f rpm the lag turned by %g deg per %% of speed",
        slow->name, a->speed_rpm, fast->name, b->speed_rpm, findings_figure(found.slope));
}

void repeats_resonance(struct vet_runs *runs, const size_t *order, const struct job *job,
                       struct findings *findings)
{
    size_t *members = malloc((runs->count + 1) * sizeof *members);

    if (!members)
        findings->failed = true;
    for (size_t i = 0; members && i < job->sensor_count; i++) {
        for (size_t k = 0; k < runs->count; k++) {
            size_t count = across_repeats_of(runs, order, job, k, i, members);
            if (count >= 2)
                turn_of(runs, order, job, members, count, i, findings);
        }
    }
    free(members);
}
