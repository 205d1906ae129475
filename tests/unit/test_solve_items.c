/* The smaller items of solve: what sits on the rotor, whether it is good as found, what mends a
 * refusal, what the sheet allows on a plane, pieces that work against each other, holes that meet.
 */
#include <setjmp.h>
#include <stdarg.h>
#include <stddef.h>
#include <cmocka.h>

#include <math.h>
#include <string.h>

#include "base/angle.h"
#include "solve/already.h"
#include "solve/holes.h"
#include "solve/menu.h"
#include "solve/oppose.h"
#include "solve/remedy.h"
#include "solve/sits.h"

/* One sensor in the aim and one outside, a plane that is added to and one that is drilled, four
 * runs. */
struct desk {
    struct job job;
    struct job_sensor sensors[2];
    struct job_plane planes[2];
    struct job_position positions[4];
    struct job_piece stock[3];
    struct job_run runs[4];
    struct job_weight weights[4];
    struct model model;
    struct model_row rows[2];
    size_t bare[2];
    double complex y[2];
    double total[2][3];
};

static void near(double got, double wanted, double tolerance)
{
    if (!(fabs(got - wanted) <= tolerance))
        fail_msg("got %.17g, wanted %.17g +- %.3g", got, wanted, tolerance);
}

static void desk_init(struct desk *d)
{
    static const char *const names[] = {"as-found", "one", "two", "three"};
    memset(d, 0, sizeof *d);
    job_init(&d->job);
    d->job.sensors = d->sensors;
    d->job.planes = d->planes;
    d->job.runs = d->runs;
    d->job.sensor_count = d->job.plane_count = 2;
    d->job.run_count = 4;
    for (size_t r = 0; r < 4; r++)
        strcpy(d->runs[r].name, names[r]);
    for (size_t i = 0; i < 2; i++) {
        strcpy(d->sensors[i].name, i ? "B" : "A");
        strcpy(d->planes[i].name, i ? "hub" : "rim");
        d->planes[i].radius_m = 0.4;
        d->planes[i].any_position = true;
        d->planes[i].most = d->planes[i].most_in_all = INFINITY;
        d->rows[i] = (struct model_row){.sensor = i, .in_aim = i == 0, .target = NAN};
    }
    d->planes[1].work = WORK_REMOVE;
    d->model.job = &d->job;
    d->model.rows = d->rows;
    d->model.row_count = 2;
    d->model.dof = INFINITY;
}

/* ---- what sits there ---- */

/* 20 g at 30 deg and 5 g at 30.4 deg are one place, 10 g at 31 deg another; 8 g drilled off the
 * hub. The second of them stands at half the radius: 2.5 g there. */
static void test_what_sits(void **state)
{
    (void)state;
    struct desk d;
    desk_init(&d);
    d.runs[1].weights = d.weights;
    d.runs[1].weight_count = 4;
    d.weights[0] = (struct job_weight){0, 0.020, 0.4, 0.020, 30, 0};
    d.weights[1] = (struct job_weight){0, 0.005, 0.2, 0.0025, 30.4, 0};
    d.weights[2] = (struct job_weight){0, 0.010, 0.4, 0.010, 31, 0};
    d.weights[3] = (struct job_weight){1, -0.008, 0.4, -0.008, 359.8, 0};
    assert_true(sits_mass(&d.job, 0, 30) == 0 && sits_in_all(&d.job, 0) == 0); /* all comes off */
    d.job.aim.mounted = 1;
    near(sits_mass(&d.job, 0, 30), 0.025, 1e-12);
    near(sits_equivalent(&d.job, 0, 30), 0.0225, 1e-12);
    near(sits_at(&d.job, 0, 30), 0.025, 1e-12);
    near(sits_in_all(&d.job, 0), 0.035, 1e-12);
    near(sits_mass(&d.job, 0, 90), 0, 0);
    near(sits_mass(&d.job, 1, 0.1), -0.008, 1e-12); /* over 360 deg */
    near(sits_at(&d.job, 1, 0.1), 0.008, 1e-12);    /* a hole counts where holes are drilled */
    d.planes[1].work = WORK_ADD;
    near(sits_at(&d.job, 1, 0.1), 0, 0); /* and is no weight where weights are added */
    near(sits_in_all(&d.job, 1), 0, 0);
}

