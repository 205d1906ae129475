/* Circular statistics against published data sets. Tolerances are half of the last digit published.
 */
#include <setjmp.h>
#include <stdarg.h>
#include <stddef.h>
#include <stdint.h>

#include <cmocka.h>

#include "close_to.h"

#include <math.h>

#include "average/circular.h"

#define COUNT(array) (sizeof(array) / sizeof *(array))
#define MOST 128

/* The statistics of directions in degrees, each so many times; NULL: once. */
static struct circular summary(const double *deg, const double *times, size_t count)
{
    double complex z[MOST];
    size_t n = 0;

    for (size_t i = 0; i < count; i++)
        for (int k = 0; k < (times ? (int)times[i] : 1); k++) {
            assert_true(n < MOST);
            z[n++] = cexp(I * deg[i] * 3.14159265358979323846 / 180);
        }
    return circular_of_vectors(z, n);
}

/* J. H. Zar, Biostatistical Analysis, 5th ed. (2010), examples 26.2 and 26.4: mean 99 deg, r
 * 0.82522, angular deviation 34 deg, circular standard deviation 36 deg. */
static void eight_directions(void **state)
{
    static const double deg[] = {45, 55, 81, 96, 110, 117, 132, 154};
    struct circular c = summary(deg, NULL, COUNT(deg));

    (void)state;
    assert_close(c.mean_deg, 99, 0.5);
    assert_close(c.resultant, 0.82522, 5e-6);
    assert_close(c.deviation_deg, 34, 0.5);
    assert_close(c.sd_deg, 36, 0.5);
}

/* Zar (2010), examples 26.3 and 26.5, grouped in 30 deg: mean 162 deg, r 0.55064, deviation 54 deg,
 * circular standard deviation 63 deg, without correction for grouping. */
static void grouped_directions(void **state)
{
    static const double frequency[12] = {0, 6, 9, 13, 15, 22, 17, 12, 8, 3, 0, 0};
    double deg[12];
    struct circular c;

    (void)state;
    for (int i = 0; i < 12; i++)
        deg[i] = 15 + 30 * i;
    c = summary(deg, frequency, COUNT(deg));
    assert_close(c.mean_deg, 162, 0.5);
    assert_close(c.resultant, 0.55064, 1e-5); /* the book rounds sums on the way */
    assert_close(c.deviation_deg, 54, 0.5);
    assert_close(c.sd_deg, 63, 0.5);
}

/* K. V. Mardia and P. E. Jupp, Directional Statistics (2000), example 1.1, a roulette wheel: mean
 * 51 deg, R 0.711, circular variance 0.289. */
static void roulette(void **state)
{
    static const double deg[] = {43, 45, 52, 61, 75, 88, 88, 279, 357};
    struct circular c = summary(deg, NULL, COUNT(deg));

    (void)state;
    assert_close(c.mean_deg, 51, 0.5);
    assert_close(c.resultant, 0.711, 5e-4);
    assert_close(c.variance, 0.289, 5e-4);
}

/* N. I. Fisher, Statistical Analysis of Circular Data (1993), appendix B.3, 76 turtles after
 * Stephens (1969): mean 64.2 deg, R 0.497 (results and the last ten directions: value from memory).
 */
static void turtles(void **state)
{
    static const double deg[] = {8,   9,   13,  13,  14,  18,  22,  27,  30,  34,  38,  38,  40,
                                 44,  45,  47,  48,  48,  48,  48,  50,  53,  56,  57,  58,  58,
                                 61,  63,  64,  64,  64,  65,  65,  68,  70,  73,  78,  78,  78,
                                 83,  83,  88,  88,  88,  90,  92,  92,  93,  95,  96,  98,  100,
                                 103, 106, 113, 118, 138, 153, 153, 155, 204, 215, 223, 226, 237,
                                 238, 243, 244, 250, 251, 257, 268, 285, 319, 343, 350};
    struct circular c = summary(deg, NULL, COUNT(deg));

    (void)state;
    assert_int_equal(COUNT(deg), 76);
    assert_close(c.mean_deg, 64.2, 0.05);
    assert_close(c.resultant, 0.497, 5e-4);
}

/* Across north: the published test value of SciPy's circular mean, 0.167690146 deg. */
static void across_north(void **state)
{
    static const double deg[] = {355, 5, 2, 359, 10, 350};
    struct circular c = summary(deg, NULL, COUNT(deg));
    double complex z[COUNT(deg)];

    (void)state;
    assert_close(c.mean_deg, 0.167690146, 5e-10);
    for (size_t i = 0; i < COUNT(deg); i++) /* of any length: directions alone count */
        z[i] = (double)(i + 1) * cexp(I * deg[i] * 3.14159265358979323846 / 180);
    assert_close(circular_of_vectors(z, COUNT(deg)).mean_deg, 0.167690146, 5e-10);
    assert_close(circular_of_vectors(z, COUNT(deg)).sd_deg, c.sd_deg, 1e-9);
}

static void singular(void **state)
{
    static const double opposite[] = {10, 190}, same[] = {33, 33, 33};
    double bad[] = {1, NAN, 3};
    double complex zero[] = {1, 0};

    (void)state;
    assert_true(isnan(summary(opposite, NULL, 2).mean_deg));
    assert_close(summary(opposite, NULL, 2).resultant, 0, 1e-12);
    assert_close(summary(same, NULL, 3).sd_deg, 0, 1e-5);
    assert_close(summary(same, NULL, 3).mean_deg, 33, 1e-9);
    assert_true(isnan(summary(bad, NULL, 3).resultant));
    assert_true(isnan(summary(same, NULL, 0).resultant));
    assert_true(isnan(circular_of_vectors(zero, 2).resultant));
}

int main(void)
{
    const struct CMUnitTest tests[] = {
        cmocka_unit_test(eight_directions), cmocka_unit_test(grouped_directions),
        cmocka_unit_test(roulette),         cmocka_unit_test(turtles),
        cmocka_unit_test(across_north),     cmocka_unit_test(singular),
    };
    return cmocka_run_group_tests(tests, NULL, NULL);
}
