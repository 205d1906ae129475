#include "solve/sits.h"

#include <math.h>
#include <stdio.h>

#include "base/angle.h"
#include "solve/judge.h"

/* The weights that stay on; their number is 0 where everything comes off. */
static size_t staying(const struct job *job, const struct job_weight **weights)
{
    *weights = NULL;
    if (job->aim.mounted < 0)
        return 0;
    *weights = job->runs[job->aim.mounted].weights;
    return job->runs[job->aim.mounted].weight_count;
}

static bool is_here(const struct job_weight *w, size_t plane, double angle_deg)
{
    return w->plane == plane &&
           fabs(angle_wrap_180(w->angle_deg - angle_deg)) <= SITS_NEAR_DEG + 1e-9;
}

/* What the limits count of one weight. */
static double counted(const struct job *job, const struct job_weight *w)
{
    double sign = job->planes[w->plane].work == WORK_REMOVE ? -1 : 1;
    return fmax(0, sign * w->mounted_mass);
}

static double mounted(const struct job *job, const struct job_weight *w)
{
    (void)job;
    return w->mounted_mass;
}

static double equivalent(const struct job *job, const struct job_weight *w)
{
    (void)job;
    return w->mass;
}

/* Of what stays at one place, the sum of what `of` tells of each weight. */
static double sum_at(const struct job *job, size_t plane, double angle_deg,
                     double (*of)(const struct job *, const struct job_weight *))
{
    const struct job_weight *w;
    double sum = 0;
    for (size_t n = staying(job, &w); n > 0; n--, w++)
        sum += is_here(w, plane, angle_deg) ? of(job, w) : 0;
    return sum;
}

double sits_mass(const struct job *job, size_t plane, double angle_deg)
{
    return sum_at(job, plane, angle_deg, mounted);
}

double sits_equivalent(const struct job *job, size_t plane, double angle_deg)
{
    return sum_at(job, plane, angle_deg, equivalent);
}

double sits_at(const struct job *job, size_t plane, double angle_deg)
{
    return sum_at(job, plane, angle_deg, counted);
}

double sits_in_all(const struct job *job, size_t plane)
{
    const struct job_weight *w;
    double sum = 0;
    for (size_t n = staying(job, &w); n > 0; n--, w++)
        sum += w->plane == plane ? counted(job, w) : 0;
    return sum;
}

bool sits_nowhere(const struct job *job, size_t p, char *text, size_t size)
{
    const struct job_plane *plane = &job->planes[p];
    const char *unit = job->units == UNITS_US ? "oz" : "g";
    double kg = job->units == UNITS_US ? 0.45359237 / 16 : 1e-3, least = INFINITY;
    double most = fmin(plane->most, plane->most_in_all - sits_in_all(job, p));
    bool open = plane->any_position;
    for (size_t i = 0; i < plane->position_count; i++)
        open = open || !plane->positions[i].taken;
    for (size_t i = 0; i < plane->stock_count; i++)
        least = fmin(least, plane->stock[i].mass);
    if (!open)
        snprintf(text, size, "all positions of '%s' are taken", plane->name);
    else if (plane->stock_count > 0 && least > most * (1 + 1e-12))
        snprintf(
            text, size,
            "the sheet's limits exclude every weight on '%s': smallest piece %s %s, most %s %s",
            plane->name, judge_figure(least / kg, 3).text, unit,
            judge_figure(fmax(0, most) / kg, 3).text, unit);
    else
        return false;
    return true;
}

bool sits_only_removed(const struct job *job, size_t run)
{
    for (size_t i = 0; i < job->runs[run].weight_count; i++)
        if (!(job->runs[run].weights[i].mounted_mass < 0))
            return false;
    return job->runs[run].weight_count > 0;
}
