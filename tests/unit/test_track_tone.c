/* Without a tacho: which line is the shaft's, how fast it turns, how large it is. The truth is the
 * closed form of the signal; bounds are what a Hann window owes (Harris 1978), or common sense
 * where said. */
#include "track_recipe.h"

#include "track/tone.h"
#include "track/tone_line.h"

struct machine {
    double rate, seconds, hz, wander, amplitude, second, noise;
    double other_hz, other; /* a neighbour */
    double high_hz, high;   /* a line that would alias */
};

static const struct machine fan = {.rate = 6400, .seconds = 12, .hz = 24.7, .amplitude = 1};

static void run(struct tone *tone, const struct machine *m, double service_rpm, int derivative)
{
    struct tone_set_up set_up = {m->rate, m->rate * m->seconds, 1, service_rpm, &derivative};
    uint64_t seed = 88172645463325252ULL;
    size_t n = (size_t)(m->rate * m->seconds);
    float x[777];
    const float *planes[1] = {x};

    assert_int_equal(tone_init(tone, &set_up), 0);
    for (size_t i = 0; i < n;) {
        size_t k = 0;

        for (; k < 777 && i < n; k++, i++) {
            double t = (double)i / m->rate, slow = TAU * t / m->seconds;
            double theta = TAU * m->hz * (t + m->wander * m->seconds / TAU * sin(slow));

            x[k] = (float)(3 + m->amplitude * cos(theta - 1) + m->second * cos(2 * theta) +
                           m->other * cos(TAU * m->other_hz * t) +
                           m->high * cos(TAU * m->high_hz * t) + m->noise * signal_normal(&seed));
        }
        assert_int_equal(tone_add(tone, planes, k), 0);
    }
    assert_int_equal(tone_finish(tone), 0);
}

static double amplitude_of(const struct tone *tone)
{
    double sum = 0;

    for (size_t b = 0; b < tone->block_count; b++) {
        sum += tone->amplitude[b];
    }
    return sum / (double)tone->block_count;
}

static void test_clean(void **unused)
{
    (void)unused;
    for (double hz = 4.3; hz < 90; hz *= 1.7) {
        struct machine m = fan;
        struct tone tone;

        m.hz = hz;
        m.second = 0.3;
        m.high_hz = 1066.67 + hz; /* the thinned rate and the line: what would fall onto it */
        m.high = 0.5;
        run(&tone, &m, NAN, 0);
        assert_true(tone.found);
        assert_true(tone.rival == 0);
        assert_float_equal(tone_speed(&tone), 60 * hz, 0.01 * hz);
        assert_float_equal(amplitude_of(&tone), 1, 0.005); /* 0.5*(hz/1067)^2 gets through */
        /* rms of everything else: 2x and the high line */
        assert_float_equal(tone.rest[0], sqrt((0.09 + 0.25) / 2), 0.03);
        tone_release(&tone);
    }
}

/* Speed that wanders by 0.5 % is followed, and the amplitude stays. */
static void test_wander_and_noise(void **unused)
{
    struct machine m = fan;
    struct tone tone;

    (void)unused;
    m.wander = 0.005;
    m.noise = 0.5;
    run(&tone, &m, 1500, 0);
    assert_true(tone.found);
    assert_true(tone.block_count >= 11);
    assert_float_equal(amplitude_of(&tone), 1, 0.02);
    for (size_t b = 0; b < tone.block_count; b++) {
        double t = (tone.blocks[b].from + tone.blocks[b].to) / 2 / m.rate;

        assert_float_equal(tone.blocks[b].hz, m.hz * (1 + m.wander * cos(TAU * t / m.seconds)),
                           0.04);
    }
    /* a sine's standard deviation: 0.5 % / sqrt(2) of 1482 rpm */
    assert_float_equal(tone_scatter(&tone), 5.24, 0.8);
    tone_release(&tone);
}

