/* The checks of vet that compare runs: each with a case that trips it and one just on the good
 * side. */
#include "vet_desk.h"

static void one_recording_twice(void **state)
{
    (void)state;
    vet_desk_set();
    memcpy(desk.hashes[2], desk.hashes[1], sizeof desk.hashes[1]);
    across_same_recording(&desk.runs, desk.order, &desk.job, &desk.findings);
    assert_int_equal(vet_desk_ruled(CHECK_SAME_RECORDING, 1, -1), RULING_REFUSE); /* whose is it? */
    assert_int_equal(vet_desk_ruled(CHECK_SAME_RECORDING, 2, -1), RULING_REFUSE);
    assert_int_equal(vet_desk_ruled(CHECK_SAME_RECORDING, 0, -1), RULING_OK);
    assert_true(!vet_desk_any_used(1) && !vet_desk_any_used(2) && vet_desk_all_used(0) &&
                vet_desk_all_used(3));

    vet_desk_set();
    memcpy(desk.hashes[3], desk.hashes[1], sizeof desk.hashes[1]);
    across_same_recording(&desk.runs, desk.order, &desk.job, &desk.findings);
    assert_int_equal(vet_desk_ruled(CHECK_SAME_RECORDING, 1, -1),
                     RULING_OK); /* it is one of these weights */
    assert_int_equal(vet_desk_ruled(CHECK_SAME_RECORDING, 3, -1), RULING_REFUSE);
}

static void speeds_apart(void **state)
{
    static const struct figure figures[] = {{CHECK_SPEED_MATCH, 0.9, RULING_OK},
                                            {CHECK_SPEED_MATCH, 1.1, RULING_CAUTION},
                                            {CHECK_SPEED_MATCH, 2.9, RULING_CAUTION},
                                            {CHECK_SPEED_MATCH, 3.2, RULING_REFUSE}};

    (void)state;
    for (size_t i = 0; i < 4; i++) {
        vet_desk_set();
        desk.readings[2][0].speed_rpm = desk.readings[2][1].speed_rpm =
            1480 * (1 + figures[i].value / 100);
        across_speed_match(&desk.runs, desk.order, &desk.job, &desk.findings);
        assert_int_equal(vet_desk_ruled(CHECK_SPEED_MATCH, -2, -1), figures[i].expected);
        assert_int_equal(vet_desk_any_used(2), figures[i].expected != RULING_REFUSE);
        assert_true(vet_desk_all_used(0) && vet_desk_all_used(1) && vet_desk_all_used(3));
    }
    strcpy(desk.items[2].condition, "hot"); /* conditions are not compared */
    vet_desk_set();
    strcpy(desk.items[2].condition, "hot");
    desk.readings[2][0].speed_rpm = 1600;
    across_speed_match(&desk.runs, desk.order, &desk.job, &desk.findings);
    assert_int_equal(vet_desk_ruled(CHECK_SPEED_MATCH, -2, -1), RULING_OK);
}

/* A caution for the speeds widens what stands off the as-found run's, and refuses no trial. 2 %
 * off, nothing told: a disc of radius 2 * 5 deg * |z|, r^2/4 a component; a turn of 8 +- 1 deg that
 * is told: its square and error's, halved. */
static void speeds_apart_widen(void **state)
{
    double one = 3.14159265358979 / 180;

    (void)state;
    for (int told = 0; told < 2; told++) {
        vet_desk_set();
        for (int s = 0; s < SENSORS; s++)
            desk.readings[2][s].speed_rpm = 1480 * 1.02;
        if (told)
            desk.readings[2][0].resonance = (struct resonance){8, 1};
        trials_effect(&desk.runs, desk.order, &desk.job, &desk.findings);
        int before = vet_desk_ruled(CHECK_TRIAL_EFFECT, 2, -1);
        findings_clear(&desk.findings);
        assert_int_equal(across_runs(&desk.runs, desk.order, &desk.job, &desk.findings), 0);
        assert_int_equal(vet_desk_ruled(CHECK_SPEED_MATCH, -1, -1), RULING_CAUTION);
        assert_int_equal(vet_desk_ruled(CHECK_TRIAL_EFFECT, 2, -1), before);
        double z = desk.readings[2][0].amplitude;
        double expected = told ? (64 + 1) * one * one / 2 * 4 * z * z : pow(2 * 5 * one * z, 2) / 4;
        assert_true(fabs(desk.readings[2][0].widen[0] / expected - 1) < 1e-9);
        assert_true(fabs(desk.readings[2][0].widen[2] / expected - 1) < 1e-9);
        assert_true(fabs(desk.readings[2][0].by_speed / expected - 1) < 1e-9);
        assert_true(desk.readings[2][0].widen[1] == 0);
        for (int r = 0; r < 4; r++)
            assert_true(r == 2 || desk.readings[r][0].widen[0] == 0);
    }
    for (int off = 0; off < 2; off++) { /* in order, or not looked at */
        vet_desk_set();
        desk.readings[2][0].speed_rpm = desk.readings[2][1].speed_rpm = 1480 * (off ? 1.02 : 1.009);
        desk.limits.rows[CHECK_SPEED_MATCH].off = off;
        assert_int_equal(across_runs(&desk.runs, desk.order, &desk.job, &desk.findings), 0);
        assert_true(desk.readings[2][0].widen[0] == 0);
    }
}

