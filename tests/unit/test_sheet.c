/* Good sheets: every key arrives where it should, in SI, with its sign. */
#include <math.h>
#include <stdarg.h>
#include <stddef.h>
#include <stdint.h>
#include <setjmp.h>
#include <stdlib.h>
#include <string.h>
#include <cmocka.h>

#include "base/angle.h"
#include "sheet_desk.h"

static void near(double got, double wanted, double tolerance)
{
    if (!(fabs(got - wanted) <= tolerance))
        fail_msg("got %.17g, wanted %.17g +- %.3g", got, wanted, tolerance);
}

static struct sheet good(const char *text, bool audit)
{
    struct sheet sheet;
    struct buffer errors = BUFFER_INIT;
    if (sheet_desk_read(&sheet, text, strlen(text), audit, &errors) != 0)
        fail_msg("not taken:\n%s", errors.bytes ? errors.bytes : "");
    assert_int_equal(errors.length, 0);
    buffer_release(&errors);
    return sheet;
}

/* The sheet with `old` replaced by `new`. */
static struct sheet swapped(const char *text, const char *old, const char *new)
{
    char *made = sheet_desk_swap(text, old, new);
    struct sheet sheet = good(made, false);
    free(made);
    return sheet;
}

static void test_machine(void **state)
{
    (void)state;
    struct sheet sheet = good(SHEET_DESK_FULL, false);
    const struct job *job = &sheet.job;
    assert_string_equal(job->title, "Grain dryer, exhaust fan 3");
    assert_int_equal(job->angles, SENSE_AGAINST);
    assert_int_equal(job->phase, PHASE_LAG);
    assert_int_equal(job->units, UNITS_METRIC);
    near(job->rotor_mass, 340, 0);
    near(job->service_rpm, 1480, 0);
    assert_int_equal(job->turning, TURNING_CLOCKWISE);
    assert_string_equal(job->seen_from, "drive end");
    near(job->grade, 6.3, 0);
    assert_int_equal(job->support, SUPPORT_BETWEEN_BEARINGS);
    near(job->span_m, 2.4, 1e-15);
    near(job->centre_m, 0.9, 1e-15);
    assert_true(job->has_tacho);
    assert_string_equal(job->tacho_channel, "4");
    assert_int_equal(job->tacho_edge, -1);
    assert_int_equal(job->tacho_marks, 2);
    near(job->tacho_level, 2.5, 0);
    near(sheet.layout.full_scale, 10, 0);
    near(sheet.layout.rate, 12800, 0);
    assert_string_equal(sheet.layout.time_column, "Time");
    assert_int_equal(sheet.layout.separator, ';');
    assert_int_equal(sheet.layout.decimal, ',');
    assert_int_equal(sheet.layout.skip, 6);
    sheet_release(&sheet);
}

static void test_sensors(void **state)
{
    (void)state;
    struct sheet sheet = good(SHEET_DESK_FULL, false);
    const struct job *job = &sheet.job;
    assert_int_equal(job->sensor_count, 2);
    assert_string_equal(job->sensors[0].name, "DE-V");
    assert_string_equal(job->sensors[0].channel, "1");
    assert_int_equal(job->sensors[0].quantity, QUANTITY_ACCELERATION);
    assert_string_equal(job->sensors[0].show.unit, "mm/s");
    assert_int_equal(job->sensors[0].show.detection, DETECTION_RMS);
    near(job->sensors[0].at_deg, 90, 0);
    assert_true(sheet.scales[0].given);
    near(sheet.scales[0].si_per_volt, 98.0665, 1e-12); /* 9.80665 m/s2 in 0.1 V */
    assert_string_equal(job->sensors[1].name, "NDE H");
    assert_string_equal(job->sensors[1].channel, "Column two");
    assert_int_equal(job->sensors[1].quantity, QUANTITY_DISPLACEMENT);
    assert_string_equal(job->sensors[1].show.unit, "um");
    assert_int_equal(job->sensors[1].show.detection, DETECTION_PEAK_TO_PEAK);
    assert_true(isnan(job->sensors[1].at_deg));
    assert_false(sheet.scales[1].given);
    near(sheet.scales[1].si_per_unit, 1e-6, 0);
    sheet_release(&sheet);
}

