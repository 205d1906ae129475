/* Tachos as they are in the field. Bounds: the vector within 0.01 % and 0.01 deg, the project's bar
 * for clean signals. The truth is the geometry of the shaft. */
#include "track_recipe.h"

/* A smooth pulse at `at` turns, `width` turns wide in all, 1 at its middle. */
static double bump(double u, double at, double width)
{
    double a = u - at;

    a -= floor(a + 0.5);
    return fabs(a) < width / 2 ? 0.5 + 0.5 * cos(TAU * a / width) : 0;
}

/* Seconds to a lag that edge detection on a bump shifts by: the half height lies width/4 before the
 * middle. */
static const double bump_edge = 0.25;

static double slow_edges(const struct recipe *r, double t)
{
    return 2 * bump(signal_turns(&r->shaft, t), 0.05, 0.2); /* half height at 0 */
}

static double small_on_offset(const struct recipe *r, double t)
{
    return 8 + 0.05 * bump(signal_turns(&r->shaft, t), 0.025, 0.1);
}

/* 60 teeth at a third of the mark's height. */
static double toothed(const struct recipe *r, double t)
{
    double u = signal_turns(&r->shaft, t);

    return fmax(3 * bump(u, 0.01, 0.04), 0.5 + 0.5 * cos(60 * TAU * u));
}

/* A scratch of 70 % height and more, and 60 % width, somewhere or, the worst place, opposite the
 * tape. */
static double scratch(const struct recipe *r, double t)
{
    double u = signal_turns(&r->shaft, t);

    return 3 * bump(u, 0.015, 0.06) + r->low * bump(u, r->high, 0.036);
}

/* Pulses whose height is proportional to speed, as a magnetic pick-up gives. */
static double growing(const struct recipe *r, double t)
{
    return signal_speed(&r->shaft, t) / r->shaft.rev * 1.5 *
           bump(signal_turns(&r->shaft, t), 0.0125, 0.05);
}

/* A bipolar pulse, as after a capacitor: up, then down. */
static double coupled(const struct recipe *r, double t)
{
    double u = signal_turns(&r->shaft, t);

    return 2 * bump(u, 0.01, 0.04) - 1.2 * bump(u, 0.05, 0.06);
}

/* A coil's pulse, the derivative of a Gaussian bump with a standard deviation of 7 degrees: up and
 * then down (r->high 1), or down and then up (-1). 1 at its tops; rests at 0. */
#define COIL (7.0 / 360)

static double coil(const struct recipe *r, double t)
{
    double u = signal_turns(&r->shaft, t), a = (u - floor(u + 0.5)) / COIL;

    return r->high * -a * exp(0.5 - a * a / 2) + r->low * sin(977 * TAU * u);
}

static double two_unequal(const struct recipe *r, double t)
{
    double u = signal_turns(&r->shaft, t);

    return 3 * bump(u, 0.015, 0.06) + 3 * bump(u, 0.51, 0.04);
}

static double two_uneven(const struct recipe *r, double t)
{
    double u = signal_turns(&r->shaft, t);

    return 3 * bump(u, 0.015, 0.06) + 3 * bump(u, 0.315, 0.06);
}

static double four_equal(const struct recipe *r, double t)
{
    return 3 * bump(4 * signal_turns(&r->shaft, t), 0.06, 0.24);
}

static double two_alike(const struct recipe *r, double t)
{
    double u = signal_turns(&r->shaft, t);

    return 3 * bump(u, 0.015, 0.06) + 3 * bump(u, 0.185, 0.058);
}

/* Nine teeth of ten: the mark is the one after the gap. */
static double gap_tooth(const struct recipe *r, double t)
{
    double u = signal_turns(&r->shaft, t), tooth = floor(10 * (u - floor(u)) + 0.5);

    return tooth == 9 ? 0 : 3 * bump(10 * u, 0.1, 0.4);
}

static void check(double (*tacho)(const struct recipe *, double), int marks, double percent,
                  double deg)
{
    struct recipe r = plain;

    r.tacho = tacho;
    r.marks = marks;
    r.shaft.rate = 12800;
    r.shaft.wander = 0.02;
    r.shaft.wander_turns = 25;
    assert_vector(measure(&r), 1, LAG, percent, deg);
}

static void test_slow_edges(void **unused)
{
    (void)unused;
    assert_true(bump_edge * 0.2 == 0.05);
    check(slow_edges, 1, 0.01, 0.01);
}

