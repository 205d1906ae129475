#include "track/spectrum.h"

#include <fftw3.h>
#include <math.h>
#include <stdlib.h>
#include <string.h>

#include "base/angle.h"

#define TOP_HZ                                                                                     \
    1000.0 /* the upper end of ordinary broad-band vibration (ISO 20816-1: 10 to 1000 Hz) */
#define BYTES_MOST (4L << 20) /* for the grids of all sensors */

static size_t power_of_two(double least)
{
    size_t n = 16;

    while (n < 1024 && (double)n < least) {
        n *= 2;
    }
    return n;
}

int spectrum_init(struct spectrum *spectrum, size_t sensors, double rate_hz, double period,
                  double frames)
{
    double top = fmax(SPECTRUM_FINE + 0.5, TOP_HZ * period / rate_hz);
    size_t turns = SPECTRUM_TURNS, bins = power_of_two(2.5 * top);

    while (frames > 0 && turns > 1 && (double)turns > frames / period - 2) {
        turns /= 2;
    }
    while (bins > 16 && (2 * (double)bins > period ||
                         sensors * turns * bins * sizeof(double) > (size_t)BYTES_MOST)) {
        bins /= 2; /* two samples or more to a step */
    }
    size_t n = turns * bins;

    *spectrum = (struct spectrum){.sensors = sensors,
                                  .bins = bins,
                                  .turns = turns,
                                  .every = 1,
                                  .top = fmin(top, 0.4 * (double)bins)};
    if (frames > 0) {
        spectrum->every = (long)ceil(frames / period / (double)turns / SPECTRUM_MOST);
        spectrum->every = spectrum->every < 1 ? 1 : spectrum->every;
    }
    spectrum->grid = calloc(sensors * n + 1, sizeof(double));
    spectrum->share = calloc(n, sizeof(double));
    spectrum->power = calloc(sensors * (n / 2 + 1) + 1, sizeof(double));
    spectrum->complex_out = calloc(n + 2, sizeof(double));
    if (spectrum->grid && spectrum->complex_out) {
        spectrum->plan =
            fftw_plan_dft_r2c_1d((int)n, spectrum->grid, (fftw_complex *)spectrum->complex_out,
                                 FFTW_ESTIMATE | FFTW_UNALIGNED | FFTW_PRESERVE_INPUT);
    }
    if (!spectrum->share || !spectrum->power || !spectrum->plan) {
        spectrum_end(spectrum);
        return -1;
    }
    return 0;
}

void spectrum_end(struct spectrum *spectrum)
{
    if (spectrum->plan) {
        fftw_destroy_plan(spectrum->plan);
    }
    free(spectrum->grid);
    free(spectrum->share);
    free(spectrum->power);
    free(spectrum->complex_out);
    *spectrum = (struct spectrum){0};
}

bool spectrum_wants(const struct spectrum *spectrum)
{
    return spectrum->turns > 0 && spectrum->stretch % spectrum->every == 0;
}

void spectrum_add(struct spectrum *spectrum, const struct vector_weights *weights, size_t sensor,
                  const float *x, float offset)
{
    size_t bins = spectrum->bins, n = bins * spectrum->turns;
    double *grid = spectrum->grid + sensor * n + spectrum->turn * bins;
    double *share = spectrum->share + spectrum->turn * bins;

    for (size_t i = 0; i < weights->count; i++) {
        float place = weights->angle[i] * (float)bins;
        size_t bin = place > 0 ? (size_t)place : 0;

        bin = bin < bins ? bin : bins - 1;
        grid[bin] += (double)(weights->one[i] * (x[i] - offset));
        if (sensor == 0) {
            share[bin] += (double)weights->one[i];
        }
    }
}

/* Sums to means; a step that got no sample takes the value before it. The mean is taken off. */
static void level_grid(const struct spectrum *spectrum, double *grid)
{
    size_t n = spectrum->bins * spectrum->turns;
    double mean = 0;

    for (size_t i = 0; i < n; i++) {
        if (spectrum->share[i] > 0) {
            grid[i] /= spectrum->share[i];
        } else {
            grid[i] = i > 0 ? grid[i - 1] : 0;
        }
        mean += grid[i] / (double)n;
    }
    for (size_t i = 0; i < n; i++) {
        grid[i] -= mean;
    }
}

static void transform(struct spectrum *spectrum)
{
    size_t n = spectrum->bins * spectrum->turns;

    for (size_t s = 0; s < spectrum->sensors; s++) {
        double *grid = spectrum->grid + s * n, *power = spectrum->power + s * (n / 2 + 1);

        level_grid(spectrum, grid);
        fftw_execute_dft_r2c(spectrum->plan, grid, (fftw_complex *)spectrum->complex_out);
        for (size_t k = 1; k < n / 2; k++) {
            double re = spectrum->complex_out[2 * k] * 2 / (double)n;
            double im = spectrum->complex_out[2 * k + 1] * 2 / (double)n;

            power[k] += re * re + im * im;
        }
    }
    spectrum->count++;
}

static void clear(struct spectrum *spectrum)
{
    size_t n = spectrum->bins * spectrum->turns;

    memset(spectrum->grid, 0, spectrum->sensors * n * sizeof(double));
    memset(spectrum->share, 0, n * sizeof(double));
    spectrum->turn = 0;
}

void spectrum_turn(struct spectrum *spectrum)
{
    if (spectrum->turns == 0) {
        return;
    }
    spectrum->turn++;
    if (spectrum->turn == spectrum->turns) {
        if (spectrum_wants(spectrum)) {
            transform(spectrum);
            clear(spectrum);
        }
        spectrum->turn = 0;
        spectrum->stretch++;
    }
}

void spectrum_break(struct spectrum *spectrum)
{
    if (spectrum->turns > 0) {
        clear(spectrum);
    }
}

/* What averaging over a step of angle leaves of a line, as an amplitude. */
static double droop(double order, size_t bins)
{
    double y = PI * order / (double)bins;

    return sin(y) / y;
}

size_t spectrum_lines(const struct spectrum *spectrum, size_t sensor, double *orders,
                      double *amplitude)
{
    size_t n = spectrum->bins * spectrum->turns, lines = 0;
    const double *power = spectrum->power + sensor * (n / 2 + 1);
    double turns = (double)spectrum->turns, above = spectrum->top - SPECTRUM_FINE, sum = 0;
    double step = fmax(1, ceil(above / (SPECTRUM_LINES - SPECTRUM_FINE * SPECTRUM_TURNS - 2)));
    double border = SPECTRUM_FINE + step;

    for (size_t k = 1; spectrum->count > 0 && k < n / 2 && (double)k / turns <= spectrum->top;
         k++) {
        double order = (double)k / turns, part = droop(order, spectrum->bins);
        double square = power[k] / (double)spectrum->count / (part * part);

        if (order <= SPECTRUM_FINE) {
            orders[lines] = order;
            amplitude[lines++] = sqrt(square);
            continue;
        }
        sum += square;
        if (order >= border) {
            orders[lines] = border - step / 2;
            amplitude[lines++] = sqrt(sum);
            border += step;
            sum = 0;
        }
    }
    return lines;
}
