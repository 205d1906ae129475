/* What vet finds out about things that were moved, speeds that turn lags, and times of recording:
 * kernels on invented numbers, each with a case that trips and one just on the good side. */
#include "noise_source.h"
#include "vet_desk.h"

#include "vet/moved.h"
#include "vet/repeats.h"
#include "vet/resonance.h"
#include "vet/suspects.h"
#include "vet/when.h"

#define PLANES 2
#define MOST 6
static const double TURN = 2 * 3.14159265358979;

static double complex deviate(void) /* 1 per component */
{
    return sqrt(-2 * log(uniform())) * cexp(I * TURN * uniform());
}

/* A job with two planes and three sensors that answer as they please: as found, trial A, trial B,
 * both, as found again, half of both. Standard deviation from run to run 3 % of as found. */
struct jobs {
    double complex weights[MOST * PLANES], vectors[MOST * 3];
    double variance[MOST * 3], repeatability[3];
    bool alike[9];
    struct suspects_set set;
};

static void draw(struct jobs *j, size_t runs)
{
    static const double complex w[MOST * PLANES] = {0, 0, 1, 0, 0, I, 1, I, 0, 0, 0.5, 0.5 * I};
    double complex response[3][PLANES + 1];

    for (size_t i = 0; i < 3; i++) {
        response[i][0] = 10 * cexp(I * TURN * uniform());
        response[i][1] = 6 * cexp(I * TURN * uniform());
        response[i][2] = 5 * cexp(I * TURN * uniform());
        j->repeatability[i] = 0.3 * 0.3;
        for (size_t k = 0; k < 3; k++)
            j->alike[3 * i + k] = true;
    }
    for (size_t r = 0; r < runs; r++) {
        for (size_t p = 0; p < PLANES; p++)
            j->weights[r * PLANES + p] = 0.05 * w[r * PLANES + p];
        for (size_t i = 0; i < 3; i++) {
            j->vectors[3 * r + i] = response[i][0] + response[i][1] * w[r * PLANES] +
                                    response[i][2] * w[r * PLANES + 1] + 0.31 * deviate();
            j->variance[3 * r + i] = 0.1 * 0.1;
        }
    }
    j->set = (struct suspects_set){runs,       3,           PLANES,           j->weights,
                                   j->vectors, j->variance, j->repeatability, j->alike};
}

/* Points of chi-squared: NIST/SEMATECH e-Handbook of Statistical Methods, 1.3.6.7.4 (three
 * decimals); the approximation is good to a percent or two. */
static void points_of_chi_squared(void **state)
{
    (void)state;
    assert_close(suspects_chi2(2, 1.6449), 5.991, 0.09);
    assert_close(suspects_chi2(10, 1.6449), 18.307, 0.05);
    assert_close(suspects_chi2(2, 3.0902), 13.816, 0.4);
    assert_close(suspects_chi2(20, 3.0902), 45.315, 0.2);
}

static void nothing_was_moved(void **state)
{
    struct jobs j;
    struct suspect s;
    int alarms = 0;

    (void)state;
    seed = 11;
    for (int k = 0; k < 700; k++) {
        draw(&j, 4 + k % 3);
        for (int kind = SUSPECTS_TAPE; kind <= SUSPECTS_TURN; kind++) {
            assert_int_equal(suspects_find(&j.set, (enum suspects_kind)kind, &s), 0);
            assert_true(s.spare);
            alarms += s.likely;
        }
    }
    assert_true(alarms <= 4); /* of 2100, each gate alone lets through 1 in 1000 */
    draw(&j, 3);              /* as found and a trial on each plane: nothing is spare */
    assert_int_equal(suspects_find(&j.set, SUSPECTS_TAPE, &s), 0);
    assert_true(!s.spare && !s.likely);
}

