/* The checks of vet that one run answers: each with a case that trips it and one just on the good
 * side. The limits are those of the table in the manual page; where nothing else is said, common
 * practice. */
#include "vet_desk.h"

static void a_good_job_is_ok(void **state)
{
    (void)state;
    vet_desk_set();
    for (int r = 0; r < RUNS; r++) {
        vet_desk_within(r);
        for (size_t i = 0; i < desk.findings.count; i++)
            assert_int_equal(desk.findings.items[i].ruling, RULING_OK);
        assert_true(desk.findings.count > 5);
        vet_desk_vectors(r);
        for (size_t i = 0; i < desk.findings.count; i++)
            assert_int_equal(desk.findings.items[i].ruling, RULING_OK);
        assert_true(desk.findings.count >= 6);
    }
    findings_clear(&desk.findings);
    assert_int_equal(across_runs(&desk.runs, desk.order, &desk.job, &desk.findings), 0);
    for (size_t i = 0; i < desk.findings.count; i++)
        assert_int_equal(desk.findings.items[i].ruling, RULING_OK);
    for (int r = 0; r < RUNS; r++)
        assert_true(vet_desk_all_used(r));
    assert_int_equal(vet_desk_ruled(CHECK_REPEAT, 3, 0), RULING_OK);
    assert_int_equal(vet_desk_ruled(CHECK_TRIAL_EFFECT, 1, -1), RULING_OK);
    assert_int_equal(vet_desk_ruled(CHECK_TRIAL_EFFECT, 2, -1), RULING_OK);
    assert_int_equal(vet_desk_ruled(CHECK_TRIAL_EFFECT, 3, -1),
                     -1); /* a repeat tells nothing new */
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
        vet_desk_set();
        vet_desk_figure(f->check, f->value);
        vet_desk_within(1);
        got = vet_desk_ruled(f->check, 1, -1);
        vet_desk_vectors(1);
        if (vet_desk_ruled(f->check, 1, -1) > got)
            got = vet_desk_ruled(f->check, 1, -1);
        if (got != (int)f->expected)
            fail_msg("%s at %g: ruled %d, not %d", desk.limits.rows[f->check].name, f->value, got,
                     (int)f->expected);
        assert_int_equal(vet_desk_any_used(1), f->expected != RULING_REFUSE);
    }
}

/* A small remainder on a well-balanced machine: lag says nothing, and scatter is held against what
 * was there. */
static void a_balanced_machine_is_not_punished(void **state)
{
    (void)state;
    vet_desk_set();
    vet_desk_reading(1, 0, 0.19 * 7e-3);
    desk.readings[1][0].phase_deg = 80;
    desk.readings[1][0].amplitude_pct = 50; /* 9.5 % of as found */
    vet_desk_vectors(1);
    assert_int_equal(vet_desk_ruled(CHECK_PHASE_STEADY, 1, 0), -1);
    assert_int_equal(vet_desk_ruled(CHECK_AMPLITUDE_STEADY, 1, 0), RULING_OK);
    vet_desk_reading(1, 0, 0.21 * 7e-3);
    desk.readings[1][0].phase_deg = 80;
    vet_desk_vectors(1);
    assert_int_equal(vet_desk_ruled(CHECK_PHASE_STEADY, 1, 0), RULING_REFUSE);
    assert_true(!desk.readings[1][0].use && desk.readings[1][1].use);
}

/* The target is no measure of a reading's percentages: what is unsteady against as found is so
 * whatever is aimed at. */
static void the_target_is_no_floor(void **state)
{
    static const enum check checks[] = {CHECK_AMPLITUDE_STEADY, CHECK_DRIFT};

    (void)state;
    for (int c = 0; c < 2; c++) {
        for (int given = 0; given < 2; given++) {
            vet_desk_set();
            if (given)
                desk.targets[0].amplitude = 0.25;
            vet_desk_figure(checks[c], 150);
            vet_desk_vectors(1);
            assert_int_equal(vet_desk_ruled(checks[c], 1, 0), RULING_REFUSE);
            assert_false(desk.readings[1][0].use);
        }
    }
    vet_desk_set();
    desk.targets[0].amplitude = 0.25; /* repeats, likewise */
    vet_desk_reading(3, 0, -4e-3);
    across_repeat(&desk.runs, desk.order, &desk.job, &desk.findings);
    assert_int_equal(vet_desk_ruled(CHECK_REPEAT, -2, 0), RULING_REFUSE);
}

