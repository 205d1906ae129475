#include "track/sieve.h"

#include <math.h>
#include <stdlib.h>
#include <string.h>

#define WEIGHT 0.05 /* of the latest pulse in the running means */
#define REGULAR 0.1 /* spread of the kept pulses' period, as a share of it, at most */
#define EVEN 0.7    /* share of the intervals that must be even */
#define EVEN_BY_CHANCE                                                                             \
    0.55 /* of two equal pulses a turn a choice at random leaves half of them even */
#define RATIO_DOUBT 1.06 /* classes this far apart may be told apart in another recording */
#define TURN_LEAST                                                                                 \
    0.6 /* a turn by the kept pulses against one by all of them, lost and added ones */
#define TURN_MOST 1.5 /* included: half a turn and two turns lie outside */

/* What sampling alone makes of equal marks: steep pulses of 4.3 samples are seen as 4 or as 5, so
 * that two widths, or two gaps, differ by a sample, and a height found in so few of them by up to a
 * quarter, which at two samples is another half (measured). Where the
 * turn takes a whole number of samples each mark falls between them in the same way every time,
 * and no number of turns averages that out. It does where the turn's samples drift by more than
 * DITHER over the pulses seen: one for the measure of the drift itself, the rest to be passed
 * through. */
#define SAMPLING 2 /* samples */
#define DITHER 2.5 /* samples */

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
    if (sieve->seen > sieve->settle && gap > (double)(sieve->settle + 2) * sieve->gap) {
        sieve_restart(
            sieve); /* more than a turn without a pulse: a hole, not a gap between marks */
        value = NAN;
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

    return sieve->feature == SIEVE_OFF ||
           (sieve->seen > sieve->settle && sieve->sign * value > sieve->sign * sieve->threshold);
}

static int ascending(const void *a, const void *b)
{
    double x = *(const double *)a, y = *(const double *)b;

    return (x > y) - (x < y);
}

/* The widest gap between sorted values that leaves about one in `marks` beyond it; its width, 0
 * where there is none. */
static double split(const double *sorted, size_t n, int marks, double sign, double ratio,
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
    return widest;
}

/* The time of a turn from all pulses: the median of what `marks` of them take; 0: too few. */
static double turn_of(const struct pulse *pulses, size_t count, int marks)
{
    double spans[SIEVE_MOST];
    size_t k = (size_t)marks, n = count > k ? count - k : 0;

    for (size_t i = 0; i < n; i++) {
        spans[i] = pulses[i + k].at - pulses[i].at;
    }
    qsort(spans, n, sizeof *spans, ascending);
    return n > 0 ? spans[n / 2] : 0;
}

/* The intervals between the pulses that the sieve keeps, in their order. */
static size_t intervals_of(const struct sieve *sieve, const struct pulse *pulses, size_t count,
                           double *intervals)
{
    struct sieve trial = *sieve;
    double last = NAN;
    size_t n = 0;

    sieve_restart(&trial);
    for (size_t i = 0; i < count; i++) {
        if (sieve_keeps(&trial, &pulses[i])) {
            if (!isnan(last)) {
                intervals[n++] = pulses[i].at - last;
            }
            last = pulses[i].at;
        }
    }
    return n;
}

/* By how many samples the kept pulses drift against the samples; `median` of n intervals. */
static double drift_of(const double *intervals, size_t n, double median)
{
    double at = 0, least = 0, most = 0;

    for (size_t i = 0; i < n; i++) {
        double turns = round(intervals[i] / median);

        if (fabs(intervals[i] / median - turns) > REGULAR) {
            continue; /* between two different marks */
        }
        at += intervals[i] - turns * round(median);
        least = fmin(least, at);
        most = fmax(most, at);
    }
    return most - least;
}

/* What is to be known of the pulses that a sieve keeps. */
struct kept {
    double even;  /* share of their intervals that are even (like their median), 0 where there are
                   * too few or the median is not the time that `marks` pulses take: no turn then */
    double drift; /* samples */
};

