#include "solve/repeat.h"

#include <math.h>

void repeat_add(struct repeat_pool *pool, const double complex *vectors, const double (*cov)[3],
                size_t count, double scale)
{
    if (count < 2)
        return;
    double complex mean = 0;
    double traces = 0;
    for (size_t i = 0; i < count; i++) {
        mean += vectors[i] / (double)count;
        traces += cov[i][0] + cov[i][2];
    }
    for (size_t i = 0; i < count; i++) {
        double d = cabs(vectors[i] - mean) / scale;
        pool->squares += d * d;
    }
    pool->explained += traces * (1 - 1 / (double)count) / (scale * scale);
    pool->dof += 2 * (double)(count - 1);
}

double repeat_estimate(const struct repeat_pool *pool, double prior, double *dof)
{
    *dof = INFINITY;
    if (!(pool->dof > 0))
        return prior;
    double seen = fmax(0, pool->squares - pool->explained);
    *dof = pool->dof + REPEAT_PRIOR_DOF;
    return sqrt((seen + REPEAT_PRIOR_DOF * prior * prior) / *dof);
}
