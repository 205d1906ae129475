#include "stream/job.h"

#include <math.h>
#include <stdio.h>
#include <stdlib.h>
#include <string.h>
#include <strings.h>

#include "base/angle.h"

static const char *const quantity_names[] = {"acceleration", "velocity", "displacement", "tacho"};
static const char *const detection_names[] = {"pk", "pk-pk", "rms"};

const char *quantity_text(enum quantity q)
{
    return quantity_names[q];
}

int quantity_parse(const char *text)
{
    for (int i = 0; i < 4; i++)
        if (!strcmp(text, quantity_names[i]))
            return i;
    return -1;
}

const char *detection_text(enum detection d)
{
    return detection_names[d];
}

void job_init(struct job *job)
{
    *job = (struct job){.rotor_mass = NAN,
                        .service_rpm = NAN,
                        .grade = NAN,
                        .span_m = NAN,
                        .centre_m = NAN,
                        .tacho_edge = 1,
                        .tacho_marks = 1,
                        .tacho_level = NAN,
                        /* the assumed run-to-run scatter, common practice */
                        .aim = {.mounted = -1, .repeatability = 0.03}};
}

void job_release(struct job *job)
{
    for (size_t i = 0; i < job->plane_count; i++) {
        free(job->planes[i].positions);
        free(job->planes[i].stock);
    }
    for (size_t i = 0; i < job->run_count; i++) {
        free(job->runs[i].weights);
        free(job->runs[i].hand);
        free(job->runs[i].without);
        free(job->runs[i].speeds_rpm);
    }
    free(job->sensors);
    free(job->planes);
    free(job->runs);
    free(job->aim.targets);
    free(job->aim.importances);
    free(job->responses);
    free(job->limits);
    job_init(job);
}

/* Names lie at the start of each struct, so one search serves all. */
static int find_name(const void *items, size_t count, size_t size, const char *name)
{
    for (size_t i = 0; i < count; i++)
        if (!strcmp((const char *)items + i * size, name))
            return (int)i;
    return -1;
}

int job_find_sensor(const struct job *job, const char *name)
{
    return find_name(job->sensors, job->sensor_count, sizeof *job->sensors, name);
}

int job_find_plane(const struct job *job, const char *name)
{
    return find_name(job->planes, job->plane_count, sizeof *job->planes, name);
}

int job_find_run(const struct job *job, const char *name)
{
    return find_name(job->runs, job->run_count, sizeof *job->runs, name);
}

double complex job_run_weight(const struct job *job, size_t run, size_t plane)
{
    double complex sum = 0;
    for (size_t i = 0; i < job->runs[run].weight_count; i++) {
        const struct job_weight *w = &job->runs[run].weights[i];
        if (w->plane == plane)
            sum += angle_vector(w->mass, w->angle_deg);
    }
    return sum;
}

bool job_run_is_bare(const struct job *job, size_t run)
{
    double total = 0, largest = 0;
    for (size_t i = 0; i < job->runs[run].weight_count; i++)
        largest = fmax(largest, fabs(job->runs[run].weights[i].mass));
    for (size_t p = 0; p < job->plane_count; p++)
        total = fmax(total, cabs(job_run_weight(job, run, p)));
    return total <= 1e-12 * largest; /* rounding of weights that cancel */
}

static bool says_found(const char *name)
{
    for (; *name; name++)
        if (strncasecmp(name, "found", 5) == 0)
            return true;
    return false;
}

int job_found_loaded(const struct job *job)
{
    for (size_t r = 0; r < job->run_count; r++)
        if (!job->runs[r].role[0] && says_found(job->runs[r].name) && !job_run_is_bare(job, r) &&
            job->aim.mounted < 0)
            return (int)r;
    return -1;
}

bool job_never_bare(const struct job *job)
{
    size_t ordinary = 0, bare = 0;
    for (size_t r = 0; r < job->run_count; r++) {
        ordinary += !job->runs[r].role[0];
        bare += !job->runs[r].role[0] && job_run_is_bare(job, r);
    }
    return job->aim.mounted < 0 && ordinary > 0 && bare == 0;
}

/* True where run `run` lists a removal like `w`, or a larger one at its place. */
static bool lists_removal(const struct job_run *run, const struct job_weight *w)
{
    for (size_t i = 0; i < run->weight_count; i++) {
        const struct job_weight *o = &run->weights[i];
        double apart = fabs(remainder(o->angle_deg - w->angle_deg, 360));
        if (o->plane == w->plane && apart < 1e-6 &&
            fabs(o->radius_m - w->radius_m) <= 1e-9 * w->radius_m &&
            o->mounted_mass <= w->mounted_mass * (1 - 1e-9))
            return true;
    }
    return false;
}

int job_removed_run(const struct job *job)
{
    const struct job_run *kept = job->aim.mounted >= 0 ? &job->runs[job->aim.mounted] : NULL;
    for (size_t r = 0; r < job->run_count; r++)
        for (size_t i = 0; i < job->runs[r].weight_count; i++) {
            const struct job_weight *w = &job->runs[r].weights[i];
            if (w->mounted_mass < 0 && !(kept && lists_removal(kept, w)))
                return (int)r;
        }
    return -1;
}

bool job_speed_condition(const char *condition, double speed_rpm, char to[NAME_ROOM])
{
    char text[32];
    for (int decimals = 0; decimals <= 6; decimals++) {
        snprintf(text, sizeof text, "%.*f", decimals, speed_rpm);
        if (fabs(strtod(text, NULL) - speed_rpm) < 1e-6)
            break;
    }
    return snprintf(to, NAME_ROOM, "%.*s @ %s rpm", NAME_ROOM - 1, condition, text) < NAME_ROOM;
}

double job_sheet_angle(const struct job *job, double angle_deg)
{
    return angle_wrap_360(job->angles == SENSE_WITH ? -angle_deg : angle_deg);
}

const char *job_sense_text(const struct job *job)
{
    return job->angles == SENSE_WITH ? "with rotation" : "against rotation";
}