static void a_drift_widens(void **state)
{
    (void)state;
    vet_desk_set();
    vet_desk_figure(CHECK_DRIFT, 12);
    vet_desk_vectors(1);
    /* A value spread evenly over a length d has the variance d^2/12. */
    assert_close(desk.readings[1][0].widen[0], pow(0.12 * 7e-3, 2) / 12, 1e-15);
    assert_close(desk.readings[1][0].widen[2], desk.readings[1][0].widen[0], 0);
    assert_close(desk.readings[1][0].cov[0], 1e-10, 0);
}

static void unreadable_and_dead(void **state)
{
    (void)state;
    vet_desk_set();
    desk.items[1].unreadable = true;
    vet_desk_within(1);
    assert_false(vet_desk_any_used(1));

    vet_desk_set();
    desk.channels[1][0].min = desk.channels[1][0].max = 0.3;
    desk.channels[1][0].resolution = 0;
    vet_desk_within(1);
    assert_int_equal(vet_desk_ruled(CHECK_SENSOR_DEAD, 1, 0), RULING_REFUSE);
    assert_int_equal(vet_desk_ruled(CHECK_SENSOR_DEAD, 1, 1), RULING_OK);
    assert_true(!desk.readings[1][0].use && desk.readings[1][1].use);

    vet_desk_set();
    desk.channels[1][0].max = -1 + 2e-4; /* three levels */
    desk.channels[1][1].max = -1 + 3e-4; /* four */
    vet_desk_within(1);
    assert_int_equal(vet_desk_ruled(CHECK_SENSOR_DEAD, 1, 0), RULING_REFUSE);
    assert_int_equal(vet_desk_ruled(CHECK_SENSOR_DEAD, 1, 1), RULING_OK);

    vet_desk_set();
    desk.channels[1][1].same_as = 0;
    vet_desk_within(1);
    assert_int_equal(vet_desk_ruled(CHECK_SENSOR_DEAD, 1, 0),
                     RULING_REFUSE); /* neither can be believed */
    assert_int_equal(vet_desk_ruled(CHECK_SENSOR_DEAD, 1, 1), RULING_REFUSE);
}

static void no_turns_at_all(void **state)
{
    (void)state;
    vet_desk_set();
    desk.readings[1][0].present = desk.readings[1][1].present = false;
    desk.items[1].has_tacho = false;
    vet_desk_within(1);
    assert_int_equal(vet_desk_ruled(CHECK_LENGTH, 1, -1), RULING_REFUSE);
    desk.items[1].has_tacho = true; /* then it is the tacho that is to blame, not the length */
    vet_desk_within(1);
    assert_int_equal(vet_desk_ruled(CHECK_LENGTH, 1, -1), -1);
    assert_int_equal(vet_desk_ruled(CHECK_PHASE_REFERENCE, 1, -1), RULING_REFUSE);
    desk.items[1].hand = true; /* an instrument's readings have no turns to count */
    vet_desk_within(1);
    assert_int_equal(vet_desk_ruled(CHECK_LENGTH, 1, -1), -1);
}

static void below_target(void **state)
{
    (void)state;
    vet_desk_set();
    desk.targets[0].amplitude = 7.1e-3;
    desk.targets[1].amplitude = 6.9e-3;
    across_low_level(&desk.runs, desk.order, &desk.job, &desk.findings);
    assert_int_equal(vet_desk_ruled(CHECK_LOW_LEVEL, 0, 0), RULING_CAUTION);
    assert_int_equal(vet_desk_ruled(CHECK_LOW_LEVEL, 0, 1), RULING_OK);
    assert_int_equal(vet_desk_ruled(CHECK_LOW_LEVEL, 1, -1), -1);
}

static void share_of_one_x(void **state)
{
    (void)state;
    vet_desk_set();
    desk.readings[0][0].overall_rms = 7e-3 / sqrt(2) / 0.51;
    desk.readings[0][1].overall_rms = 7e-3 / sqrt(2) / 0.49;
    desk.readings[0][0].two_x = 49;
    desk.readings[0][1].two_x = 51;
    vet_desk_vectors(0);
    assert_int_equal(vet_desk_ruled(CHECK_ONE_X_SHARE, 0, 0), RULING_OK);
    assert_int_equal(vet_desk_ruled(CHECK_ONE_X_SHARE, 0, 1), RULING_CAUTION);
    assert_int_equal(vet_desk_ruled(CHECK_TWO_X, 0, 0), RULING_OK);
    assert_int_equal(vet_desk_ruled(CHECK_TWO_X, 0, 1), RULING_CAUTION);
    desk.readings[1][1].overall_rms = 1;
    vet_desk_vectors(1); /* what remains under a weight is not judged */
    assert_int_equal(vet_desk_ruled(CHECK_ONE_X_SHARE, 1, 1), -1);
}

