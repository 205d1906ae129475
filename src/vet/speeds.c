#include "vet/speeds.h"

#include <math.h>
#include <string.h>

#include "base/angle.h"

static const double GROWTH = 0.04; /* of the vector for each % of speed, as the header says */

double speeds_variance(double percent, double amplitude, const struct resonance *found,
                       double limit)
{
    double moved = percent * amplitude, floor = GROWTH * GROWTH / 4;
    double assumed = limit * PI / 180, told = hypot(found->slope, found->error) * PI / 180;
    double share = found->error < limit / 2 ? fmax(floor, told * told / 2) : assumed * assumed / 4;

    return share * moved * moved;
}

/* A run of the condition whose speed counts; its speed, or NaN. */
static double speed_in(const struct vet_run *run, const struct job *job, const char *condition)
{
    if (run->index < 0 || run->parent >= 0 || facts_role(run, job)[0] ||
        strcmp(run->condition, condition) != 0)
        return NAN;
    return facts_speed(run, job, true);
}

static void widen_run(struct vet_run *run, const struct job *job, double reference, double limit)
{
    for (size_t i = 0; i < job->sensor_count; i++) {
        struct vet_reading *r = &run->readings[i];
        double percent = 100 * (r->speed_rpm / reference - 1);
        if (!r->present || !r->use || isnan(percent))
            continue;
        r->by_speed = speeds_variance(percent, r->amplitude, &r->resonance, limit);
        r->widen[0] += r->by_speed;
        r->widen[2] += r->by_speed;
    }
}

static void widen_condition(struct vet_runs *runs, const size_t *order, const struct job *job,
                            const char *condition, const struct findings *findings)
{
    double least = INFINITY, most = -INFINITY, sum = 0, count = 0, first = NAN, bare = NAN, limit;

    for (size_t k = 0; k < runs->count; k++) {
        const struct vet_run *run = &runs->items[order[k]];
        double speed = speed_in(run, job, condition);
        if (isnan(speed))
            continue;
        least = fmin(least, speed);
        most = fmax(most, speed);
        sum += speed;
        first = count++ > 0 ? first : speed;
        if (isnan(bare) && job_run_is_bare(job, (size_t)run->index))
            bare = speed;
    }
    if (limits_judge(findings->limits, CHECK_SPEED_MATCH, 100 * (most - least) / (sum / count),
                     &limit) != RULING_CAUTION)
        return;
    limit = findings->limits->rows[CHECK_NEAR_RESONANCE].caution;
    for (size_t k = 0; k < runs->count; k++)
        if (!isnan(speed_in(&runs->items[order[k]], job, condition)))
            widen_run(&runs->items[order[k]], job, isnan(bare) ? first : bare, limit);
}

void speeds_widen(struct vet_runs *runs, const size_t *order, const struct job *job,
                  const struct findings *findings)
{
    if (findings->limits->rows[CHECK_SPEED_MATCH].off)
        return;
    for (size_t k = 0; k < runs->count; k++) {
        const char *condition = runs->items[order[k]].condition;
        bool seen = false;
        for (size_t m = 0; m < k && !seen; m++)
            seen = !strcmp(runs->items[order[m]].condition, condition);
        if (!seen)
            widen_condition(runs, order, job, condition, findings);
    }
}
