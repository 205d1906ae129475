/* From readings to an answer: what may be solved, what is left on, what comes next. */
#include <setjmp.h>
#include <stdarg.h>
#include <stddef.h>
#include <cmocka.h>

#include <complex.h>
#include <math.h>
#include <stdlib.h>
#include <string.h>

#include "base/angle.h"
#include "solve/advice.h"
#include "solve/follow.h"
#include "solve/misfit.h"
#include "solve/amplitude.h"
#include "solve/answer.h"
#include "solve/model.h"
#include "solve/outlook.h"
#include "solve/ruling.h"

/* A small job in memory: two sensors, up to two planes, up to five runs, exact hand readings. */
struct desk {
    struct job job;
    struct job_sensor sensors[2];
    struct job_plane planes[2];
    struct job_run runs[5];
    struct job_weight weights[5][2];
    struct job_target targets[2];
    struct model_reading readings[10];
    size_t count;
    struct model model;
};

/* Z = truth[s][0] + truth[s][1] W0 + truth[s][2] W1. */
static const double truth[2][3][2] = {{{8e-3, 40}, {70e-3, 200}, {20e-3, 10}},
                                      {{5e-3, 130}, {15e-3, 80}, {60e-3, 300}}};

static void desk_init(struct desk *d, size_t planes)
{
    memset(d, 0, sizeof *d);
    job_init(&d->job);
    d->job.aim.repeatability = 0;
    d->job.service_rpm = 1480;
    d->job.rotor_mass = 340;
    d->job.sensors = d->sensors;
    d->job.sensor_count = 2;
    d->job.planes = d->planes;
    d->job.plane_count = planes;
    d->job.runs = d->runs;
    d->job.aim.targets = d->targets;
    for (int s = 0; s < 2; s++) {
        strcpy(d->sensors[s].name, s ? "B" : "A");
        d->sensors[s].quantity = d->sensors[s].show.quantity = QUANTITY_VELOCITY;
        d->targets[s] = (struct job_target){NAN, QUANTITY_VELOCITY, true};
        d->planes[s] = (struct job_plane){.radius_m = 0.4,
                                          .any_position = true,
                                          .pieces = 4,
                                          .most = INFINITY,
                                          .most_in_all = INFINITY};
        strcpy(d->planes[s].name, s ? "right" : "left");
    }
}

/* A run with weights on both planes and its two readings. */
static void desk_run(struct desk *d, const char *name, double complex left, double complex right)
{
    size_t r = d->job.run_count++;
    double complex w[2] = {left, right};
    struct job_run *run = &d->runs[r];
    strcpy(run->name, name);
    strcpy(run->condition, "service");
    run->weights = d->weights[r];
    for (size_t p = 0; p < d->job.plane_count; p++)
        if (w[p] != 0)
            run->weights[run->weight_count++] =
                (struct job_weight){p, cabs(w[p]), 0.4, cabs(w[p]), angle_of(w[p]), 0};
    for (size_t s = 0; s < 2; s++) {
        struct model_reading *reading = &d->readings[d->count++];
        *reading = (struct model_reading){
            .run = r, .sensor = s, .speed_rpm = 1480, .phase = true, .use = true};
        strcpy(reading->condition, "service");
        reading->vector = angle_vector(truth[s][0][0], truth[s][0][1]);
        for (size_t p = 0; p < 2; p++)
            reading->vector += w[p] * angle_vector(truth[s][p + 1][0], truth[s][p + 1][1]);
        reading->amplitude = cabs(reading->vector);
    }
}

static enum ruling_kind desk_rule(struct desk *d)
{
    assert_int_equal(model_init(&d->model, &d->job, d->readings, d->count), MODEL_OK);
    return ruling_of(&d->model).kind;
}

static void two_planes(struct desk *d)
{
    desk_init(d, 2);
    desk_run(d, "found", 0, 0);
    desk_run(d, "left", angle_vector(0.06, 30), 0);
    desk_run(d, "right", 0, angle_vector(0.05, 200));
}

