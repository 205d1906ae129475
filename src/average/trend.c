#include "average/trend.h"

#include <math.h>

#include "average/longrun.h"

static const double LEVEL = 0.01; /* of the test; common practice */

struct straight {
    double complex middle, slope;
    double t_middle, spread; /* mean of t, sum of squares about it */
};

static struct straight fit(const double complex *vectors, const double *t, size_t count)
{
    struct straight line = {0};

    for (size_t i = 0; i < count; i++) {
        line.t_middle += t[i] / (double)count;
        line.middle += vectors[i] / (double)count;
    }
    for (size_t i = 0; i < count; i++) {
        double d = t[i] - line.t_middle;
        line.spread += d * d;
        line.slope += (vectors[i] - line.middle) * d;
    }
    line.slope /= line.spread;
    return line;
}

/* Lag-1 correlation of the residuals, as a factor on the variance of the slope. */
static double slow_factor(const double complex *vectors, const double *t, size_t count,
                          const struct straight *line, double *power)
{
    double complex last = 0;
    double sum = 0, n = (double)count, r;

    *power = 0;
    for (size_t i = 0; i < count; i++) {
        double complex e = vectors[i] - line->middle - line->slope * (t[i] - line->t_middle);
        *power += creal(e * conj(e));
        sum += creal(e * conj(last));
        last = e;
    }
    /* A straight line taken off lowers the correlation by about two more in n (Kendall 1954). */
    r = *power > 0 ? sum / *power + 2 / n : 0;
    if (!(r > 0))
        return 1;
    return r > 0.9 ? 19 : (1 + r) / (1 - r); /* bounded as in longrun.c */
}

double trend_size(const double complex *vectors, const double *t, size_t count)
{
    struct straight line;
    double power, factor, freedom, variance, f;

    if (count < 4)
        return NAN;
    line = fit(vectors, t, count);
    if (!(line.spread > 0) || isnan(creal(line.slope)) || isnan(cimag(line.slope)))
        return NAN;
    factor = slow_factor(vectors, t, count, &line, &power);
    freedom = (double)(count - 2) / factor; /* half of the degrees of freedom: two components */
    if (freedom < 1)
        freedom = 1;
    variance =
        power / (2 * (double)(count - 2)) * factor / line.spread; /* a component of the slope */
    f = creal(line.slope * conj(line.slope)) / 2 / variance;
    /* No residuals at all beside a slope is a trend (f is infinite); beside none it is not (NaN).
     */
    if (!(f > longrun_f2_point(LEVEL, freedom)))
        return 0;
    return cabs(line.slope) * (t[count - 1] - t[0]);
}
