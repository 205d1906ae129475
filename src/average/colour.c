#include "average/colour.h"

#include <math.h>

#include "base/angle.h"

#define COUNT_MOST 256 /* blocks that are looked at singly */
#define NOISES 5

static const double CORRELATION[NOISES] = {0, 0.3, 0.5, 0.7, 0.85};
/* Weights before the blocks are seen, chosen by the simulation in tests/unit/test_average_mean.c:
 * ordinary runs are mostly white. Only their ratios count. */
static const double PRIOR[NOISES] = {1, 0.1, 0.1, 0.1, 0.3};
static const double FEW = 1.9;     /* see the header */
static const double MISSED = 0.05; /* 1 - 95 % */
static const int HALVINGS = 50;    /* of the search: to rounding */

/* What the blocks say of each noise. */
struct noises {
    double weight[NOISES]; /* they add up to 1 */
    double size[NOISES];   /* s_0 Q / n */
    double power;          /* exponent: (n-1) components/2 */
};

double colour_cosine_power(const double complex *vectors, size_t count, size_t j)
{
    double complex sum = 0;

    for (size_t i = 0; i < count; i++)
        sum += vectors[i] * cos(PI * (double)j * ((double)i + 0.5) / (double)count);
    return 2 * (creal(sum) * creal(sum) + cimag(sum) * cimag(sum)) / (double)count;
}

/* Means of runs of equal length, at most COUNT_MOST; returns their number. */
static size_t batches(const double complex *vectors, size_t count, double complex out[COUNT_MOST])
{
    size_t length = (count + COUNT_MOST - 1) / COUNT_MOST, used = count / length;

    for (size_t k = 0; k < used; k++) {
        out[k] = 0;
        for (size_t i = 0; i < length; i++)
            out[k] += vectors[k * length + i] / (double)length;
    }
    return used;
}

/* The power in cosine sums 1..n-1; all cosines are of multiples of a quarter period over n. */
static void all_powers(const double complex *z, size_t n, double powers[COUNT_MOST])
{
    double table[4 * COUNT_MOST];

    for (size_t k = 0; k < 4 * n; k++)
        table[k] = cos(PI * (double)k / (2 * (double)n));
    for (size_t j = 1; j < n; j++) {
        double re = 0, im = 0;
        for (size_t i = 0; i < n; i++) {
            double c = table[j * (2 * i + 1) % (4 * n)];
            re += creal(z[i]) * c;
            im += cimag(z[i]) * c;
        }
        powers[j - 1] = 2 * (re * re + im * im) / (double)n;
    }
}

/* Logarithm of the weight of first-order noise r, without the prior, and its s_0 Q / n. */
static double weigh(const double *powers, size_t n, double r, double exponent, double *size)
{
    double count = (double)n, q = 0, logs = 0;
    double s0 = (1 + r) / (1 - r) - 2 * r * (1 - pow(r, count)) / (count * (1 - r) * (1 - r));

    for (size_t j = 1; j < n; j++) {
        double s = (1 - r * r) / (1 + r * r - 2 * r * cos(PI * (double)j / count));
        q += powers[j - 1] / s;
        logs += log(s);
    }
    *size = s0 * q / count;
    return -exponent / (count - 1) * logs - exponent * log(q);
}

static double tail(const struct noises *noises, double x)
{
    double sum = 0;

    for (int k = 0; k < NOISES; k++)
        sum += noises->weight[k] * exp(-noises->power * log1p(x / noises->size[k]));
    return sum;
}

/* The point that |error|^2 exceeds with the probability MISSED. */
static double point(const struct noises *noises)
{
    double low = INFINITY, high = 0, share = pow(MISSED, -1 / noises->power) - 1;

    for (int k = 0; k < NOISES; k++) { /* between those of the smallest and the largest alone */
        low = fmin(low, noises->size[k] * share);
        high = fmax(high, noises->size[k] * share);
    }
    for (int i = 0; i < HALVINGS; i++) {
        double middle = 0.5 * (low + high);
        if (tail(noises, middle) > MISSED)
            low = middle;
        else
            high = middle;
    }
    return high;
}

double colour_variance(const double complex *vectors, size_t count, int components)
{
    double complex z[COUNT_MOST];
    double powers[COUNT_MOST], power = 0, likeliest = -INFINITY, sum = 0;
    size_t n = batches(vectors, count, z);
    struct noises noises = {.power = (double)(n - 1) * components / 2};

    all_powers(z, n, powers);
    for (size_t j = 1; j < n; j++)
        power += powers[j - 1];
    if (!(power > 0))
        return power;
    for (int k = 0; k < NOISES; k++) {
        noises.weight[k] =
            log(PRIOR[k]) + weigh(powers, n, CORRELATION[k], noises.power, &noises.size[k]);
        likeliest = fmax(likeliest, noises.weight[k]);
    }
    for (int k = 0; k < NOISES; k++)
        sum += noises.weight[k] = exp(noises.weight[k] - likeliest);
    for (int k = 0; k < NOISES; k++)
        noises.weight[k] /= sum;
    return (1 - FEW / (double)count) * point(&noises) / COLOUR_CHI2_95;
}
