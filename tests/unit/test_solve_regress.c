/* Regression and corrections against textbook examples and constructed exact sets. */
#include <setjmp.h>
#include <stdarg.h>
#include <stddef.h>
#include <stdint.h>
#include <cmocka.h>

#include <complex.h>
#include <math.h>
#include <stdlib.h>
#include <string.h>

#include "base/angle.h"
#include "solve/chebyshev.h"
#include "solve/correct.h"
#include "solve/regress.h"
#include "solve/repeat.h"

static double complex at(double amplitude, double deg)
{
    return angle_vector(amplitude, deg);
}

static void assert_vector(double complex z, double amplitude, double deg,
                          double amplitude_tolerance, double deg_tolerance)
{
    assert_true(fabs(cabs(z) - amplitude) < amplitude_tolerance);
    assert_true(fabs(angle_wrap_180(angle_of(z) - deg)) < deg_tolerance);
}

/* Exact readings: fits one row. */
static struct posterior fit(size_t count, size_t planes, const double complex *y,
                            const double complex *x)
{
    static const double none[16][3] = {{0}};
    struct regress_data data = {.count = count, .planes = planes, .y = y, .x = x, .cov = none, .scale = cabs(y[0])};
    struct posterior p;
    assert_int_equal(regress_fit(&data, &p), REGRESS_OK);
    return p;
}

/* One plane, as found and one trial run. */
static double complex one_plane(double complex o, double complex w, double complex ot)
{
    double complex y[2] = {o, ot}, x[2] = {0, w}, answer;
    double scale = 1;
    struct posterior p = fit(2, 1, y, x);
    assert_int_equal(correct_least_squares(&p, &scale, 1, 1, &answer), CORRECT_OK);
    double complex form[4], ideal;
    posterior_forms(&p, 1, form, NULL);
    assert_int_equal(correct_quadratic(form, 1, &ideal), CORRECT_OK);
    assert_true(cabs(ideal - answer) <
                1e-6 * cabs(answer)); /* exact: both are the classical answer */
    posterior_release(&p);
    return answer;
}

/* R. B. McMillan, Rotating Machinery: Practical Solutions to Unbalance and Misalignment (Fairmont
 * Press), ch. 5: 3.5 mil at 60, with 5 oz 5.0 mil at 120. Printed: 79 deg, read off a protractor
 * (its tolerance is 3 deg); exact by arithmetic: 3.9378 oz, 77.00 deg from the trial weight. */
static void test_one_plane_mcmillan(void **state)
{
    (void)state;
    double complex w = one_plane(at(3.5, 60), 5, at(5, 120));
    assert_true(fabs(cabs(w) - 3.9378) < 1e-4);
    assert_true(fabs(fabs(angle_wrap_180(angle_of(w))) - 79) < 3);
    assert_true(fabs(fabs(angle_wrap_180(angle_of(w))) - 76.9961) < 1e-3);
}

/* S. S. Rao, Mechanical Vibrations, ch. 9, unbalanced flywheel and grinding wheel (statements as
 * printed; answers by arithmetic: a printed web answer to the first, 6.491 g at 18.672 deg, leaves
 * the wheel unbalanced and must not come out). */
static void test_one_plane_rao(void **state)
{
    (void)state;
    assert_vector(one_plane(at(0.165, -15), at(50, 45), at(0.225, 35)), 47.534, 128.26, 1e-3, 0.01);
    assert_vector(one_plane(at(6.5, -15), at(2, 45), at(8.8, 35)), 1.9135, 127.87, 1e-4, 0.01);
    assert_vector(one_plane(at(0.2, 40), at(0.2, -65), at(0.5, 150)), 0.066815, 346.7, 1e-6, 0.05);
}

/* S. S. Rao, Mechanical Vibrations, ch. 9, two-plane turbine rotor: 10.0561 at 325.55 deg
 * left, 5.8774 at 68.26 deg right (values from memory, recomputed independently). */
