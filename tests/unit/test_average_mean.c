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
enum noise { WHITE, SLOW, MIXED, TREND, BURST, BURSTS, UNEQUAL, SWING };

static void simulate(double complex *z, double *turns, size_t n, enum noise kind, double r)
{
    double complex x = normal();
    double phase = 6.283185307179586 * uniform();

    for (size_t i = 0; i < n; i++)
        turns[i] = kind != UNEQUAL ? 24 : uniform() < 0.5 ? 10 : 30;
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
        case BURSTS: /* a share r of them far off, each its own way */
            z[i] = uniform() < r ? 10 * w : w;
            break;
        case UNEQUAL: /* white over the turns: a longer block scatters less */
            z[i] = w * sqrt(20 / turns[i]);
            break;
        case SWING: /* one period in r of the run, to and fro, over a little white noise */
            z[i] = 0.2 * w +
                   1.4 * cos(6.283185307179586 * ((double)i + 0.5) / (r * (double)n) + phase);
            break;
        }
        x = r * x + sqrt(1 - r * r) * normal();
        z[i] += 10; /* the truth */
    }
}

struct cover {
    double chi2, hotelling; /* %, of the region from chi-squared, and from Hotelling's T2 */
    double size; /* of the standard error, over that of uncorrelated blocks of variance 1 (geometric
                    mean) */
};

static struct cover cover_of(size_t n, enum noise kind, double r, int times)
{
    /* T2 = 2(n-1)/(n-2) F(2, n-2) at 95 %; F's point in closed form for 2 degrees of freedom. */
    double m = (double)n - 2, t2 = 2 * (m + 1) / m * (m / 2 * (pow(0.05, -2 / m) - 1));
    double complex z[MOST];
    double turns[MOST], t[MOST];
    int chi2 = 0, hotelling = 0;
    double size = 0;

    for (size_t i = 0; i < n; i++)
        t[i] = (double)i + 0.5;
    for (int k = 0; k < times; k++) {
        struct mean mean;
        double det, q;
        double complex d;
        simulate(z, turns, n, kind, r);
        assert_int_equal(mean_of_blocks(z, turns, t, n, &mean), 0);
        d = mean.vector - 10;
        det = mean.cov[0] * mean.cov[2] - mean.cov[1] * mean.cov[1];
        q = (mean.cov[2] * creal(d) * creal(d) - 2 * mean.cov[1] * creal(d) * cimag(d) +
             mean.cov[0] * cimag(d) * cimag(d)) /
            det;
        chi2 += q < 5.99146;
        hotelling += q < t2;
        size += log((mean.cov[0] + mean.cov[2]) / 2 * (double)n) / 2 / times;
    }
    return (struct cover){100.0 * chi2 / times, 100.0 * hotelling / times, exp(size)};
}

/* White noise, also of bursts that are set aside and of blocks of unequal length: 93..97 % with
 * chi-squared, to which cov is made. Whoever reads it with Hotelling's T2 gets no more than a wider
 * region gives. A binomial standard error of 16,000 is 0.2 %, of 4,000 0.4 %. */
static void covers_in_white_noise(void **state)
{
    static const struct {
        size_t count;
        enum noise kind;
        double r;
        double hotelling; /* at most */
        int times;
    } cases[] = {
        {8, WHITE, 0, 100, 4000},     {12, WHITE, 0, 98.8, 4000},    {16, WHITE, 0, 97.8, 16000},
        {20, WHITE, 0, 97.6, 8000},   {30, WHITE, 0, 97.6, 4000},    {60, WHITE, 0, 97.2, 4000},
        {16, BURSTS, 0.05, 98, 4000}, {30, BURSTS, 0.1, 97.6, 4000}, {20, UNEQUAL, 0, 97.8, 4000}};

    (void)state;
    seed = 1;
    for (size_t i = 0; i < sizeof cases / sizeof *cases; i++) {
        struct cover c = cover_of(cases[i].count, cases[i].kind, cases[i].r, cases[i].times);
        print_message("white %d, %zu blocks: %.1f %% chi-squared, %.1f %% Hotelling, s.e. x %.2f\n",
                      (int)cases[i].kind, cases[i].count, c.chi2, c.hotelling, c.size);
        assert_true(c.chi2 >= 93 && c.chi2 <= 97);
        assert_true(c.hotelling <= cases[i].hotelling);
        assert_true(c.hotelling >= c.chi2);
        if (cases[i].kind == WHITE && cases[i].count >= 16) /* and at no great cost */
            assert_true(c.size < 1.2);
    }
}