static void test_rivals(void **unused)
{
    struct machine m = fan;
    struct tone tone;

    (void)unused;
    m.second = 2; /* a stronger harmonic: taken for the shaft where nobody says how fast it turns */
    run(&tone, &m, NAN, 0);
    assert_float_equal(tone.hz, 2 * m.hz, 0.02);
    assert_float_equal(tone.rival_hz, m.hz, 0.1);
    assert_float_equal(tone.rival, 0.5, 0.02);
    tone_release(&tone);
    run(&tone, &m, 1500, 0); /* said, but doubtful all the same */
    assert_float_equal(tone.hz, m.hz, 0.02);
    assert_float_equal(tone.rival, 2, 0.05);
    tone_release(&tone);
    m.second = 0.2; /* not doubtful */
    run(&tone, &m, NAN, 0);
    assert_true(tone.rival == 0);
    tone_release(&tone);
    m.other_hz = 26.5; /* a neighbour within the search */
    m.other = 0.8;
    run(&tone, &m, 1500, 0);
    /* 1.8 Hz off stands in the lobe of a segment's window, which ends at 2 Hz: it pulls a little */
    assert_float_equal(tone.hz, m.hz, 0.15);
    assert_float_equal(tone.rival_hz, 26.5, 0.1);
    tone_release(&tone);
    /* an acceleration: the 2x of 1.2 is 0.6 of the 1x as a velocity, so that 1x is chosen */
    m = fan;
    m.second = 1.2;
    run(&tone, &m, NAN, 1);
    assert_float_equal(tone.hz, m.hz, 0.02);
    assert_float_equal(tone.rival, 0.6, 0.02);
    tone_release(&tone);
}

/* Noise alone, silence, NaN, next to nothing: no line, no block, no crash. */
static void test_nothing(void **unused)
{
    struct tone tone;

    (void)unused;
    for (int k = 0; k < 6; k++) {
        struct machine m = fan;

        m.amplitude = k == 2 ? NAN : 0;
        m.noise = k == 0 || k == 4 ? 1 : 0;
        m.seconds = k == 3 ? 0.002 : k == 4 ? 0.3 : k == 5 ? 0 : 12;
        run(&tone, &m, k == 1 ? 1500 : NAN, 0);
        assert_false(tone.found);
        assert_int_equal(tone.block_count, 0);
        assert_true(isnan(tone_speed(&tone)));
        tone_release(&tone);
    }
}

/* The same samples give the same blocks however they are cut. */
static void test_cuts(void **unused)
{
    struct tone a, b;
    int derivative = 0;
    struct tone_set_up set_up = {6400, 64000, 1, NAN, &derivative};
    uint64_t seed = 7, cuts = 9;
    float *x = malloc(64000 * sizeof *x);

    (void)unused;
    assert_non_null(x);
    for (size_t i = 0; i < 64000; i++) {
        x[i] = (float)(cos(TAU * 25 * (double)i / 6400) + 0.1 * signal_normal(&seed));
    }
    assert_int_equal(tone_init(&a, &set_up), 0);
    assert_int_equal(tone_init(&b, &set_up), 0);
    for (size_t i = 0; i < 64000; i += 2000) {
        const float *planes[1] = {x + i};

        assert_int_equal(tone_add(&a, planes, 2000), 0);
    }
    for (size_t i = 0; i < 64000;) {
        size_t k = 1 + (size_t)(5000 * signal_uniform(&cuts));
        const float *planes[1] = {x + i};

        k = k < 64000 - i ? k : 64000 - i;
        assert_int_equal(tone_add(&b, planes, k), 0);
        i += k;
    }
    assert_int_equal(tone_finish(&a), 0);
    assert_int_equal(tone_finish(&b), 0);
    assert_int_equal(a.block_count, b.block_count);
    assert_true(a.block_count > 0);
    for (size_t k = 0; k < a.block_count; k++) {
        assert_float_equal(a.amplitude[k], b.amplitude[k], 1e-6); /* sums in another order */
        assert_float_equal(a.blocks[k].hz, b.blocks[k].hz, 1e-6);
    }
    tone_release(&a);
    tone_release(&b);
    free(x);
}

/* The order spectrum of `columns` equal columns without a tacho: sizes of the lines 1x to 3x, of
 * what lies between, and the mean square of all (peak squared over two). Returns the stretches. */
