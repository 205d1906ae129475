#include "track/sieve.h"

#include <math.h>
#include <stdlib.h>

#define WEIGHT 0.05 /* of the latest pulse in the running means */
#define REGULAR 0.1 /* spread of the kept pulses' period, as a share of it, at most */
#define EVEN 0.7    /* share of the intervals that must be even */
#define EVEN_BY_CHANCE                                                                             \
    0.55 /* of two equal pulses a turn a choice at random leaves half of them even */
#define RATIO_DOUBT 1.06 /* classes this far apart may be told apart in another recording */
#define TURN_LEAST                                                                                 \
    0.6 /* a turn by the kept pulses against one by all of them, lost and added ones */
#define TURN_MOST 1.5 /* included: half a turn and two turns lie outside */

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

/* The share of the kept pulses' intervals that are even (like their median), 0 where there are too
 * few or the median is not the time that `marks` pulses take: then it is no turn. */
static double evenness(const struct sieve *sieve, const struct pulse *pulses, size_t count,
                       int marks)
{
    struct sieve trial = *sieve;
    double intervals[SIEVE_MOST], sorted[SIEVE_MOST], last = NAN, turn, median;
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
        return 0;
    }
    qsort(sorted, n, sizeof *sorted, ascending);
    median = sorted[n / 2];
    turn = turn_of(pulses, count, marks);
    if (!(median > TURN_LEAST * turn && median < TURN_MOST * turn)) {
        return 0;
    }
    for (size_t i = 0; i < n; i++) {
        even += fabs(intervals[i] / median - 1) < REGULAR;
    }
    return (double)even / (double)n;
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
            double even;
            bool clear = split(values, n, marks, trial.sign, ratio, &trial.threshold);

            if (!clear && !split(values, n, marks, trial.sign, RATIO_DOUBT, &trial.threshold)) {
                continue;
            }
            even = evenness(&trial, pulses, count, marks);
            if (clear && even >= EVEN) {
                *sieve = trial;
                sieve_restart(sieve);
                return true;
            }
            if (even >= EVEN_BY_CHANCE || feature == SIEVE_GAP) {
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

    if (!split(values, n, marks, 1, ratio, &trial.threshold) ||
        evenness(&trial, pulses, count, marks) < EVEN) {
        return false;
    }
    others = trial;
    others.sign = -1;
    if (marks == 2 && evenness(&others, pulses, count, marks) < EVEN) {
        return false;
    }
    *sieve = trial;
    sieve_restart(sieve);
    return true;
}
