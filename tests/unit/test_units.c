/* Units against published conversion constants and exact arithmetic done outside. */
#include <math.h>
#include <stdarg.h>
#include <stddef.h>
#include <stdint.h>
#include <setjmp.h>
#include <string.h>
#include <cmocka.h>

#include "base/angle.h"
#include "sheet/units.h"

static struct show show_of(const char *text)
{
    struct show show;
    assert_true(units_show_parse(text, &show));
    return show;
}

/* `value` shown as `from` at w rad/s, as the number shown as `to`. */
static double through(double value, const char *from, const char *to, double w)
{
    struct show a = show_of(from), b = show_of(to);
    double complex z = units_convert(units_from_shown(value, &a), a.quantity, b.quantity, w);
    return units_shown(cabs(z), &b);
}

static void near(double got, double wanted, double tolerance)
{
    if (!(fabs(got - wanted) <= tolerance))
        fail_msg("got %.10g, wanted %.10g +- %.3g", got, wanted, tolerance);
}

/* Handbook constants in common use: D mil pk-pk, V in/s pk, A g pk, F cycles a minute. Each with
 * half a unit of its last printed digit. */
static void test_handbook_constants(void **state)
{
    (void)state;
    double w = 2 * PI / 60;                                      /* F = 1 */
    near(through(1, "in/s pk", "mil pk-pk", w), 19100, 50);      /* D = 19.1e3 V/F */
    near(through(1, "g pk", "mil pk-pk", w), 70.4e6, 0.05e6);    /* D = 70.4e6 A/F^2 */
    near(through(1, "mil pk-pk", "in/s pk", w), 5.236e-5, 5e-9); /* V = 52.36e-6 D F */
    near(through(1, "mil pk-pk", "g pk", w), 1.42e-8, 5e-11);    /* A = 14.2e-9 D F^2 */
    near(through(1, "in/s pk", "g pk", w), 2.7e-4, 5e-6);        /* A = 0.27e-3 V F */
}

/* The same tables print V = 3.87e3 A/F; g*60/(2 pi) = 386.0886*9.5493 = 3.687e3 shows the misprint.
 * A conversion that agreed with the print would be wrong. */
static void test_misprint(void **state)
{
    (void)state;
    double got = through(1, "g pk", "in/s pk", 2 * PI / 60);
    near(got, 3687, 0.5);
    assert_true(fabs(got - 3870) > 100);
}

/* A unit chart of vibration control, zero-peak in inches, f in Hz; half a unit of the last digit.
 */
static void test_chart(void **state)
{
    (void)state;
    double w = 2 * PI; /* f = 1 */
    near(through(1, "g pk", "in/s pk", w), 61.4, 0.05);
    near(through(1, "g pk", "in pk", w), 9.78, 0.005);
    near(through(1, "in pk", "g pk", w), 0.102, 0.0005);
    near(through(1, "in/s pk", "g pk", w), 0.0163, 0.00005);
    near(through(1, "in/s pk", "in pk", w), 0.159, 0.0005);
}

/* Exact unit arithmetic, computed outside with NumPy from the definitions of inch and g. */
static void test_exact(void **state)
{
    (void)state;
    static const struct {
        double mm_s, rpm, um, mil, in_s, g;
    } CASES[] = {{4.5, 1500, 81.0285, 3.1901, 0.25055, 0.072079},
                 {7.1, 3000, 63.9225, 2.51663, 0.395312, 0.227451},
                 {2.3, 3000, 20.7073, 0.81525, 0.128059, 0.073681},
                 {2.8, 1480, 51.099, 2.01177, 0.155898, 0.044251},
                 {11.2, 990, 305.5619, 12.03, 0.62359, 0.118403}};
    for (size_t i = 0; i < sizeof CASES / sizeof CASES[0]; i++) {
        double w = CASES[i].rpm * 2 * PI / 60;
        near(through(CASES[i].mm_s, "mm/s rms", "um pk-pk", w), CASES[i].um, 6e-5);
        near(through(CASES[i].mm_s, "mm/s rms", "mil pk-pk", w), CASES[i].mil, 6e-6);
        near(through(CASES[i].mm_s, "mm/s rms", "in/s pk", w), CASES[i].in_s, 6e-7);
        near(through(CASES[i].mm_s, "mm/s rms", "g rms", w), CASES[i].g, 6e-7);
    }
}

