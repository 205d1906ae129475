/* The instant at which pulses pass their own half height, against the geometry they are made from.
 * Bars: 0.01 deg of bias on clean signals is the project's; a sample is 360 deg over the samples a
 * turn. */
#include "track_recipe.h"

#define TURNS 120

struct train {
    double samples;                                   /* a turn */
    double (*shape)(const struct train *t, double u); /* at the angle u, turns */
    double gain, offset, noise;
    int edge;
};

struct timing {
    double mean, worst, sd; /* of the pulses' angles, deg */
    size_t count;
};

static double bump(double u, double at, double width)
{
    double a = u - at;

    a -= floor(a + 0.5);
    return fabs(a) < width / 2 ? 0.5 + 0.5 * cos(TAU * a / width) : 0;
}

static struct timing time_of(const struct train *t, const float *x, size_t n, size_t skip)
{
    struct timing timing = {0};
    struct pulse_finder finder;
    struct pulse *pulses = malloc((n / 2 + 1) * sizeof *pulses);
    double sum = 0, squares = 0;

    assert_non_null(pulses);
    pulse_init(&finder, t->edge, NAN);
    assert_true(pulse_levels(&finder, x, n / 4));
    size_t count = pulse_find(&finder, x, n, 0, 0, pulses);

    for (size_t i = skip; i < count; i++) {
        double off = pulses[i].at / t->samples;

        off = 360 * (off - round(off));
        sum += off;
        squares += off * off;
        timing.worst = fmax(timing.worst, fabs(off));
        timing.count++;
    }
    assert_true(timing.count > 0);
    timing.mean = sum / (double)timing.count;
    timing.sd = sqrt(fmax(0, squares / (double)timing.count - timing.mean * timing.mean));
    free(pulses);
    return timing;
}

static struct timing timing_of(const struct train *t)
{
    size_t n = (size_t)(TURNS * t->samples);
    float *x = malloc(n * sizeof *x);
    uint64_t state = 4711;

    assert_non_null(x);
    for (size_t i = 0; i < n; i++) {
        double y = t->shape(t, (double)i / t->samples);

        y += t->noise > 0 ? t->noise * signal_normal(&state) : 0;
        x[i] = (float)(t->gain * y + t->offset);
    }
    struct timing timing = time_of(t, x, n, 1);

    free(x);
    return timing;
}

static double wide_bump(const struct train *t, double u)
{
    (void)t;
    return bump(u, 0.025, 0.1);
}

/* Each pulse has its own height, between 0.7 and 1.3. */
static double unequal(const struct train *t, double u)
{
    uint64_t state = 7919 * (uint64_t)(floor(u + 0.5) + 1000);

    (void)t;
    signal_uniform(&state);
    signal_uniform(&state);
    return (0.7 + 0.6 * signal_uniform(&state)) * bump(u, 0.025, 0.1);
}

static double growing(const struct train *t, double u)
{
    (void)t;
    return (1 + u / 12) * bump(u, 0.025, 0.1);
}

static double tape(const struct train *t, double u)
{
    struct signal s = {.rate = t->samples, .rev = 1, .tape = 0.05};

    return signal_tape(&s, u);
}

static double slow_tape(const struct train *t, double u)
{
    struct signal s = {.rate = t->samples, .rev = 1, .tape = 0.2, .edge = 0.04};

    return signal_tape(&s, u);
}

static double trailing_bump(const struct train *t, double u)
{
    (void)t;
    return bump(u, -0.025, 0.1);
}

/* Gain, offset and polarity leave the instant where it is. */
static void test_any_height(void **unused)
{
    (void)unused;
    for (double gain = 1e-3; gain < 2e3; gain *= 10) {
        struct train t = {131.7, wide_bump, gain, 0, 0, 1};

        assert_true(timing_of(&t).worst < 0.01);
        t.offset = 7 * gain;
        assert_true(timing_of(&t).worst < 0.01);
        t.gain = -gain;
        t.edge = -1;
        assert_true(timing_of(&t).worst < 0.01);
        t.shape = trailing_bump;
        t.edge = 1;
        assert_true(timing_of(&t).worst < 0.01);
    }
}

/* Half of each pulse's own height, not of the train's: a fixed level would be off by up to 0.15 of
 * the height, 1.7 deg on these edges, which rise by pi/0.1 heights a turn. A height that is wrong
 * by h moves the instant by h/2 over that slope, 5.7 deg times h. The largest of the samples lies
 * up to half a sample beside the top, which is (pi/25.7)^2/4 = 0.4 % below it: 0.021 deg. That is
 * the bar for heights that grow evenly, and twice of it for any: there a pulse's neighbours tell
 * nothing of it. In the mean, and with four times the samples, the project's. */
static void test_each_height(void **unused)
{
    struct train t = {256.7, unequal, 3, 1, 0, 1};

    (void)unused;
    assert_true(timing_of(&t).worst < 0.042);
    assert_true(fabs(timing_of(&t).mean) < 0.01);
    t.shape = growing;
    assert_true(timing_of(&t).worst < 0.021);
    t.samples = 1024.3;
    assert_true(timing_of(&t).worst < 0.01);
}

/* Four samples a pulse: flat tops and round ones, each unbiased over the phases of sampling to the
 * project's bar. One of them: on the tape's edge, half a sine over two samples, a straight line
 * between the two about its middle is off by up to 0.043 of a sample of 4.48 deg, 0.19 deg. Of a
 * round top the parabola through three samples, 1.04 rad of its cosine apart, falls short by up
 * to 1.3 % of the height (half way between two of them), at 5.7 deg a height as above 0.07 deg; the
 * curve through the edge's samples may add half of that. */