static void a_tape_was_moved(void **state)
{
    struct jobs j;
    struct suspect s;
    int seen = 0;

    (void)state;
    seed = 12;
    for (int k = 0; k < 100; k++) {
        draw(&j, 5);
        for (size_t r = 3; r < 5; r++) /* from "both" on */
            for (size_t i = 0; i < 3; i++)
                j.vectors[3 * r + i] *= cexp(I * TURN * 40 / 360);
        assert_int_equal(suspects_find(&j.set, SUSPECTS_TAPE, &s), 0);
        if (s.likely && s.better > 3) {
            seen++;
            assert_close(s.angle_deg, 40, 6);
            assert_true(s.ambiguous || (s.run == 3 && s.onwards));
        }
        assert_int_equal(suspects_find(&j.set, SUSPECTS_SWAP, &s), 0);
        assert_false(s.likely);
    }
    assert_true(seen >= 90);
    draw(&j, 5); /* 2 deg is within what lags scatter from run to run, 1.7 deg */
    for (size_t i = 0; i < 3; i++)
        j.vectors[12 + i] *= cexp(I * TURN * 2 / 360);
    assert_int_equal(suspects_find(&j.set, SUSPECTS_TAPE, &s), 0);
    assert_false(s.likely);
}

static void sensors_were_swapped_or_turned(void **state)
{
    struct jobs j;
    struct suspect s;
    int swaps = 0, turns = 0;

    (void)state;
    seed = 13;
    for (int k = 0; k < 100; k++) {
        double complex kept;
        draw(&j, 6);
        kept = j.vectors[3 * 4];
        j.vectors[3 * 4] = j.vectors[3 * 4 + 2]; /* as found again: the first and the third */
        j.vectors[3 * 4 + 2] = kept;
        assert_int_equal(suspects_find(&j.set, SUSPECTS_SWAP, &s), 0);
        swaps += s.likely && s.run == 4 && !s.onwards && s.sensor == 0 && s.with == 2;
        j.alike[2] = j.alike[6] = false; /* of two quantities they cannot have been exchanged */
        assert_int_equal(suspects_find(&j.set, SUSPECTS_SWAP, &s), 0);
        assert_false(s.likely);

        draw(&j, 6);
        j.vectors[3 * 4 + 1] *= -I; /* lag 90 deg smaller */
        assert_int_equal(suspects_find(&j.set, SUSPECTS_TURN, &s), 0);
        turns += s.likely && s.run == 4 && !s.onwards && s.sensor == 1;
        if (s.likely)
            assert_close(s.angle_deg, -90, 0);
        assert_int_equal(suspects_find(&j.set, SUSPECTS_TAPE, &s), 0);
        assert_false(s.likely);
    }
    assert_true(swaps >= 80); /* some of the drawn vectors are nearly equal */
    assert_true(turns >= 90);
    draw(&j, 6);
    j.vectors[3 * 4 + 1] = j.vectors[3 * 4 + 2] = CMPLX(NAN, NAN); /* off in that run */
    assert_int_equal(suspects_find(&j.set, SUSPECTS_SWAP, &s), 0);
    assert_true(s.spare && !s.likely);
}

