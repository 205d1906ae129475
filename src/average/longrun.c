#include "average/longrun.h"

#include <math.h>

#include "average/colour.h"

static const size_t COUNT_LEAST = 6; /* with fewer a correlation says nothing */
static const double LEVEL = 0.1;     /* of the cosine test; see tests/unit/test_average_mean.c */
static const size_t WANDER_LEAST =
    12; /* blocks; with fewer there is no slow part beside the line */
static const double WANDER_LEVEL = 0.01; /* of the search for wander; common practice */
static const double FEW = 2.5;           /* from the simulation, with colour.c's weights */
static const double CHI2_95 = 5.99146;   /* chi-squared with 2 degrees of freedom, 95 % */

double longrun_f_tail(double x, size_t a, size_t b)
{
    double y = (double)b / ((double)b + (double)a * x);
    double term = pow(y, (double)b), sum = 0;

    for (size_t j = 0; j < a; j++) {
        sum += term;
        term *= (1 - y) * (double)(b + j) / (double)(j + 1);
    }
    return sum;
}

double longrun_f2_point(double p, double b)
{
    return b * (pow(p, -1 / b) - 1);
}

double longrun_few(size_t count)
{
    double n = (double)count;

    return count < COUNT_LEAST ? 2 * longrun_f2_point(0.05, n - 1) / CHI2_95 : 1 - FEW / n;
}

static double complex mean(const double complex *vectors, size_t count)
{
    double complex sum = 0;

    for (size_t i = 0; i < count; i++)
        sum += vectors[i];
    return sum / (double)count;
}

static double square(double complex z)
{
    return creal(z) * creal(z) + cimag(z) * cimag(z);
}

static double from_cosines(const double complex *vectors, size_t count, double power)
{
    size_t most = count < 128 ? 8 : 16, j = 1;
    double low = 0, factor = 1;

    for (size_t b = 2; b <= most && 2 * b <= count; b *= 2) {
        size_t rest = count - 1 - b;
        double excess;
        for (; j <= b; j++)
            low += colour_cosine_power(vectors, count, j);
        excess = low / (double)b / ((power - low) / (double)rest);
        if (longrun_f_tail(excess, b, rest) < LEVEL) {
            double wider = 2 * longrun_f2_point(0.05, (double)b) / CHI2_95;
            double ratio = low / (double)b / (power / (double)(count - 1)) * wider;
            if (ratio > factor)
                factor = ratio;
        }
    }
    return factor;
}

double longrun_wander(const double complex *vectors, size_t count)
{
    double power = 0, low = 0, largest = 0;
    size_t most = count < 128 ? 8 : 16, j = 1;

    for (size_t i = 0; i < count; i++)
        power += square(vectors[i]);
    if (count < WANDER_LEAST || isnan(power))
        return NAN;
    for (size_t b = 2; b <= most && 2 * b <= count; b *= 2) {
        size_t rest = count - 1 - b;
        for (; j <= b; j++)
            low += colour_cosine_power(vectors, count, j);
        double floor = fmax(power - low, 0) / (double)rest;
        if (low > 0 && longrun_f_tail(low / (double)b / floor, b, rest) < WANDER_LEVEL)
            largest = fmax(largest, low - (double)b * floor);
    }
    return sqrt(largest / (double)count);
}

double longrun_factor(const double complex *vectors, size_t count, int components)
{
    double complex middle = mean(vectors, count);
    double power = 0, shown, cosines;

    for (size_t i = 0; i < count; i++)
        power += square(vectors[i] - middle);
    if (isnan(power))
        return NAN;
    /* No scatter beyond rounding: correlated or not, it does not matter. */
    if (count < COUNT_LEAST || power <= 1e-24 * square(middle) * (double)count || power == 0)
        return longrun_few(count);
    shown =
        power / (double)(components * (long)(count - 1)); /* variance of a component of a block */
    cosines = from_cosines(vectors, count, power) * longrun_few(count);
    return fmax(cosines, colour_variance(vectors, count, components) * (double)count / shown);
}