/* Coloured noise and slow drift: at least 90 %, where the uncorrelated formula falls to 70 % and
 * less. 0.8 in 16 blocks is wander nearly as slow as the run: their mean is worth two blocks. The
 * last column bounds the price: the standard error over the true one is known from the spectrum,
 * (1+r)/(1-r) (any textbook on time series), and in the swing's case over that of uncorrelated
 * blocks: it comes round in the run. */
static void covers_in_coloured_noise(void **state)
{
    static const struct {
        size_t count;
        enum noise kind;
        double r, size;
    } cases[] = {{16, SLOW, 0.3, 1.4}, {20, SLOW, 0.3, 1.4}, {30, SLOW, 0.3, 1.4},
                 {60, SLOW, 0.3, 1.5}, {16, SLOW, 0.5, 1.6}, {20, SLOW, 0.5, 1.6},
                 {30, SLOW, 0.5, 1.6}, {60, SLOW, 0.5, 1.6}, {16, SLOW, 0.8, 1.5},
                 {20, SLOW, 0.8, 1.5}, {30, SLOW, 0.8, 1.5}, {60, SLOW, 0.8, 1.5},
                 {60, MIXED, 0.8, 0},  {16, TREND, 3, 0},    {30, TREND, 3, 0},
                 {60, TREND, 1, 0},    {30, BURST, 40, 0},   {17, SWING, 0.61, 0}};

    (void)state;
    seed = 2;
    for (size_t i = 0; i < sizeof cases / sizeof *cases; i++) {
        struct cover c = cover_of(cases[i].count, cases[i].kind, cases[i].r, 4000);
        print_message("noise %d of %.1f, %zu blocks: %.1f %% chi-squared, s.e. x %.2f\n",
                      (int)cases[i].kind, cases[i].r, cases[i].count, c.chi2, c.size);
        assert_true(c.chi2 >= 90);
        if (cases[i].size > 0)
            assert_true(c.size < cases[i].size * sqrt((1 + cases[i].r) / (1 - cases[i].r)));
        if (cases[i].kind == SWING)
            assert_true(c.size < 4);
    }
}

/* A memory of a third of the recording and more, or slow noise below white in a short one: mean.h
 * names what is held then. */
static void what_the_blocks_cannot_tell(void **state)
{
    static const struct {
        size_t count;
        enum noise kind;
        double r, held; /* %, as the header says */
    } cases[] = {{60, SLOW, 0.9, 90}, {16, SLOW, 0.9, 70}, {16, MIXED, 0.8, 78}};

    (void)state;
    seed = 4;
    for (size_t i = 0; i < sizeof cases / sizeof *cases; i++) {
        double held = cover_of(cases[i].count, cases[i].kind, cases[i].r, 2000).chi2;
        print_message("noise %d of %.2f, %zu blocks: %.1f %%\n", (int)cases[i].kind, cases[i].r,
                      cases[i].count, held);
        assert_true(fabs(held - cases[i].held) < 3); /* three binomial standard errors of 78 % */
    }
}

/* The same again as the formula for uncorrelated blocks would have it: it must fail, or the test
 * above proves nothing. */