/* The desk: the repeat of trial A with both sensors' cables exchanged. */
static void moved_on_the_desk(void **state)
{
    (void)state;
    vet_desk_set();
    moved_check(&desk.runs, desk.order, &desk.job, &desk.findings);
    /* As found is not repeated after the trials: what moved in between is taken for their effect.
     */
    assert_int_equal(desk.findings.count, 1);
    assert_int_equal(desk.findings.items[0].ruling, RULING_OK);
    assert_true(isnan(desk.findings.items[0].value));
    assert_int_equal(strncmp(desk.findings.items[0].text, "not checkable", 13), 0);

    vet_desk_set(); /* as found once more at the end: now it would show */
    vet_desk_weight(3, 0, 0, 0);
    for (int i = 0; i < SENSORS; i++)
        vet_desk_reading(3, i, 7.05e-3);
    moved_check(&desk.runs, desk.order, &desk.job, &desk.findings);
    assert_int_equal(desk.findings.count, 3);
    for (size_t i = 0; i < 3; i++) {
        assert_int_equal(desk.findings.items[i].ruling, RULING_OK);
        assert_close(desk.findings.items[i].value, 1, 0);
    }
    for (int i = 0; i < SENSORS; i++) /* and does */
        vet_desk_reading(3, i, 7.05e-3 * cexp(I * TURN * 30 / 360));
    moved_check(&desk.runs, desk.order, &desk.job, &desk.findings);
    assert_int_equal(vet_desk_ruled(CHECK_TAPE_MOVED, -2, -1), RULING_CAUTION);

    vet_desk_set();
    for (int r = 0; r < 2; r++)
        vet_desk_reading(r, 1, 3e-3 * I + r * 1e-3);
    vet_desk_reading(3, 0, desk.readings[1][1].vector);
    vet_desk_reading(3, 1, desk.readings[1][0].vector);
    moved_check(&desk.runs, desk.order, &desk.job, &desk.findings);
    assert_int_equal(vet_desk_ruled(CHECK_SENSOR_SWAPPED, -2, -1), RULING_CAUTION);
    assert_int_equal(vet_desk_ruled(CHECK_TAPE_MOVED, -2, -1), RULING_OK);

    vet_desk_set();
    for (int i = 0; i < SENSORS; i++)
        vet_desk_reading(3, i, desk.readings[1][i].vector * cexp(-I * TURN * 30 / 360));
    moved_check(&desk.runs, desk.order, &desk.job, &desk.findings);
    assert_int_equal(vet_desk_ruled(CHECK_TAPE_MOVED, -2, -1), RULING_CAUTION);
    /* from trial B on says the same: alone on its plane it fits whatever it shows */
    if (!strstr(desk.findings.items[0].text,
                "if all lags had shifted by -30 deg in run 'trial A again' "
                "(or by -30 deg from 'trial B' on)"))
        fail_msg("%s", desk.findings.items[0].text);

    vet_desk_set();
    vet_desk_reading(3, 1, -desk.readings[1][1].vector);
    moved_check(&desk.runs, desk.order, &desk.job, &desk.findings);
    assert_int_equal(vet_desk_ruled(CHECK_SENSOR_TURNED, -2, 1), RULING_CAUTION);

    vet_desk_set(); /* a limit of the sheet's */
    desk.job.limits = &desk.limit;
    desk.job.limit_count = 1;
    desk.limit = (struct job_limit){"sensor-turned", true, NAN, NAN};
    limits_init(&desk.limits, &desk.job);
    vet_desk_reading(3, 1, -desk.readings[1][1].vector);
    moved_check(&desk.runs, desk.order, &desk.job, &desk.findings);
    assert_int_equal(vet_desk_ruled(CHECK_SENSOR_TURNED, -2, -1), -1);
}

/* Lags that turn by `slope` deg per % while the speed swings by 0.3 % and creeps, and the lag warms
 * up. */
static void wander(double complex *z, double *speed, double *t, int count, double slope)
{
    for (int k = 0; k < count; k++) {
        double percent = 0.3 * sin(TURN * k / 7.3) + 0.01 * k;
        t[k] = k + 0.5;
        speed[k] = 1480 * (1 + percent / 100);
        z[k] = 5 * cexp(I * TURN / 360 * (170 + slope * percent + 0.1 * k)) + 0.03 * deviate();
    }
}

static void lag_turns_with_speed(void **state)
{
    double complex z[30];
    double speed[30], t[30], alarms = 0, covered = 0;
    struct resonance r;

    (void)state;
    seed = 14;
    wander(z, speed, t, 30, 8);
    r = resonance_of(z, speed, t, 30);
    assert_close(r.slope, 8, 4 * r.error);
    assert_true(r.error < 0.6 && resonance_stands_out(&r));
    for (int k = 0; k < 1000; k++) {
        wander(z, speed, t, 30, 0);
        r = resonance_of(z, speed, t, 30);
        alarms += resonance_stands_out(&r);
        covered += fabs(r.slope) < 2.05 * r.error; /* t with 27 degrees of freedom, 95 % */
    }
    assert_true(alarms <= 2); /* 1 in 10000 expected at this length */
    assert_true(covered > 930);
    assert_true(isnan(resonance_of(z, speed, t, 11).slope));
    for (int k = 0; k < 30; k++)
        speed[k] = 1480;
    assert_true(isnan(resonance_of(z, speed, t, 30).slope));
    z[4] = CMPLX(NAN, NAN);
    assert_true(isnan(resonance_of(z, speed, t, 30).slope));
}