/* Differentiating a*cos(w*t - lag) numerically gives amplitude and lag of the derivative. */
static void test_derivative_in_time(void **state)
{
    (void)state;
    double w = 155, lag = 37 * PI / 180, a = 3e-5, h = 1e-6;
    double complex z =
        units_convert(a * cexp(I * lag), QUANTITY_DISPLACEMENT, QUANTITY_VELOCITY, w);
    near(carg(z) * 180 / PI, 37 - 90, 1e-9);
    for (int i = 0; i < 8; i++) {
        double t = i * 0.005;
        double slope = (a * cos(w * (t + h) - lag) - a * cos(w * (t - h) - lag)) / (2 * h);
        near(cabs(z) * cos(w * t - carg(z)), slope, 1e-9);
    }
}

static void test_round_trips(void **state)
{
    (void)state;
    static const char *const SHOWS[] = {"um pk-pk", "mil pk-pk", "mm/s rms", "in/s pk",
                                        "g pk",     "g rms",     "m/s2 rms", "m/s2 pk"};
    double complex z = CMPLX(0.3, -0.7);
    for (int from = 0; from < 3; from++)
        for (int to = 0; to < 3; to++) {
            double complex back =
                units_convert(units_convert(z, (enum quantity)from, (enum quantity)to, 155),
                              (enum quantity)to, (enum quantity)from, 155);
            near(cabs(back - z), 0, 1e-15);
        }
    for (size_t i = 0; i < sizeof SHOWS / sizeof SHOWS[0]; i++) {
        char text[24];
        struct show show = show_of(SHOWS[i]);
        assert_string_equal(units_show_text(&show, text), SHOWS[i]);
        near(units_from_shown(units_shown(0.0123, &show), &show), 0.0123, 1e-17);
    }
}

static void test_factors(void **state)
{
    (void)state;
    /* exact by definition: CGPM 1901, international yard and pound 1959 */
    near(units_factor(DIMENSION_MASS, "lb"), 0.45359237, 0);
    near(units_factor(DIMENSION_MASS, "oz") * 16, 0.45359237, 1e-17);
    near(units_factor(DIMENSION_LENGTH, "in"), 0.0254, 0);
    near(units_factor(DIMENSION_VIBRATION, "g"), 9.80665, 0);
    near(units_factor(DIMENSION_MASS, "g"), 1e-3, 0);
    near(units_factor(DIMENSION_PERCENT, "%"), 1, 0);
    /* a unit of another dimension, another case, or none */
    near(units_factor(DIMENSION_LENGTH, "g"), 0, 0);
    near(units_factor(DIMENSION_RATE, "hz"), 0, 0);
    near(units_factor(DIMENSION_MASS, ""), 0, 0);
    struct show show;
    assert_false(units_show_parse("mm/s", &show));
    assert_false(units_show_parse("mm/s rms ", &show));
    assert_false(units_show_parse("rms", &show));
    assert_false(units_show_parse("", &show));
    assert_false(units_vibration("mm/S", &show));
    assert_true(units_vibration("\xc2\xb5m", &show));
    assert_string_equal(show.unit, "um");
}

static void test_nan_and_singular(void **state)
{
    (void)state;
    assert_true(isnan(creal(units_convert(1, QUANTITY_VELOCITY, QUANTITY_DISPLACEMENT, 0))));
    assert_true(isnan(creal(units_convert(1, QUANTITY_VELOCITY, QUANTITY_DISPLACEMENT, NAN))));
    assert_true(isnan(creal(units_convert(1, QUANTITY_TACHO, QUANTITY_VELOCITY, 1))));
    assert_true(isnan(cabs(units_convert(NAN, QUANTITY_VELOCITY, QUANTITY_DISPLACEMENT, 1))));
    assert_true(creal(units_convert(2, QUANTITY_VELOCITY, QUANTITY_VELOCITY, NAN)) == 2);
    struct show show = show_of("mm/s rms");
    assert_true(isnan(units_shown(NAN, &show)));
}

int main(void)
{
    const struct CMUnitTest tests[] = {cmocka_unit_test(test_handbook_constants),
                                       cmocka_unit_test(test_misprint),
                                       cmocka_unit_test(test_chart),
                                       cmocka_unit_test(test_exact),
                                       cmocka_unit_test(test_derivative_in_time),
                                       cmocka_unit_test(test_round_trips),
                                       cmocka_unit_test(test_factors),
                                       cmocka_unit_test(test_nan_and_singular)};
    return cmocka_run_group_tests(tests, NULL, NULL);
}