static void test_planes(void **state)
{
    (void)state;
    struct sheet sheet = good(SHEET_DESK_FULL, false);
    const struct job_plane *plane = &sheet.job.planes[0];
    assert_int_equal(sheet.job.plane_count, 2);
    assert_string_equal(plane->name, "wheel");
    near(plane->radius_m, 0.41, 1e-16);
    assert_false(plane->any_position);
    assert_int_equal(plane->position_count, 12);
    for (int i = 0; i < 12; i++) {
        assert_int_equal(plane->positions[i].number, i + 1);
        near(plane->positions[i].angle_deg, 10 + 30 * i, 1e-12);
        assert_int_equal(plane->positions[i].taken, i == 2 || i == 6);
    }
    assert_int_equal(plane->stock_count, 3);
    near(plane->stock[0].mass, 0.01, 1e-17);
    assert_int_equal(plane->stock[0].count, 4);
    near(plane->stock[2].mass, 0.05, 1e-16);
    assert_int_equal(plane->stock[2].count, -1);
    assert_int_equal(plane->pieces, 3);
    near(plane->most, 0.15, 1e-16);
    near(plane->most_in_all, 0.4, 1e-16);
    plane = &sheet.job.planes[1];
    near(plane->radius_m, 0.508, 1e-15);
    assert_true(plane->any_position);
    assert_int_equal(plane->position_count, 0);
    assert_int_equal(plane->stock_count, 0);
    assert_null(plane->stock);
    assert_int_equal(plane->pieces, 4);
    assert_true(isinf(plane->most) && isinf(plane->most_in_all));
    sheet_release(&sheet);
}

static void test_runs(void **state)
{
    (void)state;
    struct sheet sheet = good(SHEET_DESK_FULL, false);
    const struct job_run *run = sheet.job.runs;
    assert_int_equal(sheet.job.run_count, 3);
    assert_int_equal(sheet.runs[0].file_count, 2);
    assert_string_equal(sheet.runs[0].files[1], "more/as-found 2.wav");
    assert_int_equal(sheet.runs[0].file_lines[1], sheet_desk_line(SHEET_DESK_FULL, "file = more"));
    assert_int_equal(sheet.runs[1].line, sheet_desk_line(SHEET_DESK_FULL, "[run trial]"));
    assert_string_equal(run[0].condition, "service");
    assert_true(isnan(run[0].speed_rpm));
    assert_string_equal(run[1].when, "2025-03-14 10:40");
    assert_int_equal(run[1].weight_count, 3);
    near(run[1].weights[0].mounted_mass, 0.06, 1e-17);
    near(run[1].weights[0].radius_m, 0.205, 1e-16);
    near(run[1].weights[0].mass, 0.03, 1e-16); /* half the radius, half the effect */
    near(run[1].weights[0].angle_deg, 30, 0);
    assert_int_equal(run[1].weights[0].position, 0);
    near(run[1].weights[1].mass, -0.02, 1e-17);
    near(run[1].weights[1].angle_deg, 40, 1e-12);
    assert_int_equal(run[1].weights[1].position, 2);
    assert_int_equal(run[1].weights[2].plane, 1);
    near(run[1].weights[2].mass, 0.45359237 / 8, 1e-16);
    near(run[1].weights[2].angle_deg, 330, 0);
    assert_false(run[1].without[0]);
    assert_true(run[1].without[1]);
    assert_string_equal(sheet.runs[0].channels[0], "1");
    assert_string_equal(sheet.runs[1].channels[0], "3");
    near(sheet.runs[1].scales[0].si_per_volt, 100, 1e-12); /* 1 m/s2 in 0.01 V */
    near(sheet.runs[0].scales[0].si_per_volt, 98.0665, 1e-12);
    assert_int_equal(sheet.runs[1].layout.separator, '\t');
    assert_int_equal(sheet.runs[1].layout.decimal, ',');
    assert_int_equal(sheet.runs[0].layout.separator, ';');
    sheet_release(&sheet);
}

/* 7 mm/s rms at a lag of 143 deg and 1500 rpm, as acceleration: amplitude times w, lag 90 deg less.
 */
static void test_hand(void **state)
{
    (void)state;
    struct sheet sheet = good(SHEET_DESK_FULL, false);
    const struct job_run *run = &sheet.job.runs[2];
    double w = 1500 / 60.0 * 2 * PI;
    assert_string_equal(run->condition, "hot");
    near(run->speed_rpm, 1500, 0);
    assert_int_equal(run->hand_count, 2);
    assert_true(run->hand[0].has_phase);
    near(cabs(run->hand[0].vector), 0.007 * sqrt(2) * w, 1e-12);
    near(run->hand[0].amplitude, 0.007 * sqrt(2) * w, 1e-12);
    near(angle_of(run->hand[0].vector), 53, 1e-9);
    assert_false(run->hand[1].has_phase);
    near(run->hand[1].amplitude, 15e-6, 1e-20);
    sheet_release(&sheet);
    sheet = swapped(SHEET_DESK_FULL, "phase  = lag", "phase = lead");
    near(angle_of(sheet.job.runs[2].hand[0].vector), 360 - 143 - 90, 1e-9);
    sheet_release(&sheet);
}

