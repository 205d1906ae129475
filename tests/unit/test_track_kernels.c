/* The kernels of `track` one by one, against closed forms. */
#include "track_recipe.h"
#include "track/sieve.h"
#include "track/spectrum.h"

/* ---- pulse ---- */

/* A triangle wave crosses its middle where geometry says, exactly, whatever the sampling. */
static void test_pulse_times(void **unused)
{
    struct pulse_finder finder;
    struct pulse pulses[600];
    float x[1000];

    (void)unused;
    for (size_t i = 0; i < 1000; i++) {
        double u = (double)i / 37.3 + 0.1;

        x[i] = (float)(1 - fabs(4 * (u - floor(u)) - 2)); /* -1 at 0, 0 at 1/4 */
    }
    pulse_init(&finder, 1, 0.0);
    assert_true(pulse_levels(&finder, x, 1000));
    size_t n = pulse_find(&finder, x, 1000, 0, 0, pulses);

    assert_int_equal(n, 27); /* 0.25, 1.25 ... 26.25 turns; the last sample lies at 26.88 */
    for (size_t k = 0; k < n; k++) {
        assert_float_equal(pulses[k].at, ((double)k + 0.15) * 37.3, 1e-4);
    }
    pulse_init(&finder, -1, NAN);
    assert_true(pulse_levels(&finder, x, 1000));
    n = pulse_find(&finder, x, 1000, 0, 0, pulses);
    for (size_t k = 0; k < n; k++) { /* the level found lies within a sample's step of the middle */
        assert_float_equal(pulses[k].at, ((double)k + 0.65) * 37.3, 0.5);
    }
}

static void test_pulse_nothing(void **unused)
{
    struct pulse_finder finder;
    struct pulse pulses[60];
    float x[100] = {0};

    (void)unused;
    pulse_init(&finder, 1, NAN);
    assert_false(pulse_levels(&finder, x, 100));
    assert_int_equal(pulse_find(&finder, x, 100, 0, 0, pulses), 0);
    assert_false(pulse_levels(&finder, x, 0));
    x[3] = INFINITY;
    assert_false(pulse_levels(&finder, x, 100));
}

/* ---- marks ---- */

static void test_marks_counts(void **unused)
{
    struct marks marks;
    static struct mark out[MARKS_ROOM];
    size_t given = 0;

    (void)unused;
    marks_init(&marks, 1);
    for (int k = 0; k < 200; k++) {
        struct pulse pulse = {.at = 100.0 * k, .high = 5, .low = 95, .top = 1};

        if (k % 25 != 13) { /* eight are missing */
            given += marks_push(&marks, &pulse, out);
        }
        if (k % 20 == 7) { /* ten are extra */
            pulse.at += 41;
            given += marks_push(&marks, &pulse, out);
        }
    }
    given += marks_finish(&marks, out);
    assert_int_equal(given, 200);
    assert_int_equal(marks.count, 192);
    assert_int_equal(marks.missed, 8);
    assert_int_equal(marks.extra, 10);
}

/* ---- shaft ---- */

/* Times of marks 0.. of a shaft whose speed swings by 2 % in ten turns: Newton on the closed form.
 */
static double mark_time(const struct signal *s, double turns)
{
    double t = turns / s->rev;

    for (int k = 0; k < 20; k++) {
        t -= (signal_turns(s, t) - turns) / signal_speed(s, t);
    }
    return t;
}

static void test_shaft_follows(void **unused)
{
    struct signal s = {.rate = 1, .rev = 0.01, .wander = 0.02, .wander_turns = 10};
    struct shaft shaft;
    struct shaft_turn turn;
    double worst = 0;
    long turns = 0;

    (void)unused;
    shaft_init(&shaft);
    for (int m = 0; m <= 60; m++) {
        shaft_push(&shaft, mark_time(&s, m), true);
        if (m == 60) {
            shaft_end(&shaft);
        }
        while (shaft_next(&shaft, &turn)) {
            for (double u = 0.05; u < 1; u += 0.1) {
                double t = turn.t0 + u * (turn.t1 - turn.t0);
                double angle = 0, power = 1;

                for (int k = 0; k < 6; k++, power *= u) {
                    angle += turn.c[k] * power;
                }
                if (turns > 3 && turns < 56) {
                    worst = fmax(worst, fabs(angle + (double)turns - signal_turns(&s, t)) * 360);
                }
            }
            assert_int_equal(turn.first, turns == 0);
            assert_int_equal(turn.last, turns == 59);
            turns++;
        }
    }
    assert_int_equal(turns, 60);
    if (!(worst < 0.003)) { /* deg, of a swing of 11.5: a third of the bar */
        fail_msg("%g deg", worst);
    }
    assert_true(shaft_jitter(&shaft) < 0.05);
}

