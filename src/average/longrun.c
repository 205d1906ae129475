#include "average/longrun.h"

#include <math.h>

#include "average/colour.h"

static const size_t COUNT_LEAST = 6; /* with fewer a correlation says nothing */
static const double LEVEL = 0.1;     /* of the cosine test; see tests/unit/test_average_mean.c */
static const size_t WANDER_LEAST =
    12; /* blocks; with fewer there is no slow part beside the line */
static const double WANDER_LEVEL = 0.01; /* of the search for wander; common practice */
static const double FEW = 2.5;           /* from the simulation, with colour.c's weights */
static const double CHI1_95 = 3.84146;   /* chi-squared with 1 degree of freedom, 95 % */
/* Student's t, two-sided 95 %, of 1 to 16 degrees of freedom: M. Abramowitz, I. A. Stegun (1964),
 * table 26.10. */
static const double T_95[] = {12.706, 4.303, 3.182, 2.776, 2.571, 2.447, 2.365, 2.306,
                              2.262,  2.228, 2.201, 2.179, 2.160, 2.145, 2.131, 2.120};

double longrun_f_tail(double x, size_t a, double b)
{
    double y = b / (b + (double)a * x);
    double term = pow(y, b), sum = 0;

    for (size_t j = 0; j < a; j++) {
        sum += term;
        term *= (1 - y) * (b + (double)j) / (double)(j + 1);
    }
    return sum;
}

double longrun_f2_point(double p, double b)
{
    return b * (pow(p, -1 / b) - 1);
}

/* What a region of 95 % is wider (squared) where the variance of each component rests on so many
 * `freedom` squares a component than where it is known. */
static double wider(size_t freedom, int components)
{
    if (components == 2)
        return 2 * longrun_f2_point(0.05, (double)freedom) / COLOUR_CHI2_95;
    return T_95[freedom - 1] * T_95[freedom - 1] / CHI1_95;
}

double longrun_few(size_t count, int components)
{
    return count < COUNT_LEAST ? wider(count - 1, components) : 1 - FEW / (double)count;
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

static double from_cosines(const double complex *vectors, size_t count, double power,
                           int components)
{
    size_t most = count < 128 ? 8 : 16, j = 1;
    double low = 0, factor = 1;

    for (size_t b = 2; b <= most && 2 * b <= count; b *= 2) {
        size_t rest = count - 1 - b;
        double excess;
        for (; j <= b; j++)
            low += colour_cosine_power(vectors, count, j);
        excess = low / (double)b / ((power - low) / (double)rest);
        if (longrun_f_tail(excess, b * (size_t)components / 2, (double)rest * components / 2) <
            LEVEL) {
            double ratio = low / (double)b / (power / (double)(count - 1)) * wider(b, components);
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
        if (low > 0 && longrun_f_tail(low / (double)b / floor, b, (double)rest) < WANDER_LEVEL)
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
        return longrun_few(count, components);
    shown =
        power / (double)(components * (long)(count - 1)); /* variance of a component of a block */
    cosines = from_cosines(vectors, count, power, components) * longrun_few(count, components);
    return fmax(cosines, colour_variance(vectors, count, components) * (double)count / shown);
}
