#include "vet/resonance.h"

#include <math.h>

#include "base/angle.h"

static const double ERRORS = 4.6; /* as the header says */
static const size_t COUNT_LEAST = 12, COUNT_LEAST_WITHOUT_TIME = 4;
static const double WANDER_LEAST = 1e-6; /* of the speed; below that it is a number repeated */

static const double WINDOW =
    0.03; /* of the speed: the lag's turn is straight there, common practice */
#define POINTS_MOST 256

/* The two series, each less its mean and, where there are times, its trend. */
struct pair {
    const double complex *vectors;
    const double *speed, *t;
    double complex direction;
    double speed_mean, speed_slope, lag_mean, lag_slope, t_mean;
};

struct resonance resonance_unknown(void)
{
    return (struct resonance){NAN, NAN};
}

static double speed_raw(const struct pair *p, size_t i)
{
    return 100 * (p->speed[i] / p->speed_mean - 1);
}

static double lag_raw(const struct pair *p, size_t i)
{
    return carg(p->vectors[i] * conj(p->direction)) * 180 / PI;
}

static double time_of(const struct pair *p, size_t i)
{
    return p->t ? p->t[i] - p->t_mean : 0;
}

static double speed_at(const struct pair *p, size_t i)
{
    return speed_raw(p, i) - p->speed_slope * time_of(p, i);
}

static double lag_at(const struct pair *p, size_t i)
{
    return lag_raw(p, i) - p->lag_mean - p->lag_slope * time_of(p, i);
}

static struct pair pair_of(const double complex *vectors, const double *speed, const double *t,
                           size_t count)
{
    struct pair p = {.vectors = vectors, .speed = speed, .t = t};
    double n = (double)count, spread = 0;

    for (size_t i = 0; i < count; i++) {
        p.direction += vectors[i];
        p.speed_mean += speed[i] / n;
        p.t_mean += t ? t[i] / n : 0;
    }
    for (size_t i = 0; i < count; i++)
        p.lag_mean += lag_raw(&p, i) / n;
    for (size_t i = 0; i < count; i++) {
        double d = time_of(&p, i);
        p.speed_slope += d * speed_raw(&p, i);
        p.lag_slope += d * lag_raw(&p, i);
        spread += d * d;
    }
    p.speed_slope = spread > 0 ? p.speed_slope / spread : 0;
    p.lag_slope = spread > 0 ? p.lag_slope / spread : 0;
    return p;
}

/* Variance factor for residuals and speeds that both go together with their neighbours. */
static double togetherness(const struct pair *p, size_t count, double slope)
{
    double speed = 0, rest = 0, speed_next = 0, rest_next = 0, both;

    for (size_t i = 0; i < count; i++) {
        double s = speed_at(p, i), r = lag_at(p, i) - slope * s;
        speed += s * s;
        rest += r * r;
        if (i + 1 < count) {
            speed_next += s * speed_at(p, i + 1);
            rest_next += r * (lag_at(p, i + 1) - slope * speed_at(p, i + 1));
        }
    }
    both = rest > 0 ? speed_next / speed * (rest_next / rest) : 0;
    both = fmin(fmax(both, 0), 0.9); /* never less than for white noise */
    return (1 + both) / (1 - both);
}

struct resonance resonance_of(const double complex *vectors, const double *speed, const double *t,
                              size_t count)
{
    struct pair p;
    double product = 0, spread = 0, rest = 0, slope, parameters = t ? 3 : 2;

    if (count < (t ? COUNT_LEAST : COUNT_LEAST_WITHOUT_TIME))
        return resonance_unknown();
    p = pair_of(vectors, speed, t, count);
    for (size_t i = 0; i < count; i++) {
        double s = speed_at(&p, i);
        product += s * lag_at(&p, i);
        spread += s * s;
    }
    if (!(sqrt(spread / (double)count) > 100 * WANDER_LEAST) || isnan(product))
        return resonance_unknown();
    slope = product / spread;
    for (size_t i = 0; i < count; i++) {
        double r = lag_at(&p, i) - slope * speed_at(&p, i);
        rest += r * r;
    }
    return (struct resonance){
        slope, sqrt(rest / ((double)count - parameters) / spread * togetherness(&p, count, slope))};
}

struct resonance resonance_of_two(double complex a, double speed_a, double complex b,
                                  double speed_b, double variance)
{
    double change = 200 * (speed_b - speed_a) / (speed_b + speed_a);

    if (!(fabs(change) > 100 * WANDER_LEAST))
        return resonance_unknown();
    return (struct resonance){carg(b * conj(a)) * 180 / PI / change, sqrt(variance) / fabs(change)};
}

struct resonance resonance_along(const double complex *vectors, const double *speed, size_t count,
                                 double at)
{
    double complex near[POINTS_MOST];
    double speeds[POINTS_MOST];
    size_t n = 0;

    for (size_t i = 0; i < count && n < POINTS_MOST; i++) {
        if (isnan(creal(vectors[i])) || !(fabs(speed[i] / at - 1) <= WINDOW))
            continue;
        near[n] = vectors[i];
        speeds[n++] = speed[i];
    }
    return resonance_of(near, speeds, NULL, n);
}

bool resonance_stands_out(const struct resonance *resonance)
{
    return fabs(resonance->slope) > ERRORS * resonance->error;
}