static void turbine(int sign, double complex left_stays, double complex w[2])
{
    double complex x[6] = {0, 0, at(10, 270), 0, left_stays, at(12, 180)};
    double complex a[3] = {at(8.5, 60 * sign), at(6, 125 * sign), at(6, 35 * sign)};
    double complex b[3] = {at(6.5, 205 * sign), at(4.5, 230 * sign), at(10.5, 160 * sign)};
    struct posterior rows[2] = {fit(3, 2, a, x), fit(3, 2, b, x)};
    double scale[2] = {1, 1};
    assert_int_equal(correct_least_squares(rows, scale, 2, 2, w), CORRECT_OK);
    posterior_release(&rows[0]);
    posterior_release(&rows[1]);
}

static void test_two_plane_turbine(void **state)
{
    (void)state;
    double complex w[2];
    turbine(1, 0, w);
    assert_vector(w[0], 10.0561, 325.55, 5e-5, 5e-3);
    assert_vector(w[1], 5.8774, 68.26, 5e-5, 5e-3);
}

/* Negative controls, by algebra: lag read as lead mirrors the answer about the trial weights (angle
 * 2*trial - right); the same readings with the left weight stated as still on in the right run give
 * left + (W_L/W_R)*right: 5.387 at 314.02. */
static void test_two_plane_wrong_statements(void **state)
{
    (void)state;
    double complex w[2];
    turbine(-1, 0, w);
    assert_vector(w[0], 10.0561, 214.45, 5e-5, 5e-3);
    assert_vector(w[1], 5.8774, 291.74, 5e-5, 5e-3);
    turbine(1, at(10, 270), w);
    assert_vector(w[0], 5.3869, 314.02, 5e-5, 5e-3);
    assert_vector(w[1], 5.8774, 68.26, 5e-5, 5e-3);
}

/* Condition number with columns at unit length: NumPy 1.24 svd gives 2.27258 for the turbine. */
static void test_condition(void **state)
{
    (void)state;
    double complex x[6] = {0, 0, at(10, 270), 0, 0, at(12, 180)}, weak[2];
    double complex a[3] = {at(8.5, 60), at(6, 125), at(6, 35)};
    double complex b[3] = {at(6.5, 205), at(4.5, 230), at(10.5, 160)};
    struct posterior rows[2] = {fit(3, 2, a, x), fit(3, 2, b, x)};
    double se[2] = {1, 1}, condition;
    assert_int_equal(correct_condition(rows, se, 2, 2, &condition, weak), CORRECT_OK);
    assert_true(fabs(condition - 2.272580) < 1e-5);
    assert_int_equal(correct_condition(rows, se, 1, 2, &condition, weak), CORRECT_OK);
    assert_true(isinf(condition));
    /* planes exactly alike: the pattern that is not seen has equal and opposite weights */
    for (int r = 0; r < 2; r++)
        rows[r].mean[2] = rows[r].mean[1];
    assert_int_equal(correct_condition(rows, se, 2, 2, &condition, weak), CORRECT_OK);
    assert_true(condition > 1e12);
    assert_true(cabs(weak[0] + weak[1]) < 1e-9);
    posterior_release(&rows[0]);
    posterior_release(&rows[1]);
}

/* A constructed set: three planes, four sensors at two speeds (amplitude, deg). */
static const double responses[8][3][2] = {
    {{0.42, 35}, {0.18, 80}, {0.11, 210}},  {{0.3, 60}, {0.37, 20}, {0.16, 300}},
    {{0.12, 140}, {0.33, 345}, {0.39, 40}}, {{0.09, 250}, {0.21, 110}, {0.45, 15}},
    {{0.65, 120}, {0.4, 150}, {0.25, 260}}, {{0.52, 100}, {0.58, 95}, {0.31, 10}},
    {{0.28, 200}, {0.55, 70}, {0.6, 110}},  {{0.19, 310}, {0.36, 175}, {0.71, 90}}};
static const double found[8][2] = {{31, 200}, {24, 150}, {28, 95},  {35, 40},
                                   {52, 310}, {47, 255}, {60, 180}, {44, 120}};
static const double exact[8][2] = {{4.19183, 270.3724},  {3.450451, 6.2355},   {2.358297, 148.9274},
                                   {9.10964, 138.6982},  {7.825742, 357.7551}, {2.703801, 100.6097},
                                   {3.003722, 200.1432}, {14.671373, 208.9517}};

