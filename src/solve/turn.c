#include "solve/turn.h"

#include <math.h>

#include "base/angle.h"

#define LEAST_TURN 20 /* deg: less tells nothing about the sense */

/* Which plane alone carries weight in run i: its index, planes for none, -1 for several. */
static int only_plane(size_t planes, const double complex *x)
{
    int only = (int)planes;
    for (size_t p = 0; p < planes; p++) {
        if (x[p] == 0)
            continue;
        if (only != (int)planes)
            return -1;
        only = (int)p;
    }
    return only;
}

static double variance(const double cov[3])
{
    return cov[0] + cov[2];
}

bool turn_worst(size_t count, size_t planes, const double complex *y, const double complex *x,
                const double (*cov)[3], size_t plane, struct turn_figure *worst)
{
    double complex bare = 0;
    double noise = 0, bare_runs = 0;
    for (size_t i = 0; i < count; i++)
        if (only_plane(planes, x + i * planes) == (int)planes) {
            bare += y[i];
            noise += variance(cov[i]);
            bare_runs++;
        }
    if (bare_runs == 0)
        return false;
    bare /= bare_runs;
    noise /= bare_runs * bare_runs;
    bool any = false, seen = false;
    for (size_t i = 0; i < count; i++)
        for (size_t j = i + 1; j < count; j++) {
            if (only_plane(planes, x + i * planes) != (int)plane ||
                only_plane(planes, x + j * planes) != (int)plane)
                continue;
            double complex a = y[i] - bare, b = y[j] - bare;
            double complex u = x[i * planes + plane], v = x[j * planes + plane];
            double weight = angle_wrap_180(angle_of(v) - angle_of(u));
            double spread = (noise + variance(cov[i])) / (2 * cabs(a) * cabs(a)) +
                            (noise + variance(cov[j])) / (2 * cabs(b) * cabs(b));
            if (!(spread > 0) || !isfinite(spread))
                continue;
            if (!any)
                *worst = (struct turn_figure){.weight_deg = weight, .from = i, .to = j};
            any = true;
            if (fabs(weight) < LEAST_TURN)
                continue;
            double effect = angle_wrap_180(angle_of(b) - angle_of(a));
            double se = fabs(angle_wrap_180(effect - weight)) * PI / 180 / sqrt(spread);
            bool told = worst->told || fabs(weight) <= 180 - LEAST_TURN;
            if (!seen || se > worst->se)
                *worst = (struct turn_figure){se, effect, weight, i, j, told};
            worst->told = told;
            seen = true;
        }
    return any;
}
