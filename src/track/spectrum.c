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

/* How many stretches may be joined for the finer spectrum. */
static size_t joined_of(const struct spectrum *spectrum, double rate_hz, double period,
                        double frames)
{
    size_t joined = 1, bytes = spectrum->sensors * spectrum->turns * spectrum->bins * sizeof(float);
    double time = (double)spectrum->turns * period;

    while (2 * joined * spectrum->turns <= SPECTRUM_FINE_TURNS &&
           2 * (double)joined * time <= SPECTRUM_FINE_S * rate_hz &&
           !(frames > 0 && 2 * (double)joined * time * SPECTRUM_FINE_LEAST > frames) &&
           2 * joined * bytes <= (size_t)BYTES_MOST) {
        joined *= 2;
    }
    return joined;
}

/* Both transforms go from `in` to `out`, which lie as FFTW likes it. */
static void *plan_of(const struct spectrum *spectrum, size_t n)
{
    return fftw_plan_dft_r2c_1d((int)n, spectrum->in, (fftw_complex *)spectrum->out,
                                FFTW_ESTIMATE | FFTW_PRESERVE_INPUT);
}

/* Memory and plans. 0, or -1 when memory is out. */
static int furnish(struct spectrum *spectrum)
{
    size_t n = spectrum->turns * spectrum->bins, all = spectrum->joined * n;
    size_t sensors = spectrum->sensors;

    spectrum->fine_count = SPECTRUM_FINE * spectrum->joined * spectrum->turns + 1;
    if (spectrum->fine_count > all * 2 / 5) {
        spectrum->fine_count = all * 2 / 5; /* as `top` */
    }
    spectrum->halves = 2 * spectrum->fine_count / (spectrum->joined * spectrum->turns) + 1;
    spectrum->grid = calloc(sensors * (n + 2) + 1, sizeof(double));
    spectrum->share = calloc(n + 2, sizeof(double));
    spectrum->power = calloc(sensors * (n / 2 + 1) + 1, sizeof(double));
    spectrum->fine = calloc(sensors * all + 1, sizeof(float));
    spectrum->fine_power = calloc(sensors * spectrum->fine_count + 1, sizeof(double));
    spectrum->locked = calloc(sensors * spectrum->halves + 1, sizeof(double));
    spectrum->in = fftw_alloc_real(all);
    spectrum->out = fftw_alloc_real(all + 2);
    if (!spectrum->grid || !spectrum->share || !spectrum->power || !spectrum->fine ||
        !spectrum->fine_power || !spectrum->locked || !spectrum->in || !spectrum->out) {
        return -1;
    }
    spectrum->plan = plan_of(spectrum, n);
    spectrum->fine_plan = plan_of(spectrum, all);
    return spectrum->plan && spectrum->fine_plan ? 0 : -1;
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
    *spectrum = (struct spectrum){.sensors = sensors,
                                  .bins = bins,
                                  .turns = turns,
                                  .every = 1,
                                  .top = fmin(top, 0.4 * (double)bins)};
    spectrum->joined = joined_of(spectrum, rate_hz, period, frames);
    if (frames > 0) {
        spectrum->every = (long)ceil(frames / period / (double)turns / SPECTRUM_MOST);
        spectrum->every = spectrum->every < 1 ? 1 : spectrum->every;
    }
    if (furnish(spectrum)) {
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
    if (spectrum->fine_plan) {
        fftw_destroy_plan(spectrum->fine_plan);
    }
    free(spectrum->grid);
    free(spectrum->share);
    free(spectrum->power);
    free(spectrum->fine);
    free(spectrum->fine_power);
    free(spectrum->locked);
    fftw_free(spectrum->in);
    fftw_free(spectrum->out);
    *spectrum = (struct spectrum){0};
}

bool spectrum_wants(const struct spectrum *spectrum)
{
    return spectrum->turns > 0 && spectrum->stretch / (long)spectrum->joined % spectrum->every == 0;
}

/* ---- samples to steps of angle ---- */

/* Where the samples of a piece lie between the steps, and their weights there. */
static void place_samples(struct spectrum *spectrum, const struct vector_weights *weights)
{
    double *share = spectrum->share + spectrum->turn * spectrum->bins;
    float bins = (float)spectrum->bins;

    for (size_t i = 0; i < weights->count; i++) {
        float place = weights->angle[i] * bins, last = bins - 0.001F;

        place = place > 0 ? place : 0;
        place = place < last ? place : last;
        int step = (int)place;
        float far = weights->one[i] * (place - (float)step);

        spectrum->step[i] = step;
        spectrum->beyond[i] = far;
        share[step] += (double)(weights->one[i] - far);
        share[step + 1] += (double)far;
    }
    spectrum->samples += (double)weights->count;
}

void spectrum_add(struct spectrum *spectrum, const struct vector_weights *weights, size_t sensor,
                  const float *x, float offset)
{
    size_t bins = spectrum->bins, n = bins * spectrum->turns;
    double *grid = spectrum->grid + sensor * (n + 2) + spectrum->turn * bins;

    if (sensor == 0) {
        place_samples(spectrum, weights);
    }
    for (size_t i = 0; i < weights->count; i++) {
        double *to = grid + spectrum->step[i];
        float y = x[i] - offset, far = spectrum->beyond[i] * y;

        to[0] += (double)(weights->one[i] * y - far);
        to[1] += (double)far; /* the last one of the stretch is not used */
    }
}

/* Sums to means; a step that got no sample takes the value before it. */
static void level_grid(const struct spectrum *spectrum, double *grid)
{
    size_t n = spectrum->bins * spectrum->turns;

    for (size_t i = 0; i < n; i++) {
        if (spectrum->share[i] > 0) {
            grid[i] /= spectrum->share[i];
        } else {
            grid[i] = i > 0 ? grid[i - 1] : 0;
        }
    }
}

/* ---- spectra ---- */

/* The joined stretches of a sensor as seen through a Hann window: one transform, whose neighbouring
 * bins are joined instead (1 - cos is three lines). The orders and half orders, which are bins of
 * their own, do not take part, so that nothing of them is left in the bins beside. */
static void transform_fine(struct spectrum *spectrum, size_t sensor)
{
    size_t turns = spectrum->joined * spectrum->turns, n = turns * spectrum->bins;
    const float *x = spectrum->fine + sensor * n;
    double *power = spectrum->fine_power + sensor * spectrum->fine_count, *z = spectrum->out;
    double *locked = spectrum->locked + sensor * spectrum->halves, scale = 1 / (double)n;

    for (size_t i = 0; i < n; i++) {
        spectrum->in[i] = x[i];
    }
    fftw_execute(spectrum->fine_plan);
    for (size_t i = 0, k = 0; k <= spectrum->fine_count; i++, k += turns / 2) {
        locked[i] += 4 * scale * scale * (z[2 * k] * z[2 * k] + z[2 * k + 1] * z[2 * k + 1]);
        z[2 * k] = z[2 * k + 1] = 0;
    }
    for (size_t k = 1; k < spectrum->fine_count; k++) {
        double re = scale * (2 * z[2 * k] - z[2 * k - 2] - z[2 * k + 2]);
        double im = scale * (2 * z[2 * k + 1] - z[2 * k - 1] - z[2 * k + 3]);

        power[k] += re * re + im * im;
    }
}

/* Adds the stretch to the joined ones, and these, once they are complete, to the finer spectrum. */
static void join(struct spectrum *spectrum)
{
    size_t n = spectrum->bins * spectrum->turns;

    if (spectrum->joined * spectrum->turns < STRAY_TURNS) {
        return;
    }
    for (size_t s = 0; s < spectrum->sensors; s++) {
        float *to = spectrum->fine + (s * spectrum->joined + spectrum->held) * n;

        for (size_t i = 0; i < n; i++) {
            to[i] = (float)spectrum->grid[s * (n + 2) + i];
        }
    }
    spectrum->held++;
    if (spectrum->held < spectrum->joined) {
        return;
    }
    for (size_t s = 0; s < spectrum->sensors; s++) {
        transform_fine(spectrum, s);
    }
    spectrum->fine_sum++;
    spectrum->used += spectrum->weighed;
    spectrum->weighed = 0;
    spectrum->held = 0;
}

static void transform(struct spectrum *spectrum)
{
    size_t n = spectrum->bins * spectrum->turns;

    for (size_t s = 0; s < spectrum->sensors; s++) {
        double *grid = spectrum->grid + s * (n + 2), *power = spectrum->power + s * (n / 2 + 1);

        level_grid(spectrum, grid);
        memcpy(spectrum->in, grid, n * sizeof *grid);
        fftw_execute(spectrum->plan);
        for (size_t k = 1; k < n / 2; k++) {
            double re = spectrum->out[2 * k] * 2 / (double)n;
            double im = spectrum->out[2 * k + 1] * 2 / (double)n;

            power[k] += re * re + im * im;
        }
    }
    spectrum->count++;
}

/* Weighs the turn's time as the window weighs the power of what came in it. */
static void weigh_turn(struct spectrum *spectrum)
{
    size_t turn = spectrum->held * spectrum->turns + spectrum->turn;
    double middle = ((double)turn + 0.5) / (double)(spectrum->joined * spectrum->turns);
    double window = 1 - cos(2 * PI * middle);

    spectrum->weighed += window * window * spectrum->samples;
    spectrum->samples = 0;
}

static void clear(struct spectrum *spectrum)
{
    size_t n = spectrum->bins * spectrum->turns + 2;

    memset(spectrum->grid, 0, spectrum->sensors * n * sizeof(double));
    memset(spectrum->share, 0, n * sizeof(double));
    spectrum->turn = 0;
}

void spectrum_turn(struct spectrum *spectrum)
{
    if (spectrum->turns == 0) {
        return;
    }
    weigh_turn(spectrum);
    spectrum->turn++;
    if (spectrum->turn == spectrum->turns) {
        if (spectrum_wants(spectrum)) {
            transform(spectrum);
            join(spectrum);
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
        spectrum->stretch -= spectrum->stretch % (long)spectrum->joined; /* the group anew */
        spectrum->held = 0;
        spectrum->samples = spectrum->weighed = 0;
    }
}

/* What averaging over the triangle leaves of a line, as an amplitude. */
static double droop(double order, size_t bins)
{
    double y = PI * order / (double)bins;

    return y > 0 ? sin(y) / y * (sin(y) / y) : 1;
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

size_t spectrum_strays(const struct spectrum *spectrum, size_t sensor, struct stray *out)
{
    size_t n = spectrum->bins * spectrum->turns, turns = spectrum->joined * spectrum->turns;
    const double *power = spectrum->power + sensor * (n / 2 + 1);
    double square = 0;

    if (spectrum->turns == 0 || spectrum->fine_sum == 0) {
        return 0;
    }
    double period = spectrum->used / (1.5 * (double)turns * (double)spectrum->fine_sum); /* mean of
    the window's square is 1.5 */

    for (size_t k = 1; k < n / 2; k++) {
        square += power[k] / 2 / (double)spectrum->count;
    }
    struct stray_spectrum fine = {spectrum->fine_power + sensor * spectrum->fine_count,
                                  spectrum->locked + sensor * spectrum->halves,
                                  spectrum->fine_count, turns, spectrum->fine_sum};
    size_t found = stray_find(&fine, square, out);

    for (size_t i = 0; i < found; i++) {
        out[i].amplitude /= droop(out[i].order, spectrum->bins);
        out[i].order /= period;
    }
    return found;
}