static void known_rows(const double vibration[8][2], struct posterior rows[8])
{
    for (int r = 0; r < 8; r++) {
        assert_int_equal(posterior_init(&rows[r], 4), 0);
        rows[r].mean[0] = at(vibration[r][0], vibration[r][1]);
        for (int p = 0; p < 3; p++)
            rows[r].mean[p + 1] = at(responses[r][p][0], responses[r][p][1]);
    }
}

static void release_rows(struct posterior rows[8])
{
    for (int r = 0; r < 8; r++)
        posterior_release(&rows[r]);
}

/* Expected values: computed outside by normal equations in NumPy; method Goodman, ASME J. Eng. Ind.
 * 86 (1964) 273-279. */
static void test_least_squares_three_planes(void **state)
{
    (void)state;
    static const double residual[8] = {9.65898,  17.14149, 12.78141, 10.28459,
                                       20.25056, 16.56515, 5.15368,  7.38832};
    struct posterior rows[8];
    double scale[8] = {1, 1, 1, 1, 1, 1, 1, 1}, cov[3];
    double complex w[3];
    known_rows(found, rows);
    assert_int_equal(correct_least_squares(rows, scale, 8, 3, w), CORRECT_OK);
    assert_vector(w[0], 31.12991, 331.092, 1e-4, 1e-3);
    assert_vector(w[1], 61.59819, 331.161, 1e-4, 1e-3);
    assert_vector(w[2], 73.35355, 221.289, 1e-4, 1e-3);
    for (int r = 0; r < 8; r++)
        assert_true(fabs(cabs(posterior_predict(&rows[r], w, cov)) - residual[r]) < 1e-4);
    for (int r = 4; r < 8; r++)
        scale[r] = 0.5;
    assert_int_equal(correct_least_squares(rows, scale, 8, 3, w), CORRECT_OK);
    assert_vector(w[0], 40.22679, 314.737, 1e-4, 1e-3);
    assert_vector(w[1], 52.42052, 326.29, 1e-4, 1e-3);
    assert_vector(w[2], 73.33075, 220.165, 1e-4, 1e-3);
    release_rows(rows);
}

/* Expected value: bracketed from both sides by linear-programming cutting planes, outside. */
static void test_worst_three_planes(void **state)
{
    (void)state;
    struct posterior rows[8];
    double scale[8] = {1, 1, 1, 1, 1, 1, 1, 1}, largest;
    double complex w[3], forms[8 * 16];
    known_rows(found, rows);
    assert_int_equal(correct_least_squares(rows, scale, 8, 3, w), CORRECT_OK);
    for (int r = 0; r < 8; r++)
        posterior_forms(&rows[r], 1, forms + 16 * r, NULL);
    assert_int_equal(chebyshev_solve(forms, 8, 3, w, &largest), CHEBYSHEV_OK);
    assert_true(fabs(sqrt(largest) - 15.197085) < 2e-6);
    assert_vector(w[0], 24.2644, 336.656, 5e-3, 0.01);
    assert_vector(w[1], 67.9784, 330.966, 5e-3, 0.01);
    assert_vector(w[2], 67.5743, 225.042, 5e-3, 0.01);
    release_rows(rows);
}

/* The vibrations that weights 12 at 40, 7 at 200 and 15 at 310 null exactly (constructed). */
static void test_exact_recovery(void **state)
{
    (void)state;
    struct posterior rows[8];
    double scale[8] = {1, 1, 1, 1, 1, 1, 1, 1}, largest;
    double complex w[3], forms[8 * 16];
    known_rows(exact, rows);
    assert_int_equal(correct_least_squares(rows, scale, 8, 3, w), CORRECT_OK);
    assert_vector(w[0], 12, 40, 1e-4, 1e-3);
    assert_vector(w[1], 7, 200, 1e-4, 1e-3);
    assert_vector(w[2], 15, 310, 1e-4, 1e-3);
    for (int r = 0; r < 8; r++)
        posterior_forms(&rows[r], 1, forms + 16 * r, NULL);
    assert_int_equal(chebyshev_solve(forms, 8, 3, w, &largest), CHEBYSHEV_OK);
    assert_vector(w[0], 12, 40, 1e-4, 1e-3);
    release_rows(rows);
}

