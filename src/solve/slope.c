#include "solve/slope.h"

#include <math.h>
#include <string.h>

#define BLOCKS_LEAST 16
#define DEPENDENT 4 /* blocks that count as one */
#define HELPS 3.0   /* s.e. of all shifts together: our choice */
#define WORTH 0.01  /* of the readings: less is not worth it */

void slope_add(struct slope *s, double rpm, double complex z)
{
    if (!isfinite(rpm) || !isfinite(creal(z) + cimag(z)))
        return;
    double n = (double)++s->count, off = rpm - s->mean_rpm;
    double complex step = z - s->mean;
    s->least = s->count == 1 ? rpm : fmin(s->least, rpm);
    s->most = s->count == 1 ? rpm : fmax(s->most, rpm);
    s->mean_rpm += off / n;
    s->mean += step / n;
    s->sxx += off * (rpm - s->mean_rpm);
    s->sxz += (rpm - s->mean_rpm) * step;
    s->szz += creal(step * conj(z - s->mean));
}

bool slope_shift(const struct slope *s, double from, double to, double complex *shift,
                 double *variance)
{
    double way = to - from;
    if (s->count < BLOCKS_LEAST || !(s->sxx > 0) || !(fabs(way) <= s->most - s->least))
        return false;
    double complex slope = s->sxz / s->sxx;
    double left = fmax(0, s->szz - creal(slope * conj(s->sxz)));
    *shift = slope * way;
    *variance = DEPENDENT * left / ((double)s->count - 2) / s->sxx * way * way;
    return true;
}

static bool counts(const struct job *job, const struct model_reading *r, size_t sensor,
                   const char *condition)
{
    return r->sensor == sensor && r->use && r->phase && !job->runs[r->run].role[0] &&
           !strcmp(r->condition, condition);
}

bool slope_bring(const struct job *job, struct model_reading *readings, size_t count,
                 const struct slope *slopes, size_t sensor, const char *condition,
                 struct slope_match *match)
{
    double speeds = 0, moved = 0, cost = 0, size = 0, variance;
    double complex shift;
    size_t n = 0;
    for (size_t i = 0; i < count; i++)
        if (counts(job, &readings[i], sensor, condition)) {
            speeds += readings[i].speed_rpm;
            n++;
        }
    *match = (struct slope_match){sensor, condition, speeds / (double)n, 0};
    for (size_t i = 0; i < count; i++) {
        const struct model_reading *r = &readings[i];
        if (!counts(job, r, sensor, condition))
            continue;
        if (!slope_shift(&slopes[r->run * job->sensor_count + sensor], r->speed_rpm, match->rpm,
                         &shift, &variance))
            return false;
        moved += creal(shift * conj(shift));
        cost += variance;
        size += creal(r->vector * conj(r->vector));
    }
    if (n < 2 || !(moved > HELPS * HELPS * cost) || !(moved > WORTH * WORTH * size))
        return false;
    for (size_t i = 0; i < count; i++) {
        struct model_reading *r = &readings[i];
        if (!counts(job, r, sensor, condition) ||
            !slope_shift(&slopes[r->run * job->sensor_count + sensor], r->speed_rpm, match->rpm,
                         &shift, &variance))
            continue;
        r->vector += shift;
        r->speed_rpm = match->rpm;
        r->cov[0] += variance / 2 - r->by_speed; /* what was allowed for is now taken off */
        r->cov[2] += variance / 2 - r->by_speed;
        r->by_speed = 0;
        match->largest = fmax(match->largest, cabs(shift));
    }
    return true;
}