static void test_rulings(void **state)
{
    (void)state;
    struct desk d;
    desk_init(&d, 2);
    desk_run(&d, "found", 0, 0);
    assert_int_equal(desk_rule(&d), RULING_TRIAL);
    model_release(&d.model);
    d.readings[0].use = d.readings[1].use = false;
    assert_int_equal(desk_rule(&d), RULING_REPEAT);
    model_release(&d.model);

    desk_init(&d, 2);
    desk_run(&d, "found", 0, 0);
    desk_run(&d, "left", angle_vector(0.06, 30), 0);
    assert_int_equal(desk_rule(&d), RULING_MISSING);
    struct advice_next next;
    struct ruling ruling = ruling_of(&d.model);
    advice_missing_step(&d.model, &ruling, &next);
    assert_string_equal(next.step, "trial");
    assert_non_null(strstr(next.reason, "'right'"));
    model_release(&d.model);

    two_planes(&d);
    assert_int_equal(desk_rule(&d), RULING_SOLVE);
    model_release(&d.model);
}

static void test_refusals(void **state)
{
    (void)state;
    struct desk d;
    two_planes(&d);
    d.readings[4].use = d.readings[5].use = false; /* a whole run that is needed */
    assert_int_equal(desk_rule(&d), RULING_REPEAT);
    assert_int_equal(ruling_of(&d.model).row->lost_run, 2);
    model_release(&d.model);

    desk_init(&d, 1);
    desk_run(&d, "found", 0, 0);
    desk_run(&d, "left", angle_vector(0.06, 30), 0);
    d.readings[3].use = false; /* sensor B, which nobody names: go on without it */
    assert_int_equal(desk_rule(&d), RULING_SOLVE);
    model_release(&d.model);
    d.job.aim.named = true;
    assert_int_equal(desk_rule(&d), RULING_REPEAT);
    assert_true(ruling_of(&d.model).named);
    model_release(&d.model);
    d.targets[1].in_aim = false; /* the aim names the other one */
    assert_int_equal(desk_rule(&d), RULING_SOLVE);
    model_release(&d.model);

    two_planes(&d);
    desk_run(&d, "left again", angle_vector(0.06, 30), 0);
    d.readings[2].use = d.readings[3].use = false; /* its repeat stands in */
    assert_int_equal(desk_rule(&d), RULING_SOLVE);
    model_release(&d.model);
}

/* Two planes, two sensors, exact: what nulls both is Cramer's rule on the truth. */
static void ideal(double complex w[2])
{
    double complex t[2][3];
    for (int s = 0; s < 2; s++)
        for (int k = 0; k < 3; k++)
            t[s][k] = angle_vector(truth[s][k][0], truth[s][k][1]);
    double complex det = t[0][1] * t[1][2] - t[0][2] * t[1][1];
    w[0] = -(t[0][0] * t[1][2] - t[0][2] * t[1][0]) / det;
    w[1] = -(t[0][1] * t[1][0] - t[0][0] * t[1][1]) / det;
}

static void test_mounted_weights_stay(void **state)
{
    (void)state;
    struct desk d;
    struct answer a;
    double complex want[2];
    ideal(want);
    two_planes(&d);
    for (int mounted = -1; mounted < 3; mounted++) {
        d.job.aim.mounted = mounted;
        assert_int_equal(desk_rule(&d), RULING_SOLVE);
        assert_int_equal(answer_init(&a, &d.model), ANSWER_OK);
        assert_int_equal(answer_correct(&a), ANSWER_OK);
        assert_int_equal(answer_place(&a), ANSWER_OK);
        assert_int_equal(outlook_fill(&a), ANSWER_OK);
        for (size_t p = 0; p < 2; p++) {
            double complex on = mounted < 0 ? 0 : job_run_weight(&d.job, (size_t)mounted, p);
            assert_true(cabs(a.weights[p] + on - want[p]) < 1e-6 * cabs(want[p]));
            assert_true(cabs(a.placed_weights[p] - a.weights[p]) < 1e-12);
        }
        assert_int_equal(a.forecast_count, 2);
        for (size_t s = 0; s < 2; s++) {
            size_t base = mounted < 0 ? 0 : (size_t)mounted;
            assert_true(cabs(a.forecasts[s].before - *model_find(a.row[s], base)) < 1e-9);
            assert_true(cabs(a.forecasts[s].after) < 1e-9);
        }
        answer_release(&a);
        model_release(&d.model);
    }
}