static struct kept keep(const struct sieve *sieve, const struct pulse *pulses, size_t count,
                        int marks)
{
    double intervals[SIEVE_MOST], sorted[SIEVE_MOST], turn, median;
    size_t n = intervals_of(sieve, pulses, count, intervals), even = 0;

    if (n < 3) {
        return (struct kept){0, 0};
    }
    memcpy(sorted, intervals, n * sizeof *sorted);
    qsort(sorted, n, sizeof *sorted, ascending);
    median = sorted[n / 2];
    turn = turn_of(pulses, count, marks);
    if (!(median > TURN_LEAST * turn && median < TURN_MOST * turn)) {
        return (struct kept){0, 0};
    }
    for (size_t i = 0; i < n; i++) {
        even += fabs(intervals[i] / median - 1) < REGULAR;
    }
    return (struct kept){(double)even / (double)n, drift_of(intervals, n, median)};
}

/* What the unit of a feature's values is in samples: the pulses' mean width, or gap. */
static double scale_of(enum sieve_feature feature, const struct pulse *pulses, size_t count)
{
    double sum = 0;

    if (feature == SIEVE_GAP) {
        return count > 1 ? (pulses[count - 1].at - pulses[0].at) / (double)(count - 1) : 0;
    }
    for (size_t i = 0; i < count; i++) {
        sum += fmin(pulses[i].high, pulses[i].low);
    }
    return sum / (double)count;
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

/* Whether classes that are so far `apart`, and even, differ by more than the sampling can make of
 * them. *doubt: more pulses might show it. */
static bool beyond_sampling(const struct sieve *sieve, double apart, const struct kept *kept,
                            const struct pulse *pulses, size_t count, bool *doubt)
{
    if (!(apart > 0) || kept->even < EVEN) {
        return false;
    }
    *doubt = !(kept->drift > DITHER || apart * scale_of(sieve->feature, pulses, count) > SAMPLING);
    return !*doubt;
}

/* Rules are tried in a fixed order, and a rule that might hold in another recording of the same
 * shaft ends the search: the next one could name another mark. */
bool sieve_find(struct sieve *sieve, const struct pulse *pulses, size_t count, int marks,
                double ratio)
{
    double values[SIEVE_MOST];

    count = count < SIEVE_MOST ? count : SIEVE_MOST;
    for (int feature = SIEVE_SIZE; feature <= SIEVE_GAP; feature++) {
        struct sieve trial = {.feature = (enum sieve_feature)feature, .settle = marks};
        size_t n = values_of(&trial, pulses, count, marks, values);

        for (int side = 0; side < 2; side++) {
            trial.sign = side ? -1 : 1;
            double apart = split(values, n, marks, trial.sign, ratio, &trial.threshold);

            if (!(apart > 0) &&
                !(split(values, n, marks, trial.sign, RATIO_DOUBT, &trial.threshold) > 0)) {
                continue;
            }
            struct kept kept = keep(&trial, pulses, count, marks);

            if (beyond_sampling(&trial, apart, &kept, pulses, count, &sieve->doubt)) {
                *sieve = trial;
                sieve_restart(sieve);
                return true;
            }
            if (kept.even >= EVEN_BY_CHANCE || feature == SIEVE_GAP) {
                return false;
            }
        }
    }
    return false;
}

bool sieve_find_large(struct sieve *sieve, const struct pulse *pulses, size_t count, int marks,
                      double ratio)
{
    double values[SIEVE_MOST];
    struct sieve trial = {.feature = SIEVE_SIZE, .sign = 1, .settle = marks}, others;

    count = count < SIEVE_MOST ? count : SIEVE_MOST;
    size_t n = values_of(&trial, pulses, count, marks, values);

    double apart = split(values, n, marks, 1, ratio, &trial.threshold);
    struct kept kept = keep(&trial, pulses, count, marks);

    if (!beyond_sampling(&trial, apart, &kept, pulses, count, &sieve->doubt)) {
        return false;
    }
    others = trial;
    others.sign = -1;
    if (marks == 2 && keep(&others, pulses, count, marks).even < EVEN) {
        return false;
    }
    *sieve = trial;
    sieve_restart(sieve);
    return true;
}