static void test_nowhere(void **state)
{
    (void)state;
    struct desk d;
    char text[200];
    desk_init(&d);
    assert_false(sits_nowhere(&d.job, 0, text, sizeof text));
    d.planes[0].stock = d.stock;
    d.planes[0].stock_count = 2;
    d.stock[0] = (struct job_piece){0.020, -1};
    d.stock[1] = (struct job_piece){0.010, -1};
    d.planes[0].most = 0.010; /* the smaller one just fits */
    assert_false(sits_nowhere(&d.job, 0, text, sizeof text));
    d.planes[0].most_in_all = 0.009;
    assert_true(sits_nowhere(&d.job, 0, text, sizeof text));
    assert_non_null(strstr(text, "smallest piece 10.0 g, most 9.00 g"));
    d.planes[0].any_position = false;
    d.planes[0].positions = d.positions;
    d.planes[0].position_count = 2;
    d.positions[0].taken = d.positions[1].taken = true;
    assert_true(sits_nowhere(&d.job, 0, text, sizeof text));
    assert_string_equal(text, "all positions of 'rim' are taken");
}

/* ---- good as found? ---- */

/* Readings about nothing, scatter s = 1 per component. One more reading then has the variance of
 * its own and of the mean: 2 after one reading, 1.5 after two. Rayleigh's 97.5 % point is sqrt(-2
 * ln 0.025) = 2.7162 deviations: 3.841 and 3.327. */
static void test_already(void **state)
{
    (void)state;
    struct desk d;
    desk_init(&d);
    struct model_row *row = &d.rows[0];
    d.runs[1].weights = d.weights; /* a trial: its reading does not count */
    d.runs[1].weight_count = 1;
    d.weights[0] = (struct job_weight){0, 0.020, 0.4, 0.020, 30, 0};
    row->runs = d.bare;
    row->y = d.y;
    row->total = d.total;
    row->count = 1;
    for (int i = 0; i < 2; i++)
        d.total[i][0] = d.total[i][2] = 1;
    assert_false(already_meets(&d.model)); /* no target */
    row->target = 3.86;
    assert_true(already_meets(&d.model));
    row->target = 3.82;
    assert_false(already_meets(&d.model));
    row->count = 2; /* both as found */
    assert_true(already_meets(&d.model));
    row->target = 3.31;
    assert_false(already_meets(&d.model));
    row->target = 3.34;
    assert_true(already_meets(&d.model));
    d.bare[1] = 1; /* the second is the trial's */
    assert_false(already_meets(&d.model));
    d.bare[0] = 1; /* none is as found */
    row->target = 1e6;
    assert_false(already_meets(&d.model));
    d.bare[0] = d.bare[1] = 0;
    d.rows[1].target = 1e-6; /* outside of the aim, hence no matter */
    assert_true(already_meets(&d.model));
    d.job.aim.mounted = 1;
    assert_false(already_meets(&d.model));
}

/* ---- what mends it ---- */

static struct remedy_cause cause(const char *check, int run, int sensor, const char *text)
{
    struct remedy_cause c = {.run = run, .sensor = sensor, .refused = true};
    strcpy(c.check, check);
    strcpy(c.text, text);
    return c;
}

static void test_remedy(void **state)
{
    (void)state;
    struct desk d;
    struct advice_next next = {.step = "repeat", .text = "as it was"};
    desk_init(&d);
    remedy_step(&d.model, NULL, 0, &next);
    assert_string_equal(next.text, "as it was");
    struct remedy_cause c[4];
    c[0] = cause("clipping", 1, 1, "seen: lower the gain"); /* outside of the aim */
    remedy_step(&d.model, c, 1, &next);
    assert_string_equal(next.text, "as it was");
    for (int i = 0; i < 3; i++)
        c[i] = cause("clipping", i + 1, 0, "seen, limit 1: again: lower the gain");
    remedy_step(&d.model, c, 3, &next);
    assert_string_equal(next.text, "runs 'one', 'two' and 1 more (sensor 'A'): lower the gain");
    c[3] = cause("same-recording", 2, -1,
                 "x"); /* the sheet is mended first; clipping may come of it */
    remedy_step(&d.model, c, 4, &next);
    assert_string_equal(next.text,
                        "run 'two': name the file that belongs to each run; no new run is needed");
    c[0] = cause("tape-moved", 3, 0, "the tape stands elsewhere");
    c[0].refused = false; /* a caution is enough for what explains the rest */
    remedy_step(&d.model, c, 1, &next);
    assert_string_equal(next.text, "the tape stands elsewhere");
    assert_true(remedy_is_diagnosis("sensor-swapped") && !remedy_is_diagnosis("clipping"));
}