/* A damped oscillator through its resonance: tan(lag) = 2 D r / (1 - r^2), so that at r = 1 the lag
 * turns by 1/D per unit of r (any textbook of vibrations): D = 5 % gives 0.2 rad = 11.46 deg per %.
 */
static void along_a_curve(void **state)
{
    double complex z[81];
    double speed[81];
    struct resonance r;

    (void)state;
    for (int k = 0; k < 81; k++) {
        double ratio = 1.2 - 0.005 * k;
        speed[k] = 1200 * ratio;
        z[k] = ratio * ratio / (1 - ratio * ratio - I * 2 * 0.05 * ratio);
    }
    r = resonance_along(z, speed, 81, 1200);
    assert_close(r.slope, 11.46, 2); /* over 8 % of speed the curve bends */
    assert_true(resonance_stands_out(&r));
    r = resonance_along(z, speed, 81, 1000);
    assert_true(fabs(r.slope) < 5);
    assert_true(isnan(resonance_along(z, speed, 81, 700).slope));
}

static void resonance_on_the_desk(void **state)
{
    (void)state;
    vet_desk_set();
    desk.readings[1][0].resonance = (struct resonance){-5.1, 0.5};
    desk.readings[1][1].resonance = (struct resonance){4.9, 0.5};
    vet_desk_vectors(1);
    assert_int_equal(vet_desk_ruled(CHECK_NEAR_RESONANCE, 1, 0), RULING_CAUTION);
    assert_int_equal(vet_desk_ruled(CHECK_NEAR_RESONANCE, 1, 1), RULING_OK);
    desk.readings[1][0].resonance = (struct resonance){8, 2}; /* within chance */
    vet_desk_vectors(1);
    assert_int_equal(vet_desk_ruled(CHECK_NEAR_RESONANCE, 1, 0), RULING_OK);

    for (double turn = 4; turn <= 7;
         turn += 3) { /* a repeat 2 % faster: 2 or 3.5 times 2 deg per % */
        vet_desk_set();
        desk.job.aim.repeatability = 0.01;
        vet_desk_reading(1, 0, 7e-3);
        vet_desk_reading(3, 0, 7e-3 * cexp(I * TURN * 2 * turn / 360));
        desk.readings[3][0].speed_rpm = 1480 * 1.02;
        repeats_resonance(&desk.runs, desk.order, &desk.job, &desk.findings);
        assert_int_equal(vet_desk_ruled(CHECK_NEAR_RESONANCE, -1, 0),
                         turn < 5 ? RULING_OK : RULING_CAUTION);
        assert_int_equal(vet_desk_ruled(CHECK_NEAR_RESONANCE, -1, 1),
                         -1); /* equal speeds tell nothing */
    }
}

/* Julian day numbers: 2000-01-01 is 2451545 at noon (Astronomical Almanac); 2024 was a leap year.
 */
static void times_of_recording(void **state)
{
    (void)state;
    assert_close(when_hours("2000-01-01 00:00"), 0, 0);
    assert_close(when_hours("2000-01-01"), 12, 0);
    assert_close(when_hours("2025-03-14T10:40:30"), 24.0 * (2460749 - 2451545) + 10 + 40 / 60.0, 1e-9);
    assert_close(when_hours("2024-03-01 00:00") - when_hours("2024-02-28 23:00"), 25, 1e-9);
    assert_true(isnan(when_hours("")) && isnan(when_hours("14.3.2025")));
    assert_true(isnan(when_hours("2025-13-01 10:00")) && isnan(when_hours("2025-01-01 10h")));
}

/* Three to six repeats: a line in scatter is claimed once in 100, as the test says. */
static void trends_over_time(void **state)
{
    static const double hours[] = {0, 1, 1.5, 3, 4, 6};
    double complex z[6];
    int claimed = 0;

    (void)state;
    seed = 15;
    for (int k = 0; k < 4000; k++) {
        for (int i = 0; i < 6; i++)
            z[i] = 7 + deviate();
        claimed += when_trend_of(hours, z, 3 + (size_t)k % 4).chance < 0.01;
    }
    assert_in_range(claimed, 22, 58); /* 40 +- 3 standard deviations */
    for (int i = 0; i < 6; i++)
        z[i] = 7 + 0.5 * I * hours[i];
    assert_close(cabs(when_trend_of(hours, z, 6).move - 3 * I), 0, 1e-12);
    assert_true(isnan(when_trend_of(hours, z, 2).chance));
}

