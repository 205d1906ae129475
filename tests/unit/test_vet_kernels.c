/* The kernels of vet that see numbers only: effects, lines of a spectrum, beats, what is left to
 * answer with. */
#include <setjmp.h>
#include <stdarg.h>
#include <stddef.h>
#include <stdint.h>

#include <cmocka.h>

#include "close_to.h"
#include "noise_source.h"

#include <math.h>

#include "vet/beat.h"
#include "vet/effect.h"
#include "vet/orders.h"
#include "vet/ruling.h"
#include "vet/speeds.h"

/* The standard error of a change: cov 2 and 2 in all, repeatability 1 per component of both
 * readings, hence sqrt(2 + 2 + 4) by the law of propagation of variances. */
static void effects(void **state)
{
    static const double cov[3] = {1, 0, 1};
    struct effect e = effect_of(10, cov, 10 + 8 * I, cov, 1);

    (void)state;
    assert_close(e.errors, 8 / sqrt(8), 1e-12);
    assert_close(e.amplitude_pct, 100 * (sqrt(164) / 10 - 1), 1e-9);
    assert_close(e.lag_deg, atan2(8, 10) * 180 / 3.14159265358979, 1e-9);
    assert_close(effect_of(10, cov, 10, cov, 0).errors, 0, 0);
    assert_close(effect_of(cexp(I * 3.1), cov, cexp(-I * 3.1), cov, 0).lag_deg, 4.7662, 1e-4);
}

/* 3 % off at an amplitude of 2: no turn told, r = 3 * 2 * 5 deg in radians over a disc, r^2/4; a
 * turn of 4 +- 3 deg is not told well enough for a limit of 5; 4 +- 2 is, (16 + 4) deg^2/2; none at
 * all leaves 4 % a %, as a disc. */
static void speeds_that_differ(void **state)
{
    struct resonance unknown = {NAN, NAN}, vague = {4, 3}, told = {4, 2}, none = {0, 0.1};
    double radians = 3.14159265358979 / 180;

    (void)state;
    assert_close(speeds_variance(3, 2, &unknown, 5), pow(6 * 5 * radians, 2) / 4, 1e-12);
    assert_close(speeds_variance(-3, 2, &vague, 5), pow(6 * 5 * radians, 2) / 4, 1e-12);
    assert_close(speeds_variance(3, 2, &told, 5), 36 * 20 * radians * radians / 2, 1e-12);
    assert_close(speeds_variance(3, 2, &none, 5), pow(6 * 0.04, 2) / 4, 1e-12);
    assert_close(speeds_variance(0, 2, &unknown, 5), 0, 0);
    assert_true(isnan(speeds_variance(NAN, 2, &unknown, 5)) &&
                isnan(speeds_variance(1, NAN, &none, 5)));
}

/* Acceleration shown as velocity: a line at order n counts 1/n of its size against 1x. */
static void lines_of_a_spectrum(void **state)
{
    double orders[160], amplitude[160] = {0};
    struct orders o;

    (void)state;
    for (int i = 0; i < 160; i++)
        orders[i] = (i + 1) / 16.0;
    amplitude[15] = 2;    /* 1x */
    amplitude[31] = 1.6;  /* 2x */
    amplitude[23] = 0.9;  /* 1.5x */
    amplitude[26] = 0.6;  /* 1.6875x */
    amplitude[27] = 0.45; /* 1.75x */
    amplitude[3] = 50;    /* 0.25x: below half of 1x */
    o = orders_of(orders, amplitude, 160, 0);
    assert_close(o.two_x, 80, 1e-9);
    assert_close(o.half_order, 45, 1e-9);
    assert_close(o.neighbour, 37.5, 1e-9); /* root of the sum of squares, 0.75 */
    assert_close(o.neighbour_order, 27 / 16.0, 1e-12);
    o = orders_of(orders, amplitude, 160, -1);
    assert_close(o.two_x, 40, 1e-9);
    assert_close(o.half_order, 30, 1e-9);
    assert_true(isnan(orders_of(orders, amplitude, 3, 0).two_x));
}

/* Blocks of `step` seconds of 1x at `rpm` beside a neighbour's line at `hz`, averaged over each
 * block by the integral itself: x = 10 cos(wt) + 2 cos(2 pi hz t), Z = (2/T) integral of x
 * exp(jwt). */
static void beside_neighbour(double complex *z, double *t, int count, double step, double rpm,
                             double hz, double noise)
{
    for (int k = 0; k < count; k++) {
        double turning = 2 * 3.14159265358979 * (rpm / 60 - hz);
        double complex sum = 0;
        for (int i = 0; i < 200; i++) /* the fast part averages out over whole turns */
            sum += 2 * cexp(I * turning * (k + (i + 0.5) / 200) * step) / 200;
        t[k] = (k + 0.5) * step;
        z[k] = 10 + sum + noise * normal();
    }
}