/* A trial of 4 g with 2 s.e. where 5 are needed: 4 * 5/2 = 10 g; by the 10 % practice, where the
 * rotor is known, the more of it: half of 100 kg g / (0.4 m (2 pi 20/s)^2) is 7.8 g in 10 %: not
 * more than 1.2 times 8 g. */
static void test_remedy_of_a_small_trial(void **state)
{
    (void)state;
    struct desk d;
    struct advice_next next = {.step = "repeat"};
    struct remedy_cause c = cause("trial-effect", 1, -1, "x");
    desk_init(&d);
    c.value = 2;
    c.limit = 5;
    d.runs[1].weights = d.weights;
    d.runs[1].weight_count = 1;
    d.weights[0] = (struct job_weight){0, 0.004, 0.4, 0.004, 30, 0};
    remedy_step(&d.model, &c, 1, &next);
    assert_string_equal(next.text, "run 'one': repeat with a larger trial weight, about 10 g");
    d.job.rotor_mass = 100;
    d.job.service_rpm = 1200;
    d.planes[0].pieces = d.planes[1].pieces = 4;
    remedy_step(&d.model, &c, 1, &next);
    assert_string_equal(next.text, "run 'one': repeat with a larger trial weight, about 7.8 g");
    d.weights[0].mass = d.weights[0].mounted_mass = 0.008;
    remedy_step(&d.model, &c, 1, &next);
    assert_string_equal(next.text, "run 'one': repeat with a larger trial weight, about 20 g");
}

/* ---- where something may be put ---- */

static void test_menu(void **state)
{
    (void)state;
    struct desk d;
    struct menu menu = {0};
    struct place_plane to;
    desk_init(&d);
    d.planes[1].any_position = false; /* drilled, 10 mm wide and 10 mm deep in steel: 6.17 g */
    d.planes[1].hole_m = d.planes[1].depth_m = 0.010;
    d.planes[1].density = 7850;
    d.planes[1].positions = d.positions;
    d.planes[1].position_count = 4;
    for (int i = 0; i < 4; i++)
        d.positions[i] = (struct job_position){.angle_deg = 90.0 * i, .taken = i == 1};
    d.planes[1].stock = d.stock;
    d.planes[1].stock_count = 3;
    d.stock[0] = (struct job_piece){0.007, -1};
    d.stock[1] = (struct job_piece){0.006, 2};
    d.stock[2] = (struct job_piece){0.003, -1};
    near(menu_most(&d.planes[1]), 6.16538e-3, 1e-8);
    assert_int_equal(menu_fill(&d.job, 1, NULL, &menu, &to), 0);
    assert_int_equal(to.positions, 3);
    near(to.angles_deg[1], 180, 0);
    assert_int_equal(to.stock, 2); /* 7 g are too deep */
    near(to.masses[0], 0.006, 0);
    assert_int_equal(to.counts[0], 2);
    near(to.most, 6.16538e-3, 1e-8); /* all pieces at one place are one hole */
    assert_true(to.sign == -1 && to.pieces == 4);
    menu_release(&menu);
    struct menu_arc arc = {350, 85}; /* 265 to 75 deg */
    assert_int_equal(menu_fill(&d.job, 1, &arc, &menu, &to), 0);
    assert_int_equal(to.positions, 2);
    struct place_item item = {.plane = 1, .position = 1};
    struct place_choice choice = {.items = &item, .count = 1};
    near(to.angles_deg[1], 270, 0);
    menu_number(&menu, 0, &choice); /* another plane's: untouched */
    assert_int_equal(item.position, 1);
    menu_number(&menu, 1, &choice);
    assert_int_equal(item.position, 2); /* the third of the free ones */
    menu_release(&menu);
    arc.half_deg = 1;
    assert_int_equal(menu_fill(&d.job, 1, &arc, &menu, &to), 0);
    assert_true(to.positions == 1 && to.most == 0 && to.most_in_all == 0); /* nothing may be put */
    menu_release(&menu);
}

