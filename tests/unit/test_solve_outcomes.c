/* What stands beside the answer: zones, holes, static and couple parts, stored responses, runout.
 */
#include <setjmp.h>
#include <stdarg.h>
#include <stddef.h>
#include <cmocka.h>

#include <complex.h>
#include <math.h>
#include <string.h>

#include "base/angle.h"
#include "solve/correct.h"
#include "solve/drill.h"
#include "solve/lookback.h"
#include "solve/model.h"
#include "solve/notes.h"
#include "solve/parts.h"
#include "solve/ruling.h"
#include "solve/slope.h"
#include "solve/stored.h"
#include "solve/zones.h"

static void near(double got, double wanted, double tolerance)
{
    if (!(fabs(got - wanted) <= tolerance))
        fail_msg("got %.17g, wanted %.17g +- %.3g", got, wanted, tolerance);
}

/* ISO 20816-3:2022 (10816-3:2009): B/C and C/D as a fan maker prints them after DIN ISO 10816-3;
 * A/B and displacement from memory. Consistency: velocity over displacement is one crossover
 * frequency a row, about 12.5 Hz for group 1 and 10 Hz for group 2. */
static void test_zones(void **state)
{
    (void)state;
    static const double wanted[2][2][3] = {{{2.3, 4.5, 7.1}, {3.5, 7.1, 11.0}},
                                           {{1.4, 2.8, 4.5}, {2.3, 4.5, 7.1}}};
    double v[3], x[3];
    for (int group = 1; group <= 2; group++)
        for (int flexible = 0; flexible < 2; flexible++) {
            zones_limits(group, flexible, false, v);
            zones_limits(group, flexible, true, x);
            for (int i = 0; i < 3; i++) {
                near(v[i], 1e-3 * wanted[group - 1][flexible][i], 1e-12);
                near(v[i] / x[i] / (2 * PI), group == 1 ? 12.5 : 10, 0.3);
            }
        }
    zones_limits(2, false, false, v);
    assert_int_equal(zones_of(0.0014, v), 'A');
    assert_int_equal(zones_of(0.00141, v), 'B');
    assert_int_equal(zones_of(0.0028, v), 'B');
    assert_int_equal(zones_of(0.0045, v), 'C');
    assert_int_equal(zones_of(0.0046, v), 'D');
    assert_int_equal(zones_of(NAN, v), '?');
}

/* Steel of 7850 kg/m3 (any handbook): 10 mm by 10 mm are 6.165 g. */
static void test_drill(void **state)
{
    (void)state;
    near(drill_mass(0.010, 7850, 0.010), 6.16538e-3, 1e-8);
    near(drill_depth(0.010, 7850, 6.16538e-3), 0.010, 1e-7);
    assert_true(isinf(drill_mass(0.010, 7850, NAN)) && isinf(drill_mass(0, 7850, 1)));
    assert_true(isnan(drill_depth(NAN, 7850, 1)));
}

/* The published two-plane turbine rotor (S. S. Rao, Mechanical Vibrations, ch. 9; from memory):
 * 10.0561 g at 325.55 deg and 5.8774 g at 68.26 deg are 5.2364 g at 358.75 deg on both and 6.3573 g
 * at 298.75 deg as a couple (identities of J. J. Yu, 2009). */
static void test_parts(void **state)
{
    (void)state;
    double complex w[2] = {angle_vector(10.0561, 325.55), angle_vector(5.8774, 68.26)}, s, c;
    static const double one[2] = {1, 1}, two[2] = {0.2, 0.4};
    parts_split(w, one, &s, &c);
    near(cabs(s), 5.2364, 1e-3);
    near(angle_of(s), 358.75, 0.01); /* the weights are given to 0.01 deg */
    near(cabs(c), 6.3573, 1e-3);
    near(angle_of(c), 298.75, 0.01);
    parts_split(w, two, &s, &c); /* unbalances, not masses, are equal */
    near(cabs(s + c - 0.2 * w[0]) + cabs(s - c - 0.4 * w[1]), 0, 1e-12);
}

/* x^H F x is the same, whether the unbalance is set on both planes or on the reduced form. */
static void test_parts_reduce(void **state)
{
    (void)state;
    static const double radius[2] = {0.2, 0.5};
    double complex v[3] = {CMPLX(1, 2), CMPLX(-3, 0.5), CMPLX(0.25, -4)}, form[9], small[4];
    for (int i = 0; i < 9; i++)
        form[i] = conj(v[i / 3]) * v[i % 3];
    parts_reduce(form, 1, radius, small);
    double complex u = CMPLX(0.7, -0.3), w[2] = {u / radius[0], u / radius[1]};
    near(correct_value(small, 1, &u), correct_value(form, 2, w), 1e-9);
}

/* ---- a small job: one probe, one plane, stored responses ---- */

