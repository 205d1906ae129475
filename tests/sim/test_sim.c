/* test_sim.c - the simulator against facts that every book on rotor dynamics has, and published
 * numbers. */
#include <math.h>
#include <setjmp.h>
#include <stdarg.h>
#include <stddef.h>
#include <stdint.h>
#include <stdlib.h>

#include <cmocka.h>

#include "optical.h"
#include "rng.h"
#include "rotor.h"

/* A stiff, hardly damped support: 1 kg at 100 Hz, the same both ways; sensor and tacho at the top.
 */
static struct rotor disc(int direction, double rpm)
{
    return (struct rotor){.direction = direction,
                          .start_deg = 33,
                          .rpm = rpm,
                          .tape_deg = 70,
                          .tape_width_deg = 8,
                          .tacho_deg = 90,
                          .modes = {{100, 100, 1e-4, 1, {1}, {1}}},
                          .mode_count = 1,
                          .sensors = {{90, ROTOR_DISPLACEMENT}},
                          .sensor_count = 1};
}

static double lag_off(const struct rotor *rotor, struct rotor_mass mass, int edge, double want)
{
    return remainder(rotor_truth(rotor, &mass, 1, 0, edge).lag_deg - want, 360);
}

/* Well below a critical speed the high spot is the heavy spot, well above it is opposite (common
 * knowledge: any text on the Jeffcott rotor, after Jeffcott, Phil. Mag. 37 (1919) 304-314). Sensor
 * and tacho stand at the same place: a spot b further against rotation than the tape's middle comes
 * b later; the leading edge is half a tape earlier than the middle, the trailing edge half a tape
 * later. */
static void test_lag_by_geometry(void **state)
{
    (void)state;
    for (int direction = -1; direction <= 1; direction += 2)
        for (double against = 0; against < 360; against += 37) {
            struct rotor slow = disc(direction, 600), fast = disc(direction, 60000);
            struct rotor_mass m = rotor_weight(&slow, 0, 0.001, 0.1, against);
            assert_true(fabs(lag_off(&slow, m, 1, against + 4)) < 0.01);
            assert_true(fabs(lag_off(&slow, m, -1, against - 4)) < 0.01);
            assert_true(fabs(lag_off(&fast, m, 1, against + 4 + 180)) < 0.01);
            assert_true(fabs(rotor_against(&slow, m.body_deg) - against) < 1e-9);
        }
}

/* A sensor a quarter turn further in the sense of rotation feels the spot a quarter turn later. */
static void test_sensor_further_round(void **state)
{
    (void)state;
    for (int direction = -1; direction <= 1; direction += 2) {
        struct rotor rotor = disc(direction, 600);
        rotor.sensors[0].at_deg = 90 + direction * 90;
        assert_true(fabs(lag_off(&rotor, rotor_weight(&rotor, 0, 0.001, 0.1, 10), 1, 10 + 4 + 90)) <
                    0.01);
    }
}

/* Jeffcott: displacement m r w^2 / (M (wn^2 - w^2)), 90 deg behind the force at wn with m r/(2 zeta
 * M). */
static void test_size_and_resonance(void **state)
{
    (void)state;
    struct rotor rotor = disc(1, 3000); /* 50 Hz: half of the critical speed */
    struct rotor_mass m = rotor_weight(&rotor, 0, 0.001, 0.1, 0);
    assert_true(fabs(rotor_truth(&rotor, &m, 1, 0, 1).amplitude / (1e-4 / 3) - 1) < 1e-6);
    rotor.rpm = 6000;
    rotor.modes[0].damping = 0.05;
    assert_true(fabs(rotor_truth(&rotor, &m, 1, 0, 1).amplitude / (1e-4 / 0.1) - 1) < 1e-6);
    assert_true(fabs(lag_off(&rotor, m, 1, 4 + 90)) < 0.001);
}