static void test_aim(void **state)
{
    (void)state;
    struct sheet sheet = good(SHEET_DESK_FULL, false);
    const struct job_aim *aim = &sheet.job.aim;
    near(aim->targets[0].amplitude, 0.0018 * sqrt(2), 1e-15);
    assert_int_equal(aim->targets[0].quantity, QUANTITY_VELOCITY);
    near(aim->targets[1].amplitude, 10e-6, 1e-18);
    assert_int_equal(aim->targets[1].quantity, QUANTITY_DISPLACEMENT);
    assert_true(aim->targets[0].in_aim && aim->targets[1].in_aim && !aim->named);
    assert_int_equal(aim->minimise, MINIMISE_WORST);
    assert_int_equal(aim->mounted, 1);
    near(aim->repeatability, 0, 0);
    assert_true(aim->repeatability_given);
    assert_int_equal(aim->tolerance, TOLERANCE_API_4WN);
    sheet_release(&sheet);
    sheet = swapped(SHEET_DESK_FULL, "target = 1.8 mm/s rms\n", "");
    assert_true(sheet.job.aim.named);
    assert_false(sheet.job.aim.targets[0].in_aim);
    assert_true(isnan(sheet.job.aim.targets[0].amplitude));
    assert_true(sheet.job.aim.targets[1].in_aim);
    sheet_release(&sheet);
}

/* Steel of 7850 kg/m3 (any handbook), 12 mm drill. */
static void test_drill(void **state)
{
    (void)state;
    struct sheet sheet = swapped(SHEET_DESK_FULL, "work = add",
                                 "work = remove\nhole = 12 mm\ndensity = 7.85 g/cm3\ndepth = 1 in");
    const struct job_plane *plane = &sheet.job.planes[0];
    assert_int_equal(plane->work, WORK_REMOVE);
    near(plane->hole_m, 0.012, 1e-15);
    near(plane->density, 7850, 1e-9);
    near(plane->depth_m, 0.0254, 1e-15);
    assert_false(sheet.job.planes[1].hole_m > 0);
    sheet_release(&sheet);
    sheet = swapped(SHEET_DESK_FULL, "work = add", "work = remove");
    assert_int_equal(sheet.job.planes[0].work, WORK_REMOVE);
    assert_false(sheet.job.planes[0].hole_m > 0);
    sheet_release(&sheet);
}

static void test_more_aims(void **state)
{
    (void)state;
    struct sheet sheet =
        swapped(SHEET_DESK_FULL, "minimise = worst",
                "minimise = static first\nzones = group 2 flexible\nimportance hot = 2.5\n"
                "importance service @ 900 rpm = 0.5");
    const struct job_aim *aim = &sheet.job.aim;
    assert_int_equal(aim->minimise, MINIMISE_STATIC_FIRST);
    assert_int_equal(aim->zone_group, 2);
    assert_true(aim->zone_flexible);
    assert_int_equal(aim->importance_count, 2);
    assert_string_equal(aim->importances[0].condition, "hot");
    near(aim->importances[0].factor, 2.5, 0);
    assert_string_equal(aim->importances[1].condition, "service @ 900 rpm");
    sheet_release(&sheet);
}

static void test_limits(void **state)
{
    (void)state;
    static const struct job_limit WANTED[] = {{"speed-match", false, 2, NAN},
                                              {"drift", false, 4, 18},
                                              {"length", false, 200, 50},
                                              {"clipping", true, NAN, NAN},
                                              {"trial-effect", false, 25, 4}};
    struct sheet sheet = good(SHEET_DESK_FULL, false);
    assert_int_equal(sheet.job.limit_count, 5);
    for (size_t i = 0; i < 5; i++) {
        const struct job_limit *got = &sheet.job.limits[i];
        assert_string_equal(got->check, WANTED[i].check);
        assert_int_equal(got->off, WANTED[i].off);
        assert_true(got->caution == WANTED[i].caution || isnan(WANTED[i].caution));
        assert_int_equal(isnan(got->caution), isnan(WANTED[i].caution));
        assert_true(got->refuse == WANTED[i].refuse || isnan(WANTED[i].refuse));
        assert_int_equal(isnan(got->refuse), isnan(WANTED[i].refuse));
    }
    sheet_release(&sheet);
}

