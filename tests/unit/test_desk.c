/* test_desk.c - the kernels that stand around the chain: levels of a signal, words of a header, progress. */
#include <math.h>
#include <setjmp.h>
#include <stdarg.h>
#include <stddef.h>
#include <stdint.h>
#include <string.h>

#include <cmocka.h>

#include "base/angle.h"
#include "desk/channels.h"
#include "desk/look.h"
#include "desk/progress.h"

#define N 20000

static float values[N];

/* A sine is within a fifth of its range of an extreme where |sin| >= 0.6: a share of
 * 1 - 2 asin(0.6)/pi = 0.5903 of the time. */
static void test_sine(void **state)
{
    (void)state;
    for (int i = 0; i < N; i++)
        values[i] = (float)(3 + 2 * sin(2 * PI * i * 37 / N));
    assert_true(fabs(look_extremes(values, N) - (1 - 2 * asin(0.6) / PI)) < 0.01);
}

/* A saw tooth is there for two fifths of the time; a pulse train always. */
static void test_saw_and_pulses(void **state)
{
    (void)state;
    for (int i = 0; i < N; i++)
        values[i] = (float)(i % 1000);
    assert_true(fabs(look_extremes(values, N) - 0.4) < 0.01);
    for (int i = 0; i < N; i++)
        values[i] = i % 100 < 3 ? 5 : 0.1F;
    assert_true(look_extremes(values, N) == 1);
    for (int i = 0; i < N; i++)
        values[i] = 7;
    assert_true(isnan(look_extremes(values, N)));
    assert_true(isnan(look_extremes(values, 0)));
}

/* One spike does not make levels of a sine: the extremes are those of the inner 99.8 %. */
static void test_spike(void **state)
{
    (void)state;
    for (int i = 0; i < N; i++)
        values[i] = (float)sin(2 * PI * i * 37 / N);
    values[N / 3] = 1000;
    assert_true(fabs(look_extremes(values, N) - 0.5903) < 0.01);
}

static void test_units(void **state)
{
    (void)state;
    assert_string_equal(channels_unit("m/s\xC2\xB2"), "m/s2");
    assert_string_equal(channels_unit("\xC2\xB5m"), "um");
    assert_string_equal(channels_unit("ips"), "in/s");
    assert_null(channels_unit("V"));
    assert_null(channels_unit("rpm"));
    assert_null(channels_unit(""));
}

static void test_names(void **state)
{
    (void)state;
    char name[NAME_ROOM];
    channels_name("  Brg #2: DE;H=\t ", name);
    assert_string_equal(name, "Brg _2_ DE_H__");
    channels_name("   ", name);
    assert_string_equal(name, "");
    /* 39 bytes and a character of two: it does not fit, and is not cut in half */
    channels_name("123456789012345678901234567890123456789\xC3\xA4", name);
    assert_string_equal(name, "123456789012345678901234567890123456789");
    channels_name("12345678901234567890123456789012345678\xC3\xA4z", name);
    assert_string_equal(name, "12345678901234567890123456789012345678\xC3\xA4");
}

static void expect(const char *text, double done, double total, double seconds)
{
    char got[64];
    progress_text(got, sizeof got, done, total, seconds);
    assert_string_equal(got, text);
}

static void test_progress(void **state)
{
    (void)state;
    expect("25 % of 2.0 GB, 100 MB/s, 15 s left", 0.5e9, 2e9, 5);
    expect("99 % of 500 MB, 50 MB/s, 1 s left", 499.9e6, 500e6, 10);
    expect("10 % of 10.0 GB, 10 MB/s, 15 min left", 1e9, 10e9, 100);
    expect("1 % of 100.0 GB, 10 MB/s, 2.8 h left", 1e9, 100e9, 100);
    expect("100 % of 500 MB, 50 MB/s, 0 s left", 500e6, 500e6, 10);
    expect("0 % of 500 MB", 0, 500e6, 10);
    expect("", 0, 0, 10);
}

int main(void)
{
    const struct CMUnitTest tests[] = {
        cmocka_unit_test(test_sine),  cmocka_unit_test(test_saw_and_pulses),
        cmocka_unit_test(test_spike), cmocka_unit_test(test_units),
        cmocka_unit_test(test_names), cmocka_unit_test(test_progress)};
    return cmocka_run_group_tests(tests, NULL, NULL);
}
