/* Quantiles of amplitudes against tables and SciPy, and coverage on simulated jobs. */
#include <setjmp.h>
#include <stdarg.h>
#include <stddef.h>
#include <stdint.h>
#include <cmocka.h>

#include <complex.h>
#include <math.h>
#include <string.h>

#include "base/angle.h"
#include "solve/correct.h"
#include "solve/forecast.h"
#include "solve/regress.h"
#include "solve/repeat.h"

static const double circle[3] = {1, 0, 1};

/* Rayleigh: closed form. Rice: scipy.stats.ncx2 (SciPy 1.10). */
static void test_circular_normal(void **state)
{
    (void)state;
    for (double p = 0.025; p < 1; p += 0.19)
        assert_true(fabs(forecast_quantile(0, circle, INFINITY, p) - sqrt(-2 * log(1 - p))) < 1e-4);
    static const double rice[][3] = {{3, 2.5, 0.24610159595577688},
                                     {10, 11.5, 0.9269361553704916},
                                     {0.5, 1.2, 0.4711511309055841},
                                     {100, 101, 0.8401378870951451}};
    for (size_t i = 0; i < 4; i++)
        for (double deg = 0; deg < 360; deg += 77)
            assert_true(
                fabs(forecast_within(angle_vector(rice[i][0], deg), circle, INFINITY, rice[i][1]) -
                     rice[i][2]) < 1e-5);
}

/* mean 2 - 1j, covariance [1.5 0.6; 0.6 0.8], radius 3: scipy.integrate.dblquad over
 * multivariate_normal and multivariate_t(df=8), SciPy 1.10. */
static void test_general_covariance(void **state)
{
    (void)state;
    static const double cov[3] = {1.5, 0.6, 0.8};
    assert_true(fabs(forecast_within(CMPLX(2, -1), cov, INFINITY, 3) - 0.717330991) < 1e-5);
    assert_true(fabs(forecast_within(CMPLX(2, -1), cov, 8, 3) - 0.689482752) < 1e-4);
}

/* |z|^2/2 of a central bivariate t is F(2, dof): scipy.stats.f.ppf. */
static void test_t_is_f(void **state)
{
    (void)state;
    static const double table[][3] = {{6, 0.22549918424391077, 3.8104739023014393},
                                      {8, 0.22538012877851274, 3.4812260591531485},
                                      {20, 0.22516609255822678, 2.9870572461602563}};
    for (size_t i = 0; i < 3; i++) {
        assert_true(fabs(forecast_quantile(0, circle, table[i][0], 0.025) - table[i][1]) < 1e-3);
        assert_true(fabs(forecast_quantile(0, circle, table[i][0], 0.975) - table[i][2]) < 5e-3);
    }
}

static void test_singular(void **state)
{
    (void)state;
    static const double none[3] = {0, 0, 0}, line[3] = {1, 0, 0}, bad[3] = {NAN, 0, 1};
    assert_true(forecast_within(3, none, INFINITY, 3) == 1);
    assert_true(forecast_within(3, none, INFINITY, 2.9) == 0);
    assert_true(forecast_quantile(3, none, INFINITY, 0.975) == 3);
    /* a line through the origin: |N(0,1)|, 95 % within 1.95996 (normal table) */
    assert_true(fabs(forecast_quantile(0, line, INFINITY, 0.95) - 1.95996) < 1e-2);
    assert_true(isnan(forecast_within(3, bad, INFINITY, 3)));
    assert_true(isnan(forecast_within(3, circle, INFINITY, NAN)));
}

/* ---- coverage: jobs drawn from the stated model ---- */

static double uniform(uint64_t *seed) /* (0, 1); multiplier of Knuth's MMIX generator */
{
    *seed = *seed * 6364136223846793005u + 1442695040888963407u;
    return ((double)(*seed >> 12) + 0.5) / 4503599627370496.0;
}

static double complex normal(uint64_t *seed) /* Box & Muller 1958; variance 1 per component */
{
    double r = sqrt(-2 * log(uniform(seed)));
    return angle_vector(r, 360 * uniform(seed));
}

#define SENSORS 2
#define SCATTER 0.03 /* of as found per component, also what the sheet says */

struct tally {
    int ranges, held, ellipses, inside;
};

/* 2 sensors, `planes` planes, as found (repeated or not), a trial each with an effect of `effect`
 * standard errors on sensor 0; the correction by least expected vibration; one more reading. */
