#include "track/tone_line.h"

#include <fftw3.h>
#include <math.h>
#include <stdlib.h>
#include <string.h>

#include "base/angle.h"

#define SEARCH 0.1      /* about the service speed: `service-speed` refuses beyond it anyway */
#define LOWEST_HZ 2.0   /* 120 rpm */
#define HIGHEST_SHARE 5 /* of the rate: the triangle's droop is then a quarter */
#define STANDS_OUT                                                                                 \
    40.0 /* power over the median about it: noise over 1e5 bins reaches ln(1e5)/ln 2 =             \
          * 17 times the median */
#define RIVAL_BELOW                                                                                \
    0.1          /* the same at the half and the third of a line that was chosen by size alone */
#define LOBE 2.5 /* bins from a line's middle to where a Hann window lets go of it */

static size_t power_of_two(size_t least)
{
    size_t n = 64;

    while (n < least) {
        n *= 2;
    }
    return n;
}

static double hann(size_t i, size_t n)
{
    double s = sin(PI * ((double)i + 0.5) / (double)n);

    return s * s;
}

static double mean_of(const float *x, size_t n)
{
    double sum = 0;

    for (size_t i = 0; i < n; i++) {
        sum += x[i];
    }
    return sum / (double)n;
}

/* Adds a sensor's spectrum, as a velocity and by its own total, to `power`. */
static void add_spectrum(double *power, const float *x, size_t n, double *in, double *out,
                         fftw_plan plan, size_t bins, int derivatives)
{
    double mean = mean_of(x, n), total = 0;

    memset(in, 0, bins * sizeof *in);
    for (size_t i = 0; i < n; i++) {
        in[i] = hann(i, n) * (x[i] - mean);
    }
    fftw_execute(plan);
    for (size_t k = 1; k < bins / 2; k++) {
        double p = out[2 * k] * out[2 * k] + out[2 * k + 1] * out[2 * k + 1];

        p *= pow((double)k, -2.0 * derivatives);
        out[2 * k] = p;
        total += (double)k * (double)n > 2 * LOBE * (double)bins ? p : 0; /* the mean's own lobe */
    }
    for (size_t k = 1; total > 0 && k < bins / 2; k++) {
        power[k] += out[2 * k] / total;
    }
}

static int ascending(const void *a, const void *b)
{
    double x = *(const double *)a, y = *(const double *)b;

    return (x > y) - (x < y);
}

/* Median power of the `reach` bins on either side. */
static double floor_about(const double *power, size_t bins, size_t k, size_t reach, double *scratch)
{
    size_t from = k > reach ? k - reach : 1, to = k + reach < bins / 2 ? k + reach : bins / 2 - 1;
    size_t n = to - from + 1;

    memcpy(scratch, power + from, n * sizeof *scratch);
    qsort(scratch, n, sizeof *scratch, ascending);
    return scratch[n / 2];
}

/* The largest bin of [from, to] Hz that is a local maximum and lies off `not_hz` by a lobe; 0:
 * none. */
static size_t largest(const double *power, size_t bins, double bin_hz, double from, double to,
                      double not_hz, double lobe_hz)
{
    size_t best = 0;

    for (size_t k = (size_t)fmax(2, ceil(from / bin_hz));
         k + 1 < bins / 2 && (double)k * bin_hz <= to; k++) {
        bool peak = power[k] >= power[k - 1] && power[k] >= power[k + 1];

        if (peak && !(fabs((double)k * bin_hz - not_hz) < lobe_hz) &&
            (best == 0 || power[k] > power[best])) {
            best = k;
        }
    }
    return best;
}

static void find_rival(struct tone_line *line, const double *power, size_t bins, double bin_hz,
                       double lobe, size_t own, bool guided, double top)
{
    size_t k = largest(power, bins, bin_hz, fmax(LOWEST_HZ, line->hz / 3), fmin(top, 5 * line->hz),
                       line->hz, lobe);
    double share = k ? sqrt(power[k] / power[own]) : 0;

    if (share >= TONE_LINE_RIVAL) {
        line->rival_hz = (double)k * bin_hz;
        line->rival = share;
    }
    for (int part = 2; !guided && part <= 3; part++) {
        double at = line->hz / part;

        k = largest(power, bins, bin_hz, at - lobe / 2, at + lobe / 2, NAN, 0);
        share = k && at > 2 * lobe ? sqrt(power[k] / power[own]) : 0;
        if (share >= RIVAL_BELOW && share > line->rival) {
            line->rival_hz = (double)k * bin_hz;
            line->rival = share;
        }
    }
}

