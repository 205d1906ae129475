#include "average/smooth.h"

#include <lapacke.h>
#include <math.h>
#include <stdbool.h>
#include <stdlib.h>
#include <string.h>

#include "average/colour.h"
#include "average/longrun.h"

#define LENGTHS 10
#define RATIOS 7
#define NOISES 3
#define MODELS (LENGTHS * RATIOS * NOISES)

static const double LENGTH[LENGTHS] = {0.06, 0.1, 0.16, 0.25, 0.35,
                                       0.5,  0.7, 1,    1.7,  3}; /* over reach */
/* Lengths below 0.25 are for a resonance that is narrow for its sweep, which stands out by tens of
 * powers of ten; their weight before the points are seen keeps slow noise from passing as one. */
static const double NARROW = 0.25, NARROW_PRIOR = 0.01;
static const double HOPELESS = 40; /* e^-40 of the likeliest is less than rounding */
static const double RATIO[RATIOS] = {1, 3, 10, 30, 100, 1000, 10000}; /* of the curve over noise */
/* Of the noise from block to block, and its weight before the points are seen: our choice, the
 * runs being mostly white, as in colour.c, whose five noises have weights of their own. */
static const double CORRELATION[NOISES] = {0, 0.5, 0.85};
static const double PRIOR[NOISES] = {1, 0.2, 0.3};
/* What is added to the variance of curves that bend within reach, which seldom bend alike
 * everywhere; from the campaign of tests/unit/test_average_sweep.c, on the flanks of resonances. */
static const double UNEVEN = 0.15;
static const double LINE = 100; /* variance of the straight line over the curve's: vague */

/* Room for the models of one length. */
struct room {
    double complex *without; /* count x count, by columns, lower half: covariances without noise */
    double complex *matrix;  /* the same with noise, and then its factor */
    double complex *given;   /* 3 columns: the points, covariances with the value, with the slope */
    double complex *solved;  /* the same, multiplied by the inverse of the matrix */
    double *alike;           /* NOISES times count x count: correlations of the points' noise */
};

/* What one model says. */
struct said {
    double complex value, slope;
    double variance, noise, weight; /* weight: its logarithm at first */
};

static double complex blurred(double u, double length, double complex blur)
{
    double complex l = length * length + 2 * blur;

    return length / csqrt(l) * cexp(-u * u / (2 * l));
}

static void set_length(const struct smooth_point *p, size_t n, double reach, double length,
                       double complex middle, const struct room *room)
{
    double complex *value = room->given + n, *slope = value + n;

    for (size_t j = 0; j < n; j++)
        for (size_t i = j; i < n; i++)
            room->without[j * n + i] =
                blurred(p[i].x - p[j].x, length, p[i].blur + conj(p[j].blur)) +
                LINE * (1 + p[i].x * p[j].x / (reach * reach));
    for (size_t i = 0; i < n; i++) {
        double complex k = blurred(p[i].x, length, p[i].blur);
        room->given[i] = p[i].z - middle;
        value[i] = k + LINE;
        slope[i] = k * p[i].x / (length * length + 2 * p[i].blur) + LINE * p[i].x / (reach * reach);
    }
}

static void set_noises(const struct smooth_point *p, size_t n, double *alike)
{
    for (int k = 0; k < NOISES; k++)
        for (size_t j = 0; j < n; j++)
            for (size_t i = 0; i < n; i++) {
                size_t apart =
                    p[i].order > p[j].order ? p[i].order - p[j].order : p[j].order - p[i].order;
                *alike++ = pow(CORRELATION[k], (double)apart);
            }
}

/* False where the matrix is singular, or a NaN is among the points. */
static bool ask(size_t n, double ratio, int noise, double complex middle, const struct room *room,
                struct said *said)
{
    double power = 0, logs = 0, known = 0, scale;
    const double complex *given = room->given, *solved = room->solved;
    const double *alike = room->alike + (size_t)noise * n * n;

