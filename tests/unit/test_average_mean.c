/* The covariance of a mean, by simulation: how often does its 95 % region hold the truth? */
#include <setjmp.h>
#include <stdarg.h>
#include <stddef.h>
#include <stdint.h>

#include <cmocka.h>

#include "close_to.h"
#include "noise_source.h"

#include <math.h>
#include <stdio.h>
#include <string.h>

#include "average/longrun.h"
#include "average/mean.h"

#define MOST 80

/* Independent normal components of variance 1 (Box & Muller 1958). */
enum noise { WHITE, SLOW, MIXED, TREND, BURST };

static void simulate(double complex *z, size_t n, enum noise kind, double r)
{
    double complex x = normal();

    for (size_t i = 0; i < n; i++) {
        double complex w = normal();
        switch (kind) {
        case WHITE:
            z[i] = w;
            break;
        case SLOW: /* first-order, of correlation r from block to block */
            z[i] = x;
            break;
        case MIXED: /* the same below white noise */
            z[i] = w + x;
            break;
        case TREND: /* the truth is the middle of the trend */
            z[i] = w + r * ((double)i / (double)(n - 1) - 0.5);
            break;
        case BURST: /* one block far off */
            z[i] = i == n / 3 ? w + r : w;
            break;
        }
        x = r * x + sqrt(1 - r * r) * normal();
        z[i] += 10; /* the truth */
    }
}

struct cover {
    double chi2, hotelling; /* %, of the region from chi-squared, and from Hotelling's T2 */
};

static struct cover cover_of(size_t n, enum noise kind, double r, int times)
{
    /* T2 = 2(n-1)/(n-2) F(2, n-2) at 95 %; F's point in closed form for 2 degrees of freedom. */
    double m = (double)n - 2, t2 = 2 * (m + 1) / m * (m / 2 * (pow(0.05, -2 / m) - 1));
    double complex z[MOST];
    double turns[MOST], t[MOST];
    int chi2 = 0, hotelling = 0;

    for (size_t i = 0; i < n; i++) {
        turns[i] = 24;
        t[i] = (double)i + 0.5;
    }
    for (int k = 0; k < times; k++) {
        struct mean mean;
        double det, q;
        double complex d;
        simulate(z, n, kind, r);
        assert_int_equal(mean_of_blocks(z, turns, t, n, &mean), 0);
        d = mean.vector - 10;
        det = mean.cov[0] * mean.cov[2] - mean.cov[1] * mean.cov[1];
        q = (mean.cov[2] * creal(d) * creal(d) - 2 * mean.cov[1] * creal(d) * cimag(d) +
             mean.cov[0] * cimag(d) * cimag(d)) /
            det;
        chi2 += q < 5.99146;
        hotelling += q < t2;
    }
    return (struct cover){100.0 * chi2 / times, 100.0 * hotelling / times};
}

/* White noise: 93..97 % with either region. A binomial standard error of 5,000 is 0.3 %. */
static void covers_in_white_noise(void **state)
{
    static const size_t counts[] = {16, 20, 30, 60};

    (void)state;
    seed = 1;
    for (size_t i = 0; i < 4; i++) {
        struct cover c = cover_of(counts[i], WHITE, 0, counts[i] == 16 ? 16000 : 5000);
        print_message("white, %zu blocks: %.1f %% chi-squared, %.1f %% Hotelling\n", counts[i],
                      c.chi2, c.hotelling);
        assert_true(c.chi2 >= 93 && c.hotelling <= 97);
        assert_true(c.hotelling >= c.chi2);
    }
}

/* Coloured noise and slow drift: at least 90 %, where the uncorrelated formula falls to 70 % and
 * less. Of what changes more slowly than the whole run no run can tell; 0.8 in 16 blocks
 * is nearly that (their mean is worth two blocks; 83 % are covered). */
static void covers_in_coloured_noise(void **state)
{
    static const struct {
        size_t count;
        enum noise kind;
        double r;
    } cases[] = {{16, SLOW, 0.3}, {20, SLOW, 0.5},  {30, SLOW, 0.6}, {60, SLOW, 0.6},
                 {60, SLOW, 0.8}, {60, MIXED, 0.8}, {16, TREND, 3},  {30, TREND, 3},
                 {60, TREND, 1},  {30, BURST, 40}};

    (void)state;
    seed = 2;
    for (size_t i = 0; i < sizeof cases / sizeof *cases; i++) {
        struct cover c = cover_of(cases[i].count, cases[i].kind, cases[i].r, 4000);
        print_message("noise %d of %.1f, %zu blocks: %.1f %% chi-squared\n", (int)cases[i].kind,
                      cases[i].r, cases[i].count, c.chi2);
        assert_true(c.chi2 >= 90);
    }
}

