/* Beats, steps and wander: found where they are, and only there. */
#include <setjmp.h>
#include <stdarg.h>
#include <stddef.h>
#include <stdint.h>
#include <stdio.h>

#include <cmocka.h>

#include "close_to.h"

#include <math.h>
#include <stdlib.h>

#include "average/longrun.h"
#include "average/step.h"
#include "average/swing.h"
#include "average/unsteady.h"
#include "sim/rng.h"

#define PI_HERE 3.14159265358979323846
#define MOST 256

static struct rng rng;
static double complex z[MOST];
static double t[MOST];

static double complex normal(void)
{
    return CMPLX(rng_normal(&rng), rng_normal(&rng));
}

/* n blocks of a second around 10, white scatter of sd `noise` a component. */
static void steady(size_t n, double noise)
{
    for (size_t k = 0; k < n; k++) {
        t[k] = 3 + (double)k;
        z[k] = CMPLX(6, 8) + noise * normal();
    }
}

static struct unsteady judged(size_t n)
{
    struct unsteady u;

    assert_int_equal(unsteady_of_blocks(z, t, n, &u), 0);
    return u;
}

/* A neighbour at f_n beside f_s, as blocks of a second see it: its vector turns at f_s - f_n, averaged over the
 * block (the integral of exp, by hand). */
static void add_neighbour(size_t n, double turning, double size)
{
    for (size_t k = 0; k < n; k++) {
        double a = PI_HERE * turning;
        z[k] += size * cexp(I * (2 * PI_HERE * turning * t[k] + 0.7)) * sin(a) / a;
    }
}

static void a_neighbour_turns_the_vector(void **state)
{
    (void)state;
    rng_init(&rng, 1);
    for (int way = -1; way <= 1; way += 2) {
        for (size_t n = 20; n <= 60; n += 20) {
            steady(n, 0.1);
            add_neighbour(n, way * 0.23, 1.5);
            struct unsteady u = judged(n);
            assert_close(u.beat, 1.5, 0.15); /* 2 sd of an amplitude from 20 blocks: 0.1*sqrt(2/20)/0.91*2 = 0.07 */
            assert_close(u.turning_hz, way * 0.23, 0.01);
            assert_close(u.beat_s, 1 / 0.23, 0.2);
            assert_close(u.step, 0, 0);
        }
    }
}

static void the_own_swing_goes_to_and_fro(void **state)
{
    (void)state;
    rng_init(&rng, 2);
    steady(40, 0.05);
    for (int k = 0; k < 40; k++)
        z[k] *= 1 + 0.1 * sin(2 * PI_HERE * t[k] / 7.5);
    struct unsteady u = judged(40);
    assert_close(u.beat, 1, 0.1); /* 10 % of 10; blocks of a second weaken 7.5 s by 3 %, which is undone */
    assert_close(u.beat_s, 7.5, 0.2);
    assert_true(isnan(u.turning_hz));
}

/* A faster beat than the blocks can follow shows at its alias or, over whole periods, not at all. */
static void whole_periods_in_a_block_leave_nothing(void **state)
{
    (void)state;
    rng_init(&rng, 3);
    steady(40, 0.1);
    add_neighbour(40, 2, 3);
    assert_close(judged(40).beat, 0, 0);
}

static void a_step_is_no_beat_and_no_drift(void **state)
{
    (void)state;
    rng_init(&rng, 4);
    for (size_t n = 24; n <= 96; n += 24) {
        steady(n, 0.2);
        for (size_t k = n / 3; k < n; k++)
            z[k] += 1.2 * I;
        struct unsteady u = judged(n);
        assert_close(u.step, 1.2, 0.35); /* 3 sd: 0.2*sqrt(1/8 + 1/16)*sqrt(2) = 0.12 at 24 blocks */
        assert_close(u.step_s, 3 + (double)n / 3 - 0.5, 1.01);
        assert_close(u.beat, 0, 0);
    }
}

static void a_drift_is_no_step(void **state)
{
    int steps = 0;

    (void)state;
    rng_init(&rng, 5);
    for (int i = 0; i < 100; i++) {
        steady(40, 0.2);
        for (size_t k = 0; k < 40; k++)
            z[k] += 2.0 * (double)k / 40;
        steps += judged(40).step != 0;
    }
    assert_true(steps <= 2);
}