/* Two recordings of an audit with one content: told, not refused. */
static void copies_in_an_audit(void **state)
{
    (void)state;
    vet_desk_set();
    for (int r = 0; r < RUNS; r++)
        desk.items[r].index = -1;
    across_same_recording(&desk.runs, desk.order, &desk.job, &desk.findings);
    assert_int_equal(desk.findings.count, 0);
    memcpy(desk.hashes[2][0], desk.hashes[0][0], 65);
    across_same_recording(&desk.runs, desk.order, &desk.job, &desk.findings);
    assert_int_equal(desk.findings.count, 1);
    assert_int_equal(vet_desk_ruled(CHECK_SAME_RECORDING, -1, -1), RULING_CAUTION);
    assert_int_equal(desk.findings.items[0].run, -1); /* neither's verdict is another than alone */
    assert_true(vet_desk_all_used(0) && vet_desk_all_used(2));
}

/* The first finding's text has this in it. */
static void phase_text(const char *what)
{
    assert_true(desk.findings.count > 0);
    if (!strstr(desk.findings.items[0].text, what))
        fail_msg("%s", desk.findings.items[0].text);
}

static void lost_phase(void **state)
{
    (void)state;
    vet_desk_set();
    desk.readings[1][0].has_phase = desk.readings[1][1].has_phase = false;
    across_phase_reference(&desk.runs, desk.order, &desk.job, &desk.findings);
    assert_int_equal(vet_desk_ruled(CHECK_PHASE_REFERENCE, 1, -1), RULING_REFUSE);
    assert_int_equal(desk.findings.count, 1); /* one for the run, not one for each sensor */
    assert_true(!vet_desk_any_used(1) && vet_desk_all_used(0));
    phase_text("the sheet has no [tacho]");
    desk.job.has_tacho = true;
    findings_clear(&desk.findings);
    across_phase_reference(&desk.runs, desk.order, &desk.job, &desk.findings);
    phase_text("the marks of a turn cannot be told apart");
    desk.items[1].tacho_rpm = 2 * 1480 * 1.02; /* two marks a turn, and the sheet says one */
    desk.job.service_rpm = 1480;
    findings_clear(&desk.findings);
    across_phase_reference(&desk.runs, desk.order, &desk.job, &desk.findings);
    phase_text(
        "the service speed times 2: see whether the shaft gives 2 marks a turn, and say marks = 2");
    desk.job.tacho_marks = 4; /* one, and the sheet says four */
    desk.items[1].tacho_rpm = 1480 / 4.0;
    findings_clear(&desk.findings);
    across_phase_reference(&desk.runs, desk.order, &desk.job, &desk.findings);
    phase_text("the service speed times 1/4: see whether the shaft gives 1 mark a turn, and say "
               "marks = 1 ");

    vet_desk_set(); /* one sensor alone, noted by hand */
    desk.items[1].hand = true;
    desk.readings[1][1].has_phase = false;
    across_phase_reference(&desk.runs, desk.order, &desk.job, &desk.findings);
    assert_int_equal(vet_desk_ruled(CHECK_PHASE_REFERENCE, 1, 1), RULING_REFUSE);
    phase_text("only an amplitude was noted: note the lag");
    assert_true(desk.readings[1][0].use && !desk.readings[1][1].use);

    vet_desk_set(); /* one plane and no phase anywhere: the amplitudes may serve */
    desk.job.plane_count = 1;
    for (int r = 0; r < RUNS; r++)
        desk.readings[r][0].has_phase = desk.readings[r][1].has_phase = false;
    across_phase_reference(&desk.runs, desk.order, &desk.job, &desk.findings);
    assert_int_equal(vet_desk_ruled(CHECK_PHASE_REFERENCE, 1, -1), RULING_CAUTION);
    assert_true(vet_desk_all_used(1));

    vet_desk_set(); /* a recording of an audit stands alone */
    desk.items[1].index = -1;
    vet_desk_within(1);
    assert_int_equal(vet_desk_ruled(CHECK_PHASE_REFERENCE, 1, -1), RULING_OK);
    desk.readings[1][0].has_phase = desk.readings[1][1].has_phase = false;
    vet_desk_within(1);
    assert_int_equal(vet_desk_ruled(CHECK_PHASE_REFERENCE, 1, -1), RULING_REFUSE);
}