static bool choose(struct tone_line *line, const double *power, size_t bins, size_t n,
                   double rate_hz, double service_hz, double *scratch)
{
    double bin_hz = rate_hz / (double)bins, lobe = LOBE * rate_hz / (double)n;
    double top = rate_hz / HIGHEST_SHARE;
    bool guided = service_hz > 0;
    double from = guided ? service_hz * (1 - SEARCH) : fmax(LOWEST_HZ, 2 * lobe);
    double to = guided ? service_hz * (1 + SEARCH) : top;
    size_t k = largest(power, bins, bin_hz, from, to, NAN, 0);
    size_t reach = (size_t)(12 * lobe / bin_hz);

    *line = (struct tone_line){0};
    if (k == 0 || !(power[k] > STANDS_OUT * floor_about(power, bins, k, reach, scratch))) {
        return false;
    }
    line->hz = (double)k * bin_hz;
    find_rival(line, power, bins, bin_hz, lobe, k, guided, top);
    return true;
}

static bool all_finite(const float *data, size_t sensors, size_t room, size_t n)
{
    for (size_t s = 0; s < sensors; s++) {
        if (!isfinite(mean_of(data + s * room, n))) {
            return false;
        }
    }
    return true;
}

int tone_line_search(struct tone_line *line, bool *found, const float *data, size_t sensors,
                     size_t room, size_t n, const int *derivatives, double rate_hz,
                     double service_hz)
{
    size_t bins = 2 * power_of_two(n);
    double *in, *out, *power;
    fftw_plan plan = NULL;

    *found = false;
    if (n < 64 || sensors == 0 || !all_finite(data, sensors, room, n)) {
        return 0;
    }
    in = calloc(bins, sizeof *in);
    out = calloc(bins + 2, sizeof *out);
    power = calloc(bins / 2 + 1, sizeof *power);
    if (in && out && power) {
        plan = fftw_plan_dft_r2c_1d((int)bins, in, (fftw_complex *)out,
                                    FFTW_ESTIMATE | FFTW_UNALIGNED | FFTW_PRESERVE_INPUT);
    }
    if (plan) {
        for (size_t s = 0; s < sensors; s++) {
            add_spectrum(power, data + s * room, n, in, out, plan, bins, derivatives[s]);
        }
        *found = choose(line, power, bins, n, rate_hz, service_hz, in);
        fftw_destroy_plan(plan);
    }
    free(power);
    free(out);
    free(in);
    return plan ? 0 : -1;
}

double tone_line_amplitude(const float *x, size_t n, double hz, double rate_hz)
{
    double mean = mean_of(x, n), w = 2 * PI * hz / rate_hz, turn = 2 * PI / (double)n;
    double re = 0, im = 0, weights = 0;

    /* cos and sin by rotation; over some thousand steps their error stays below 1e-12 */
    double c = 1, s = 0, cw = cos(w), sw = sin(w);
    double hc = cos(turn / 2), hs = sin(turn / 2), ch = cos(turn), sh = sin(turn);

    for (size_t i = 0; i < n; i++) {
        double weight = 0.5 - 0.5 * hc, y = weight * (x[i] - mean), next = c * cw - s * sw;

        re += y * c;
        im += y * s;
        weights += weight;
        s = s * cw + c * sw;
        c = next;
        next = hc * ch - hs * sh;
        hs = hs * ch + hc * sh;
        hc = next;
    }
    return 2 * hypot(re, im) / weights;
}

/* Sum of the sensors' powers at hz, each by its own mean square. */
static double together(const float *data, size_t sensors, size_t room, size_t n, double hz,
                       double rate_hz)
{
    double sum = 0;

    for (size_t s = 0; s < sensors; s++) {
        const float *x = data + s * room;
        double mean = mean_of(x, n), square = 0, a = tone_line_amplitude(x, n, hz, rate_hz);

        for (size_t i = 0; i < n; i++) {
            square += (x[i] - mean) * (x[i] - mean);
        }
        sum += square > 0 ? a * a / square : 0;
    }
    return sum;
}

double tone_line_follow(const float *data, size_t sensors, size_t room, size_t n, double hz,
                        double reach, double rate_hz)
{
    double bin = rate_hz / (double)n, step = bin / 4, best = hz, most = -1;
    long steps = (long)ceil(reach / step);

    for (long k = -steps; k <= steps; k++) {
        double at = hz + (double)k * step;
        double p = at > 0 ? together(data, sensors, room, n, at, rate_hz) : 0;

        if (p > most) {
            most = p;
            best = at;
        }
    }
    for (int round = 0; round < 3; round++, step /= 8) { /* parabolas through three points */
        double a = together(data, sensors, room, n, best - step, rate_hz);
        double b = together(data, sensors, room, n, best, rate_hz);
        double c = together(data, sensors, room, n, best + step, rate_hz), bend = a - 2 * b + c;

        if (bend < 0) {
            best += fmax(-1, fmin(1, 0.5 * (a - c) / bend)) * step;
        }
    }
    return best;
}