static void test_few_samples(void **unused)
{
    struct train t = {80.31, tape, 5, 0, 0, 1};

    (void)unused;
    assert_true(fabs(timing_of(&t).mean) < 0.01);
    assert_true(timing_of(&t).worst < 0.19);
    t.shape = wide_bump;
    t.samples = 60.31; /* six samples in all */
    assert_true(fabs(timing_of(&t).mean) < 0.01);
    assert_true(timing_of(&t).worst < 0.1);
}

/* A capacitor in the line: a first-order high-pass, integrated in 200 steps a sample. Its edge is
 * the tape's whatever the speed, though base and top tilt by a tenth of the height and more. What
 * remains: the top is taken an eighth of the pulse behind the edge's end, 0.0125 turns after its
 * middle, and has fallen by so much over the time constant; half of that over the slope of 201
 * heights a turn (pi/4 a sample) is 0.0112 deg over the constant in turns. */
static void test_coupled(void **unused)
{
    enum { STEPS = 200 };

    (void)unused;
    for (double constant = 0.3; constant < 4; constant *= 2) { /* turns */
        struct train t = {256.7, tape, 1, 0, 0, 1};
        size_t n = (size_t)(TURNS * t.samples);
        float *x = malloc(n * sizeof *x);
        double y = 0, before = 0, decay = exp(-1 / (constant * t.samples * STEPS));

        assert_non_null(x);
        for (size_t i = 0; i < n; i++) {
            for (int k = 0; k < STEPS; k++) {
                double now = tape(&t, ((double)i + (double)(k + 1) / STEPS - 1) / t.samples);

                y = decay * (y + now - before);
                before = now;
            }
            x[i] = (float)y;
        }
        assert_true(fabs(time_of(&t, x, n, 20).mean) < 0.005 + 0.0112 / constant);
        free(x);
    }
}

/* White noise of 1 % of the height: on slow edges of many samples it averages out, and base and top
 * are not its extremes. Between two samples alone it would be noise over slope, 0.19 deg on the
 * bump of a fifth of a turn (slope 15.7 heights a turn, 1.2 for interpolation). */
static void test_noise(void **unused)
{
    struct train t = {1024.3, slow_tape, 1, 0, 0.01, 1};
    struct timing timing = timing_of(&t);

    (void)unused;
    assert_true(fabs(timing.mean) < 0.02); /* sd of a mean of 120: 0.004 */
    assert_true(timing.sd < 0.06);         /* slope 39 heights a turn: 0.09 from two samples */
    t.shape = wide_bump;
    timing = timing_of(&t);
    assert_true(fabs(timing.mean) < 0.02);
    assert_true(timing.sd < 0.06);
}

static void test_not_there(void **unused)
{
    float x[40] = {0};
    struct edge edge = {0};
    struct edge_half half;
    struct edge_spot spot = {0, 40, 2, 14, 25, 0.5, 0.15};

    (void)unused;
    assert_false(edge_find(&edge, x, 1, &spot, &half)); /* no height */
    for (int i = 15; i < 25; i++) {
        x[i] = 1;
    }
    assert_true(edge_find(&edge, x, 1, &spot, &half));
    assert_float_equal(half.rise, 14.5, 1e-9);
    assert_float_equal(half.fall, 24.6, 1e-6); /* a tenth of the height below its half */
    assert_float_equal(half.top, 1, 1e-9);
    assert_float_equal(half.bottom, 0, 1e-9);
    x[20] = NAN;
    assert_false(edge_find(&edge, x, 1, &spot, &half));
    x[20] = INFINITY;
    assert_false(edge_find(&edge, x, 1, &spot, &half));
    x[20] = 1;
    spot.from = spot.low = 14; /* the base is gone */
    assert_false(edge_find(&edge, x, 1, &spot, &half));
}

/* A level that the user gives is that level, whatever the height. */
static void test_given_level(void **unused)
{
    struct pulse_finder finder;
    struct pulse pulses[600];
    float x[1000];

    (void)unused;
    for (size_t i = 0; i < 1000; i++) { /* up by 1 V a sample to 20 V */
        double ramp = fmin(20, fmax(0, (double)(i % 100) - 30.25));

        x[i] = (float)(i % 100 < 80 ? ramp : 0);
    }
    pulse_init(&finder, 1, 4.0);
    assert_true(pulse_levels(&finder, x, 1000));
    assert_int_equal(pulse_find(&finder, x, 1000, 0, 0, pulses), 10);
    for (int k = 0; k < 10; k++) {
        assert_float_equal(pulses[k].at, 100 * k + 34.25, 1e-5);
    }
    pulse_init(&finder, 1, NAN);
    assert_true(pulse_levels(&finder, x, 1000));
    assert_int_equal(pulse_find(&finder, x, 1000, 0, 0, pulses), 10);
    for (int k = 0; k < 10; k++) {
        assert_float_equal(pulses[k].at, 100 * k + 40.25, 1e-5);
    }
}

int main(void)
{
    const struct CMUnitTest tests[] = {
        cmocka_unit_test(test_any_height),  cmocka_unit_test(test_each_height),
        cmocka_unit_test(test_few_samples), cmocka_unit_test(test_coupled),
        cmocka_unit_test(test_noise),       cmocka_unit_test(test_not_there),
        cmocka_unit_test(test_given_level)};

    return cmocka_run_group_tests(tests, NULL, NULL);
}