/* Residual of a correction that is perfect but for its angle: 2 sin(d/2) (well-known table). */
static void test_angle_error(void **state)
{
    (void)state;
    static const double table[][2] = {{1, 0.0175},  {2, 0.0349},  {5, 0.0872}, {10, 0.1743},
                                      {15, 0.2611}, {30, 0.5176}, {60, 1.0},   {90, 1.4142}};
    double complex y[2] = {at(7, 33), at(9, 120)}, x[2] = {0, at(4, 210)};
    struct posterior p = fit(2, 1, y, x);
    double complex w = one_plane(y[0], x[1], y[1]);
    for (size_t i = 0; i < 8; i++) {
        double cov[3];
        double complex turned = w * at(1, table[i][0]);
        assert_true(fabs(cabs(posterior_predict(&p, &turned, cov)) / 7 - table[i][1]) < 6e-5);
    }
    posterior_release(&p);
}

static double uniform(uint64_t *seed) /* -1..1; multiplier of Knuth's MMIX generator */
{
    *seed = *seed * 6364136223846793005u + 1442695040888963407u;
    return (double)(*seed >> 11) / 4503599627370496.0 - 1;
}

static double complex random_vector(uint64_t *seed)
{
    double re = uniform(seed);
    return CMPLX(re, uniform(seed));
}

/* predict(solve(x)) == x: random systems, weights in any combination, runs in any order. */
static void test_recovers_random_systems(void **state)
{
    (void)state;
    uint64_t seed = 12345;
    for (int trial = 0; trial < 100; trial++) {
        size_t planes = 1 + (size_t)trial % 4, runs = planes + 1 + (size_t)trial % 3;
        double complex truth[5], x[32], y[8], w[4], back = 0;
        for (size_t k = 0; k <= planes; k++)
            truth[k] = random_vector(&seed);
        for (size_t i = 0; i < runs; i++) {
            y[i] = truth[0];
            for (size_t k = 0; k < planes; k++) {
                x[i * planes + k] = random_vector(&seed);
                y[i] += truth[k + 1] * x[i * planes + k];
            }
        }
        struct posterior p = fit(runs, planes, y, x);
        assert_int_equal(p.rank, planes + 1);
        for (size_t k = 0; k <= planes; k++)
            assert_true(cabs(p.mean[k] - truth[k]) < 1e-7);
        double one = 1, cov[3];
        assert_int_equal(correct_least_squares(&p, &one, 1, planes, w), CORRECT_OK);
        back = posterior_predict(&p, w, cov);
        assert_true(cabs(back) < 1e-9); /* one sensor can always be nulled */
        /* moving the origin to x0 and asking for nothing more gives the reading at x0 */
        assert_int_equal(posterior_rebase(&p, x), 0);
        assert_true(cabs(p.mean[0] - y[0]) < 1e-7);
        posterior_release(&p);
    }
}

/* Turning the mark (all weights by t, the lags with it) turns the answer by t. */
static void test_turning_turns_the_answer(void **state)
{
    (void)state;
    double complex w = one_plane(at(3, 10), at(5, 40), at(4, 77));
    double complex turned = one_plane(at(3, 10), at(5, 40 + 25), at(4, 77));
    assert_true(cabs(turned - w * at(1, 25)) < 1e-6);
}

/* Mixed exact and scattered readings: weights follow the variances (weighted mean, by hand:
 * readings 1 and 2 of variance 1 and 3 give 1.25). */
static void test_weights_follow_variances(void **state)
{
    (void)state;
    double complex y[2] = {1, 2};
    static const double cov[2][3] = {{1, 0, 1}, {3, 0, 3}};
    struct regress_data data = {.count = 2, .planes = 0, .y = y, .x = y, .cov = cov, .scale = 1};
    struct posterior p;
    size_t which = 9;
    double own[3];
    assert_int_equal(regress_fit(&data, &p), REGRESS_OK);
    assert_true(fabs(creal(p.mean[0]) - 1.25) < 1e-12);
    posterior_marginal(&p, 0, own);
    assert_true(fabs(own[0] - 0.75) < 1e-12 && fabs(own[2] - 0.75) < 1e-12);
    /* each residual over its standard error: |0.25|/sqrt(2 (1 - 0.75)) = |0.75|/sqrt(2 (3 - 0.75))
     */
    assert_true(fabs(regress_misfit(&data, &p, &which) - 0.353553) < 1e-6);
    posterior_release(&p);
}