static void test_defaults(void **state)
{
    (void)state;
    struct sheet sheet = good(SHEET_DESK_LEAST, false);
    const struct job *job = &sheet.job;
    assert_string_equal(job->title, "fan"); /* the stem of the file's name */
    assert_int_equal(job->angles, SENSE_NONE);
    assert_int_equal(job->phase, PHASE_NONE);
    assert_true(isnan(job->rotor_mass) && isnan(job->service_rpm) && isnan(job->grade));
    assert_true(isnan(job->tacho_level) && isnan(sheet.layout.rate));
    assert_true(isnan(sheet.layout.full_scale));
    assert_int_equal(sheet.layout.skip, -1);
    assert_int_equal(job->tacho_edge, 1);
    assert_int_equal(job->tacho_marks, 1);
    assert_string_equal(job->sensors[0].show.unit, "mm/s");
    near(job->aim.repeatability, 0.03, 0);
    assert_false(job->aim.repeatability_given);
    assert_int_equal(job->aim.mounted, -1);
    assert_true(job->aim.targets[0].in_aim && isnan(job->aim.targets[0].amplitude));
    assert_true(job->planes[0].any_position);
    assert_int_equal(job->aim.tolerance, TOLERANCE_NONE);
    assert_non_null(strstr(sheet.path, "/fan.ini"));
    assert_int_equal(strlen(sheet.folder) + strlen("/fan.ini"), strlen(sheet.path));
    sheet_release(&sheet);
    sheet = swapped(SHEET_DESK_LEAST, "[tacho]", "[job]\nunits = US\n[tacho]");
    assert_string_equal(sheet.job.sensors[0].show.unit, "in/s");
    assert_int_equal(sheet.job.sensors[0].show.detection, DETECTION_PEAK);
    sheet_release(&sheet);
    sheet = swapped(SHEET_DESK_FULL, "units  = metric", "units = US");
    assert_string_equal(sheet.job.sensors[1].show.unit, "mil");
    assert_int_equal(sheet.job.sensors[1].show.detection, DETECTION_PEAK_TO_PEAK);
    assert_string_equal(sheet.job.sensors[0].show.unit, "mm/s"); /* `show` stands in the sheet */
    sheet_release(&sheet);
}

/* A weight 30 deg with rotation from the mark is 330 deg against it: geometry, whatever is
 * numbered. */
static void test_senses(void **state)
{
    (void)state;
    char *with = sheet_desk_swap(SHEET_DESK_FULL, "against rotation  ", "with rotation  ");
    struct sheet sheet = good(with, false);
    near(sheet.job.runs[1].weights[0].angle_deg, 330, 1e-12);
    near(sheet.job.runs[1].weights[2].angle_deg, 30, 1e-12);
    for (int i = 0; i < 12; i++)
        near(sheet.job.planes[0].positions[i].angle_deg, angle_wrap_360(-(10 + 30 * i)), 1e-12);
    near(sheet.job.runs[1].weights[1].angle_deg, 320, 1e-12); /* position 2 */
    sheet_release(&sheet);
    /* [in the sheet's sense][numbered] against rotation: position 2 of 12 from 10 deg */
    static const struct {
        bool with;
        const char *numbered;
        double second;
    } CASES[] = {{false, "", 40},
                 {false, ", numbered against rotation", 40},
                 {false, ", numbered with rotation", 340},
                 {true, "", 320},
                 {true, ", numbered with rotation", 320},
                 {true, ", numbered against rotation", 20}};
    for (size_t i = 0; i < sizeof CASES / sizeof CASES[0]; i++) {
        char line[80] = "12 from 10 deg";
        strcat(line, CASES[i].numbered);
        sheet = swapped(CASES[i].with ? with : SHEET_DESK_FULL, "12 from 10 deg", line);
        near(sheet.job.planes[0].positions[0].angle_deg, CASES[i].with ? 350 : 10, 1e-12);
        near(sheet.job.planes[0].positions[1].angle_deg, CASES[i].second, 1e-12);
        assert_int_equal(sheet.job.planes[0].positions[1].number, 2);
        sheet_release(&sheet);
    }
    free(with);
}