static void a_condition_that_changed(void **state)
{
    (void)state;
    for (int aligned = 0; aligned < 2; aligned++) {
        vet_desk_set(); /* three repeats of trial A */
        desk.job_runs[2].weights = &desk.weights[1];
        strcpy(desk.job_runs[1].when, "2025-03-14 08:00");
        strcpy(desk.job_runs[2].when, "2025-03-14 09:00");
        strcpy(desk.job_runs[3].when, "2025-03-14 10:00");
        for (int r = 1; r < 4; r++)
            vet_desk_reading(r, 0, 5e-3 + 0.5e-3 * r + (aligned || r != 2 ? 0 : 0.4e-3 * I));
        repeats_trend(&desk.runs, desk.order, &desk.job, &desk.findings);
        /* 1 mm/s of 7, as found */
        assert_int_equal(vet_desk_ruled(CHECK_REPEAT, -1, 0), aligned ? RULING_CAUTION : -1);
    }
    assert_close(desk.findings.items[0].value, 100 / 7.0, 1e-6);
    desk.job_runs[2].when[0] = '\0';
    findings_clear(&desk.findings);
    repeats_trend(&desk.runs, desk.order, &desk.job, &desk.findings);
    assert_int_equal(desk.findings.count, 0);
}

/* A runout run wants a speed where unbalance does nothing, and is no as-found run. */
static void runout(void **state)
{
    static const struct figure figures[] = {{CHECK_SERVICE_SPEED, 300, RULING_OK},
                                            {CHECK_SERVICE_SPEED, 369, RULING_OK},
                                            {CHECK_SERVICE_SPEED, 371, RULING_REFUSE},
                                            {CHECK_SERVICE_SPEED, 1480, RULING_REFUSE}};

    (void)state;
    for (size_t k = 0; k < 4; k++) {
        vet_desk_set();
        strcpy(desk.job_runs[0].role, "runout"); /* bare and first, and yet not as found */
        for (int i = 0; i < SENSORS; i++)
            desk.readings[0][i].speed_rpm = figures[k].value;
        vet_desk_within(0);
        assert_int_equal(vet_desk_ruled(CHECK_SERVICE_SPEED, 0, -1), -1);
        across_runout(&desk.runs, desk.order, &desk.job, &desk.findings);
        assert_int_equal(vet_desk_ruled(CHECK_SERVICE_SPEED, 0, -1), figures[k].expected);
        const char *said = desk.findings.items[desk.findings.count - 1].text;
        assert_null(strstr(said, "run at service speed"));
        if (figures[k].expected == RULING_REFUSE)
            assert_non_null(strstr(said, "slower"));
        assert_int_equal(vet_desk_any_used(0), figures[k].expected != RULING_REFUSE);
        across_speed_match(&desk.runs, desk.order, &desk.job, &desk.findings);
        assert_int_equal(vet_desk_ruled(CHECK_SPEED_MATCH, -2, -1), RULING_OK);
        assert_true(vet_desk_all_used(1));
        assert_false(across_stands_alone(&desk.items[0], &desk.job));
        assert_true(isnan(across_as_found(&desk.runs, desk.order, &desk.job, "service", 0)));
    }
}