static void test_shaft_jitter(void **unused)
{
    struct shaft shaft;
    struct shaft_turn turn;
    uint64_t state = 4711;
    double squares = 0;
    const int marks = 4000;

    (void)unused;
    shaft_init(&shaft);
    for (int m = 0; m < marks; m++) {
        shaft_push(&shaft, 100 * (m + signal_normal(&state) / 360), true); /* 1 deg */
        while (shaft_next(&shaft, &turn)) {
            double off = turn.t0 / 100 - round(turn.t0 / 100);

            squares += off * off * 360 * 360;
        }
    }
    /* standard error of a standard deviation from 4000: 1.1 %, more as neighbours share marks */
    assert_float_equal(shaft_jitter(&shaft), 1.0, 0.06);
    /* smoothing over eleven marks passes 0.476 of the variance on (the filter's centre weight) */
    assert_float_equal(squares / marks, 0.476, 0.05);
}

/* ---- vector ---- */

static void test_vector_sums(void **unused)
{
    struct shaft_turn turn = {.t0 = 0.25, .t1 = 200.25, .c = {0, 1}};
    struct vector_weights weights;
    struct vector_sums full = {0}, ramped = {0};
    float x[201];

    (void)unused;
    for (int i = 0; i < 201; i++) {
        x[i] = (float)(3 + 2 * cos(TAU * (i - 0.25) / 200 - 1) + cos(TAU * 2 * (i - 0.25) / 200));
    }
    vector_weigh(&weights, &turn, 1, 200);
    vector_add(&full, &weights, x + 1, 0);
    assert_float_equal(2 * full.re, 2 * cos(1), 2e-6);
    assert_float_equal(2 * full.im, 2 * sin(1), 2e-6);
    assert_float_equal(full.mean, 3, 2e-6);
    assert_float_equal(full.square, 9 + 2 + 0.5, 1e-5);
    vector_ramp(&weights);
    vector_add(&ramped, &weights, x + 1, 0);
    /* The integrals of u - sin(2 pi u)/(2 pi) over the turn, alone, with cos and with sin, by
     * parts; the sum begins a quarter of a sample off, which leaves 1/800 of the ramp's final step.
     */
    struct vector_sums plain_ramp = {0};
    float one[200];

    for (int i = 0; i < 200; i++) {
        one[i] = 1;
    }
    vector_add(&plain_ramp, &weights, one, 0);
    assert_float_equal(plain_ramp.mean, 0.5, 2e-3);
    assert_float_equal(plain_ramp.re, 0, 2e-3);
    assert_float_equal(plain_ramp.im, -1 / TAU - 1 / (2 * TAU), 2e-3);
}

/* ---- window ---- */

static void test_window_length(void **unused)
{
    (void)unused;
    assert_int_equal(window_length(10000, 400, 0, false), 25); /* a second */
    assert_int_equal(window_length(10000, 400, 1e6, false), 25);
    assert_int_equal(window_length(10000, 400, 400 * 161, false), 10); /* sixteen blocks */
    assert_int_equal(window_length(10000, 400, 400 * 20, false), 4);   /* four turns at least */
    assert_int_equal(window_length(1000, 1000, 0, false), 4);
    assert_int_equal(window_length(10000, 200, 0, true), 13); /* a quarter of a second */
    assert_int_equal(window_length(10000, 100, 100.0 * 1000000, false),
                     500); /* two thousand at most */
}

/* Every number of turns: whole blocks, the rest in the last one, one turn lost to the two ends. */
static void test_window_turns(void **unused)
{
    (void)unused;
    for (long all = 1; all < 60; all++) {
        struct windows windows;
        struct vector_sums one = {0, 0, 0, 1}, half = {0, 0, 0, 0.5};
        double square = 0;
        long turns = 0;

        window_init(&windows, 1);
        windows.length = 7;
        for (long k = 0; k < all; k++) {
            struct shaft_turn turn = {.t0 = (double)k,
                                      .t1 = (double)k + 1,
                                      .c = {0, 1},
                                      .first = k == 0,
                                      .last = k == all - 1};

            assert_int_equal(window_turn(&windows, &turn, &one, &half), 0);
        }
        for (size_t b = 0; b < windows.count; b++) {
            turns += windows.blocks[b].turns;
            square += windows.sums[b].square;
            assert_true(windows.blocks[b].turns >= 4 || windows.count == 1);
            assert_float_equal(windows.blocks[b].to - windows.blocks[b].from,
                               (double)windows.blocks[b].turns, 1e-12);
        }
        assert_int_equal(turns, all - 1);
        assert_float_equal(square, (double)(all - 1), 1e-12);
        window_release(&windows);
    }
}

/* ---- channel ---- */

static void channel_of(struct channel *channel, double rail, double clip, double step)
{
    float x[10000];

    channel_init(channel, rail);
    for (int i = 0; i < 10000; i++) {
        double v = fmax(-clip, fmin(clip, sin(TAU * i / 101.7)));

        x[i] = (float)(step > 0 ? step * round(v / step) : v);
    }
    for (int i = 0; i < 10000; i += 1000) {
        channel_add(channel, x + i, 1000);
    }
}