static void beats(void **state)
{
    double complex z[40];
    double t[40];
    struct beat beat;
    int false_alarms = 0;

    (void)state;
    seed = 5;
    beside_neighbour(z, t, 40, 1.01, 1480, 24.9, 0.3);
    beat = beat_of(z, t, 40);
    assert_close(beat.swing, 2, 0.15); /* the line's own amplitude */
    assert_close(1480.0 / 60 - beat.turning, 24.9, 0.007);
    beside_neighbour(z, t, 40, 1.01, 1480, 24.3, 0.3); /* and on the other side */
    assert_close(1480.0 / 60 - beat_of(z, t, 40).turning, 24.3, 0.007);
    beside_neighbour(z, t, 40, 1.01, 1480, 1480.0 / 60 + 1.5 / 40, 0.3);
    assert_close(beat_of(z, t, 40).swing, 0, 0); /* one and a half periods are a wander */
    for (int k = 0; k < 1000; k++) {
        beside_neighbour(z, t, 20, 1, 1500, 25, 1); /* on 1x itself: part of the reading */
        false_alarms += beat_of(z, t, 20).swing > 0;
    }
    assert_true(false_alarms <= 10); /* 0.1 % times a finer grid than independent lines */
    z[3] = NAN;
    assert_true(isnan(beat_of(z, t, 20).swing));
    assert_true(isnan(beat_of(z + 4, t, 11).swing));
}

/* The mean of a unit vector turning at f over T is at most 1/(pi f T) long; its square is shared by
 * two components. */
static void what_a_beat_leaves(void **state)
{
    struct beat beat = {2, -0.25, 4, 20, 1, 1.5};

    (void)state;
    assert_close(beat_variance(&beat), pow(2 / (3.14159265358979 * 5), 2) / 2, 1e-12);
    beat.swing = 0;
    assert_close(beat_variance(&beat), 0, 0);
}

/* A swing to and fro of size 2 has the root mean square 1.41, less what a block averages away. */
static void a_beat_from_elsewhere(void **state)
{
    struct beat own = {0, NAN, NAN, 20, 1, 1.3}, measured = {2, NAN, 8, NAN, NAN, NAN};

    (void)state;
    assert_close(beat_join(&measured, own).swing, 2, 0);
    assert_close(beat_join(&measured, own).duration, 20, 0);
    own.rest = 0.5; /* the blocks do not scatter that much */
    assert_close(beat_join(&measured, own).swing, 0, 0);
    own.rest = 1.3;
    measured.swing = NAN;
    assert_close(beat_join(&measured, own).swing, 0, 0);
    measured.swing = 0; /* looked for, and not found */
    own.swing = 1;
    assert_close(beat_join(&measured, own).swing, 0, 0);
}

static int answer(const bool *usable, const bool *in_aim, bool named)
{
    static const int condition[4] = {0, 0, 0, 0};
    static const double complex weights[8] = {0, 0, 0.02, 0, 0, 0.02 * I, 0.02, 0};
    bool expected[8];
    struct ruling_set set = {4, 2, 2, condition, weights, expected, usable, in_aim, named};
    size_t run = 9, sensor = 9;
    int result;

    for (int i = 0; i < 8; i++)
        expected[i] = true;
    result = ruling_can_answer(&set, &run, &sensor);
    return result == 1 ? -1 : (int)(run * 2 + sensor); /* what was lost */
}

static void what_is_left(void **state)
{
    bool both[2] = {true, true}, first[2] = {true, false};
    bool usable[8] = {1, 1, 1, 1, 1, 1, 1, 1};

    (void)state;
    assert_int_equal(answer(usable, both, true), -1);
    usable[2] = usable[3] = false; /* trial A is repeated */
    assert_int_equal(answer(usable, both, true), -1);
    usable[7] = false; /* and its repeat lost for the second sensor */
    assert_int_equal(answer(usable, both, true), 3);
    assert_int_equal(answer(usable, first, true), -1);
    assert_int_equal(answer(usable, both, false), -1); /* nobody named it: on without it */
    usable[0] = false;                                 /* as found, for the first */
    assert_int_equal(answer(usable, first, true), 0);
    assert_int_equal(answer(usable, both, false), 0); /* now both are lost */
    assert_int_equal(answer(usable, first, false), 0);
    usable[2] = true;
    usable[0] = true;
    usable[4] = false; /* the trial of plane 2 */
    assert_int_equal(answer(usable, first, true), 4);
}

/* Complex weights: two runs whose weights are multiples of each other do not tell two planes apart.
 */
static void ranks(void **state)
{
    double complex full[4] = {1, I, I, 1}, single[4] = {1, I, I, -1};

    (void)state;
    assert_int_equal(ruling_rank(full, 2, 2), 2);
    assert_int_equal(ruling_rank(single, 2, 2), 1);
}

int main(void)
{
    const struct CMUnitTest tests[] = {
        cmocka_unit_test(effects),
        cmocka_unit_test(speeds_that_differ),
        cmocka_unit_test(lines_of_a_spectrum),
        cmocka_unit_test(beats),
        cmocka_unit_test(what_a_beat_leaves),
        cmocka_unit_test(a_beat_from_elsewhere),
        cmocka_unit_test(what_is_left),
        cmocka_unit_test(ranks),
    };
    return cmocka_run_group_tests(tests, NULL, NULL);
}