#define EFFECT angle_vector(1e-3, 70) /* m/kg */

struct desk {
    struct job job;
    struct job_sensor sensor;
    struct job_plane plane;
    struct job_target target;
    struct job_run runs[4];
    struct job_weight weights[4];
    struct job_response response;
    struct model_reading readings[4];
    struct model model;
};

static void desk_init(struct desk *d)
{
    memset(d, 0, sizeof *d);
    job_init(&d->job);
    d->job.aim.repeatability = 0.02;
    d->job.sensors = &d->sensor;
    d->job.planes = &d->plane;
    d->job.runs = d->runs;
    d->job.responses = &d->response;
    d->job.aim.targets = &d->target;
    d->job.sensor_count = d->job.plane_count = 1;
    d->sensor = (struct job_sensor){.name = "probe",
                                    .quantity = QUANTITY_DISPLACEMENT,
                                    .show = {"um", QUANTITY_DISPLACEMENT, 1e-6, DETECTION_PEAK}};
    d->plane = (struct job_plane){.name = "disc", .radius_m = 0.3, .any_position = true};
    d->target = (struct job_target){NAN, QUANTITY_DISPLACEMENT, true};
}

static void desk_store(struct desk *d, double complex vector, double variance, double rpm)
{
    d->job.response_count = 1;
    d->response = (struct job_response){
        .condition = "service", .vector = vector, .cov = {variance, 0, variance}, .speed_rpm = rpm};
}

/* A run with `kg` at `deg` and the reading that EFFECT makes of it, `off` added. */
static void desk_run(struct desk *d, const char *role, double kg, double deg, double complex off)
{
    size_t r = d->job.run_count++;
    struct job_run *run = &d->runs[r];
    run->name[0] = (char)('a' + r);
    strcpy(run->condition, "service");
    strcpy(run->role, role);
    run->weights = &d->weights[r];
    run->weight_count = kg > 0;
    d->weights[r] = (struct job_weight){0, kg, 0.3, kg, deg, 0};
    d->readings[r] = (struct model_reading){
        .run = r, .speed_rpm = 1480, .phase = true, .use = true, .overall = NAN};
    strcpy(d->readings[r].condition, "service");
    d->readings[r].vector = angle_vector(80e-6, 30) + EFFECT * angle_vector(kg, deg) + off;
    d->readings[r].amplitude = cabs(d->readings[r].vector);
}

static struct model_row *desk_fit(struct desk *d)
{
    assert_int_equal(model_init(&d->model, &d->job, d->readings, d->job.run_count), MODEL_OK);
    assert_int_equal(d->model.row_count, 1);
    return &d->model.rows[0];
}

static void test_stored_alone(void **state)
{
    (void)state;
    struct desk d;
    struct advice_finding f;
    desk_init(&d);
    desk_store(&d, EFFECT, 1e-10, 1475);
    desk_run(&d, "", 0, 0, 0);
    struct model_row *row = desk_fit(&d);
    assert_int_equal(row->state, MODEL_GOOD);
    assert_int_equal(row->kept, MODEL_STORED_HELD);
    assert_true(d.model.held[0] && isnan(row->changed));
    near(cabs(row->posterior.mean[1] - EFFECT), 0, 1e-12);
    double cov[3];
    posterior_marginal(&row->posterior, 1, cov);
    near(cov[0], 1e-10, 1e-15);
    assert_false(notes_stored(&d.model, row, &f));
    model_release(&d.model);
}

static void test_stored_of_another_speed(void **state)
{
    (void)state;
    struct desk d;
    struct advice_finding f;
    desk_init(&d);
    desk_store(&d, EFFECT, 1e-10, 1480 * 1.04); /* STORED_SPEED_APART is 3 % */
    desk_run(&d, "", 0, 0, 0);
    struct model_row *row = desk_fit(&d);
    assert_int_equal(row->state, MODEL_SHORT);
    assert_true(notes_stored(&d.model, row, &f));
    assert_int_equal(f.verdict, ADVICE_CAUTION);
    near(f.value, 4, 1e-9);
    model_release(&d.model);
}

/* The runs tell all: where the stored response differs, it is set aside, and the answer is theirs.
 */