static long spectrum_of(const struct machine *m, size_t columns, double line[4], double *between,
                        double *square)
{
    size_t n = (size_t)(m->rate * m->seconds);
    double rail[8], orders[SPECTRUM_LINES], amplitude[SPECTRUM_LINES];
    struct tracker_set_up set_up = {m->rate, (double)n, columns, -1,   rail, 1,
                                    1,       NAN,       NAN,     NULL, false};
    struct tracker tracker;
    uint64_t seed = 88172645463325252ULL;
    float frame[8];

    for (size_t c = 0; c < columns; c++) {
        rail[c] = NAN;
    }
    assert_int_equal(tracker_init(&tracker, &set_up), 0);
    for (size_t i = 0; i < n; i++) {
        double t = (double)i / m->rate, slow = TAU * t / m->seconds;
        double theta = TAU * m->hz * (t + m->wander * m->seconds / TAU * sin(slow));
        float x = (float)(m->amplitude * cos(theta - 1) + 0.5 * cos(2 * theta) +
                          0.2 * cos(3 * theta) + m->noise * signal_normal(&seed));

        for (size_t c = 0; c < columns; c++) {
            frame[c] = x;
        }
        assert_int_equal(tracker_add(&tracker, frame, 1), 0);
    }
    assert_int_equal(tracker_finish(&tracker), 0);
    size_t count = spectrum_lines(&tracker.spectrum, columns - 1, orders, amplitude);
    long stretches = tracker.spectrum.count;

    *between = *square = 0;
    for (size_t i = 0; i < count; i++) {
        double off = fabs(orders[i] - round(orders[i]));

        if (off < 1e-9 && orders[i] < 3.5) {
            line[lround(orders[i])] = amplitude[i];
        } else if (off > 0.2 && orders[i] < 4) {
            *between = fmax(*between, amplitude[i]);
        }
        *square += amplitude[i] * amplitude[i] / 2;
    }
    assert_true((double)tracker.room * (double)columns * sizeof(float) <= (double)TRACKER_HOLD);
    tracker_release(&tracker);
    return stretches;
}

static void test_spectrum(void **unused)
{
    struct machine m = fan;
    double line[4] = {0}, between, square;

    (void)unused;
    m.noise = 0.05;
    for (m.seconds = 3; m.seconds < 40; m.seconds *= 2) {
        assert_true(spectrum_of(&m, 1, line, &between, &square) > 0);
        assert_float_equal(line[1], 1, 0.005);
        assert_float_equal(line[2], 0.5, 0.005);
        assert_float_equal(line[3], 0.2, 0.005);
        assert_true(between < 0.02);
        assert_float_equal(square, 0.5 + 0.125 + 0.02 + 0.0025 / 3.2, 0.008); /* noise to 1 kHz */
    }
    m.wander = 0.01; /* half a bin at 3x in a stretch of a sixteenth of the wander's period */
    m.seconds = 20;
    assert_true(spectrum_of(&m, 1, line, &between, &square) > 25);
    assert_float_equal(line[1], 1, 0.01);
    assert_float_equal(line[2], 0.5, 0.01);
    assert_float_equal(line[3], 0.2, 0.01);
}

/* Ten seconds of this are more than may be held until the line is found. */
static void test_spectrum_of_much(void **unused)
{
    struct machine m = fan;
    double line[4] = {0}, between, square;

    (void)unused;
    m.rate = 51200;
    long stretches = spectrum_of(&m, 8, line, &between, &square);

    assert_true(stretches >= 6 && stretches < 18); /* 296 turns in all make 18 */
    assert_float_equal(line[1], 1, 0.005);
    assert_float_equal(line[3], 0.2, 0.005);
    assert_true(between < 0.01);
}

int main(void)
{
    const struct CMUnitTest tests[] = {cmocka_unit_test(test_clean),
                                       cmocka_unit_test(test_wander_and_noise),
                                       cmocka_unit_test(test_rivals),
                                       cmocka_unit_test(test_nothing),
                                       cmocka_unit_test(test_cuts),
                                       cmocka_unit_test(test_spectrum),
                                       cmocka_unit_test(test_spectrum_of_much)};

    return cmocka_run_group_tests(tests, NULL, NULL);
}
