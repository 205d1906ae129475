/* Even times: what printing rounds passes, what was lost or moved does not. Grids are made here
 * from their definition, t = i/rate, and printed by the C library. */
#include <math.h>
#include <setjmp.h>
#include <stdarg.h>
#include <stddef.h>
#include <stdint.h>
#include <stdio.h>
#include <stdlib.h>
#include <string.h>

#include <cmocka.h>

#include "read/even.h"

#define ROWS 4000

struct column {
    char text[ROWS][32];
    int count;
};

static struct column column;

enum style { FIXED, SHORT, CUT };

static void print_times(double rate, double start, int digits, enum style style)
{
    column.count = ROWS;
    for (int i = 0; i < ROWS; i++) {
        const double t = start + i / rate, scale = pow(10, digits);
        if (style == FIXED)
            snprintf(column.text[i], 32, "%.*f", digits, t);
        else if (style == SHORT)
            snprintf(column.text[i], 32, "%.*g", digits, t);
        else
            snprintf(column.text[i], 32, "%.*f", digits, floor(t * scale + 1e-6) / scale);
    }
}

/* Number of the first row that is refused, -1 if none is; its result in *what. */
static int judge(int *what)
{
    double times[ROWS];
    struct decimal_grain grains[ROWS];
    for (int i = 0; i < column.count; i++) {
        const size_t length = strlen(column.text[i]);
        assert_int_equal(decimal_parse(column.text[i], length, '.', &times[i]), DECIMAL_DONE);
        grains[i] = decimal_grain(column.text[i], length, '.');
    }
    struct even even;
    even_init(&even, times[0], times[column.count - 1], column.count, 1, grains[0],
              grains[column.count - 1]);
    for (int i = 0; i < column.count; i++) {
        *what = even_next(&even, times[i], grains[i]);
        if (*what != EVEN_DONE)
            return i;
    }
    *what = even_finish(&even);
    return *what == EVEN_DONE ? -1 : (int)even.drifted - 1;
}

static void remove_rows(int first, int count)
{
    memmove(column.text[first], column.text[first + count],
            (size_t)(column.count - first - count) * sizeof *column.text);
    column.count -= count;
}

static void test_even_grids_pass(void **unused)
{
    (void)unused;
    const double rates[] = {1000, 1024, 2560, 12800, 25600, 51200, 44100, 333.25};
    int what;
    for (size_t r = 0; r < sizeof rates / sizeof *rates; r++)
        for (int digits = 3; digits <= 9; digits++) {
            print_times(rates[r], 0, digits, FIXED);
            assert_int_equal(judge(&what), -1);
            print_times(rates[r], 17.3, digits, CUT);
            assert_int_equal(judge(&what), -1);
            print_times(rates[r], 0, digits + 2, SHORT);
            assert_int_equal(judge(&what), -1);
        }
}

/* Times counted in single precision: steps err by the spacing of float32 at 100 s, 7.6e-6 s. */
static void test_single_precision_passes(void **unused)
{
    (void)unused;
    int what;
    print_times(1000, 100, 6, FIXED);
    for (int i = 0; i < ROWS; i++)
        snprintf(column.text[i], 32, "%.6f", (double)(100.0f + (float)i * 0.001f));
    assert_int_equal(judge(&what), -1);
}

static void test_lost_rows(void **unused)
{
    (void)unused;
    int what;
    const int lost[] = {1, 2, 10, 100};
    for (size_t k = 0; k < 4; k++)
        for (int at = 100; at < ROWS - 200; at += 700) {
            print_times(12800, 0, 6, FIXED);
            remove_rows(at, lost[k]);
            assert_true(judge(&what) >= 0);
            assert_int_not_equal(what, EVEN_DONE);
            print_times(1000, 0, 3, FIXED); /* printed no finer than the step */
            remove_rows(at, lost[k]);
            assert_int_equal(judge(&what), at);
            assert_int_equal(what, EVEN_GAP);
        }
}

static void test_backwards(void **unused)
{
    (void)unused;
    int what;
    print_times(1000, 0, 6, FIXED);
    strcpy(column.text[500], column.text[400]);
    assert_int_equal(judge(&what), 500);
    assert_int_equal(what, EVEN_BACKWARDS);
}

/* A rate that changes by 10 % half way: every step is within bounds, the grid is not. */
static void test_drift(void **unused)
{
    (void)unused;
    int what;
    for (int i = 0; i < ROWS; i++)
        snprintf(column.text[i], 32, "%.6f",
                 i < ROWS / 2 ? i * 0.001 : ROWS / 2 * 0.001 + (i - ROWS / 2) * 0.0011);
    column.count = ROWS;
    assert_true(judge(&what) >= 0);
    assert_int_equal(what, EVEN_DRIFT);
}

int main(void)
{
    const struct CMUnitTest tests[] = {
        cmocka_unit_test(test_even_grids_pass), cmocka_unit_test(test_single_precision_passes),
        cmocka_unit_test(test_lost_rows),       cmocka_unit_test(test_backwards),
        cmocka_unit_test(test_drift),
    };
    return cmocka_run_group_tests(tests, NULL, NULL);
}