/* The same again as the formula for uncorrelated blocks would have it: it must fail, or the test
 * above proves nothing. */
static void naive_formula_fails(void **state)
{
    double complex z[MOST];
    int held = 0;

    (void)state;
    seed = 3;
    for (int k = 0; k < 2000; k++) {
        double complex sum = 0;
        double power = 0;
        simulate(z, 60, SLOW, 0.6);
        for (int i = 0; i < 60; i++)
            sum += z[i] / 60;
        for (int i = 0; i < 60; i++)
            power += cabs(z[i] - sum) * cabs(z[i] - sum) / 2 / 59;
        held += cabs(sum - 10) * cabs(sum - 10) / (power / 60) < 5.99146;
    }
    assert_true(held < 1500);
}

/* Points of F: Abramowitz & Stegun (1964), table 26.9. */
static void f_points(void **state)
{
    (void)state;
    assert_close(longrun_f_tail(3.48, 2, 5), 0.05, 2e-4);
    assert_close(longrun_f_tail(2.25, 2, 10), 0.10, 2e-4);
    assert_close(longrun_f_tail(2.59, 4, 8), 0.05, 2e-4);
    assert_close(longrun_f2_point(0.01, 5), 7.56, 0.005);
    assert_close(longrun_f2_point(0.05, 15), 3.32, 0.005);
    assert_close(longrun_f_tail(0, 3, 4), 1, 1e-15);
}

static void properties(void **state)
{
    double complex z[20], scaled[20];
    double turns[20], t[20], turn_size = 3.7;
    double complex turned = turn_size * cexp(I * 0.6);
    struct mean a, b;

    (void)state;
    seed = 7;
    simulate(z, 20, WHITE, 0);
    for (int i = 0; i < 20; i++) {
        turns[i] = 20 + i % 3;
        t[i] = i;
        scaled[i] = z[i] * turned;
    }
    assert_int_equal(mean_of_blocks(z, turns, t, 20, &a), 0);
    assert_int_equal(mean_of_blocks(scaled, turns, t, 20, &b), 0);
    assert_close(cabs(b.vector - a.vector * turned), 0, 1e-12);
    assert_close((b.cov[0] + b.cov[2]) / (a.cov[0] + a.cov[2]), turn_size * turn_size, 1e-9);
    assert_close(b.independent, a.independent, 1e-9);
    assert_close(b.phase_sd_deg, a.phase_sd_deg, 1e-9);
    assert_close(a.turns, 20 * 20 + 19, 0); /* 0 1 2 0 1 2 ... over 20 blocks is 19 */
}

static void few_blocks(void **state)
{
    double complex z[3] = {CMPLX(1, 2), CMPLX(1.1, 2), CMPLX(1, NAN)};
    double turns[3] = {4, 4, 4}, t[3] = {0, 1, 2};
    struct mean m;

    (void)state;
    assert_int_equal(mean_of_blocks(z, turns, t, 0, &m), -2);
    assert_int_equal(mean_of_blocks(z, turns, t, 1, &m), 0);
    assert_close(m.cov[0], 2.5, 1e-12); /* half of the squared amplitude, 1 + 4 */
    assert_true(isnan(m.amplitude_sd) && isnan(m.drift));
    assert_int_equal(mean_of_blocks(z, turns, t, 2, &m), 0);
    assert_true(m.cov[0] > 0.005 / 2 && m.cov[2] > 0);
    assert_int_equal(mean_of_blocks(z, turns, t, 3, &m), 0);
    assert_true(isnan(cimag(m.vector)) && isnan(m.cov[0]));
}

static void amplitudes_alone(void **state)
{
    double a[16], turns[16], t[16];
    struct mean m;

    (void)state;
    for (int i = 0; i < 16; i++) {
        a[i] = i % 2 ? 3.1 : 2.9;
        turns[i] = 10;
        t[i] = i;
    }
    assert_int_equal(mean_of_amplitudes(a, turns, t, 16, &m), 0);
    assert_close(creal(m.vector), 3, 1e-12);
    assert_true(isnan(m.phase_sd_deg));
    assert_close(m.cov[0], 0.01 * 16 / 15 / 16 * (1 - 1.1 / 16),
         1e-9); /* variance over n, with the header's c */
    assert_close(m.cov[0], m.cov[2], 0);
}

int main(void)
{
    const struct CMUnitTest tests[] = {
        cmocka_unit_test(covers_in_white_noise),
        cmocka_unit_test(covers_in_coloured_noise),
        cmocka_unit_test(naive_formula_fails),
        cmocka_unit_test(f_points),
        cmocka_unit_test(properties),
        cmocka_unit_test(few_blocks),
        cmocka_unit_test(amplitudes_alone),
    };
    return cmocka_run_group_tests(tests, NULL, NULL);
}