/* Velocity leads displacement by a quarter turn, acceleration velocity: lag 90 deg smaller each. */
static void test_quantities(void **state)
{
    (void)state;
    double w = 600 * 6.28318530717958647692 / 60;
    struct rotor rotor = disc(-1, 600);
    struct rotor_mass m = rotor_weight(&rotor, 0, 0.001, 0.1, 200);
    struct rotor_vector d = rotor_truth(&rotor, &m, 1, 0, 1);
    rotor.sensors[0].quantity = ROTOR_VELOCITY;
    struct rotor_vector v = rotor_truth(&rotor, &m, 1, 0, 1);
    rotor.sensors[0].quantity = ROTOR_ACCELERATION;
    struct rotor_vector a = rotor_truth(&rotor, &m, 1, 0, 1);
    assert_true(fabs(v.amplitude / d.amplitude / w - 1) < 1e-9);
    assert_true(fabs(a.amplitude / v.amplitude / w - 1) < 1e-9);
    assert_true(fabs(remainder(d.lag_deg - v.lag_deg - 90, 360)) < 1e-6);
    assert_true(fabs(remainder(v.lag_deg - a.lag_deg - 90, 360)) < 1e-6);
}

/* The equations of motion, integrated, stay on the closed-form steady state; and at slow sweep,
 * too. */
static void test_integration(void **state)
{
    (void)state;
    enum { N = 4000 };
    for (int quantity = 0; quantity < 3; quantity++) {
        struct rotor rotor = disc(-1, 1200);
        rotor.modes[0] = (struct rotor_mode){31, 43, 0.04, 20, {1}, {0.8}};
        rotor.sensors[0] = (struct rotor_sensor){25, (enum rotor_quantity)quantity};
        struct rotor_mass m = rotor_weight(&rotor, 0, 0.01, 0.2, 50);
        double *x = calloc(N, sizeof *x), top = rotor_truth(&rotor, &m, 1, 0, 1).amplitude;
        assert_non_null(x);
        rotor_run(&rotor, &m, 1, 2000, N, 4, x);
        for (int i = 0; i < N; i++)
            assert_true(fabs(x[i] - rotor_steady(&rotor, &m, 1, 0, i / 2000.0)) < 1e-5 * top);
        rotor.sweep_rpm_s = -1;
        rotor_run(&rotor, &m, 1, 2000, N, 4, x);
        for (int i = 0; i < N; i++)
            assert_true(fabs(x[i] - rotor_steady(&rotor, &m, 1, 0, i / 2000.0)) < 0.01 * top);
        free(x);
    }
}

/* The pulse is half as high exactly where an edge passes, on either side, and the tape's share
 * long. */
static void test_tacho(void **state)
{
    (void)state;
    struct rotor rotor = disc(1, 600);
    struct optical optical = {.high_v = 1, .edge_s = 1e-4};
    enum { N = 20000 };
    double *v = calloc(N, sizeof *v), share = 0;
    assert_non_null(v);
    optical_run(&optical, &rotor, 1, 100000, N, v, 1);
    for (int i = 0; i < N; i++) {
        double past =
            rotor_before_tacho(&rotor, rotor.tape_deg, i / 100000.0) * 360 / 6.28318530717958647692;
        assert_true((v[i] > 0.5) == (fabs(past) < 4) || fabs(fabs(past) - 4) < 1e-6);
        share += v[i] / N;
    }
    assert_true(fabs(share - 8.0 / 360) < 1e-4);
    free(v);
}

/* splitmix64 from 1234567: published test values (value from memory). Normal deviates: mean and
 * variance within 4 standard errors. */
static void test_random_numbers(void **state)
{
    (void)state;
    enum { N = 100000 };
    struct rng rng;
    rng_init(&rng, 1234567);
    assert_true(rng.state[0] == 6457827717110365317u);
    assert_true(rng.state[1] == 3203168211198807973u);
    double sum = 0, squares = 0;
    for (int i = 0; i < N; i++) {
        double x = rng_normal(&rng);
        sum += x;
        squares += x * x;
    }
    assert_true(fabs(sum / N) < 4 / sqrt(N));
    assert_true(fabs(squares / N - 1) < 4 * sqrt(2.0 / N));
}

int main(void)
{
    const struct CMUnitTest tests[] = {
        cmocka_unit_test(test_lag_by_geometry),    cmocka_unit_test(test_sensor_further_round),
        cmocka_unit_test(test_size_and_resonance), cmocka_unit_test(test_quantities),
        cmocka_unit_test(test_integration),        cmocka_unit_test(test_tacho),
        cmocka_unit_test(test_random_numbers),
    };
    return cmocka_run_group_tests(tests, NULL, NULL);
}