static void test_runs_in_any_order(void **state)
{
    (void)state;
    struct desk d, turned;
    two_planes(&d);
    two_planes(&turned);
    for (size_t i = 0; i < d.count; i++)
        turned.readings[i] = d.readings[d.count - 1 - i];
    assert_int_equal(desk_rule(&d), RULING_SOLVE);
    assert_int_equal(desk_rule(&turned), RULING_SOLVE);
    for (size_t r = 0; r < 2; r++)
        assert_memory_equal(d.model.rows[r].posterior.mean, turned.model.rows[r].posterior.mean,
                            3 * sizeof(double complex));
    model_release(&d.model);
    model_release(&turned.model);
}

/* Removing works opposite: what is taken off at b counts as -m exp(j b). */
static void test_remove(void **state)
{
    (void)state;
    struct desk d;
    struct answer a;
    double complex want[2];
    ideal(want);
    two_planes(&d);
    d.planes[0].work = WORK_REMOVE;
    assert_int_equal(desk_rule(&d), RULING_SOLVE);
    assert_int_equal(answer_init(&a, &d.model), ANSWER_OK);
    assert_int_equal(answer_correct(&a), ANSWER_OK);
    assert_int_equal(answer_place(&a), ANSWER_OK);
    assert_true(cabs(a.placed_weights[0] - want[0]) < 1e-6);
    assert_true(
        fabs(angle_wrap_180(a.placement.best.items[0].angle_deg - angle_of(want[0]) - 180)) < 1e-3);
    answer_release(&a);
    model_release(&d.model);
}

static void test_after_the_correction(void **state)
{
    (void)state;
    struct desk d;
    struct answer a;
    double complex want[2];
    ideal(want);
    two_planes(&d);
    d.job.aim.mounted = 2; /* a trial weight left on is no correction */
    assert_int_equal(desk_rule(&d), RULING_SOLVE);
    assert_int_equal(advice_corrected_run(&d.model), -1);
    model_release(&d.model);

    desk_run(&d, "corrected", 0.9 * want[0], 0.9 * want[1]); /* leaves a tenth: 0.8 and 0.5 mm/s */
    d.job.aim.mounted = 3;
    d.targets[0].amplitude = d.targets[1].amplitude = 1e-3;
    assert_int_equal(desk_rule(&d), RULING_SOLVE);
    assert_int_equal(advice_corrected_run(&d.model), 3);
    assert_int_equal(answer_init(&a, &d.model), ANSWER_OK);
    assert_true(advice_is_done(&a, 3));
    answer_release(&a);
    model_release(&d.model);

    d.targets[0].amplitude = 0.7e-3;
    assert_int_equal(desk_rule(&d), RULING_SOLVE);
    assert_int_equal(answer_init(&a, &d.model), ANSWER_OK);
    assert_false(advice_is_done(&a, 3));
    answer_release(&a);
    model_release(&d.model);
}

/* A misread weight shows where runs are spare: 180 deg off in one of them. */
static void test_linearity(void **state)
{
    (void)state;
    struct desk d;
    struct advice_finding f;
    two_planes(&d);
    desk_run(&d, "more", angle_vector(0.06, 150), angle_vector(0.05, 90));
    desk_run(&d, "most", angle_vector(0.06, 270), angle_vector(0.05, 320));
    d.job.aim.repeatability = 0.03;
    assert_int_equal(desk_rule(&d), RULING_SOLVE);
    assert_true(misfit_judge(&d.model, &d.model.rows[0], &f));
    assert_int_equal(f.verdict, ADVICE_OK);
    assert_true(f.value < 1e-6);
    model_release(&d.model);
    d.weights[3][0].angle_deg -= 180;
    assert_int_equal(desk_rule(&d), RULING_SOLVE);
    assert_true(misfit_judge(&d.model, &d.model.rows[0], &f));
    assert_int_equal(f.verdict, ADVICE_REFUSE);
    model_release(&d.model);
}

/* A trial moved by 120 deg turns its effect by 120 deg of lag; with weights counted the wrong way
 * round it turns by -120. */