/* What is not 1x is held against the larger of 1x and the as-found 1x, in every run. */
static void lines_of_every_run(void **state)
{
    (void)state;
    vet_desk_set(); /* as found 7e-3 */
    vet_desk_reading(1, 0, 3.5e-3);
    desk.readings[1][0].two_x = 101; /* 50.5 % of as found */
    desk.readings[1][0].half_order = 99;
    desk.readings[1][0].neighbour = 40;
    desk.readings[1][0].neighbour_order = 1.7;
    vet_desk_vectors(1);
    assert_int_equal(vet_desk_ruled(CHECK_TWO_X, 1, 0), RULING_CAUTION);
    assert_int_equal(vet_desk_ruled(CHECK_HALF_ORDER, 1, 0), RULING_OK);
    assert_int_equal(vet_desk_ruled(CHECK_NEIGHBOUR, 1, 0), RULING_OK);
    /* A line that was told by itself, beside 1x, and one below half of it. */
    vet_desk_reading(1, 0, 7e-3);
    desk.readings[1][0].speed_rpm = 1500;
    desk.readings[1][0].neighbour = 3;
    desk.readings[1][0].lines[0][0] = 26.6;
    desk.readings[1][0].lines[0][1] = 3.6e-3;
    desk.readings[1][0].lines[1][0] = 12;
    desk.readings[1][0].lines[1][1] = 1;
    desk.readings[1][0].line_count = 2;
    vet_desk_vectors(1);
    assert_int_equal(vet_desk_ruled(CHECK_NEIGHBOUR, 1, 0), RULING_CAUTION);
    desk.readings[1][0].lines[0][1] = 3.4e-3;
    vet_desk_vectors(1);
    assert_int_equal(vet_desk_ruled(CHECK_NEIGHBOUR, 1, 0), RULING_OK);
}

/* 2x far beyond 1x: the tacho may count another shaft. */
static void two_x_asks_for_the_tacho(void **state)
{
    const char *text = "";

    (void)state;
    for (int far = 0; far < 2; far++) {
        vet_desk_set();
        desk.readings[0][0].two_x = far ? 510 : 490;
        vet_desk_vectors(0);
        for (size_t i = 0; i < desk.findings.count; i++)
            if (desk.findings.items[i].check == CHECK_TWO_X && desk.findings.items[i].sensor == 0)
                text = desk.findings.items[i].text;
        assert_int_equal(strstr(text, "tacho counts this shaft") != NULL, far);
    }
}

static void a_beat_is_judged(void **state)
{
    static const struct figure figures[] = {{CHECK_BEAT, 9.9, RULING_OK},
                                            {CHECK_BEAT, 10.1, RULING_CAUTION},
                                            {CHECK_BEAT, 39, RULING_CAUTION},
                                            {CHECK_BEAT, 41, RULING_REFUSE}};

    (void)state;
    for (size_t i = 0; i < 4; i++) {
        vet_desk_set();
        desk.readings[1][0].beat =
            (struct beat){figures[i].value / 100 * 7e-3, 0.2, 5, 30, 1, 7e-3};
        vet_desk_vectors(1);
        assert_int_equal(vet_desk_ruled(CHECK_BEAT, 1, 0), figures[i].expected);
        assert_int_equal(desk.readings[1][0].use, figures[i].expected != RULING_REFUSE);
        assert_int_equal(desk.readings[1][0].widen[0] > 0, figures[i].expected != RULING_OK);
    }
}

static void the_whole_job_is_answered(void **state)
{
    size_t run = 9, sensor = 9;

    (void)state;
    vet_desk_set();
    assert_int_equal(answer_possible(&desk.runs, desk.order, &desk.job, &run, &sensor), 1);
    within_refuse(&desk.items[1], &desk.job); /* repeated */
    assert_int_equal(answer_possible(&desk.runs, desk.order, &desk.job, &run, &sensor), 1);
    desk.readings[2][1].use = false; /* no sensor is named, and the other one is left */
    assert_int_equal(answer_possible(&desk.runs, desk.order, &desk.job, &run, &sensor), 1);
    desk.job.aim.named = true;
    assert_int_equal(answer_possible(&desk.runs, desk.order, &desk.job, &run, &sensor), 0);
    assert_int_equal(run, 2);
    assert_int_equal(sensor, 1);
    /* the aim is on the other sensor */
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
    vet_desk_set();
    desk.job.limits = &desk.limit;
    desk.job.limit_count = 1;
    desk.limit = (struct job_limit){"speed-match", false, 2, NAN};
    limits_init(&limits, &desk.job);
    assert_int_equal(limits_judge(&limits, CHECK_SPEED_MATCH, 1.5, &limit), RULING_OK);
    assert_int_equal(limits_judge(&limits, CHECK_SPEED_MATCH, 2.5, &limit), RULING_CAUTION);
    assert_close(limit, 2, 0);
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
    vet_desk_figure(CHECK_CLIPPING, 1000);
    vet_desk_within(1);
    assert_int_equal(vet_desk_ruled(CHECK_CLIPPING, 1, -1), -1);
    assert_true(vet_desk_all_used(1));
}