    memcpy(room->solved, room->given, 3 * n * sizeof *room->solved);
    for (size_t i = 0; i < n * n; i++)
        room->matrix[i] = room->without[i] + alike[i] / (ratio * ratio);
    if (LAPACKE_zposv(LAPACK_COL_MAJOR, 'L', (lapack_int)n, 3, room->matrix, (lapack_int)n,
                      room->solved, (lapack_int)n) != 0)
        return false;
    *said = (struct said){.value = middle};
    for (size_t i = 0; i < n; i++) {
        power += creal(conj(given[i]) * solved[i]);
        logs += 2 * log(creal(room->matrix[i * n + i]));
        said->value += conj(given[n + i]) * solved[i];
        said->slope += conj(given[2 * n + i]) * solved[i];
        known += creal(conj(given[n + i]) * solved[n + i]);
    }
    if (!(power >= 0))
        return false;
    scale = power / (2 * (double)n);
    said->variance = fmax(0, 1 + LINE - known) * scale;
    said->noise = scale / (ratio * ratio);
    said->weight = log(PRIOR[noise]) - logs - (double)n * log(power);
    return true;
}

/* All ratios with one length and noise; gives how many have said something. */
static size_t ask_ratios(size_t n, double length, int noise, double complex middle,
                         const struct room *room, double *likeliest, struct said *said)
{
    double before = -INFINITY;
    size_t good = 0;

    for (size_t r = 0; r < RATIOS; r++) {
        struct said *one = &said[good];
        if (!ask(n, RATIO[r], noise, middle, room, one))
            continue;
        one->weight += length < NARROW ? log(NARROW_PRIOR) : 0;
        one->variance *= length <= 1 ? 1 + UNEVEN : 1;
        *likeliest = fmax(*likeliest, one->weight);
        good++;
        if (one->weight < before && one->weight < *likeliest - HOPELESS)
            break; /* it has one maximum */
        before = one->weight;
    }
    return good;
}

static void average(struct said *said, size_t count, size_t points, struct smooth *out)
{
    double likeliest = -INFINITY, sum = 0;
    double few = 2 * longrun_f2_point(0.05, (double)points - 1) / COLOUR_CHI2_95;

    *out = (struct smooth){0};
    for (size_t k = 0; k < count; k++)
        likeliest = fmax(likeliest, said[k].weight);
    for (size_t k = 0; k < count; k++) {
        said[k].weight = isinf(likeliest) ? 1 : exp(said[k].weight - likeliest);
        sum += said[k].weight;
    }
    for (size_t k = 0; k < count; k++) {
        double w = said[k].weight / sum;
        out->value += w * said[k].value;
        out->slope += w * said[k].slope;
        out->noise += w * said[k].noise;
    }
    for (size_t k = 0; k < count; k++) {
        double off = cabs(said[k].value - out->value);
        out->variance += said[k].weight / sum * (said[k].variance * few + off * off / 2);
    }
}

int smooth_at_zero(const struct smooth_point *points, size_t count, double reach,
                   struct smooth *out)
{
    size_t square = count * count;
    double complex *all = calloc(2 * square + 6 * count, sizeof *all);
    double *alike = malloc(NOISES * square * sizeof *alike);
    struct said said[MODELS];
    double complex middle = 0;
    double likeliest = -INFINITY;
    size_t good = 0;

    if (!all || !alike) {
        free(alike);
        free(all);
        return -1;
    }
    const struct room room = {all, all + square, all + 2 * square, all + 2 * square + 3 * count,
                              alike};
    for (size_t i = 0; i < count; i++)
        middle += points[i].z / (double)count;
    set_noises(points, count, alike);
    for (size_t l = 0; l < LENGTHS; l++) {
        set_length(points, count, reach, LENGTH[l] * reach, middle, &room);
        for (int k = 0; k < NOISES; k++)
            good += ask_ratios(count, LENGTH[l], k, middle, &room, &likeliest, &said[good]);
    }
    if (good > 0)
        average(said, good, count, out);
    free(alike);
    free(all);
    return good > 0 ? 0 : 1;
}
