#include "average/step.h"

#include <math.h>

#include "average/longrun.h"

static const double TRIM = 0.15;       /* see the header */
static const double LEVEL = 0.01 / 23; /* see the header */

static double square(double complex z)
{
    return creal(z) * creal(z) + cimag(z) * cimag(z);
}

/* Sum of squares about a straight line. */
static double straight(const double complex *vectors, const double *t, size_t count,
                       double complex mean, double total)
{
    double middle = 0, spread = 0;
    double complex slope = 0;

    for (size_t i = 0; i < count; i++)
        middle += t[i] / (double)count;
    for (size_t i = 0; i < count; i++) {
        spread += (t[i] - middle) * (t[i] - middle);
        slope += (vectors[i] - mean) * (t[i] - middle);
    }
    return spread > 0 ? total - square(slope) / spread : total;
}

/* (1+r)/(1-r) of the residuals' lag-1 correlation, as in trend.c. */
static double slow_factor(const double complex *vectors, size_t count, const struct step *s)
{
    double complex last = 0;
    double sum = 0, power = 0, r;

    for (size_t i = 0; i < count; i++) {
        double complex e = vectors[i] - (i < s->at ? s->before : s->after);
        power += square(e);
        sum += creal(e * conj(last));
        last = e;
    }
    r = power > 0 ? sum / power + 2 / (double)count : 0;
    if (!(r > 0))
        return 1;
    return r > 0.9 ? 19 : (1 + r) / (1 - r);
}

struct step step_find(const double complex *vectors, const double *t, size_t count)
{
    struct step s = {.size = NAN, .t = NAN, .residual = NAN, .straight = NAN};
    double n = (double)count, total = 0, best = 0, factor, freedom, f;
    double complex all = 0, sum = 0;
    size_t side = (size_t)ceil(TRIM * n);

    side = side > STEP_SIDE ? side : STEP_SIDE;
    if (count < 2 * STEP_SIDE)
        return s;
    for (size_t i = 0; i < count; i++)
        all += vectors[i];
    for (size_t i = 0; i < count; i++)
        total += square(vectors[i] - all / n);
    if (isnan(total))
        return s;
    s.straight = straight(vectors, t, count, all / n, total);
    for (size_t m = 1; m + side <= count; m++) {
        sum += vectors[m - 1] - all / n; /* from the mean: less rounding */
        double gain = square(sum) * n / ((double)m * (n - (double)m));
        if (m < side || !(gain > best || s.at == 0))
            continue;
        best = gain;
        s.at = m;
        s.before = all / n + sum / (double)m;
        s.after = all / n - sum / (n - (double)m);
    }
    s.residual = fmax(total - best, 0);
    factor = slow_factor(vectors, count, &s);
    freedom = fmax((n - 2) / factor, 1);
    f = best / 2 / (s.residual / (2 * (n - 2)) * factor);
    s.size = 0;
    if (f > longrun_f2_point(LEVEL, freedom) && s.residual < s.straight) {
        s.size = cabs(s.after - s.before);
        s.t = (t[s.at - 1] + t[s.at]) / 2;
    }
    return s;
}