static void test_lag_follows_weight(void **state)
{
    (void)state;
    struct desk d;
    struct advice_finding f;
    two_planes(&d);
    d.job.aim.repeatability = 0.03;
    assert_int_equal(desk_rule(&d), RULING_SOLVE);
    assert_false(follow_worst(&d.model, 0, &f)); /* one trial a plane tells nothing */
    model_release(&d.model);
    desk_run(&d, "left turned", angle_vector(0.06, 150), 0);
    assert_int_equal(desk_rule(&d), RULING_SOLVE);
    assert_true(follow_worst(&d.model, 0, &f));
    assert_false(follow_worst(&d.model, 1, &f));
    assert_true(follow_worst(&d.model, 0, &f) && f.value < 1e-6);
    assert_int_equal(f.verdict, ADVICE_OK);
    model_release(&d.model);
    for (int r = 1; r < 4; r++)
        d.weights[r][0].angle_deg = 360 - d.weights[r][0].angle_deg;
    assert_int_equal(desk_rule(&d), RULING_SOLVE);
    assert_true(follow_worst(&d.model, 0, &f));
    assert_int_equal(f.verdict, ADVICE_REFUSE); /* far beyond 6 s.e.: the sign hangs on it */
    assert_non_null(strstr(f.text, "the other way"));
    model_release(&d.model);
}

/* Trials opposite each other or at one place look alike in a mirror, so that nothing is called in
 * order; one that acts opposite to what the sheet says is no mirror. */
static void test_mirror_not_told(void **state)
{
    (void)state;
    struct desk d;
    struct advice_finding f;
    two_planes(&d);
    d.job.aim.repeatability = 0.03;
    desk_run(&d, "opposite", angle_vector(0.06, 210), 0); /* the first stands at 30 deg */
    assert_int_equal(desk_rule(&d), RULING_SOLVE);
    assert_true(follow_worst(&d.model, 0, &f));
    assert_int_equal(f.verdict, ADVICE_OK);
    assert_true(isnan(f.value) && strstr(f.text, "not checkable") == f.text);
    model_release(&d.model);
    d.weights[3][0].angle_deg -= 90; /* says 120 deg where it stood at 210 */
    assert_int_equal(desk_rule(&d), RULING_SOLVE);
    assert_true(follow_worst(&d.model, 0, &f));
    assert_true(isfinite(f.value) && f.verdict == ADVICE_REFUSE);
    model_release(&d.model);
    d.weights[3][0].angle_deg -= 90; /* says 30 deg: at one place, effects opposite */
    assert_int_equal(desk_rule(&d), RULING_SOLVE);
    assert_true(follow_worst(&d.model, 0, &f));
    assert_true(isnan(f.value)); /* `linearity` sees it */
    model_release(&d.model);
}

/* A weight of -60 deg whose effect turns by 120: as if taken off instead of put on. */
static void test_opposite(void **state)
{
    (void)state;
    struct desk d;
    struct advice_finding f;
    two_planes(&d);
    d.job.aim.repeatability = 0.03;
    desk_run(&d, "turned", angle_vector(0.06, 150), 0);
    d.weights[3][0].angle_deg += 180;
    assert_int_equal(desk_rule(&d), RULING_SOLVE);
    assert_true(follow_worst(&d.model, 0, &f));
    assert_int_equal(f.verdict, ADVICE_REFUSE);
    assert_non_null(strstr(f.text, "removed instead of added"));
    assert_null(strstr(f.text, "the other way"));
    model_release(&d.model);
}

/* Planes that are nearly alike: the answer stays moderate and the finding names the run to make. */
static void test_planes_alike(void **state)
{
    (void)state;
    struct desk d;
    struct answer a;
    struct advice_finding f;
    two_planes(&d);
    d.job.aim.repeatability = 0.03;
    for (size_t s = 0; s < 2; s++) { /* the right trial acts as the left one, but for 15 % */
        double complex effect = d.readings[2 + s].vector - d.readings[s].vector;
        d.readings[4 + s].vector =
            d.readings[s].vector + effect * angle_vector(s ? 1.15 : 0.85, 170) * 0.05 / 0.06;
    }
    assert_int_equal(desk_rule(&d), RULING_SOLVE);
    assert_int_equal(answer_init(&a, &d.model), ANSWER_OK);
    assert_true(a.condition > 10 && a.condition < 30);
    assert_true(advice_conditioning(&a, &f));
    assert_int_equal(f.verdict, ADVICE_CAUTION);
    assert_non_null(strstr(f.text, "180 deg apart"));
    assert_int_equal(answer_correct(&a), ANSWER_OK);
    double ideal_size = cabs(a.weights[0]) + cabs(a.weights[1]);
    double classical_size = cabs(a.classical[0]) + cabs(a.classical[1]);
    assert_true(ideal_size < 0.5 * classical_size);
    answer_release(&a);
    model_release(&d.model);
}

