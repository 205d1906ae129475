#include "solve/sits.h"

#include <math.h>

#include "base/angle.h"

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

double sits_mass(const struct job *job, size_t plane, double angle_deg)
{
    const struct job_weight *w;
    double sum = 0;
    for (size_t n = staying(job, &w); n > 0; n--, w++)
        sum += is_here(w, plane, angle_deg) ? w->mounted_mass : 0;
    return sum;
}

double sits_equivalent(const struct job *job, size_t plane, double angle_deg)
{
    const struct job_weight *w;
    double sum = 0;
    for (size_t n = staying(job, &w); n > 0; n--, w++)
        sum += is_here(w, plane, angle_deg) ? w->mass : 0;
    return sum;
}

double sits_at(const struct job *job, size_t plane, double angle_deg)
{
    const struct job_weight *w;
    double sum = 0;
    for (size_t n = staying(job, &w); n > 0; n--, w++)
        sum += is_here(w, plane, angle_deg) ? counted(job, w) : 0;
    return sum;
}

double sits_in_all(const struct job *job, size_t plane)
{
    const struct job_weight *w;
    double sum = 0;
    for (size_t n = staying(job, &w); n > 0; n--, w++)
        sum += w->plane == plane ? counted(job, w) : 0;
    return sum;
}
