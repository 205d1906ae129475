/* Pulses against vibration: closed forms of kurtosis and of the middle third. */
#include <setjmp.h>
#include <stdarg.h>
#include <stddef.h>
#include <stdint.h>
#include <cmocka.h>

#include "close_to.h"
#include "track/shape.h"

#define N 50000
static float x[N];

static void measure(double *kurtosis, double *middle)
{
    static struct shape shape;
    shape_init(&shape);
    for (size_t i = 0; i < N; i += 1000)
        shape_add(&shape, x + i, 1000);
    shape_figures(&shape, kurtosis, middle);
}

static bool pulsed(void)
{
    static struct shape shape;
    shape_init(&shape);
    shape_add(&shape, x, N);
    return shape_pulsed(&shape);
}

static double noise(void) /* about normal: sum of twelve uniform numbers (central limit theorem) */
{
    static uint64_t seed = 1;
    double sum = -6;
    for (int i = 0; i < 12; i++) {
        seed = seed * 6364136223846793005u + 1442695040888963407u; /* Knuth's MMIX constants */
        sum += (double)(seed >> 11) * 0x1p-53;
    }
    return sum;
}

static void test_figures(void **state)
{
    (void)state;
    double kurtosis, middle;
    for (int i = 0; i < N; i++)
        x[i] = (float)sin(0.0123 * i);
    measure(&kurtosis, &middle);
    assert_close(kurtosis, 1.5, 0.02);                                /* m4/m2^2 = (3/8)/(1/2)^2 */
    assert_close(middle, 2 / 3.14159265358979 * asin(1.0 / 3), 0.02); /* arcsine law */
    for (int i = 0; i < N; i++)
        x[i] = i % 97 < 9 ? 5 : 0;
    measure(&kurtosis, &middle);
    double d = 9.0 / 97; /* Bernoulli: (1 - 3d(1-d))/(d(1-d)) */
    assert_close(kurtosis, (1 - 3 * d * (1 - d)) / (d * (1 - d)), 0.3);
    assert_close(middle, 0, 0);
    for (int i = 0; i < N; i++)
        x[i] = 3;
    measure(&kurtosis, &middle);
    assert_true(isnan(kurtosis) && isnan(middle));
}

static void test_tachos_have_pulses(void **state)
{
    (void)state;
    for (double duty = 0.01; duty <= 0.6; duty += 0.05) {
        for (int i = 0; i < N; i++) {
            double turn = fmod(i / 133.7, 1);
            /* edges take a fiftieth of the turn; noise of a hundredth of the height */
            double edge = fmin(1, fmax(0, fmin(turn / 0.02, (duty + 0.02 - turn) / 0.02)));
            x[i] = (float)(edge + 0.01 * noise());
        }
        if (!pulsed())
            fail_msg("pulses of duty %g are not seen as pulses", duty);
    }
    for (int i = 0; i < N; i++) { /* up and down, resting in the middle */
        double turn = fmod(i / 133.7, 1);
        x[i] = (float)((turn < 0.03) - (turn > 0.03 && turn < 0.06) + 0.02 * noise());
    }
    assert_true(pulsed());
    for (int i = 0; i < N; i++) { /* a tall mark among 60 teeth at a third of its height */
        double turn = fmod(i / 1337.7, 1);
        x[i] = (float)(turn < 0.02 ? 1 : (1 + cos(2 * 3.14159265358979 * 60 * turn)) / 6);
    }
    assert_true(pulsed());
}

static void test_vibration_has_none(void **state)
{
    (void)state;
    for (int level = 0; level <= 4; level++) {
        for (int i = 0; i < N; i++)
            x[i] = (float)(sin(0.047 * i) + 0.25 * sin(0.094 * i + 1) + 0.25 * level * noise());
        if (pulsed())
            fail_msg("a vibration with noise %g is taken for pulses", 0.25 * level);
    }
    for (int i = 0; i < N; i++)
        x[i] = (float)noise();
    assert_false(pulsed());
}

int main(void)
{
    const struct CMUnitTest tests[] = {cmocka_unit_test(test_figures),
                                       cmocka_unit_test(test_tachos_have_pulses),
                                       cmocka_unit_test(test_vibration_has_none)};
    cmocka_set_message_output(CM_OUTPUT_STDOUT);
    return cmocka_run_group_tests(tests, NULL, NULL);
}
