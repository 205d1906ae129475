#include "vet/beat.h"

#include <math.h>

#include "base/angle.h"

static const double LEVEL = 0.001;     /* of the test */
static const double PERIODS_LEAST = 3; /* fewer are a slow wander like any other */
static const size_t COUNT_LEAST = 12;
static const double REST_MARGIN = 1.3; /* for blocks that one of the two has set aside */
static const int OVERSAMPLING = 4; /* of the frequencies: loses 1 % of a line between two at most */

struct straight {
    double complex middle, slope;
    double t_middle;
};

static struct straight fit(const double complex *vectors, const double *t, size_t count)
{
    struct straight line = {0};
    double spread = 0;

    for (size_t i = 0; i < count; i++) {
        line.middle += vectors[i] / (double)count;
        line.t_middle += t[i] / (double)count;
    }
    for (size_t i = 0; i < count; i++) {
        double d = t[i] - line.t_middle;
        line.slope += (vectors[i] - line.middle) * d;
        spread += d * d;
    }
    line.slope /= spread;
    return line;
}

static double complex rest(const struct straight *line, const double complex *vectors,
                           const double *t, size_t i)
{
    return vectors[i] - line->middle - line->slope * (t[i] - line->t_middle);
}

struct phasor { /* of one block: its rest, turned back by the frequency at hand and by one step of
                   it */
    double re, im, step_re, step_im;
};

static struct phasor phasor_at(double complex rest, double t, double f, double step)
{
    double complex z = rest * cexp(-I * 2 * PI * f * t), turn = cexp(-I * 2 * PI * step * t);

    return (struct phasor){creal(z), cimag(z), creal(turn), cimag(turn)};
}

/* The line at the frequency at hand, as an amplitude; every phasor moves on to the next frequency.
 */
static double next_line(struct phasor *phasors, size_t count)
{
    double re = 0, im = 0;

    for (size_t i = 0; i < count; i++) {
        struct phasor p = phasors[i];
        re += p.re;
        im += p.im;
        phasors[i].re = p.re * p.step_re - p.im * p.step_im;
        phasors[i].im = p.re * p.step_im + p.im * p.step_re;
    }
    return hypot(re, im) / (double)count;
}

struct beat beat_of(const double complex *vectors, const double *t, size_t count)
{
    struct beat beat = {NAN, NAN, NAN, NAN, NAN, NAN};
    struct phasor phasors[BEAT_COUNT_MOST];
    struct straight line;
    double step, power = 0, most = 0, share, n;

    if (count > BEAT_COUNT_MOST)
        count = BEAT_COUNT_MOST;
    n = (double)count;
    if (count < COUNT_LEAST || !(t[count - 1] > t[0]))
        return beat;
    step = (t[count - 1] - t[0]) / (n - 1);
    beat.duration = step * n;
    beat.step = step;
    line = fit(vectors, t, count);
    for (size_t i = 0; i < count; i++)
        power += pow(cabs(rest(&line, vectors, t, i)), 2) / n;
    if (isnan(power))
        return beat;
    beat.swing = 0;
    beat.rest = sqrt(power);
    const int last = OVERSAMPLING * (int)count / 2;
    const double fine = 1 / (OVERSAMPLING * beat.duration);
    for (size_t i = 0; i < count; i++)
        phasors[i] =
            phasor_at(rest(&line, vectors, t, i), t[i] - line.t_middle, -last * fine, fine);
    for (int k = -last; k <= last; k++) {
        double f = k * fine, size = next_line(phasors, count);
        if (fabs(f) * beat.duration >= PERIODS_LEAST && size > most) {
            most = size;
            beat.turning = f;
        }
    }
    share = most * most / power;
    /* No power at all: nothing swings (share is NaN). */
    if (share > 0 && n * pow(1 - fmin(share, 1), n - 1) < LEVEL) {
        double y = PI * beat.turning * step;
        beat.swing = most * y / sin(y); /* |y| is pi/2 at most */
        beat.period = 1 / fabs(beat.turning);
    }
    return beat;
}

struct beat beat_join(const struct beat *measured, struct beat own)
{
    struct beat joined = *measured;

    double y = PI * own.step / measured->period;

    if (isnan(measured->swing) || !(own.duration > 0))
        return own;
    /* Of a swing to and fro the root mean square is 0.71 of its size. */
    if (measured->swing * fabs(sin(y) / y) / sqrt(2) > REST_MARGIN * own.rest)
        return own;
    joined.duration = own.duration;
    return joined;
}

double beat_variance(const struct beat *beat)
{
    double left;

    if (!(beat->swing > 0))
        return 0;
    left = beat->swing * beat->period / (PI * beat->duration);
    return left * left / 2;
}