static void test_small_on_offset(void **unused)
{
    (void)unused;
    check(small_on_offset, 1, 0.01, 0.01);
}

static void test_toothed(void **unused)
{
    (void)unused;
    check(toothed, 1, 0.01, 0.01);
}

static void test_coupled(void **unused)
{
    (void)unused;
    check(coupled, 1, 0.01, 0.01); /* half of the rise from rest, not of the range */
}

/* The outer side of the first lobe passes half its height there, turns before the middle: a times
 * exp((1 - a*a)/2) is a half. */
static double coil_half(void)
{
    double low = 1, high = 4;

    for (int k = 0; k < 60; k++) {
        double a = (low + high) / 2;

        if (a * exp(0.5 - a * a / 2) > 0.5) {
            low = a;
        } else {
            high = a;
        }
    }
    return low * COIL;
}

/* Whichever side comes first and whichever edge is chosen: the edge stands where it is steep, never
 * where the signal rests. With and without something on it that is no noise of chance: 4 %. */
static void test_coil(void **unused)
{
    (void)unused;
    for (int k = 0; k < 8; k++) {
        struct recipe r = plain;
        struct tracker tracker;
        size_t n;

        r.tacho = coil;
        r.shaft.rate = 12800;
        r.edge = k & 1 ? 1 : -1;
        r.high = k & 2 ? 1 : -1;
        r.low = k & 4 ? 0.04 : 0;
        float *x = record(&r, &n);

        track(&tracker, &r, x, n, NULL);
        assert_true(tracker_reference(&tracker));
        /* up then down: by its outer side; down then up: between the two */
        double before = r.edge * r.high > 0 ? coil_half() * 360 : 0;

        assert_vector(mean(&tracker), 1, LAG + before, 0.05, k & 4 ? 0.3 : 0.1);
        assert_true(shaft_jitter(&tracker.shaft) < (k & 4 ? 0.7 : 0.1));
        assert_int_equal(tracker.marks.missed + tracker.marks.extra, 0);
        tracker_release(&tracker);
        free(x);
    }
}

static void test_scratch(void **unused)
{
    static const double heights[] = {2.1, 2.7, 2.97};

    (void)unused;
    for (int k = 0; k < 8; k++) {
        struct recipe r = plain;
        struct tracker tracker;
        size_t n;
        double at = 0.17 + 0.11 * k;

        r.tacho = scratch;
        r.shaft.rate = 12800;
        r.low = heights[k % 3];
        r.high = fabs(at - 0.5) < 0.02 ? 0.515 : at;
        float *x = record(&r, &n);

        track(&tracker, &r, x, n, NULL);
        assert_true(tracker_reference(&tracker));
        assert_vector(mean(&tracker), 1, LAG, 0.01, 0.01);
        /* it comes every turn: nothing is wrong with the tacho, and it is told */
        assert_int_equal(tracker.marks.scratches, 1);
        assert_true(tracker.marks.beside > 190 && tracker.marks.beside < 202);
        assert_true(marks_extra(&tracker.marks) <= 1);
        assert_true(tracker.marks.missed <= 1);
        tracker_release(&tracker);
        free(x);
    }
}

/* A scratch like the tape: which is which nobody knows, and the pulses set aside must show. */
static void test_scratch_alike(void **unused)
{
    struct recipe r = plain;
    struct tracker tracker;
    size_t n;

    (void)unused;
    r.tacho = two_alike;
    r.shaft.rate = 12800;
    float *x = record(&r, &n);

    track(&tracker, &r, x, n, NULL);
    assert_int_equal(tracker.marks.scratches, 0);
    assert_true(marks_extra(&tracker.marks) > 180);
    assert_float_equal(tracker_speed(&tracker), 24.7 * 60, 0.5);
    tracker_release(&tracker);
    free(x);
}

static void test_growing(void **unused)
{
    struct recipe r = plain;

    (void)unused;
    r.tacho = growing;
    r.shaft.rate = 12800;
    r.shaft.rev = 5;     /* 300 rpm */
    r.shaft.sweep = 1.0; /* 60 rpm/s, to 1500 rpm: pulses become five times as high */
    r.seconds = 20;
    assert_vector(measure(&r), 1, LAG, 0.01, 0.01);
}