static void test_lists(void **state)
{
    (void)state;
    struct sheet sheet =
        swapped(SHEET_DESK_FULL, "12 from 10 deg", "0 deg, 240, 120 100.5 45 90 15 deg");
    static const double ANGLES[] = {0, 240, 120, 100.5, 45, 90, 15};
    assert_int_equal(sheet.job.planes[0].position_count, 7);
    for (int i = 0; i < 7; i++) {
        near(sheet.job.planes[0].positions[i].angle_deg, ANGLES[i], 0);
        assert_int_equal(sheet.job.planes[0].positions[i].number, i + 1);
    }
    sheet_release(&sheet);
    sheet = swapped(SHEET_DESK_FULL, "4x10 2x20 50 g", "1 2x2 oz, 10g .5e-1 kg");
    const struct job_piece *stock = sheet.job.planes[0].stock;
    assert_int_equal(sheet.job.planes[0].stock_count, 4);
    near(stock[1].mass, 0.45359237 / 8, 1e-17);
    assert_int_equal(stock[1].count, 2);
    near(stock[2].mass, 0.01, 1e-17);
    near(stock[3].mass, 0.05, 1e-17);
    sheet_release(&sheet);
}

static void test_audit(void **state)
{
    (void)state;
    struct sheet sheet = good("[tacho]\nchannel = 2\n[sensor A]\nchannel = 1\nunit = g\n", true);
    assert_int_equal(sheet.job.run_count, 0);
    assert_int_equal(sheet.job.plane_count, 0);
    sheet_release(&sheet);
    sheet = good("[tacho]\nchannel = 2\n[sensor A]\nchannel = 1\nunit = g\n[plane w]\nradius = 1 "
                 "m\n[run r]\nweight w = 1 g at 1 deg\n",
                 true);
    sheet_release(&sheet);
}

static void test_hand_only(void **state)
{
    (void)state;
    struct sheet sheet = good("[job]\nphase = lead\n[sensor A]\nunit = um\n[plane w]\nradius = 1 "
                              "m\n[run r]\nspeed = 600 rpm\nreading A = 2 mil pk-pk at 90 deg\n",
                              false);
    assert_false(sheet.job.has_tacho);
    near(cabs(sheet.job.runs[0].hand[0].vector), 25.4e-6, 1e-19);
    near(angle_of(sheet.job.runs[0].hand[0].vector), 270, 1e-12);
    sheet_release(&sheet);
    /* amplitudes alone need no sign of phase */
    sheet = good("[sensor A]\nunit = um\n[plane w]\nradius = 1 m\n[run r]\nspeed = 600 "
                 "rpm\nreading A = 2 mil pk-pk\n",
                 false);
    sheet_release(&sheet);
}

/* Roles of runs; the speeds of a coast-down in any order. */
static void test_roles(void **state)
{
    (void)state;
    char *text = sheet_desk_swap(SHEET_DESK_FULL, "when = 2025-03-14 10:40",
                                 "role = coast-down\nspeeds = 1480, 900 1100.5 rpm");
    char *both = sheet_desk_swap(text, "condition = hot", "condition = hot\nrole = runout");
    struct sheet sheet;
    struct buffer errors = BUFFER_INIT;
    assert_int_equal(sheet_desk_read(&sheet, both, strlen(both), false, &errors), 0);
    assert_string_equal(sheet.job.runs[1].role, "coast-down");
    assert_int_equal(sheet.job.runs[1].speed_count, 3);
    assert_true(sheet.job.runs[1].speeds_rpm[0] == 900);
    assert_true(sheet.job.runs[1].speeds_rpm[1] == 1100.5);
    assert_true(sheet.job.runs[1].speeds_rpm[2] == 1480);
    assert_string_equal(sheet.job.runs[2].role, "runout");
    assert_int_equal(sheet.job.runs[2].speed_count, 0);
    assert_string_equal(sheet.job.runs[0].role, "");
    sheet_release(&sheet);
    buffer_release(&errors);
    free(both);
    free(text);
}

int main(void)
{
    const struct CMUnitTest tests[] = {
        cmocka_unit_test(test_roles),
        cmocka_unit_test(test_machine), cmocka_unit_test(test_sensors),
        cmocka_unit_test(test_planes),  cmocka_unit_test(test_runs),
        cmocka_unit_test(test_hand),    cmocka_unit_test(test_aim),
        cmocka_unit_test(test_limits),  cmocka_unit_test(test_defaults),
        cmocka_unit_test(test_senses),  cmocka_unit_test(test_lists),
        cmocka_unit_test(test_audit),   cmocka_unit_test(test_hand_only),
        cmocka_unit_test(test_drill),   cmocka_unit_test(test_more_aims)};
    return cmocka_run_group_tests(tests, NULL, NULL);
}