/* Journal loads of a 340 kg rotor, mass centre 0.5 m from bearing A of 2 m: B carries a quarter. */
/* Lags that scatter are the tacho's only where its marks do. */
static void the_tacho_is_blamed_with_reason(void **state)
{
    (void)state;
    for (int bad = 0; bad < 3; bad++) {
        const char *text = NULL;
        vet_desk_set();
        desk.items[1].jitter_deg = bad == 1 ? 20 : 0.1;
        desk.items[1].extra = bad == 2 ? 60 : 0;
        vet_desk_figure(CHECK_PHASE_STEADY, 10);
        vet_desk_vectors(1);
        for (size_t i = 0; i < desk.findings.count; i++)
            if (desk.findings.items[i].check == CHECK_PHASE_STEADY)
                text = desk.findings.items[i].text;
        assert_non_null(text);
        assert_int_equal(strstr(text, "tacho") != NULL, bad > 0);
        assert_int_equal(strstr(text, "a beat") != NULL, bad == 0);
    }
}

static bool advised(const char *what)
{
    for (size_t i = 0; i < desk.findings.count; i++)
        if (desk.findings.items[i].check == CHECK_WEIGHT_FORCE)
            return strstr(desk.findings.items[i].text, what) != NULL;
    fail();
    return false;
}

/* What pulls hard may be smaller where it is a trial; elsewhere, and far beyond, the sheet is asked
 * first. */
static void advice_on_heavy_weights(void **state)
{
    (void)state;
    vet_desk_set();
    vet_desk_figure(CHECK_WEIGHT_FORCE, 20);
    vet_desk_within(1);
    assert_true(advised("use a smaller weight") && !advised("in the sheet"));
    vet_desk_figure(CHECK_WEIGHT_FORCE, 60);
    vet_desk_within(1);
    assert_true(advised("check rotor mass, speed and radius in the sheet, else"));
    desk.job.aim.mounted = 1;
    vet_desk_within(1);
    assert_true(advised("check rotor mass") && !advised("smaller weight"));

    vet_desk_set(); /* the repeat of trial A tells nothing new */
    assert_true(trials_is_trial(&desk.job, 1) && trials_is_trial(&desk.job, 2));
    assert_false(trials_is_trial(&desk.job, 0) || trials_is_trial(&desk.job, 3));
    vet_desk_weight(3, 0, 0.1, 30);
    vet_desk_within(3);
    assert_true(advised("check rotor mass") && !advised("smaller weight"));
}

static void loads(void **state)
{
    (void)state;
    vet_desk_set();
    assert_close(within_journal_load(&desk.job), 340 * 9.80665 / 2, 1e-9);
    desk.job.span_m = 2;
    desk.job.centre_m = 0.5;
    assert_close(within_journal_load(&desk.job), 340 * 9.80665 / 4, 1e-9);
    desk.job.centre_m = 2.4; /* overhung: the near bearing carries 1.2 times the weight */
    assert_close(within_journal_load(&desk.job), 340 * 9.80665 * 1.2, 1e-9);
    desk.job.rotor_mass = NAN;
    assert_true(isnan(within_journal_load(&desk.job)));
}

int main(void)
{
    const struct CMUnitTest tests[] = {
        cmocka_unit_test(a_good_job_is_ok),
        cmocka_unit_test(figures_of_a_run),
        cmocka_unit_test(a_balanced_machine_is_not_punished),
        cmocka_unit_test(the_target_is_no_floor),
        cmocka_unit_test(a_drift_widens),
        cmocka_unit_test(unreadable_and_dead),
        cmocka_unit_test(no_turns_at_all),
        cmocka_unit_test(below_target),
        cmocka_unit_test(share_of_one_x),
        cmocka_unit_test(lines_of_every_run),
        cmocka_unit_test(two_x_asks_for_the_tacho),
        cmocka_unit_test(a_beat_is_judged),
        cmocka_unit_test(the_whole_job_is_answered),
        cmocka_unit_test(limits_of_the_sheet),
        cmocka_unit_test(the_tacho_is_blamed_with_reason),
        cmocka_unit_test(advice_on_heavy_weights),
        cmocka_unit_test(loads),
    };
    int failed = cmocka_run_group_tests(tests, NULL, NULL);

    findings_release(&desk.findings);
    return failed;
}