static void repeats(void **state)
{
    static const struct figure figures[] = {{CHECK_REPEAT, 9.5, RULING_OK},
                                            {CHECK_REPEAT, 10.5, RULING_CAUTION},
                                            {CHECK_REPEAT, 29, RULING_CAUTION},
                                            {CHECK_REPEAT, 31, RULING_REFUSE}};

    (void)state;
    for (size_t i = 0; i < 4; i++) { /* as found is the larger, 7 */
        vet_desk_set();
        vet_desk_reading(3, 0, desk.readings[1][0].vector - figures[i].value / 100 * 7e-3);
        across_repeat(&desk.runs, desk.order, &desk.job, &desk.findings);
        assert_int_equal(vet_desk_ruled(CHECK_REPEAT, 3, 0), figures[i].expected);
        assert_int_equal(desk.readings[3][0].use, figures[i].expected != RULING_REFUSE);
        assert_int_equal(desk.readings[1][0].use, figures[i].expected != RULING_REFUSE);
        assert_true(desk.readings[3][1].use);
    }
    vet_desk_set(); /* within its own uncertainty: 2 mm/s apart at 1 mm/s each is no disagreement */
    vet_desk_reading(3, 0, desk.readings[1][0].vector - 2e-3);
    desk.readings[3][0].cov[0] = desk.readings[3][0].cov[2] = 1e-6;
    across_repeat(&desk.runs, desk.order, &desk.job, &desk.findings);
    assert_int_equal(vet_desk_ruled(CHECK_REPEAT, 3, 0), RULING_OK);

    vet_desk_set(); /* of three the one that differs goes */
    desk.job_runs[2].weights = &desk.weights[1];
    vet_desk_reading(2, 0, desk.readings[1][0].vector + 5e-3);
    across_repeat(&desk.runs, desk.order, &desk.job, &desk.findings);
    assert_true(desk.readings[1][0].use && !desk.readings[2][0].use && desk.readings[3][0].use);
}

/* What percentages refer to: a refused as-found reading only where there is no better one. */
static void as_found(void **state)
{
    (void)state;
    vet_desk_set();
    desk.job_runs[3].weight_count = 0;
    assert_close(across_as_found(&desk.runs, desk.order, &desk.job, "service", 0), 7e-3, 0);
    desk.readings[0][0].use = false;
    assert_close(across_as_found(&desk.runs, desk.order, &desk.job, "service", 0),
                 cabs(4.05 + 4 * I) * 1e-3, 1e-12);
    assert_close(across_as_found(&desk.runs, desk.order, &desk.job, "service", 1), 7e-3, 0);
    desk.readings[3][0].use = false;
    assert_close(across_as_found(&desk.runs, desk.order, &desk.job, "service", 0), 7e-3, 0);
    assert_true(isnan(across_as_found(&desk.runs, desk.order, &desk.job, "hot", 0)));
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
        vet_desk_set();
        for (int s = 0; s < SENSORS; s++) {
            vet_desk_reading(1, s, 7e-3 * cases[i].after);
            memset(desk.readings[1][s].cov, 0, sizeof desk.readings[1][s].cov);
            memset(desk.readings[0][s].cov, 0, sizeof desk.readings[0][s].cov);
        }
        trials_effect(&desk.runs, desk.order, &desk.job, &desk.findings);
        assert_int_equal(vet_desk_ruled(CHECK_TRIAL_EFFECT, 1, -1), cases[i].expected);
        assert_int_equal(vet_desk_any_used(1), cases[i].expected != RULING_REFUSE);
    }
    assert_int_equal(vet_desk_ruled(CHECK_TRIAL_EFFECT, 2, -1), RULING_OK);
}

/* The first trial left on during the second: the second is judged by what it adds. */
static void a_second_trial_on_top(void **state)
{
    struct job_weight both[2];

    (void)state;
    vet_desk_set();
    both[0] = desk.weights[1];
    both[1] = desk.weights[2];
    desk.job_runs[2].weights = both;
    desk.job_runs[2].weight_count = 2;
    for (int s = 0; s < SENSORS; s++)
        vet_desk_reading(2, s, desk.readings[1][s].vector * 1.02);
    trials_effect(&desk.runs, desk.order, &desk.job, &desk.findings);
    assert_int_equal(vet_desk_ruled(CHECK_TRIAL_EFFECT, 1, -1), RULING_OK);
    assert_int_equal(vet_desk_ruled(CHECK_TRIAL_EFFECT, 2, -1), RULING_REFUSE);
}

int main(void)
{
    const struct CMUnitTest tests[] = {
        cmocka_unit_test(one_recording_twice),
        cmocka_unit_test(speeds_apart),
        cmocka_unit_test(speeds_apart_widen),
        cmocka_unit_test(copies_in_an_audit),
        cmocka_unit_test(lost_phase),
        cmocka_unit_test(repeats),
        cmocka_unit_test(as_found),
        cmocka_unit_test(trial_effects),
        cmocka_unit_test(a_second_trial_on_top),
    };
    int failed = cmocka_run_group_tests(tests, NULL, NULL);

    findings_release(&desk.findings);
    return failed;
}