static void test_several_marks(void **unused)
{
    struct recipe r = plain;
    struct tracker tracker;
    size_t n;

    (void)unused;
    check(two_unequal, 2, 0.01, 0.01);
    check(two_uneven, 2, 0.01, 0.01);
    check(gap_tooth, 9, 0.01, 0.01);
    r.tacho = four_equal;
    r.marks = 4;
    float *x = record(&r, &n);

    track(&tracker, &r, x, n, NULL);
    assert_false(tracker_reference(&tracker));
    assert_true(tracker_regular(&tracker));
    assert_float_equal(tracker_speed(&tracker), 24.7 * 60, 0.5);
    tracker_release(&tracker);
    free(x);
}

/* The same physical mark is the zero in every recording, wherever the recording begins. */
static void test_same_mark(void **unused)
{
    (void)unused;
    for (double phase = 0; phase < 1; phase += 0.1) {
        struct recipe r = plain;

        r.shaft.rate = 12800;
        r.shaft.phase = phase;
        r.tacho = two_uneven;
        r.marks = 2;
        assert_vector(measure(&r), 1, LAG, 0.01, 0.01);
        r.tacho = gap_tooth;
        r.marks = 9;
        assert_vector(measure(&r), 1, LAG, 0.01, 0.01);
    }
}

/* A hole of five turns, then one of forty. */
static double with_holes(const struct recipe *r, double t)
{
    double u = signal_turns(&r->shaft, t);

    if ((u > 60.5 && u < 65.5) || (u > 100.5 && u < 140.5)) {
        return 0;
    }
    return 3 * bump(u, 0.015, 0.06);
}

static void test_holes(void **unused)
{
    struct recipe r = plain;
    struct tracker tracker;
    size_t n;
    double turns = 0;

    (void)unused;
    r.tacho = with_holes;
    r.shaft.rate = 12800;
    r.shaft.wander = 0.01;
    r.shaft.wander_turns = 40;
    float *x = record(&r, &n);

    track(&tracker, &r, x, n, NULL);
    assert_vector(mean(&tracker), 1, LAG, 0.1, 0.5);
    for (size_t b = 0; b < tracker.windows.count; b++) {
        turns += (double)tracker.windows.blocks[b].turns;
    }
    assert_true(turns > 145 && turns < 158);
    tracker_release(&tracker);
    free(x);
}

/* A plug that is out, or out for the first seconds. */
static double unplugged(const struct recipe *r, double t)
{
    (void)t;
    return r->low;
}

static double plugged_in_late(const struct recipe *r, double t)
{
    return t < 3.5 ? 0 : 3 * bump(signal_turns(&r->shaft, t), 0.015, 0.06);
}

static void test_dead(void **unused)
{
    (void)unused;
    for (int k = 0; k < 2; k++) {
        struct recipe r = plain;
        struct tracker tracker;
        size_t n;

        r.tacho = k == 1 ? plugged_in_late : unplugged;
        r.high = 0;
        r.seconds = 12;
        r.amplitude = 1.7;
        r.noise = 0.05;
        float *x = record(&r, &n);

        track(&tracker, &r, x, n, NULL);
        assert_int_equal(tracker_toned(&tracker), k == 0);
        assert_int_equal(tracker_reference(&tracker), k == 1);
        if (k == 0) { /* speed and amplitude from the spectrum */
            assert_float_equal(tone_speed(&tracker.tone), 24.7 * 60, 0.5);
            assert_true(tracker.tone.block_count > 8);
            for (size_t b = 0; b < tracker.tone.block_count; b++) {
                assert_float_equal(tracker.tone.amplitude[b], 1.7, 0.02);
            }
        } else {
            assert_vector(mean(&tracker), 1.7, LAG, 0.5, 0.3);
        }
        tracker_release(&tracker);
        free(x);
    }
}

int main(void)
{
    const struct CMUnitTest tests[] = {
        cmocka_unit_test(test_slow_edges), cmocka_unit_test(test_small_on_offset),
        cmocka_unit_test(test_toothed),    cmocka_unit_test(test_coupled),
        cmocka_unit_test(test_scratch),    cmocka_unit_test(test_scratch_alike),
        cmocka_unit_test(test_coil),       cmocka_unit_test(test_dead),
        cmocka_unit_test(test_growing),    cmocka_unit_test(test_several_marks),
        cmocka_unit_test(test_same_mark),  cmocka_unit_test(test_holes)};

    return cmocka_run_group_tests(tests, NULL, NULL);
}