/* Constructed exact four-run set: 10 as found, influence 0.2 at 35 deg, trials of 50 at 0, 120 and
 * 240: correction 50 at 145. */
static void test_four_runs(void **state)
{
    (void)state;
    double amplitude[4] = {10, 19.074339014964536, 4.3287922787620605, 14.745546736202478};
    double complex w[4] = {0, 50, angle_vector(50, 120), angle_vector(50, 240)};
    double none[4] = {0}, misfit;
    size_t which;
    struct posterior p;
    assert_int_equal(amplitude_fit(4, amplitude, w, none, 10, &p, &misfit, &which), AMPLITUDE_OK);
    double complex correction = -p.mean[0] / p.mean[1];
    assert_true(fabs(cabs(correction) - 50) < 1e-6);
    assert_true(fabs(angle_of(correction) - 145) < 1e-6);
    assert_true(isnan(misfit));
    posterior_release(&p);
    assert_int_equal(amplitude_fit(3, amplitude, w, none, 10, &p, &misfit, &which),
                     AMPLITUDE_AMBIGUOUS);
    /* without the third trial: x = A w/T lies where two circles meet, |x + 1| = 19.07../10 and
     * |x + angle_vector(1, -120)| = 4.32../10; the weights are -w/x */
    double complex either[2], from = -1, to = -angle_vector(1, -120), along = to - from;
    double r = amplitude[1] / 10, q = amplitude[2] / 10, d = cabs(along);
    double foot = (d * d + r * r - q * q) / (2 * d), height = sqrt(r * r - foot * foot);
    assert_int_equal(amplitude_pair(3, amplitude, w, none, 10, either), AMPLITUDE_OK);
    for (int k = 0; k < 2; k++) {
        double complex x = from + along / d * (foot + (k ? -1 : 1) * I * height);
        double off = fmin(cabs(either[0] + 50 / x), cabs(either[1] + 50 / x));
        assert_true(off < 1e-4);
    }
    assert_true(cabs(either[0] - either[1]) > 1);
    assert_int_equal(amplitude_pair(2, amplitude, w, none, 10, either), AMPLITUDE_AMBIGUOUS);
    assert_int_equal(amplitude_pair(4, amplitude, w, none, 10, either), AMPLITUDE_AMBIGUOUS);
    assert_true(isnan(creal(either[0])) && isnan(creal(either[1])));
    /* weights along one line: the mirrored answer fits as well */
    w[2] = -50;
    w[3] = 25;
    amplitude[1] = cabs(10 + 10 * angle_vector(1, 35));
    amplitude[2] = cabs(10 - 10 * angle_vector(1, 35));
    amplitude[3] = cabs(10 + 5 * angle_vector(1, 35));
    assert_int_equal(amplitude_fit(4, amplitude, w, none, 10, &p, &misfit, &which),
                     AMPLITUDE_AMBIGUOUS);
    /* A w/T = 1 at 35 or at -35 deg: 50 at 145 or at 215 deg */
    assert_int_equal(amplitude_pair(4, amplitude, w, none, 10, either), AMPLITUDE_OK);
    for (int k = -1; k < 2; k += 2) {
        double complex one = angle_vector(50, 180 + 35 * k);
        assert_true(fmin(cabs(either[0] - one), cabs(either[1] - one)) < 1e-4);
    }
    amplitude[0] = NAN;
    assert_int_equal(amplitude_pair(4, amplitude, w, none, 10, either), AMPLITUDE_NAN);
    assert_int_equal(amplitude_fit(4, amplitude, w, none, 10, &p, &misfit, &which), AMPLITUDE_NAN);
}

int main(void)
{
    const struct CMUnitTest tests[] = {
        cmocka_unit_test(test_rulings),
        cmocka_unit_test(test_refusals),
        cmocka_unit_test(test_mounted_weights_stay),
        cmocka_unit_test(test_runs_in_any_order),
        cmocka_unit_test(test_remove),
        cmocka_unit_test(test_after_the_correction),
        cmocka_unit_test(test_linearity),
        cmocka_unit_test(test_lag_follows_weight),
        cmocka_unit_test(test_mirror_not_told),
        cmocka_unit_test(test_opposite),
        cmocka_unit_test(test_planes_alike),
        cmocka_unit_test(test_four_runs),
    };
    return cmocka_run_group_tests(tests, NULL, NULL);
}