static void a_step_and_a_beat_together(void **state)
{
    (void)state;
    rng_init(&rng, 6);
    steady(60, 0.1);
    add_neighbour(60, 0.31, 0.8);
    for (size_t k = 30; k < 60; k++)
        z[k] += 3;
    struct unsteady u = judged(60);
    assert_close(u.step, 3, 0.2);
    assert_close(u.beat, 0.8, 0.1);
    assert_close(u.turning_hz, 0.31, 0.01);
}

/* A slow wander of variance w2 beside white blocks: AR(1) with 20 blocks' memory. */
static void wander_is_measured(void **state)
{
    double sum = 0;
    int found = 0;

    (void)state;
    rng_init(&rng, 7);
    for (int i = 0; i < 200; i++) {
        double complex slow = normal();
        double r = exp(-1 / 20.0);
        steady(200, 0.3);
        for (size_t k = 0; k < 200; k++) {
            slow = r * slow + sqrt(1 - r * r) * normal();
            z[k] += slow;
        }
        double w = judged(200).wander;
        found += w > 0;
        sum += w * w / 200;
    }
    if (getenv("LOPSIDE_SHOW"))
        printf("wander %.3f, found %d of 200\n", sqrt(sum), found);
    assert_true(found >= 198);
    /* A mean and a line leave a deviation of 1.164 of the sqrt(2) of both components, and 16 cosines hold 1.056
     * of it (quadratic forms of the AR(1) covariance, by NumPy); what is taken for a step goes off, too. */
    assert_true(sqrt(sum) > 0.7 && sqrt(sum) < 1.06);
}

static void few_blocks_say_nothing(void **state)
{
    (void)state;
    rng_init(&rng, 8);
    steady(MOST, 0.1);
    for (size_t n = 1; n < SWING_LEAST; n++) {
        struct unsteady u = judged(n);
        assert_true(isnan(u.beat) && isnan(u.turning_hz));
        assert_true(isnan(u.step) == (n < 2 * STEP_SIDE));
    }
    z[5] = NAN;
    struct unsteady u = judged(40);
    assert_true(isnan(u.beat) && isnan(u.step) && isnan(u.wander));
    for (size_t k = 0; k < MOST; k++)
        z[k] = 5;
    u = judged(40); /* no scatter at all */
    assert_close(u.beat, 0, 0);
    assert_close(u.step, 0, 0);
    assert_close(u.wander, 0, 0);
}

struct alarms {
    int beat, step, wander;
};

static struct alarms false_alarms(size_t n, double r, int times)
{
    struct alarms a = {0};

    for (int i = 0; i < times; i++) {
        double complex slow = normal();
        steady(n, 0);
        for (size_t k = 0; k < n; k++) {
            slow = r * slow + sqrt(1 - r * r) * normal();
            z[k] += 0.1 * slow;
        }
        struct unsteady u = judged(n);
        a.beat += u.beat > 0;
        a.step += u.step > 0;
        a.wander += u.wander > 0;
    }
    if (getenv("LOPSIDE_SHOW"))
        printf("%4zu blocks, r %.1f: of %d: beats %d, steps %d, wanders %d\n", n, r, times, a.beat, a.step,
               a.wander);
    return a;
}

/* Levels as the headers state them: 0.1 % of beats, 1 % of steps, 1 % of each of 3 or 4 searches for wander. */
static void steady_runs_are_steady(void **state)
{
    (void)state;
    rng_init(&rng, 9);
    for (size_t n = 16; n <= 128; n *= 2) {
        struct alarms a = false_alarms(n, 0, 1000);
        assert_true(a.beat <= 6); /* 1 expected at most */
        assert_true(a.step <= 20);
        assert_true(a.wander <= 45);
    }
    struct alarms a = false_alarms(64, 0.6, 1000); /* coloured noise is wander, seldom a beat or a step: 2.5 % */
    assert_true(a.beat <= 40);
    assert_true(a.step <= 50);
}

int main(void)
{
    const struct CMUnitTest tests[] = {
        cmocka_unit_test(a_neighbour_turns_the_vector),
        cmocka_unit_test(the_own_swing_goes_to_and_fro),
        cmocka_unit_test(whole_periods_in_a_block_leave_nothing),
        cmocka_unit_test(a_step_is_no_beat_and_no_drift),
        cmocka_unit_test(a_drift_is_no_step),
        cmocka_unit_test(a_step_and_a_beat_together),
        cmocka_unit_test(wander_is_measured),
        cmocka_unit_test(few_blocks_say_nothing),
        cmocka_unit_test(steady_runs_are_steady),
    };
    cmocka_set_message_output(CM_OUTPUT_STDOUT);
    return cmocka_run_group_tests(tests, NULL, NULL);
}