/* A covariance that is not circular: generalised least squares by hand. Reading 1
 * sees only the real part (variance 1, imaginary 1e6), reading 2 only the imaginary. */
static void test_covariances_need_not_be_circular(void **state)
{
    (void)state;
    double complex y[2] = {CMPLX(5, -100), CMPLX(300, 7)};
    static const double cov[2][3] = {{1, 0, 1e8}, {1e8, 0, 1}};
    struct regress_data data = {.count = 2, .planes = 0, .y = y, .x = y, .cov = cov, .scale = 1};
    struct posterior p;
    assert_int_equal(regress_fit(&data, &p), REGRESS_OK);
    assert_true(cabs(p.mean[0] - CMPLX(5, 7)) < 1e-4);
    posterior_release(&p);
}

static void test_rank(void **state)
{
    (void)state;
    double complex x[8] = {0, 0, 1, 0, 0, 0, 2, 0}, y[4] = {1, 2, 1, 3},
                   both[6] = {0, 0, 1, 2, 2, 4};
    assert_int_equal(regress_rank(2, 2, x, NULL), 2);
    assert_int_equal(regress_rank(0, 2, x, NULL), 0);
    assert_int_equal(regress_rank(3, 2, both, NULL), 2);
    struct posterior p = fit(4, 2, y, x); /* no run on plane 1 */
    assert_int_equal(p.rank, 2);
    assert_true(p.known[0] && p.known[1] && !p.known[2]);
    assert_true(cabs(p.mean[1] - 1) < 1e-9);
    posterior_release(&p);
    y[0] = NAN;
    static const double none[4][3] = {{0}};
    struct regress_data data = {.count = 4, .planes = 2, .y = y, .x = x, .cov = none, .scale = 1};
    assert_int_equal(regress_fit(&data, &p), REGRESS_NAN);
}

/* Static and couple parts of the turbine answer: W_s = (L + R)/2, W_c = (L - R)/2 (identities; e.g.
 * J. J. Yu, ASME J. Eng. Gas Turbines Power 131(1), 2009, treats the relation): 5.2364 at
 * 358.75, 6.3573 at 298.75 (arithmetic). */
static void test_static_and_couple(void **state)
{
    (void)state;
    double complex w[2];
    turbine(1, 0, w);
    assert_vector((w[0] + w[1]) / 2, 5.2364, 358.75, 1e-4, 0.01);
    assert_vector((w[0] - w[1]) / 2, 6.3573, 298.75, 1e-4, 0.01);
}

/* Uncertain responses do not drive large weights: with variance v on A the least expected vibration
 * of one row is at -conj(A) Z0/(|A|^2 + v) (by differentiation). */
static void test_uncertain_response_shrinks(void **state)
{
    (void)state;
    struct posterior p;
    assert_int_equal(posterior_init(&p, 2), 0);
    p.mean[0] = 2;
    p.mean[1] = CMPLX(0, 1);
    p.cov[2 * 4 + 2] = p.cov[3 * 4 + 3] = 0.25; /* complex variance 0.5 */
    double complex form[4], w;
    posterior_forms(&p, 1, form, NULL);
    assert_int_equal(correct_quadratic(form, 1, &w), CORRECT_OK);
    assert_true(cabs(w - CMPLX(0, 2 / 1.5)) < 1e-9);
    assert_true(fabs(correct_value(form, 1, &w) - (4 - 4 / 1.5)) < 1e-9);
    posterior_release(&p);
}

/* Scatter from repeats: deviations known by hand. Two readings 2 apart: 2 real degrees of freedom,
 * sum of squares 2, variance per component 1; readings' own variance is taken off. */
