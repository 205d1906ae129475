#include "track/sieve.h"

#include <math.h>
#include <stdlib.h>

#define WEIGHT 0.05 /* of the latest pulse in the running means */
#define REGULAR 0.1 /* spread of the kept pulses' period, as a share of it, at most */

double sieve_size(const struct pulse *pulse)
{
    double width = pulse->high < pulse->low ? pulse->high : pulse->low;

    return (pulse->top - pulse->bottom) * width;
}

void sieve_restart(struct sieve *sieve)
{
    sieve->seen = 0;
}

/* The pulse's feature relative to the running mean; NaN where it has none yet. */
static double value_of(struct sieve *sieve, const struct pulse *pulse, enum sieve_feature feature)
{
    double size = sieve_size(pulse), gap = pulse->at - sieve->last, value = NAN;

    if (feature == SIEVE_SIZE && sieve->seen > 0) {
        value = size / sieve->size;
    } else if (feature == SIEVE_GAP && sieve->seen > 1) {
        value = gap / sieve->gap;
    }
    double weight = sieve->seen * WEIGHT > 1 ? WEIGHT : 1 / (double)(sieve->seen + 1);

    sieve->size = sieve->seen == 0 ? size : sieve->size + weight * (size - sieve->size);
    if (sieve->seen > 0) {
        sieve->gap = sieve->seen == 1 ? gap : sieve->gap + weight * (gap - sieve->gap);
    }
    sieve->last = pulse->at;
    sieve->seen++;
    return value;
}

bool sieve_keeps(struct sieve *sieve, const struct pulse *pulse)
{
    double value = value_of(sieve, pulse, sieve->feature);

    return sieve->feature == SIEVE_OFF || sieve->sign * value > sieve->sign * sieve->threshold;
}

static int ascending(const void *a, const void *b)
{
    double x = *(const double *)a, y = *(const double *)b;

    return (x > y) - (x < y);
}

/* The widest gap between sorted values that leaves about one in `marks` beyond it. */
static bool split(const double *sorted, size_t n, int marks, double sign, double ratio,
                  double *threshold)
{
    double share = (double)n / marks, widest = 0;

    for (size_t m = (size_t)ceil(0.7 * share); m <= (size_t)(1.3 * share) && m < n; m++) {
        double low = sign > 0 ? sorted[n - m - 1] : sorted[m - 1];
        double high = sign > 0 ? sorted[n - m] : sorted[m];

        if (m > 0 && high > ratio * low && high - low > widest) {
            widest = high - low;
            *threshold = (low + high) / 2;
        }
    }
    return widest > 0;
}

/* True where the pulses kept come at even intervals (their median, for most of them). */
static bool regular(const struct sieve *sieve, const struct pulse *pulses, size_t count)
{
    struct sieve trial = *sieve;
    double intervals[SIEVE_MOST], sorted[SIEVE_MOST], last = NAN;
    size_t n = 0, even = 0;

    sieve_restart(&trial);
    for (size_t i = 0; i < count; i++) {
        if (sieve_keeps(&trial, &pulses[i])) {
            if (!isnan(last)) {
                sorted[n] = intervals[n] = pulses[i].at - last;
                n++;
            }
            last = pulses[i].at;
        }
    }
    if (n < 3) {
        return false;
    }
    qsort(sorted, n, sizeof *sorted, ascending);
    for (size_t i = 0; i < n; i++) {
        even += fabs(intervals[i] / sorted[n / 2] - 1) < REGULAR;
    }
    return 10 * even >= 7 * n;
}

static size_t values_of(struct sieve *trial, const struct pulse *pulses, size_t count, int marks,
                        double *values)
{
    size_t n = 0;

    for (size_t i = 0; i < count; i++) {
        double value = value_of(trial, &pulses[i], trial->feature);

        if (!isnan(value) && trial->seen > 2 * marks) { /* means have settled over two turns */
            values[n++] = value;
        }
    }
    qsort(values, n, sizeof *values, ascending);
    return n;
}

bool sieve_find(struct sieve *sieve, const struct pulse *pulses, size_t count, int marks,
                double ratio)
{
    double values[SIEVE_MOST];

    count = count < SIEVE_MOST ? count : SIEVE_MOST;
    for (int feature = SIEVE_SIZE; feature <= SIEVE_GAP; feature++) {
        struct sieve trial = {.feature = (enum sieve_feature)feature};
        size_t n = values_of(&trial, pulses, count, marks, values);

        for (int side = 0; side < 2; side++) {
            trial.sign = side ? -1 : 1;
            if (split(values, n, marks, trial.sign, ratio, &trial.threshold) &&
                regular(&trial, pulses, count)) {
                *sieve = trial;
                sieve_restart(sieve);
                return true;
            }
        }
    }
    return false;
}

bool sieve_find_large(struct sieve *sieve, const struct pulse *pulses, size_t count, int marks,
                      double ratio)
{
    double values[SIEVE_MOST];
    struct sieve trial = {.feature = SIEVE_SIZE, .sign = 1}, others;

    count = count < SIEVE_MOST ? count : SIEVE_MOST;
    size_t n = values_of(&trial, pulses, count, marks, values);

    if (!split(values, n, marks, 1, ratio, &trial.threshold) || !regular(&trial, pulses, count)) {
        return false;
    }
    others = trial;
    others.sign = -1;
    if (marks == 2 && !regular(&others, pulses, count)) {
        return false;
    }
    *sieve = trial;
    sieve_restart(sieve);
    return true;
}