static void test_channel(void **unused)
{
    struct channel channel;

    (void)unused;
    channel_of(&channel, 1.5, 2, 1.0 / 1024);
    assert_int_equal(channel_railed(&channel), 0);
    assert_float_equal(channel_resolution(&channel), 1.0 / 1024, 1e-9);
    assert_float_equal(channel.max, 1, 1e-3);
    assert_int_equal(channel.samples, 10000);
    /* clipped at 0.5: |sin| >= 1/2 for two thirds of the time */
    channel_of(&channel, 0.5, 0.5, 1.0 / 1024);
    assert_float_equal(channel_railed(&channel), 6667, 70);
    channel_of(&channel, NAN, 0.5, 1.0 / 1024);
    assert_float_equal(channel_railed(&channel), 6667, 70);
    channel_of(&channel, 2.0, 0.5, 1.0 / 1024); /* clipped before the recorder */
    assert_float_equal(channel_railed(&channel), 6667, 70);
    channel_of(&channel, NAN, 2, 0.1); /* coarse, not clipped */
    assert_int_equal(channel_railed(&channel), 0);
    channel_of(&channel, NAN, 0, 0);
    assert_true(channel_resolution(&channel) == 0);
    assert_int_equal(channel_railed(&channel), 0);
}

static void test_channel_pairs(void **unused)
{
    struct channel_pairs pairs;
    float a[10000], b[10000], c[10000], d[10000], e[10000];
    const float *planes[] = {a, b, c, d, e};
    uint64_t state = 99;

    (void)unused;
    for (int i = 0; i < 10000; i++) {
        a[i] = (float)(5 + signal_normal(&state));
        b[i] = (float)(a[i] + 0.05 * signal_normal(&state)); /* like it, not the same: r = 0.9988 */
        c[i] = -2 * a[i];
        d[i] = 7;
        e[i] = 7;
    }
    assert_int_equal(channel_pairs_init(&pairs, 5), 0);
    channel_pairs_add(&pairs, planes, 10000);
    assert_int_equal(channel_pairs_same(&pairs, 0), 2);
    assert_int_equal(channel_pairs_same(&pairs, 1), -1);
    assert_int_equal(channel_pairs_same(&pairs, 2), 0);
    assert_int_equal(channel_pairs_same(&pairs, 3), -1);
    channel_pairs_release(&pairs);
}

/* ---- spectrum ---- */

static double line_at(const double *orders, const double *amplitude, size_t n, double order)
{
    for (size_t i = 0; i < n; i++) {
        if (fabs(orders[i] - order) < 1e-9) {
            return amplitude[i];
        }
    }
    fail_msg("no line at order %g", order);
    return NAN;
}

static void test_spectrum(void **unused)
{
    struct spectrum spectrum;
    struct vector_weights weights;
    double orders[SPECTRUM_LINES], amplitude[SPECTRUM_LINES], sum = 0;
    float x[200];

    (void)unused;
    assert_int_equal(spectrum_init(&spectrum, 1, 5000, 200, 200 * 40), 0); /* 25 rev/s */
    for (int turn = 0; turn < 40; turn++) {
        struct shaft_turn shaft = {.t0 = 200 * turn, .t1 = 200 * turn + 200, .c = {0, 1}};

        for (int i = 0; i < 200; i++) {
            double theta = TAU * (turn + i / 200.0);

            x[i] = (float)(4 + cos(theta) + 0.5 * cos(theta / 2 - 1) + 0.25 * cos(3 * theta) +
                           0.4 * cos(20 * theta));
        }
        vector_weigh(&weights, &shaft, shaft.t0, 200);
        if (spectrum_wants(&spectrum)) {
            spectrum_add(&spectrum, &weights, 0, x, 3);
        }
        spectrum_turn(&spectrum);
    }
    assert_int_equal(spectrum.count, 2);
    size_t n = spectrum_lines(&spectrum, 0, orders, amplitude);

    assert_float_equal(line_at(orders, amplitude, n, 1), 1, 0.01);
    assert_float_equal(line_at(orders, amplitude, n, 0.5), 0.5, 0.01);
    assert_float_equal(line_at(orders, amplitude, n, 3), 0.25, 0.01);
    assert_true(line_at(orders, amplitude, n, 2) < 0.02);
    for (size_t i = 0; i < n; i++) {
        sum += amplitude[i] * amplitude[i] / 2;
    }
    assert_true(orders[n - 1] > 20);
    assert_float_equal(sum, (1 + 0.25 + 0.0625 + 0.16) / 2, 0.02);
    spectrum_end(&spectrum);
}

int main(void)
{
    const struct CMUnitTest tests[] = {
        cmocka_unit_test(test_pulse_times),   cmocka_unit_test(test_pulse_nothing),
        cmocka_unit_test(test_marks_counts),  cmocka_unit_test(test_shaft_follows),
        cmocka_unit_test(test_shaft_jitter),  cmocka_unit_test(test_vector_sums),
        cmocka_unit_test(test_window_length), cmocka_unit_test(test_window_turns),
        cmocka_unit_test(test_channel),       cmocka_unit_test(test_channel_pairs),
        cmocka_unit_test(test_spectrum)};

    return cmocka_run_group_tests(tests, NULL, NULL);
}
