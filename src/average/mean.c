#include "average/mean.h"

#include <math.h>
#include <stdbool.h>
#include <stdlib.h>

#include "average/circular.h"
#include "average/longrun.h"
#include "average/robust.h"
#include "average/trend.h"
#include "base/angle.h"

static const double ROUND_FREEDOM = 10; /* see the header, and the simulation it names */

/* The blocks used, in one allocation: z then turns then t. */
struct kept {
    double complex *z; /* owned; the others lie behind */
    double *turns, *t;
    size_t count;
};

static int keep_blocks(const double complex *vectors, const double *turns, const double *t,
                       size_t count, struct kept *kept, long *set_aside)
{
    bool *keep = malloc(count * sizeof *keep);
    double complex *room = malloc(count * (sizeof *room + 2 * sizeof(double)));
    long aside = keep && room ? robust_keep(vectors, count, keep) : -1;

    if (aside < 0) {
        free(room);
        free(keep);
        return -1;
    }
    *kept = (struct kept){room, (double *)(room + count), (double *)(room + count) + count, 0};
    for (size_t i = 0; i < count; i++) {
        if (!keep[i])
            continue;
        kept->z[kept->count] = vectors[i];
        kept->turns[kept->count] = turns[i];
        kept->t[kept->count++] = t[i];
    }
    *set_aside = aside;
    free(keep);
    return 0;
}

/* Neighbouring blocks share a turn, over which the window of the one falls as the other's rises by
 * s - sin(2*pi*s)/(2*pi), s from 0 to 1. In white noise that leaves a block of M turns a variance
 * of M - 2*c to M, and c between it and each neighbour, c the integral of rise times fall: 1/6 -
 * 5/(8*pi^2) = 0.10333. The scatter of the blocks shows the first only. */
static double shared_turns(double turns_per_block)
{
    const double c = 1 / 6.0 - 5 / (8 * PI * PI);

    return fmax(1, turns_per_block) / (fmax(1, turns_per_block) - 2 * c);
}

static void covariance_of_mean(const struct kept *k, int components, struct mean *mean)
{
    double n = (double)k->count, re = 0, im = 0, both = 0;
    double weight = (n - 1) / (n - 1 + ROUND_FREEDOM), round, scale;

    if (k->count == 1) {
        double a = cabs(mean->vector);
        mean->cov[0] = mean->cov[2] = a * a / 2;
        mean->cov[1] = 0;
        mean->independent = 1;
        return;
    }
    for (size_t i = 0; i < k->count; i++) {
        double complex d = k->z[i] - mean->vector;
        double share = k->turns[i] / mean->turns * n / (n - 1); /* a longer block scatters less */
        re += share * creal(d) * creal(d);
        im += share * cimag(d) * cimag(d);
        both += share * creal(d) * cimag(d);
    }
    scale = longrun_factor(k->z, k->count, components);
    mean->independent = fmax(1, fmin(n, n / scale));
    scale *= shared_turns(mean->turns / n);
    round = 0.5 * (re + im) * (1 - weight);
    mean->cov[0] = (re * weight + round) * scale / n;
    mean->cov[1] = both * weight * scale / n;
    mean->cov[2] = (im * weight + round) * scale / n;
}

static int steadiness(const struct kept *k, struct mean *mean)
{
    double n = (double)k->count, sum = 0, squares = 0;
    struct circular lags = circular_of_vectors(k->z, k->count);

    mean->resultant = lags.resultant;
    mean->phase_sd_deg = k->count > 1 ? lags.sd_deg : NAN;
    for (size_t i = 0; i < k->count; i++)
        sum += cabs(k->z[i]);
    for (size_t i = 0; i < k->count; i++) {
        double d = cabs(k->z[i]) - sum / n;
        squares += d * d;
    }
    mean->amplitude_sd = k->count > 1 ? sqrt(squares / (n - 1)) : NAN;
    mean->drift = trend_size(k->z, k->t, k->count);
    return unsteady_of_blocks(k->z, k->t, k->count, &mean->unsteady);
}

static int mean_of(const double complex *vectors, const double *turns, const double *t,
                   size_t count, int components, struct mean *mean)
{
    struct kept kept;
    double complex sum = 0;
    int result;

    if (count == 0)
        return -2;
    *mean = (struct mean){0};
    if (keep_blocks(vectors, turns, t, count, &kept, &mean->set_aside))
        return -1;
    mean->used = kept.count;
    for (size_t i = 0; i < kept.count; i++) {
        sum += kept.z[i] * kept.turns[i];
        mean->turns += kept.turns[i];
    }
    mean->vector = sum / mean->turns;
    covariance_of_mean(&kept, components, mean);
    result = steadiness(&kept, mean);
    free(kept.z);
    return result;
}

int mean_of_blocks(const double complex *vectors, const double *turns, const double *t,
                   size_t count, struct mean *mean)
{
    return mean_of(vectors, turns, t, count, 2, mean);
}

int mean_of_amplitudes(const double *amplitudes, const double *turns, const double *t, size_t count,
                       struct mean *mean)
{
    double complex *vectors = malloc((count + 1) * sizeof *vectors);
    int result;

    if (!vectors)
        return -1;
    for (size_t i = 0; i < count; i++)
        vectors[i] = amplitudes[i];
    result = mean_of(vectors, turns, t, count, 1, mean);
    free(vectors);
    if (result)
        return result;
    /* The scatter lies on one line: all of it is the amplitude's. */
    mean->cov[0] += mean->cov[2];
    mean->cov[2] = mean->cov[0];
    mean->cov[1] = 0;
    mean->phase_sd_deg = mean->resultant = NAN;
    mean->unsteady.turning_hz = NAN; /* real numbers turn both ways */
    return 0;
}
