/* Lines that do not turn with the shaft, by frequency and size. The truth is the closed form of the
 * recording; the bars are those of an analyst's reading: a twentieth of a line's width and 3 %. */
#include "track_recipe.h"

#define RATE 6400.0
#define REV 24.7
#ifdef __SANITIZE_ADDRESS__ /* several times slower */
#define RUNS 20
#else
#define RUNS 100
#endif

struct tone_of {
    double hz, amplitude;
};

static struct recipe steady = {.shaft = {.rate = RATE, .rev = REV, .tape = 0.05, .phase = 0.3},
                               .seconds = 20,
                               .amplitude = 1,
                               .second = 0.4,
                               .harmonics = 0.2,
                               .high = 4,
                               .low = -1,
                               .edge = 1,
                               .marks = 1,
                               .seed = 88172645463325252ULL};

/* Tracks the recipe with the tones added; returns how many lines there are, in Hz. */
static size_t lines_of(const struct recipe *r, const struct tone_of *tones, size_t count,
                       struct stray *lines)
{
    struct tracker tracker;
    size_t n;
    float *x = record(r, &n);

    for (size_t i = 0; i < n; i++) {
        for (size_t k = 0; k < count; k++) {
            x[2 * i] +=
                (float)(tones[k].amplitude * cos(TAU * tones[k].hz * (double)i / RATE + (double)k));
        }
    }
    track(&tracker, r, x, n, NULL);
    size_t found = spectrum_strays(&tracker.spectrum, 0, lines);

    for (size_t i = 0; i < found; i++) {
        lines[i].order *= RATE;
    }
    tracker_release(&tracker);
    free(x);
    return found;
}

static void assert_line(const struct stray *line, double hz, double amplitude, double off)
{
    assert_float_equal(line->order, hz, off);
    assert_float_equal(line->amplitude / amplitude, 1, 0.03);
}

/* Between two bins, on one, below 1x and high up, from 6 s to a minute. */
static void test_named(void **unused)
{
    static const struct tone_of tones[] = {
        {33.31, 0.6}, {58.4, 0.3}, {100, 0.15}, {11.2, 0.1}, {254.1, 0.05}};
    struct recipe r = steady;
    struct stray lines[STRAY_MOST];

    (void)unused;
    r.noise = 0.1;
    for (double seconds = 6; seconds < 61; seconds *= 2.1) {
        r.seconds = seconds;
        assert_int_equal(lines_of(&r, tones, 5, lines), 5);
        for (size_t k = 0; k < 5; k++) {
            /* of a width of 1.5 turns in 64, 0.6 Hz */
            assert_line(&lines[k], tones[k].hz, tones[k].amplitude, 0.03);
        }
    }
}

/* While the speed wanders the line does not stand still among the orders: 0.5 % of 100 Hz to either
 * side make it some three times as wide as the 0.58 Hz of test_named. Twice its bar is allowed, and
 * that for both lines. */
static void test_wander(void **unused)
{
    static const struct tone_of tones[] = {{58.4, 0.3}, {100, 0.15}};
    struct recipe r = steady;
    struct stray lines[STRAY_MOST];

    (void)unused;
    for (double turns = 30; turns < 2000; turns *= 7) {
        r.shaft.wander = 0.005;
        r.shaft.wander_turns = turns;
        assert_true(lines_of(&r, tones, 2, lines) >= 2);
        assert_line(&lines[0], 58.4, 0.3, 0.06);
        assert_line(&lines[1], 100, 0.15, 0.06);
    }
}

/* A line of the mains 0.6 Hz beside the double of the speed, which is as large, is not mixed up
 * with it: taken for one line both would stand at 49.7 Hz, 0.3 Hz off, and be larger by sqrt 2,
 * 0.17. The bars are a third of that. The whole turns take some of the line along. */
static void test_beside_an_order(void **unused)
{
    static const struct tone_of mains = {50, 0.4};
    struct stray lines[STRAY_MOST];

    (void)unused;
    assert_int_equal(lines_of(&steady, &mains, 1, lines), 1);
    assert_float_equal(lines[0].order, 50, 0.1);
    assert_float_equal(lines[0].amplitude, 0.4, 0.055);
}

/* Whole and half orders are the shaft's, whatever the speed does; so is what swells and fades. */
static void test_orders_alone(void **unused)
{
    struct recipe r = steady;
    struct stray lines[STRAY_MOST];
    struct tone_of half[] = {{REV / 2, 0.3}, {REV * 1.5, 0.2}, {REV * 5.5, 0.1}};

    (void)unused;
    assert_int_equal(lines_of(&r, half, 3, lines), 0);
    r.shaft.wander = 0.02;
    r.shaft.wander_turns = 41;
    assert_int_equal(lines_of(&r, NULL, 0, lines), 0);
    r.shaft.wander = 0;
    struct tone_of sides[] = {{REV * (1 + 1. / 80), 0.1}, {REV * (1 - 1. / 80), 0.1}};

    assert_int_equal(lines_of(&r, sides, 2, lines), 0);
}

static void test_noise(void **unused)
{
    struct recipe r = steady;
    struct stray lines[STRAY_MOST];
    size_t named = 0;

    (void)unused;
    r.noise = 1;
    for (int k = 0; k < RUNS; k++) {
        r.seed = 1000003 * (uint64_t)(k + 1);
        r.seconds = 2 + k % 10;
        named += lines_of(&r, NULL, 0, lines);
    }
    assert_int_equal(named, 0);
}

/* 128 steps a turn are what is transformed: lines at 138.4 and 116.3 orders come down to 10.4
 * and 11.7, by sin(x)/x squared as 0.6 % and 1 % of their size. (By sin(x)/x they would be 8 % and
 * 10 %.) */
static void test_alias(void **unused)
{
    struct recipe r = steady;
    struct stray lines[STRAY_MOST];
    struct tone_of high[] = {{REV * 138.4, 1.5}, {REV * 116.3, 1.5}};

    (void)unused;
    r.shaft.rate = 25600; /* lines_of counts in Hz of 6400 */
    for (size_t k = 0; k < 2; k++) {
        high[k].hz /= 4;
    }
    assert_int_equal(lines_of(&r, high, 2, lines), 0);
}

static void test_nothing_to_see(void **unused)
{
    double power[64] = {0}, locked[9] = {0};
    struct stray_spectrum s = {power, locked, 64, 16, 1};
    struct stray lines[STRAY_MOST];

    (void)unused;
    assert_int_equal(stray_find(&s, 1, lines), 0);
    power[20] = 1;
    assert_int_equal(stray_find(&s, 0.5, lines), 1); /* the test is not blind */
    assert_float_equal(lines[0].order, 1.25, 1e-12);
    assert_float_equal(lines[0].amplitude, sqrt(1 / 1.5), 1e-12);
    s.averaged = 0;
    assert_int_equal(stray_find(&s, 0.5, lines), 0);
    s.averaged = 1;
    s.turns = 8;
    assert_int_equal(stray_find(&s, 0.5, lines), 0);
    s.turns = 16;
    power[20] = NAN;
    assert_int_equal(stray_find(&s, NAN, lines), 0);
}

int main(void)
{
    const struct CMUnitTest tests[] = {
        cmocka_unit_test(test_named),           cmocka_unit_test(test_wander),
        cmocka_unit_test(test_beside_an_order), cmocka_unit_test(test_orders_alone),
        cmocka_unit_test(test_noise),           cmocka_unit_test(test_alias),
        cmocka_unit_test(test_nothing_to_see)};

    return cmocka_run_group_tests(tests, NULL, NULL);
}