static void test_repeat(void **state)
{
    (void)state;
    struct repeat_pool pool = {0};
    double dof, complex_pair[2][3] = {{0.25, 0, 0.25}, {0.25, 0, 0.25}};
    static const double none[2][3] = {{0}};
    double complex y[2] = {10, 12};
    assert_true(repeat_estimate(&pool, 0.03, &dof) == 0.03 && isinf(dof));
    repeat_add(&pool, y, none, 1, 10);
    assert_true(isinf((repeat_estimate(&pool, 0.03, &dof), dof)));
    repeat_add(&pool, y, none, 2, 10);
    double with = repeat_estimate(&pool, 0.03, &dof);
    assert_true(dof == 2 + REPEAT_PRIOR_DOF);
    assert_true(fabs(with * with * dof - (0.02 + REPEAT_PRIOR_DOF * 0.0009)) < 1e-12);
    struct repeat_pool less = {0};
    repeat_add(&less, y, (const double(*)[3])complex_pair, 2, 10);
    assert_true(fabs(less.squares - 0.02) < 1e-12 && fabs(less.explained - 0.005) < 1e-12);
}

/* One reading and a prior of the same weight: the textbook's mean of two normal estimates, (a/va +
 * b/vb)/(1/va + 1/vb), variance 1/(1/va + 1/vb). */
static void test_prior(void **state)
{
    (void)state;
    double complex y[2] = {at(8, 40), 0}, x[2] = {0, 0.05};
    double complex seen = at(60, 200), stored = at(66, 205);
    y[1] = y[0] + x[1] * seen;
    static const double cov[2][3] = {{1e-12, 0, 1e-12}, {0.04, 0, 0.04}};
    double per_kg = 0.04 / (0.05 * 0.05);
    const double prior_cov[1][3] = {{per_kg / 3, 0, per_kg / 3}};
    size_t plane = 0;
    struct regress_data data = {.count = 2, .planes = 1, .y = y, .x = x, .cov = cov, .scale = 8,
                                .prior_count = 1, .prior_plane = &plane, .prior = &stored,
                                .prior_cov = prior_cov};
    struct posterior p;
    assert_int_equal(regress_fit(&data, &p), REGRESS_OK);
    double complex wanted = (seen + 3 * stored) / 4;
    assert_true(cabs(p.mean[1] - wanted) < 1e-6 * cabs(wanted));
    double got[3];
    posterior_marginal(&p, 1, got);
    assert_true(fabs(got[0] / (per_kg / 4) - 1) < 1e-6 && fabs(got[2] / (per_kg / 4) - 1) < 1e-6);
    posterior_release(&p);
    /* as found alone: the prior is the answer, and nothing is left to find */
    data.count = 1;
    assert_int_equal(regress_fit(&data, &p), REGRESS_OK);
    assert_int_equal(p.rank, 2);
    assert_true(p.known[0] && p.known[1]);
    assert_true(cabs(p.mean[1] - stored) < 1e-9 * cabs(stored));
    assert_true(cabs(p.mean[0] - y[0]) < 1e-9);
    posterior_release(&p);
    const bool held[2] = {true, false};
    const double complex bare[2] = {0, 0};
    assert_int_equal(regress_rank(1, 2, bare, held), 2);
    assert_int_equal(regress_rank(1, 2, bare, NULL), 1);
}

int main(void)
{
    const struct CMUnitTest tests[] = {
        cmocka_unit_test(test_one_plane_mcmillan),
        cmocka_unit_test(test_one_plane_rao),
        cmocka_unit_test(test_two_plane_turbine),
        cmocka_unit_test(test_two_plane_wrong_statements),
        cmocka_unit_test(test_condition),
        cmocka_unit_test(test_least_squares_three_planes),
        cmocka_unit_test(test_worst_three_planes),
        cmocka_unit_test(test_exact_recovery),
        cmocka_unit_test(test_angle_error),
        cmocka_unit_test(test_recovers_random_systems),
        cmocka_unit_test(test_turning_turns_the_answer),
        cmocka_unit_test(test_weights_follow_variances),
        cmocka_unit_test(test_covariances_need_not_be_circular),
        cmocka_unit_test(test_rank),
        cmocka_unit_test(test_static_and_couple),
        cmocka_unit_test(test_uncertain_response_shrinks),
        cmocka_unit_test(test_repeat),
        cmocka_unit_test(test_prior),
    };
    return cmocka_run_group_tests(tests, NULL, NULL);
}
