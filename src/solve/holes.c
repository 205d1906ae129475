#include "solve/holes.h"

#include <math.h>
#include <stdio.h>

#include "base/angle.h"
#include "solve/sits.h"

struct close { /* the closest two so far */
    double distance, angles_deg[2];
    const char *what; /* the second of them is */
    size_t plane;
};

double holes_distance(double radius, double apart_deg)
{
    return 2 * radius * sin(fabs(angle_wrap_180(apart_deg)) / 2 * PI / 180);
}

static void compare(const struct answer *a, const struct place_item *item, double angle_deg,
                    const char *what, struct close *closest)
{
    double apart = fabs(angle_wrap_180(item->angle_deg - angle_deg));
    double distance = holes_distance(a->model->job->planes[item->plane].radius_m, apart);
    if (apart > SITS_NEAR_DEG && distance < closest->distance)
        *closest = (struct close){distance, {item->angle_deg, angle_deg}, what, item->plane};
}

static void compare_all(const struct answer *a, size_t i, struct close *closest)
{
    const struct place_item *items = a->placement.best.items, *item = &items[i];
    const struct job *job = a->model->job;
    const struct job_plane *plane = &job->planes[item->plane];
    for (size_t k = 0; k < i; k++)
        if (items[k].plane == item->plane)
            compare(a, item, items[k].angle_deg, "", closest);
    for (size_t k = 0; k < plane->position_count; k++)
        if (plane->positions[k].taken)
            compare(a, item, plane->positions[k].angle_deg, ", which is taken,", closest);
    const struct job_run *mounted = job->aim.mounted < 0 ? NULL : &job->runs[job->aim.mounted];
    for (size_t k = 0; mounted && k < mounted->weight_count; k++)
        if (mounted->weights[k].plane == item->plane && mounted->weights[k].mounted_mass < 0)
            compare(a, item, mounted->weights[k].angle_deg, ", which stays,", closest);
}

bool holes_overlap(const struct answer *a, struct advice_finding *f)
{
    const struct job *job = a->model->job;
    struct close closest = {.distance = INFINITY};
    for (size_t i = 0; i < a->placement.best.count; i++) {
        const struct job_plane *plane = &job->planes[a->placement.best.items[i].plane];
        struct close here = {.distance = INFINITY};
        if (plane->work == WORK_REMOVE && plane->hole_m > 0)
            compare_all(a, i, &here);
        if (here.distance < plane->hole_m * (1 - 1e-9) && here.distance < closest.distance)
            closest = here;
    }
    if (isinf(closest.distance))
        return false;
    const struct job_plane *plane = &job->planes[closest.plane];
    double sense = job->angles == SENSE_WITH ? -1 : 1;
    *f = (struct advice_finding){.check = "hole-spacing",
                                 .unit = "mm",
                                 .basis = "geometry",
                                 .verdict = ADVICE_CAUTION,
                                 .run = -1,
                                 .sensor = -1,
                                 .value = 1e3 * closest.distance,
                                 .limit = 1e3 * plane->hole_m};
    snprintf(f->text, sizeof f->text,
             "on '%s' the hole at %.1f deg is only %s mm from the one at %.1f deg%s %s, centre to "
             "centre, and each is %s mm wide: they would run into each other; name positions that "
             "are further apart",
             plane->name, angle_wrap_360(sense * closest.angles_deg[0]),
             judge_figure(1e3 * closest.distance, 2).text,
             angle_wrap_360(sense * closest.angles_deg[1]), closest.what, job_sense_text(job),
             judge_figure(1e3 * plane->hole_m, 2).text);
    return true;
}