static void naive_formula_fails(void **state)
{
    double complex z[MOST];
    double turns[MOST];
    int held = 0;

    (void)state;
    seed = 3;
    for (int k = 0; k < 2000; k++) {
        double complex sum = 0;
        double power = 0;
        simulate(z, turns, 60, SLOW, 0.6);
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
    assert_close(longrun_f_tail(5.79, 1, 2.5), 0.05, 2e-4); /* 5 degrees of freedom: a half b */
    assert_close(longrun_f_tail(4.12, 2, 3.5), 0.05, 2e-4);
}

static void properties(void **state)
{
    double complex z[20], scaled[20];
    double turns[20], t[20], turn_size = 3.7;
    double complex turned = turn_size * cexp(I * 0.6);
    struct mean a, b;

    (void)state;
    seed = 7;
    simulate(z, turns, 20, WHITE, 0);
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

/* Amplitudes of white noise scatter along one line: the interval of +-1.96 standard errors. From 6
 * blocks on their noise may also be slow, which costs more the fewer they are. The binomial
 * standard error of 4,000 is 0.35 %. */
static void covers_amplitudes_alone(void **state)
{
    static const struct {
        size_t count;
        int least, most; /* of 4000 */
    } cases[] = {{2, 3740, 3860}, {3, 3740, 3860}, {4, 3740, 3860},  {5, 3740, 3860},
                 {6, 3720, 3996}, {8, 3720, 3960}, {16, 3720, 3880}, {30, 3720, 3880}};
    double a[30], turns[30], t[30];

    (void)state;
    seed = 8;
    for (size_t k = 0; k < sizeof cases / sizeof *cases; k++) {
        int held = 0;
        for (int i = 0; i < 4000; i++) {
            struct mean m;
            for (size_t j = 0; j < cases[k].count; j++) {
                a[j] = 100 + creal(normal());
                turns[j] = 10;
                t[j] = (double)j;
            }
            assert_int_equal(mean_of_amplitudes(a, turns, t, cases[k].count, &m), 0);
            held += fabs(creal(m.vector) - 100) < 1.959964 * sqrt(m.cov[0]);
        }
        print_message("amplitudes, %zu blocks: %.1f %%\n", cases[k].count, held / 40.0);
        assert_true(held >= cases[k].least && held <= cases[k].most);
    }
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
    /* A sixteenth of the variance, 0.01 * 16/15, and what 15 degrees of freedom of t demand: 18 %
     * (2.131 against 1.960 in any table), more or less by half of that as the noise may have some
     * colour. */
    assert_true(m.cov[0] > 0.01 / 15 * 0.9 && m.cov[0] < 0.01 / 15 * 1.27);
    assert_close(m.cov[0], m.cov[2], 0);
}

/* Blocks by the thousand, as of a day, are averaged first: the same answer as of their means. */
static void many_blocks(void **state)
{
    static double complex z[5120], means[256];
    static double turns[5120], t[5120];
    struct mean m, coarse;

    (void)state;
    seed = 9;
    simulate(z, turns, 5120, WHITE, 0);
    for (int i = 0; i < 5120; i++) {
        t[i] = i;
        means[i / 20] += z[i] / 20;
    }
    assert_int_equal(mean_of_blocks(z, turns, t, 5120, &m), 0);
    assert_int_equal(mean_of_blocks(means, turns, t, 256, &coarse), 0);
    assert_close(cabs(m.vector - coarse.vector), 0, 1e-12);
    assert_close(m.cov[0], 1.0 / 5120, 0.15 / 5120); /* the truth; 256 batches know it to 4.4 % */
    assert_close(m.cov[0] / coarse.cov[0], 1, 0.2);
}

int main(void)
{
    const struct CMUnitTest tests[] = {
        cmocka_unit_test(covers_in_white_noise),
        cmocka_unit_test(covers_in_coloured_noise),
        cmocka_unit_test(what_the_blocks_cannot_tell),
        cmocka_unit_test(naive_formula_fails),
        cmocka_unit_test(f_points),
        cmocka_unit_test(properties),
        cmocka_unit_test(few_blocks),
        cmocka_unit_test(covers_amplitudes_alone),
        cmocka_unit_test(amplitudes_alone),
        cmocka_unit_test(many_blocks),
    };
    return cmocka_run_group_tests(tests, NULL, NULL);
}
