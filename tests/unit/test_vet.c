/* The checks of vet: each with a case that trips it and one just on the good side. The limits are
 * those of the published table of checks in the manual page; where nothing else is said they are
 * common practice. */
#include <setjmp.h>
#include <stdarg.h>
#include <stddef.h>
#include <stdint.h>

#include <cmocka.h>

#include <math.h>
#include <stdlib.h>
#include <string.h>

#include "vet/across.h"
#include "vet/answer.h"
#include "vet/beat.h"
#include "vet/limits.h"
#include "vet/trials.h"
#include "vet/within.h"

#define SENSORS 2
#define RUNS 4

#define near(actual, expected, tolerance)                                                          \
    do {                                                                                           \
        double a_ = (actual), e_ = (expected);                                                     \
        if (!(fabs(a_ - e_) <= (tolerance)))                                                       \
            fail_msg("%s is %.10g, not %.10g within %g", #actual, a_, e_, (double)(tolerance));    \
    } while (0)

/* An invented job: two sensors, two planes, runs as-found, trial A, trial B, and a repeat of trial
 * A. */
struct desk {
    struct job job;
    struct job_sensor sensors[SENSORS];
    struct job_plane planes[2];
    struct job_run job_runs[RUNS];
    struct job_weight weights[RUNS];
    struct job_target targets[SENSORS];
    struct job_limit limit;
    struct vet_run items[RUNS];
    struct vet_reading readings[RUNS][SENSORS];
    struct vet_channel channels[RUNS][SENSORS];
    char hashes[RUNS][1][65];
    struct vet_runs runs;
    size_t order[RUNS];
    struct limits limits;
    struct findings findings;
};

static struct desk desk;

static void give_reading(int run, int sensor, double complex vector)
{
    desk.readings[run][sensor] = (struct vet_reading){.present = true,
                                                      .has_phase = true,
                                                      .vector = vector,
                                                      .amplitude = cabs(vector),
                                                      .cov = {1e-10, 0, 1e-10},
                                                      .blocks = 30,
                                                      .speed_rpm = 1480,
                                                      .amplitude_pct = 1,
                                                      .phase_deg = 1,
                                                      .drift_pct = 0,
                                                      .speed_pct = 0.1,
                                                      .turns = 600,
                                                      .overall_rms = NAN,
                                                      .overall_quantity = QUANTITY_VELOCITY,
                                                      .two_x = NAN,
                                                      .half_order = NAN,
                                                      .neighbour = NAN,
                                                      .neighbour_order = NAN,
                                                      .use = true,
                                                      .reason = -1};
}

static void put_weight(int run, size_t plane, double mass, double angle_deg)
{
    desk.weights[run] = (struct job_weight){plane, mass, 0.4, mass, angle_deg, 0};
    desk.job_runs[run].weights = &desk.weights[run];
    desk.job_runs[run].weight_count = 1;
}

static void set_desk(void)
{
    static const char *const names[] = {"as-found", "trial A", "trial B", "trial A again"};

    findings_release(&desk.findings);
    memset(&desk, 0, sizeof desk);
    job_init(&desk.job);
    desk.job.rotor_mass = 340;
    desk.job.service_rpm = 1480;
    desk.job.sensors = desk.sensors;
    desk.job.sensor_count = SENSORS;
    desk.job.planes = desk.planes;
    desk.job.plane_count = 2;
    desk.job.runs = desk.job_runs;
    desk.job.run_count = RUNS;
    desk.job.aim.targets = desk.targets;
    desk.job.aim.repeatability = 0.03;
    for (int s = 0; s < SENSORS; s++) {
        strcpy(desk.sensors[s].name, s ? "NDE-H" : "DE-V");
        desk.sensors[s].quantity = desk.sensors[s].show.quantity = QUANTITY_VELOCITY;
        desk.targets[s] = (struct job_target){NAN, QUANTITY_VELOCITY, true};
    }
    desk.planes[0].radius_m = desk.planes[1].radius_m = 0.4;
    for (int r = 0; r < RUNS; r++) {
        desk.job_runs[r].speed_rpm = NAN;
        strcpy(desk.job_runs[r].name, names[r]);
        strcpy(desk.job_runs[r].condition, "service");
        strcpy(desk.items[r].name, names[r]);
        strcpy(desk.items[r].condition, "service");
        memset(desk.hashes[r][0], 'a' + r, 64);
        desk.items[r].index = r;
        desk.items[r].has_tacho = desk.items[r].reference = true;
        desk.items[r].marks = 600;
        desk.items[r].hashes = desk.hashes[r];
        desk.items[r].hash_count = 1;
        desk.items[r].readings = desk.readings[r];
        desk.items[r].channels = desk.channels[r];
        desk.order[r] = (size_t)r;
        for (int s = 0; s < SENSORS; s++)
            desk.channels[r][s] = (struct vet_channel){true, -1, 1, 1e-4, 0, 100000, -1};
    }
    for (int s = 0; s < SENSORS; s++) {
        give_reading(0, s, 7e-3);
        give_reading(1, s, 4e-3 + 4e-3 * I);
        give_reading(2, s, 5e-3 - 5e-3 * I);
        give_reading(3, s, 4.05e-3 + 4e-3 * I);
    }
    put_weight(1, 0, 0.02, 30);
    put_weight(2, 1, 0.02, 60);
    put_weight(3, 0, 0.02, 30);
    desk.runs = (struct vet_runs){desk.items, RUNS, RUNS};
    limits_init(&desk.limits, &desk.job);
    findings_init(&desk.findings, &desk.limits);
}

/* The worst ruling of a check about a run and a sensor (-1: any); -1 where it found nothing. */
static int ruled(enum check check, int run, int sensor)
{
    int worst = -1;

    for (size_t i = 0; i < desk.findings.count; i++) {
        const struct finding *f = &desk.findings.items[i];
        if (f->check == check && (run < -1 || f->run == run) &&
            (sensor < 0 || f->sensor == sensor) && (int)f->ruling > worst)
            worst = (int)f->ruling;
    }
    return worst;
}

static int within(int run)
{
    findings_clear(&desk.findings);
    within_run(&desk.items[run], run, &desk.job, &desk.findings);
    return 0;
}

static int vectors(int run)
{
    double as_found[SENSORS];

    findings_clear(&desk.findings);
    for (size_t s = 0; s < SENSORS; s++)
        as_found[s] = across_as_found(&desk.runs, desk.order, &desk.job, "service", s);
    within_vectors(&desk.items[run], run, as_found, &desk.job, &desk.findings);
    return 0;
}

static bool any_used(int run)
{
    return desk.readings[run][0].use || desk.readings[run][1].use;
}

static bool all_used(int run)
{
    return desk.readings[run][0].use && desk.readings[run][1].use;
}

static void a_good_job_is_ok(void **state)
{
    (void)state;
    set_desk();
    for (int r = 0; r < RUNS; r++) {
        within(r);
        for (size_t i = 0; i < desk.findings.count; i++)
            assert_int_equal(desk.findings.items[i].ruling, RULING_OK);
        assert_true(desk.findings.count > 5);
        vectors(r);
        for (size_t i = 0; i < desk.findings.count; i++)
            assert_int_equal(desk.findings.items[i].ruling, RULING_OK);
        assert_true(desk.findings.count >= 6);
    }
    findings_clear(&desk.findings);
    assert_int_equal(across_runs(&desk.runs, desk.order, &desk.job, &desk.findings), 0);
    for (size_t i = 0; i < desk.findings.count; i++)
        assert_int_equal(desk.findings.items[i].ruling, RULING_OK);
    for (int r = 0; r < RUNS; r++)
        assert_true(all_used(r));
    assert_int_equal(ruled(CHECK_REPEAT, 3, 0), RULING_OK);
    assert_int_equal(ruled(CHECK_TRIAL_EFFECT, 1, -1), RULING_OK);
    assert_int_equal(ruled(CHECK_TRIAL_EFFECT, 2, -1), RULING_OK);
    assert_int_equal(ruled(CHECK_TRIAL_EFFECT, 3, -1), -1); /* a repeat tells nothing new */
}

/* Sets a figure of run 1, makes the checks and returns the ruling. */
struct figure {
    enum check check;
    double value;
    enum ruling expected;
};

static void set_figure(enum check check, double value)
{
    for (int s = 0; s < SENSORS; s++) {
        struct vet_reading *r = &desk.readings[1][s];
        switch (check) {
        case CHECK_LENGTH:
            r->turns = (long)value;
            break;
        case CHECK_SERVICE_SPEED:
            r->speed_rpm = 1480 * (1 + value / 100);
            break;
        case CHECK_SPEED_STEADY:
            r->speed_pct = value;
            break;
        case CHECK_AMPLITUDE_STEADY: /* the as-found amplitude is 7, the reading's 5.657 */
            r->amplitude_pct = value * 7e-3 / r->amplitude;
            break;
        case CHECK_PHASE_STEADY:
            r->phase_deg = value;
            break;
        case CHECK_DRIFT:
            r->drift_pct = value * 7e-3 / r->amplitude;
            break;
        case CHECK_CLIPPING:
            desk.channels[1][s].railed = (long long)value;
            break;
        case CHECK_TACHO:
            desk.items[1].missed = lround(value * 3);
            desk.items[1].extra = lround(value * 3);
            desk.items[1].marks = 600 - desk.items[1].missed;
            break;
        case CHECK_WEIGHT_FORCE: /* m r w^2 against half of 340 kg * 9.80665 m/s2 */
            desk.weights[1].mounted_mass =
                value / 100 * 340 * 9.80665 / 2 / 0.4 / pow(2 * 3.14159265358979 * 1480 / 60, 2);
            break;
        default:
            fail();
        }
    }
}

static void figures_of_a_run(void **state)
{
    static const struct figure figures[] = {
        {CHECK_LENGTH, 100, RULING_OK},
        {CHECK_LENGTH, 99, RULING_CAUTION},
        {CHECK_LENGTH, 20, RULING_CAUTION},
        {CHECK_LENGTH, 19, RULING_REFUSE},
        {CHECK_SERVICE_SPEED, 1.9, RULING_OK},
        {CHECK_SERVICE_SPEED, 2.1, RULING_CAUTION},
        {CHECK_SERVICE_SPEED, -9, RULING_CAUTION},
        {CHECK_SERVICE_SPEED, -11, RULING_REFUSE},
        {CHECK_SPEED_STEADY, 0.9, RULING_OK},
        {CHECK_SPEED_STEADY, 1.1, RULING_CAUTION},
        {CHECK_SPEED_STEADY, 2.9, RULING_CAUTION},
        {CHECK_SPEED_STEADY, 3.1, RULING_REFUSE},
        {CHECK_AMPLITUDE_STEADY, 9.9, RULING_OK},
        {CHECK_AMPLITUDE_STEADY, 10.1, RULING_CAUTION},
        {CHECK_AMPLITUDE_STEADY, 29, RULING_CAUTION},
        {CHECK_AMPLITUDE_STEADY, 31, RULING_REFUSE},
        {CHECK_PHASE_STEADY, 4.9, RULING_OK},
        {CHECK_PHASE_STEADY, 5.1, RULING_CAUTION},
        {CHECK_PHASE_STEADY, 19, RULING_CAUTION},
        {CHECK_PHASE_STEADY, 21, RULING_REFUSE},
        {CHECK_DRIFT, 4.9, RULING_OK},
        {CHECK_DRIFT, 5.1, RULING_CAUTION},
        {CHECK_DRIFT, 19, RULING_CAUTION},
        {CHECK_DRIFT, 21, RULING_REFUSE},
        {CHECK_CLIPPING, 0, RULING_OK},
        {CHECK_CLIPPING, 1, RULING_CAUTION},
        {CHECK_CLIPPING, 9, RULING_CAUTION},
        {CHECK_CLIPPING, 10, RULING_REFUSE},
        {CHECK_TACHO, 0.6, RULING_OK},
        {CHECK_TACHO, 1.1, RULING_CAUTION},
        {CHECK_TACHO, 24, RULING_CAUTION},
        {CHECK_TACHO, 26, RULING_REFUSE},
        {CHECK_WEIGHT_FORCE, 14.9, RULING_OK},
        {CHECK_WEIGHT_FORCE, 15.1, RULING_CAUTION},
        {CHECK_WEIGHT_FORCE, 49, RULING_CAUTION},
        {CHECK_WEIGHT_FORCE, 51, RULING_REFUSE},
    };

    (void)state;
    for (size_t i = 0; i < sizeof figures / sizeof *figures; i++) {
        const struct figure *f = &figures[i];
        int got;
        set_desk();
        set_figure(f->check, f->value);
        within(1);
        got = ruled(f->check, 1, -1);
        vectors(1);
        if (ruled(f->check, 1, -1) > got)
            got = ruled(f->check, 1, -1);
        if (got != (int)f->expected)
            fail_msg("%s at %g: ruled %d, not %d", desk.limits.rows[f->check].name, f->value, got,
                     (int)f->expected);
        assert_int_equal(any_used(1), f->expected != RULING_REFUSE);
    }
}

/* A small remainder on a well-balanced machine: lag says nothing, and scatter is held against what
 * was there. */
static void a_balanced_machine_is_not_punished(void **state)
{
    (void)state;
    set_desk();
    give_reading(1, 0, 0.19 * 7e-3);
    desk.readings[1][0].phase_deg = 80;
    desk.readings[1][0].amplitude_pct = 50; /* 9.5 % of as found */
    vectors(1);
    assert_int_equal(ruled(CHECK_PHASE_STEADY, 1, 0), -1);
    assert_int_equal(ruled(CHECK_AMPLITUDE_STEADY, 1, 0), RULING_OK);
    give_reading(1, 0, 0.21 * 7e-3);
    desk.readings[1][0].phase_deg = 80;
    vectors(1);
    assert_int_equal(ruled(CHECK_PHASE_STEADY, 1, 0), RULING_REFUSE);
    assert_true(!desk.readings[1][0].use && desk.readings[1][1].use);
}

static void a_drift_widens(void **state)
{
    (void)state;
    set_desk();
    set_figure(CHECK_DRIFT, 12);
    vectors(1);
    /* A value spread evenly over a length d has the variance d^2/12. */
    near(desk.readings[1][0].widen[0], pow(0.12 * 7e-3, 2) / 12, 1e-15);
    near(desk.readings[1][0].widen[2], desk.readings[1][0].widen[0], 0);
    near(desk.readings[1][0].cov[0], 1e-10, 0);
}

static void unreadable_and_dead(void **state)
{
    (void)state;
    set_desk();
    desk.items[1].unreadable = true;
    within(1);
    assert_false(any_used(1));

    set_desk();
    desk.channels[1][0].min = desk.channels[1][0].max = 0.3;
    desk.channels[1][0].resolution = 0;
    within(1);
    assert_int_equal(ruled(CHECK_SENSOR_DEAD, 1, 0), RULING_REFUSE);
    assert_int_equal(ruled(CHECK_SENSOR_DEAD, 1, 1), RULING_OK);
    assert_true(!desk.readings[1][0].use && desk.readings[1][1].use);

    set_desk();
    desk.channels[1][0].max = -1 + 2e-4; /* three levels */
    desk.channels[1][1].max = -1 + 3e-4; /* four */
    within(1);
    assert_int_equal(ruled(CHECK_SENSOR_DEAD, 1, 0), RULING_REFUSE);
    assert_int_equal(ruled(CHECK_SENSOR_DEAD, 1, 1), RULING_OK);

    set_desk();
    desk.channels[1][1].same_as = 0;
    within(1);
    assert_int_equal(ruled(CHECK_SENSOR_DEAD, 1, 0), RULING_REFUSE); /* neither can be believed */
    assert_int_equal(ruled(CHECK_SENSOR_DEAD, 1, 1), RULING_REFUSE);
}

static void no_turns_at_all(void **state)
{
    (void)state;
    set_desk();
    desk.readings[1][0].present = desk.readings[1][1].present = false;
    within(1);
    assert_int_equal(ruled(CHECK_LENGTH, 1, -1), RULING_REFUSE);
    desk.items[1].hand = true; /* an instrument's readings have no turns to count */
    within(1);
    assert_int_equal(ruled(CHECK_LENGTH, 1, -1), -1);
}

static void one_recording_twice(void **state)
{
    (void)state;
    set_desk();
    memcpy(desk.hashes[2], desk.hashes[1], sizeof desk.hashes[1]);
    across_same_recording(&desk.runs, desk.order, &desk.job, &desk.findings);
    assert_int_equal(ruled(CHECK_SAME_RECORDING, 1, -1), RULING_REFUSE); /* whose is it? */
    assert_int_equal(ruled(CHECK_SAME_RECORDING, 2, -1), RULING_REFUSE);
    assert_int_equal(ruled(CHECK_SAME_RECORDING, 0, -1), RULING_OK);
    assert_true(!any_used(1) && !any_used(2) && all_used(0) && all_used(3));

    set_desk();
    memcpy(desk.hashes[3], desk.hashes[1], sizeof desk.hashes[1]);
    across_same_recording(&desk.runs, desk.order, &desk.job, &desk.findings);
    assert_int_equal(ruled(CHECK_SAME_RECORDING, 1, -1),
                     RULING_OK); /* it is one of these weights */
    assert_int_equal(ruled(CHECK_SAME_RECORDING, 3, -1), RULING_REFUSE);
}

static void speeds_apart(void **state)
{
    static const struct figure figures[] = {{CHECK_SPEED_MATCH, 0.9, RULING_OK},
                                            {CHECK_SPEED_MATCH, 1.1, RULING_CAUTION},
                                            {CHECK_SPEED_MATCH, 2.9, RULING_CAUTION},
                                            {CHECK_SPEED_MATCH, 3.2, RULING_REFUSE}};

    (void)state;
    for (size_t i = 0; i < 4; i++) {
        set_desk();
        desk.readings[2][0].speed_rpm = desk.readings[2][1].speed_rpm =
            1480 * (1 + figures[i].value / 100);
        across_speed_match(&desk.runs, desk.order, &desk.job, &desk.findings);
        assert_int_equal(ruled(CHECK_SPEED_MATCH, -2, -1), figures[i].expected);
        assert_int_equal(any_used(2), figures[i].expected != RULING_REFUSE);
        assert_true(all_used(0) && all_used(1) && all_used(3));
    }
    strcpy(desk.items[2].condition, "hot"); /* conditions are not compared */
    set_desk();
    strcpy(desk.items[2].condition, "hot");
    desk.readings[2][0].speed_rpm = 1600;
    across_speed_match(&desk.runs, desk.order, &desk.job, &desk.findings);
    assert_int_equal(ruled(CHECK_SPEED_MATCH, -2, -1), RULING_OK);
}

static void lost_phase(void **state)
{
    (void)state;
    set_desk();
    desk.readings[1][0].has_phase = desk.readings[1][1].has_phase = false;
    across_phase_reference(&desk.runs, desk.order, &desk.job, &desk.findings);
    assert_int_equal(ruled(CHECK_PHASE_REFERENCE, 1, 0), RULING_REFUSE);
    assert_true(!any_used(1) && all_used(0));

    set_desk(); /* one plane and no phase anywhere: the amplitudes may serve */
    desk.job.plane_count = 1;
    for (int r = 0; r < RUNS; r++)
        desk.readings[r][0].has_phase = desk.readings[r][1].has_phase = false;
    across_phase_reference(&desk.runs, desk.order, &desk.job, &desk.findings);
    assert_int_equal(ruled(CHECK_PHASE_REFERENCE, 1, 0), RULING_CAUTION);
    assert_true(all_used(1));

    set_desk(); /* a recording of an audit stands alone */
    desk.items[1].index = -1;
    within(1);
    assert_int_equal(ruled(CHECK_PHASE_REFERENCE, 1, -1), RULING_OK);
    desk.readings[1][0].has_phase = desk.readings[1][1].has_phase = false;
    within(1);
    assert_int_equal(ruled(CHECK_PHASE_REFERENCE, 1, -1), RULING_REFUSE);
}

static void repeats(void **state)
{
    static const struct figure figures[] = {{CHECK_REPEAT, 9.5, RULING_OK},
                                            {CHECK_REPEAT, 10.5, RULING_CAUTION},
                                            {CHECK_REPEAT, 29, RULING_CAUTION},
                                            {CHECK_REPEAT, 31, RULING_REFUSE}};

    (void)state;
    for (size_t i = 0; i < 4; i++) { /* as found is the larger, 7 */
        set_desk();
        give_reading(3, 0, desk.readings[1][0].vector - figures[i].value / 100 * 7e-3);
        across_repeat(&desk.runs, desk.order, &desk.job, &desk.findings);
        assert_int_equal(ruled(CHECK_REPEAT, 3, 0), figures[i].expected);
        assert_int_equal(desk.readings[3][0].use, figures[i].expected != RULING_REFUSE);
        assert_int_equal(desk.readings[1][0].use, figures[i].expected != RULING_REFUSE);
        assert_true(desk.readings[3][1].use);
    }
    set_desk(); /* within its own uncertainty: 2 mm/s apart at 1 mm/s each is no disagreement */
    give_reading(3, 0, desk.readings[1][0].vector - 2e-3);
    desk.readings[3][0].cov[0] = desk.readings[3][0].cov[2] = 1e-6;
    across_repeat(&desk.runs, desk.order, &desk.job, &desk.findings);
    assert_int_equal(ruled(CHECK_REPEAT, 3, 0), RULING_OK);

    set_desk(); /* of three the one that differs goes */
    desk.job_runs[2].weights = &desk.weights[1];
    give_reading(2, 0, desk.readings[1][0].vector + 5e-3);
    across_repeat(&desk.runs, desk.order, &desk.job, &desk.findings);
    assert_true(desk.readings[1][0].use && !desk.readings[2][0].use && desk.readings[3][0].use);
}

/* As-found amplitude A, repeatability 3 %: one standard error is 6 % of A. */
static void trial_effects(void **state)
{
    static const struct {
        double complex after; /* in as-found amplitudes */
        enum ruling expected;
    } cases[] = {
        {1 + 0.29, RULING_REFUSE},         /* 4.83 standard errors */
        {1 - 0.305, RULING_OK},            /* 5.08, and 30.5 % */
        {0.99 + 0.31 * I, RULING_CAUTION}, /* 5.17, 4 % and 17 deg */
        {0.866 + 0.51 * I, RULING_OK},     /* 30.5 deg */
        {0.86 + 0.48 * I, RULING_CAUTION}, /* 29 deg */
    };

    (void)state;
    for (size_t i = 0; i < sizeof cases / sizeof *cases; i++) {
        set_desk();
        for (int s = 0; s < SENSORS; s++) {
            give_reading(1, s, 7e-3 * cases[i].after);
            memset(desk.readings[1][s].cov, 0, sizeof desk.readings[1][s].cov);
            memset(desk.readings[0][s].cov, 0, sizeof desk.readings[0][s].cov);
        }
        trials_effect(&desk.runs, desk.order, &desk.job, &desk.findings);
        assert_int_equal(ruled(CHECK_TRIAL_EFFECT, 1, -1), cases[i].expected);
        assert_int_equal(any_used(1), cases[i].expected != RULING_REFUSE);
    }
    assert_int_equal(ruled(CHECK_TRIAL_EFFECT, 2, -1), RULING_OK);
}

/* The first trial left on during the second: the second is judged by what it adds. */
static void a_second_trial_on_top(void **state)
{
    struct job_weight both[2];

    (void)state;
    set_desk();
    both[0] = desk.weights[1];
    both[1] = desk.weights[2];
    desk.job_runs[2].weights = both;
    desk.job_runs[2].weight_count = 2;
    for (int s = 0; s < SENSORS; s++)
        give_reading(2, s, desk.readings[1][s].vector * 1.02);
    trials_effect(&desk.runs, desk.order, &desk.job, &desk.findings);
    assert_int_equal(ruled(CHECK_TRIAL_EFFECT, 1, -1), RULING_OK);
    assert_int_equal(ruled(CHECK_TRIAL_EFFECT, 2, -1), RULING_REFUSE);
}

static void below_target(void **state)
{
    (void)state;
    set_desk();
    desk.targets[0].amplitude = 7.1e-3;
    desk.targets[1].amplitude = 6.9e-3;
    across_low_level(&desk.runs, desk.order, &desk.job, &desk.findings);
    assert_int_equal(ruled(CHECK_LOW_LEVEL, 0, 0), RULING_CAUTION);
    assert_int_equal(ruled(CHECK_LOW_LEVEL, 0, 1), RULING_OK);
    assert_int_equal(ruled(CHECK_LOW_LEVEL, 1, -1), -1);
}

static void share_of_one_x(void **state)
{
    (void)state;
    set_desk();
    desk.readings[0][0].overall_rms = 7e-3 / sqrt(2) / 0.51;
    desk.readings[0][1].overall_rms = 7e-3 / sqrt(2) / 0.49;
    desk.readings[0][0].two_x = 49;
    desk.readings[0][1].two_x = 51;
    vectors(0);
    assert_int_equal(ruled(CHECK_ONE_X_SHARE, 0, 0), RULING_OK);
    assert_int_equal(ruled(CHECK_ONE_X_SHARE, 0, 1), RULING_CAUTION);
    assert_int_equal(ruled(CHECK_TWO_X, 0, 0), RULING_OK);
    assert_int_equal(ruled(CHECK_TWO_X, 0, 1), RULING_CAUTION);
    desk.readings[1][1].overall_rms = 1;
    vectors(1); /* what remains under a weight is not judged */
    assert_int_equal(ruled(CHECK_ONE_X_SHARE, 1, 1), -1);
}

static void a_beat_is_judged(void **state)
{
    static const struct figure figures[] = {{CHECK_BEAT, 9.9, RULING_OK},
                                            {CHECK_BEAT, 10.1, RULING_CAUTION},
                                            {CHECK_BEAT, 39, RULING_CAUTION},
                                            {CHECK_BEAT, 41, RULING_REFUSE}};

    (void)state;
    for (size_t i = 0; i < 4; i++) {
        set_desk();
        desk.readings[1][0].beat = (struct beat){figures[i].value / 100 * 7e-3, 0.2, 30};
        vectors(1);
        assert_int_equal(ruled(CHECK_BEAT, 1, 0), figures[i].expected);
        assert_int_equal(desk.readings[1][0].use, figures[i].expected != RULING_REFUSE);
        assert_int_equal(desk.readings[1][0].widen[0] > 0, figures[i].expected != RULING_OK);
    }
}

static void the_whole_job_is_answered(void **state)
{
    size_t run = 9, sensor = 9;

    (void)state;
    set_desk();
    assert_int_equal(answer_possible(&desk.runs, desk.order, &desk.job, &run, &sensor), 1);
    within_refuse(&desk.items[1], &desk.job); /* repeated */
    assert_int_equal(answer_possible(&desk.runs, desk.order, &desk.job, &run, &sensor), 1);
    desk.readings[2][1].use = false;
    assert_int_equal(answer_possible(&desk.runs, desk.order, &desk.job, &run, &sensor), 0);
    assert_int_equal(run, 2);
    assert_int_equal(sensor, 1);
    desk.job.aim.named = true; /* the aim is on the other sensor */
    desk.targets[1].in_aim = false;
    assert_int_equal(answer_possible(&desk.runs, desk.order, &desk.job, &run, &sensor), 1);
    for (int r = 0; r < RUNS; r++) { /* an audit has nothing to answer */
        desk.items[r].index = -1;
        within_refuse(&desk.items[r], &desk.job);
    }
    assert_int_equal(answer_possible(&desk.runs, desk.order, &desk.job, &run, &sensor), 1);
}

static void limits_of_the_sheet(void **state)
{
    double limit;
    struct limits limits;

    (void)state;
    set_desk();
    desk.job.limits = &desk.limit;
    desk.job.limit_count = 1;
    desk.limit = (struct job_limit){"speed-match", false, 2, NAN};
    limits_init(&limits, &desk.job);
    assert_int_equal(limits_judge(&limits, CHECK_SPEED_MATCH, 1.5, &limit), RULING_OK);
    assert_int_equal(limits_judge(&limits, CHECK_SPEED_MATCH, 2.5, &limit), RULING_CAUTION);
    near(limit, 2, 0);
    assert_int_equal(limits_judge(&limits, CHECK_SPEED_MATCH, 3.5, &limit), RULING_REFUSE);
    desk.limit =
        (struct job_limit){"speed-match", false, 5, NAN}; /* beyond the refusal's default */
    limits_init(&limits, &desk.job);
    assert_int_equal(limits_judge(&limits, CHECK_SPEED_MATCH, 4.9, &limit), RULING_OK);
    desk.limit = (struct job_limit){"length", false, 60, 10};
    limits_init(&limits, &desk.job);
    assert_int_equal(limits_judge(&limits, CHECK_LENGTH, 60, &limit), RULING_OK);
    assert_int_equal(limits_judge(&limits, CHECK_LENGTH, 11, &limit), RULING_CAUTION);
    assert_int_equal(limits_judge(&limits, CHECK_LENGTH, 9, &limit), RULING_REFUSE);
    assert_int_equal(limits_judge(&limits, CHECK_LENGTH, NAN, &limit), RULING_OK);
    desk.limit = (struct job_limit){"clipping", true, NAN, NAN};
    limits_init(&desk.limits, &desk.job);
    set_figure(CHECK_CLIPPING, 1000);
    within(1);
    assert_int_equal(ruled(CHECK_CLIPPING, 1, -1), -1);
    assert_true(all_used(1));
}

/* Journal loads of a 340 kg rotor, mass centre 0.5 m from bearing A of 2 m: B carries a quarter. */
static void loads(void **state)
{
    (void)state;
    set_desk();
    near(within_journal_load(&desk.job), 340 * 9.80665 / 2, 1e-9);
    desk.job.span_m = 2;
    desk.job.centre_m = 0.5;
    near(within_journal_load(&desk.job), 340 * 9.80665 / 4, 1e-9);
    desk.job.centre_m = 2.4; /* overhung: the near bearing carries 1.2 times the weight */
    near(within_journal_load(&desk.job), 340 * 9.80665 * 1.2, 1e-9);
    desk.job.rotor_mass = NAN;
    assert_true(isnan(within_journal_load(&desk.job)));
}

int main(void)
{
    const struct CMUnitTest tests[] = {
        cmocka_unit_test(a_good_job_is_ok),
        cmocka_unit_test(figures_of_a_run),
        cmocka_unit_test(a_balanced_machine_is_not_punished),
        cmocka_unit_test(a_drift_widens),
        cmocka_unit_test(unreadable_and_dead),
        cmocka_unit_test(no_turns_at_all),
        cmocka_unit_test(one_recording_twice),
        cmocka_unit_test(speeds_apart),
        cmocka_unit_test(lost_phase),
        cmocka_unit_test(repeats),
        cmocka_unit_test(trial_effects),
        cmocka_unit_test(a_second_trial_on_top),
        cmocka_unit_test(below_target),
        cmocka_unit_test(share_of_one_x),
        cmocka_unit_test(a_beat_is_judged),
        cmocka_unit_test(the_whole_job_is_answered),
        cmocka_unit_test(limits_of_the_sheet),
        cmocka_unit_test(loads),
    };
    int failed = cmocka_run_group_tests(tests, NULL, NULL);

    findings_release(&desk.findings);
    return failed;
}