static void test_stored_that_changed(void **state)
{
    (void)state;
    struct desk d;
    struct advice_finding f;
    desk_init(&d);
    desk_store(&d, EFFECT * angle_vector(1, 90), 1e-10, 1480);
    desk_run(&d, "", 0, 0, 0);
    desk_run(&d, "", 0.1, 200, 0);
    struct model_row *row = desk_fit(&d);
    assert_int_equal(row->kept, MODEL_STORED_LEFT);
    assert_int_equal(row->changed_plane, 0);
    /* distance 1e-3 sqrt 2 over the root of the complex variances: new 4 (0.02 80e-6)^2 / 0.1^2,
     * stored 2e-10 */
    double se = sqrt(4 * pow(0.02 * 80e-6 / 0.1, 2) + 2e-10);
    near(row->changed, 1e-3 * sqrt(2) / se, 1e-6 * row->changed);
    near(cabs(row->posterior.mean[1] - EFFECT), 0, 1e-12);
    assert_true(notes_stored(&d.model, row, &f));
    assert_int_equal(f.verdict, ADVICE_CAUTION);
    assert_non_null(strstr(f.text, "left out"));
    model_release(&d.model);
    /* just on the good side: both agree, and together are surer */
    desk_store(&d, EFFECT, 1e-10, 1480);
    row = desk_fit(&d);
    assert_int_equal(row->kept, MODEL_STORED_HELD);
    assert_true(row->changed < 3);
    assert_true(notes_stored(&d.model, row, &f));
    assert_int_equal(f.verdict, ADVICE_OK);
    model_release(&d.model);
}

/* What three runs predict for the fourth, and how far off it is: scatter of the reading (2 (0.02
 * 80e-6)^2) and of the prediction. */
static void test_lookback(void **state)
{
    (void)state;
    struct desk d;
    struct lookback look;
    desk_init(&d);
    desk_run(&d, "", 0, 0, 0);
    desk_run(&d, "", 0.1, 200, 0);
    desk_run(&d, "", 0.1, 20, CMPLX(0, 30e-6));
    struct model_row *row = desk_fit(&d);
    assert_int_equal(lookback_row(row, 1, 2, &look), 1);
    near(cabs(look.measured - look.predicted), 30e-6, 1e-12);
    /* 2 Z0 - Z1 is predicted: variances 4 + 1 and the reading's own 1, complex */
    near(look.se, 30e-6 / sqrt(6 * 2 * pow(row->sigma, 2)), 1e-6);
    assert_int_equal(lookback_row(row, 1, 1, &look), 0); /* one run predicts nothing */
    assert_int_equal(lookback_row(row, 1, 7, &look), 0); /* no such run */
    model_release(&d.model);
}

static void test_runout(void **state)
{
    (void)state;
    struct desk d;
    struct advice_finding f;
    double complex slow = angle_vector(15e-6, 250);
    desk_init(&d);
    desk_run(&d, "", 0, 0, slow);
    desk_run(&d, "", 0.1, 200, slow);
    desk_run(&d, "runout", 0, 0, 0);
    d.readings[2].vector = slow;
    d.readings[2].cov[0] = d.readings[2].cov[2] = 4e-12;
    struct model_row *row = desk_fit(&d);
    assert_true(row->runout);
    near(cabs(row->posterior.mean[0] - angle_vector(80e-6, 30)), 0, 1e-12);
    near(cabs(row->posterior.mean[1] - EFFECT), 0, 1e-12);
    near(row->posterior.cov[0], pow(row->sigma, 2) + 4e-12,
         1e-20); /* one error for all: Z0 has it */
    assert_true(notes_runout(&d.model, 0, &f));
    assert_non_null(strstr(f.text, "15.0 um pk at a lag of 250 deg"));
    model_release(&d.model);
    d.sensor.quantity = QUANTITY_VELOCITY;
    row = desk_fit(&d);
    assert_false(row->runout);
    assert_false(notes_runout(&d.model, 0, &f));
    model_release(&d.model);
}

/* A probe whose slow roll gave no vector is lost, in the aim for the whole job; any other sensor is
 * not. */
static void test_runout_missing(void **state)
{
    (void)state;
    struct desk d;
    struct advice_finding f;
    struct advice_next next;
    for (int k = 0; k < 4; k++) { /* refused, no phase, no reading at all, amplitudes alone */
        desk_init(&d);
        desk_run(&d, "", 0, 0, 0);
        desk_run(&d, "", 0.1, 200, 0);
        desk_run(&d, "runout", 0, 0, 0);
        d.readings[2].use = k != 0;
        d.readings[2].phase = k != 1;
        if (k == 2)
            d.readings[2] = d.readings[1];
        for (int i = 0; i < 2; i++)
            d.readings[i].phase = k != 3;
        struct model_row *row = desk_fit(&d);
        assert_true(row->unrolled && !row->runout);
        assert_int_equal(row->state, MODEL_LOST);
        struct ruling ruling = ruling_of(&d.model);
        assert_int_equal(ruling.kind, RULING_REPEAT);
        assert_ptr_equal(ruling.row, row);
        assert_true(notes_runout(&d.model, 0, &f));
        assert_int_equal(f.verdict, ADVICE_REFUSE);
        assert_int_equal(f.run, 2);
        assert_non_null(strstr(f.text, k == 3 ? "no phase" : "no usable slow-roll vector"));
        notes_runout_step(&d.model, row, &next);
        assert_string_equal(next.step, "repeat");
        assert_true(strlen(next.reason) > 0);
        row->in_aim = false; /* then it is left out, and said so */
        assert_ptr_not_equal(ruling_of(&d.model).row, row);
        assert_true(notes_runout(&d.model, 0, &f));
        assert_int_equal(f.verdict, ADVICE_CAUTION);
        assert_non_null(strstr(f.text, "left out"));
        model_release(&d.model);
        d.sensor.quantity = QUANTITY_VELOCITY;
        row = desk_fit(&d);
        assert_false(row->unrolled);
        assert_false(notes_runout(&d.model, 0, &f));
        model_release(&d.model);
    }
}