static void draw(uint64_t *seed, size_t planes, double effect, int repeats, struct tally *tally)
{
    double complex truth[SENSORS][3], x[16] = {0}, y[SENSORS][8], w[2], ls[2], want[2];
    size_t runs = 1 + (size_t)repeats + planes;
    struct posterior rows[SENSORS];
    struct repeat_pool pool = {0};
    double cov[8][3], scale[SENSORS], dof, ellipse[16];
    static const double none[8][3] = {{0}};
    for (size_t p = 0; p < planes; p++)
        x[(runs - planes + p) * planes + p] = angle_vector(1, 360 * uniform(seed));
    for (size_t s = 0; s < SENSORS; s++) {
        truth[s][0] = angle_vector(1 + uniform(seed), 360 * uniform(seed));
        for (size_t p = 0; p < planes; p++)
            truth[s][p + 1] = angle_vector(
                effect * 2 * SCATTER * cabs(truth[s][0]) * (s == p ? 1 : 0.4), 360 * uniform(seed));
        for (size_t i = 0; i < runs; i++) {
            y[s][i] = truth[s][0] + SCATTER * cabs(truth[s][0]) * normal(seed);
            for (size_t p = 0; p < planes; p++)
                y[s][i] += truth[s][p + 1] * x[i * planes + p];
        }
        double complex mean = 0;
        for (int i = 0; i <= repeats; i++)
            mean += cabs(y[s][i]) / (repeats + 1);
        scale[s] = 1 / cabs(mean);
        repeat_add(&pool, y[s], none, (size_t)repeats + 1, cabs(mean));
    }
    double sigma = repeat_estimate(&pool, SCATTER, &dof);
    double complex sum[9] = {0}, form[9];
    for (size_t s = 0; s < SENSORS; s++) {
        double v = sigma * sigma / (scale[s] * scale[s]);
        for (size_t i = 0; i < runs; i++)
            memcpy(cov[i], (double[3]){v, 0, v}, sizeof cov[i]);
        struct regress_data data = {.count = runs, .planes = planes, .y = y[s], .x = x,
                                    .cov = (const double(*)[3])cov, .scale = 1 / scale[s]};
        assert_int_equal(regress_fit(&data, &rows[s]), REGRESS_OK);
        rows[s].dof = dof;
        posterior_forms(&rows[s], scale[s], form, NULL);
        for (size_t i = 0; i < (planes + 1) * (planes + 1); i++)
            sum[i] += form[i];
    }
    assert_int_equal(correct_quadratic(sum, planes, w), CORRECT_OK);
    for (size_t s = 0; s < SENSORS; s++) {
        double v[3], scatter = sigma / scale[s];
        double complex after = posterior_predict(&rows[s], w, v), next = truth[s][0];
        for (size_t p = 0; p < planes; p++)
            next += truth[s][p + 1] * w[p];
        next += SCATTER * cabs(truth[s][0]) * normal(seed);
        v[0] += scatter * scatter;
        v[2] += scatter * scatter;
        double below = forecast_within(after, v, dof, cabs(next));
        tally->held += below > 0.025 && below < 0.975;
        tally->ranges++;
    }
    if (planes == SENSORS) { /* the true ideal weight is then known: it nulls both sensors */
        double complex det = truth[0][1] * truth[1][2] - truth[0][2] * truth[1][1];
        want[0] = -(truth[0][0] * truth[1][2] - truth[0][2] * truth[1][0]) / det;
        want[1] = -(truth[0][1] * truth[1][0] - truth[0][0] * truth[1][1]) / det;
        assert_int_equal(correct_least_squares(rows, scale, SENSORS, planes, ls), CORRECT_OK);
        assert_int_equal(correct_covariance(rows, scale, SENSORS, planes, ls, ellipse), CORRECT_OK);
        for (size_t p = 0; p < planes; p++) {
            double a = ellipse[8 * p + 2 * p], b = ellipse[8 * p + 2 * p + 1];
            double c = ellipse[8 * p + 4 + 2 * p + 1];
            double re = creal(want[p] - ls[p]), im = cimag(want[p] - ls[p]);
            double d2 = (c * re * re - 2 * b * re * im + a * im * im) / (a * c - b * b);
            /* chi-square with 2 degrees of freedom, 95 %: 5.9915 (table) */
            tally->inside += d2 < 5.9915;
            tally->ellipses++;
        }
    }
    for (size_t s = 0; s < SENSORS; s++)
        posterior_release(&rows[s]);
}

static double campaign(size_t planes, double least, double most, int repeats, double *ellipses)
{
    struct tally tally = {0};
    uint64_t seed = 2024 + planes;
    for (int i = 0; i < 600; i++)
        draw(&seed, planes, least + (most - least) * uniform(&seed), i % 2 ? repeats : 0, &tally);
    if (ellipses)
        *ellipses = (double)tally.inside / tally.ellipses;
    return (double)tally.held / tally.ranges;
}

/* The bars: forecasts hold 93-97 %; ellipses 93-97 % where the effect is large, 93 % or more below.
 */
static void test_coverage(void **state)
{
    (void)state;
    double ellipses, held = campaign(1, 5, 50, 1, NULL);
    print_message("one plane: ranges hold %.3f\n", held);
    assert_true(held > 0.93 && held < 0.97);
    held = campaign(2, 20, 50, 0, &ellipses);
    print_message("two planes, large effects: ranges hold %.3f, ellipses %.3f\n", held, ellipses);
    assert_true(held > 0.93 && held < 0.97);
    assert_true(ellipses > 0.93 && ellipses < 0.97);
    held = campaign(2, 5, 20, 2, &ellipses);
    print_message("two planes, small effects: ranges hold %.3f, ellipses %.3f\n", held, ellipses);
    assert_true(held > 0.93 && held < 0.97);
    assert_true(ellipses > 0.93);
}

int main(void)
{
    const struct CMUnitTest tests[] = {
        cmocka_unit_test(test_circular_normal), cmocka_unit_test(test_general_covariance),
        cmocka_unit_test(test_t_is_f),          cmocka_unit_test(test_singular),
        cmocka_unit_test(test_coverage),
    };
    return cmocka_run_group_tests(tests, NULL, NULL);
}