/* Of a slow roll only probes are judged, and each of the aim must have its vector from there. */
static void runout_of_probes(void **state)
{
    size_t run, sensor;

    (void)state;
    for (int probe = 0; probe < 2; probe++) {
        vet_desk_set();
        strcpy(desk.job_runs[3].role, "runout");
        desk.job_runs[3].weight_count = 0;
        if (probe)
            desk.sensors[1].quantity = QUANTITY_DISPLACEMENT;
        desk.channels[3][1] = (struct vet_channel){true, 1, 1, 1e-4, 0, 100000, -1}; /* constant */
        desk.readings[3][1].amplitude_pct = 90;
        vet_desk_within(3);
        assert_int_equal(vet_desk_ruled(CHECK_SENSOR_DEAD, 3, 1), probe ? RULING_REFUSE : -1);
        assert_int_equal(desk.readings[3][1].use, !probe);
        assert_int_equal(answer_possible(&desk.runs, desk.order, &desk.job, &run, &sensor), !probe);
        if (probe) {
            assert_int_equal(run, 3);
            assert_int_equal(sensor, 1);
            desk.job.aim.named = true; /* the aim does without it */
            desk.targets[1].in_aim = false;
            assert_int_equal(answer_possible(&desk.runs, desk.order, &desk.job, &run, &sensor), 1);
        }
        vet_desk_vectors(3);
        assert_int_equal(vet_desk_ruled(CHECK_AMPLITUDE_STEADY, 3, 1), probe ? RULING_REFUSE : -1);
    }
    for (int lack = 0; lack < 3; lack++) { /* good, without phase, without a reading */
        vet_desk_set();
        strcpy(desk.job_runs[3].role, "runout");
        desk.job_runs[3].weight_count = 0;
        desk.sensors[1].quantity = QUANTITY_DISPLACEMENT;
        desk.readings[3][1].has_phase = lack != 1;
        desk.readings[3][1].present = lack != 2;
        assert_int_equal(answer_possible(&desk.runs, desk.order, &desk.job, &run, &sensor), !lack);
    }
}

/* A coast-down: one run for the recording, and one for each speed that it passed. */
static void a_coast_down(void **state)
{
    struct vet_runs runs = {0};
    int parent, slow, fast;

    (void)state;
    parent = facts_add(&runs, 2);
    assert_int_equal(parent, 0);
    strcpy(runs.items[0].name, "down");
    strcpy(runs.items[0].condition, "service");
    runs.items[0].index = 3;
    assert_int_equal(facts_at_condition(&runs, 0, "service", 2), 0);
    fast = facts_at_condition(&runs, 0, "service @ 1480 rpm", 2);
    slow = facts_at_condition(&runs, 0, "service @ 900 rpm", 2);
    assert_int_equal(facts_at_condition(&runs, 0, "service @ 1480 rpm", 2), fast);
    assert_int_equal(runs.count, 3);
    assert_string_equal(runs.items[slow].name, "down");
    assert_int_equal(runs.items[slow].index, 3);
    assert_int_equal(runs.items[slow].parent, 0);
    for (int k = 0; k < 3; k++)
        for (int i = 0; i < 2; i++)
            runs.items[k].readings[i].use = runs.items[k].readings[i].present = k > 0;
    runs.items[0].readings[0].use = true; /* and the other one was clipped */
    facts_hand_down(&runs, 0, 2);
    assert_true(runs.items[slow].readings[0].use && !runs.items[slow].readings[1].use);
    vet_desk_set();
    strcpy(desk.job_runs[3].role, "coast-down");
    assert_string_equal(facts_role(&runs.items[0], &desk.job), "coast-down");
    assert_string_equal(facts_role(&runs.items[fast], &desk.job), "");
    facts_release(&runs);
}

int main(void)
{
    const struct CMUnitTest tests[] = {
        cmocka_unit_test(points_of_chi_squared),
        cmocka_unit_test(nothing_was_moved),
        cmocka_unit_test(a_tape_was_moved),
        cmocka_unit_test(sensors_were_swapped_or_turned),
        cmocka_unit_test(moved_on_the_desk),
        cmocka_unit_test(lag_turns_with_speed),
        cmocka_unit_test(along_a_curve),
        cmocka_unit_test(resonance_on_the_desk),
        cmocka_unit_test(times_of_recording),
        cmocka_unit_test(trends_over_time),
        cmocka_unit_test(a_condition_that_changed),
        cmocka_unit_test(runout),
        cmocka_unit_test(runout_of_probes),
        cmocka_unit_test(a_coast_down),
    };
    int failed = cmocka_run_group_tests(tests, NULL, NULL);

    findings_release(&desk.findings);
    return failed;
}