/* A straight line over speed, exact: y = 2 + 3j + (0.5 - 0.25j)(n - 1000); residual variance by
 * hand where two values of opposite sign stand about it. */
static void test_slope(void **state)
{
    (void)state;
    struct slope s = {0};
    double complex shift;
    double variance;
    for (int i = 0; i < 20; i++) {
        double rpm = 1000 + (i % 5), off = i % 2 ? 0.1 : -0.1;
        slope_add(&s, rpm, CMPLX(2, 3) + CMPLX(0.5, -0.25) * (rpm - 1000) + off);
        if (i == 14)
            assert_false(
                slope_shift(&s, 1000, 1001, &shift, &variance)); /* 15 blocks are too few */
    }
    slope_add(&s, NAN, 1);
    slope_add(&s, 1000, NAN);
    assert_int_equal(s.count, 20);
    assert_true(slope_shift(&s, 1002, 1004, &shift, &variance));
    /* each speed comes twice with +0.1 and twice with -0.1: the line is exact, the residual 20 x
     * 0.01 */
    near(cabs(shift - 2 * CMPLX(0.5, -0.25)), 0, 1e-12);
    near(variance, 4 * (20 * 0.01 / 18) / 40 * 4, 1e-12); /* sxx = 4 (4 + 1 + 0 + 1 + 4) = 40 */
    assert_false(
        slope_shift(&s, 1002, 1006.1, &shift, &variance)); /* further than the range of 4 rpm */
}

static void test_slope_bring(void **state)
{
    (void)state;
    struct desk d;
    struct slope slopes[3] = {{0}};
    struct slope_match match;
    desk_init(&d);
    for (int r = 0; r < 3; r++) {
        desk_run(&d, "", 0, 0, 0);
        d.readings[r].speed_rpm = 1000 + r;
        d.readings[r].vector = CMPLX(1, 0.1 * r);
        d.readings[r].by_speed = 0.25; /* of a covariance that is 1 then */
        d.readings[r].cov[0] = d.readings[r].cov[2] = 1;
        for (int i = 0; i < 40; i++)
            slope_add(&slopes[r], 998 + r + i % 5, CMPLX(1, 0.1 * (r + i % 5 - 2)));
    }
    assert_true(slope_bring(&d.job, d.readings, 3, slopes, 0, "service", &match));
    near(match.rpm, 1001, 1e-9);
    near(match.largest, 0.1, 1e-9);
    for (int r = 0; r < 3; r++) {
        near(cabs(d.readings[r].vector - CMPLX(1, 0.1)), 0, 1e-9);
        near(d.readings[r].speed_rpm, 1001, 1e-9);
        near(d.readings[r].cov[0], 0.75, 1e-9); /* the slope is exact: nothing comes instead */
        near(d.readings[r].cov[2], 0.75, 1e-9);
    }
    assert_false(
        slope_bring(&d.job, d.readings, 3, slopes, 0, "service", &match)); /* nothing is left */
    d.readings[2].speed_rpm = 1008; /* too far for one of them: then for none */
    assert_false(slope_bring(&d.job, d.readings, 3, slopes, 0, "service", &match));
    near(cabs(d.readings[0].vector - CMPLX(1, 0.1)), 0, 1e-9);
    assert_false(slope_bring(&d.job, d.readings, 3, slopes, 0, "hot", &match));
}

int main(void)
{
    const struct CMUnitTest tests[] = {
        cmocka_unit_test(test_zones),
        cmocka_unit_test(test_drill),
        cmocka_unit_test(test_parts),
        cmocka_unit_test(test_parts_reduce),
        cmocka_unit_test(test_stored_alone),
        cmocka_unit_test(test_stored_of_another_speed),
        cmocka_unit_test(test_stored_that_changed),
        cmocka_unit_test(test_lookback),
        cmocka_unit_test(test_runout),
        cmocka_unit_test(test_runout_missing),
        cmocka_unit_test(test_slope),
        cmocka_unit_test(test_slope_bring),
    };
    return cmocka_run_group_tests(tests, NULL, NULL);
}