static void test_menu_of_any_angle(void **state)
{
    (void)state;
    struct desk d;
    struct menu menu = {0};
    struct place_plane to;
    desk_init(&d);
    assert_int_equal(menu_fill(&d.job, 0, NULL, &menu, &to), 0);
    assert_true(to.positions == 0 && to.stock == 0 && to.pieces == 1);
    menu_release(&menu);
    d.runs[1].weights = d.weights; /* 15 g stay at 90 deg, of 25 g at most */
    d.runs[1].weight_count = 1;
    d.weights[0] = (struct job_weight){0, 0.015, 0.4, 0.015, 90, 0};
    d.job.aim.mounted = 1;
    d.planes[0].most = 0.025;
    d.planes[0].most_in_all = 0.040;
    assert_int_equal(menu_fill(&d.job, 0, NULL, &menu, &to), 0);
    assert_int_equal(to.positions, 360); /* whole degrees, so that what is there is minded */
    near(to.held[90], 0.015, 1e-12);
    near(to.held[91], 0, 0);
    near(to.most_in_all, 0.025, 1e-12);
    struct place_item item = {.plane = 0, .position = 17};
    struct place_choice choice = {.items = &item, .count = 1};
    menu_number(&menu, 0, &choice);
    assert_int_equal(item.position, -1);
    menu_release(&menu);
}

/* ---- about a placement ---- */

static void test_opposed(void **state)
{
    (void)state;
    static const double apart[][2] = {{0, 120}, {0, 121}, {350, 109}, {350, 111}, {200, 40}};
    static const bool opposed[] = {false, true, false, true, true};
    for (int i = 0; i < 5; i++) {
        struct place_item items[2] = {{.plane = 1, .angle_deg = apart[i][0], .mass = 1},
                                      {.plane = 1, .angle_deg = apart[i][1], .mass = 1}};
        struct place_choice choice = {.items = items, .count = 2}, same = choice;
        assert_int_equal(oppose_on(&choice, 1), opposed[i]);
        assert_false(oppose_on(&choice, 0));
        assert_true(oppose_same(&choice, &same));
        struct place_item others[2] = {items[0], items[1]};
        same.items = others;
        assert_true(oppose_same(&choice, &same));
        others[1].mass = 1.1;
        assert_false(oppose_same(&choice, &same));
        items[1].plane = 0;
        assert_false(oppose_on(&choice, 1));
        choice.count = 1;
        assert_false(oppose_same(&choice, &same));
    }
}

/* An equilateral triangle, a diameter, and the small angle. */
static void test_distance_of_holes(void **state)
{
    (void)state;
    near(holes_distance(0.1, 60), 0.1, 1e-12);
    near(holes_distance(0.1, -300), 0.1, 1e-12);
    near(holes_distance(0.1, 180), 0.2, 1e-12);
    near(holes_distance(0.1, 359), 0.1 * PI / 180, 1e-6);
    assert_true(isnan(holes_distance(NAN, 10)));
}

int main(void)
{
    const struct CMUnitTest tests[] = {
        cmocka_unit_test(test_what_sits),
        cmocka_unit_test(test_nowhere),
        cmocka_unit_test(test_already),
        cmocka_unit_test(test_remedy),
        cmocka_unit_test(test_remedy_of_a_small_trial),
        cmocka_unit_test(test_menu),
        cmocka_unit_test(test_menu_of_any_angle),
        cmocka_unit_test(test_opposed),
        cmocka_unit_test(test_distance_of_holes),
    };
    return cmocka_run_group_tests(tests, NULL, NULL);
}
