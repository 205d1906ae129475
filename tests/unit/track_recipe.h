/* track_recipe.h - a recording made from a recipe, tracked and judged. For cmocka tests. */
#ifndef TRACK_RECIPE_H
#define TRACK_RECIPE_H

#include <complex.h>
#include <math.h>
#include <setjmp.h>
#include <stdarg.h>
#include <stddef.h>
#include <stdint.h>
#include <stdlib.h>
#include <string.h>

#include <cmocka.h>

#include "track/tracker.h"
#include "track_signal.h"

#define LAG 60.0

struct recipe {
    struct signal shaft;
    double seconds;
    double amplitude, constant, second, harmonics, noise; /* of the vibration, and of the tacho: */
    double high, low;                                     /* volts under the tape and elsewhere */
    double lost, added; /* share of pulses taken away, and put in at random places */
    double delay;       /* of the vibration, turns */
    int edge, marks;
    uint64_t seed;
    double (*tacho)(const struct recipe *r, double t); /* instead of the tape; V */
};

static const struct recipe plain = {
    .shaft = {.rate = 6400, .rev = 24.7, .tape = 0.05, .phase = 0.3},
    .seconds = 8,
    .amplitude = 1,
    .high = 4,
    .low = -1,
    .edge = 1,
    .marks = 1,
    .seed = 88172645463325252ULL};

/* True where pulse number `turn` is to be left out. */
static inline int is_lost(const struct recipe *r, double turn)
{
    uint64_t state = r->seed + 7919 * (uint64_t)(long long)(turn + 1000);

    signal_uniform(&state);
    signal_uniform(&state);
    return signal_uniform(&state) < r->lost;
}

static inline double tacho_at(const struct recipe *r, double t)
{
    double u = signal_turns(&r->shaft, t), turn = floor(u + 0.5), tape = signal_tape(&r->shaft, t);
    uint64_t state = r->seed + 104729 * (uint64_t)(long long)(floor(u) + 1000);

    if (is_lost(r, turn)) {
        tape = 0;
    }
    signal_uniform(&state);
    signal_uniform(&state);
    if (signal_uniform(&state) < r->added) { /* a flash somewhere in the turn, half a tape long */
        double at = 0.1 + 0.7 * signal_uniform(&state), a = u - floor(u);

        tape = a > at && a < at + r->shaft.tape / 2 ? 1 : tape;
    }
    return r->low + (r->high - r->low) * tape;
}

static inline float *record(const struct recipe *r, size_t *n)
{
    uint64_t state = r->seed;

    *n = (size_t)(r->seconds * r->shaft.rate);
    float *x = malloc(2 * *n * sizeof *x);

    assert_non_null(x);
    for (size_t i = 0; i < *n; i++) {
        double t = (double)i / r->shaft.rate;
        double theta = TAU * (signal_turns(&r->shaft, t) - r->delay);
        double v = r->constant + r->amplitude * cos(theta - LAG / 360 * TAU) +
                   r->second * cos(2 * theta - 1);

        double c = cos(theta - 0.3), before = c,
               now = 2 * c * c - 1; /* cos(k*(theta - 0.3)), k = 1, 2 */

        for (int k = 3; r->harmonics > 0 && k <= 10; k++) {
            double next = 2 * c * now - before;

            before = now;
            now = next;
            v += r->harmonics * now;
        }
        if (r->noise > 0) {
            v += r->noise * signal_normal(&state);
        }
        x[2 * i] = (float)v;
        x[2 * i + 1] = (float)(r->tacho ? r->tacho(r, t) : tacho_at(r, t));
    }
    return x;
}

static inline void track(struct tracker *tracker, const struct recipe *r, const float *x, size_t n,
                         uint64_t *cuts)
{
    double rail[2] = {NAN, NAN};
    struct tracker_set_up set_up = {r->shaft.rate, (double)n, 2,   1,    rail, r->edge,
                                    r->marks,      NAN,       NAN, NULL, false};

    assert_int_equal(tracker_init(tracker, &set_up), 0);
    for (size_t i = 0; i < n;) {
        size_t k = cuts ? 1 + (size_t)(5000 * signal_uniform(cuts)) : 4096;

        k = k < n - i ? k : n - i;
        assert_int_equal(tracker_add(tracker, x + 2 * i, k), 0);
        i += k;
    }
    assert_int_equal(tracker_finish(tracker), 0);
}

/* The run's mean vector, blocks weighted by their turns. */
static inline double complex mean(const struct tracker *tracker)
{
    double complex sum = 0;
    double turns = 0, rest;

    for (size_t b = 0; b < tracker->windows.count; b++) {
        double w = (double)tracker->windows.blocks[b].turns;

        sum += w * window_vector(&tracker->windows, b, 0, &rest);
        turns += w;
    }
    assert_true(turns > 0);
    return sum / turns;
}

static inline double complex measure(const struct recipe *r)
{
    struct tracker tracker;
    size_t n;
    float *x = record(r, &n);

    track(&tracker, r, x, n, NULL);
    assert_true(tracker_reference(&tracker));

    double complex z = mean(&tracker);

    tracker_release(&tracker);
    free(x);
    return z;
}

static inline void assert_vector(double complex z, double amplitude, double lag, double percent,
                                 double deg)
{
    double turn = (carg(z) / TAU * 360 - lag) / 360;

    if (!(fabs(cabs(z) / amplitude - 1) * 100 < percent) ||
        !(fabs(turn - round(turn)) * 360 < deg)) {
        fail_msg("%.6f at %.4f deg, not %.6f at %.4f", cabs(z), carg(z) / TAU * 360, amplitude,
                 lag);
    }
}

#endif
