/* Names of audited recordings; the expected ones follow from the rules in names.h. */
#include <setjmp.h>
#include <stdarg.h>
#include <stddef.h>
#include <stdint.h>
#include <stdio.h>
#include <string.h>

#include <cmocka.h>

#include "read/names.h"

static char names[600][NAMES_ROOM];

static void test_stems(void **unused)
{
    (void)unused;
    char *const paths[] = {(char *)"a/fan.wav", (char *)"b/fan.wav", (char *)"/x/pump.1.flac",
                           (char *)"L\xC3\xBC"
                                   "fter.csv",
                           (char *)".hidden"};
    assert_int_equal(names_from_paths(paths, 5, names), 0);
    assert_string_equal(names[0], "a/fan");
    assert_string_equal(names[1], "b/fan");
    assert_string_equal(names[2], "pump.1");
    assert_string_equal(names[3], "L\xC3\xBC"
                                  "fter");
    assert_string_equal(names[4], ".hidden");
}

static void test_deeper_and_endings(void **unused)
{
    (void)unused;
    char *const paths[] = {(char *)"p/a/fan.wav", (char *)"q/a/fan.wav", (char *)"z.wav",
                           (char *)"z.csv",       (char *)"d/same.wav",  (char *)"d/same.wav"};
    assert_int_equal(names_from_paths(paths, 6, names), 0);
    assert_string_equal(names[0], "p/a/fan");
    assert_string_equal(names[1], "q/a/fan");
    assert_string_equal(names[2], "z.wav");
    assert_string_equal(names[3], "z.csv");
    assert_string_equal(names[4], "d/same.wav");
    assert_string_equal(names[5], "d/same.wav~2");
}

static void test_forbidden(void **unused)
{
    (void)unused;
    char *const paths[] = {(char *)"a:b=c;d#e]f\n.wav", (char *)" x .wav",
                           (char *)"bad\xFF\xC0.wav"};
    assert_int_equal(names_from_paths(paths, 3, names), 0);
    assert_string_equal(names[0], "a_b_c_d_e_f_");
    assert_string_equal(names[1], "_x_");
    assert_string_equal(names[2], "bad__");
}

static void test_long_names_stay_different(void **unused)
{
    (void)unused;
    static char text[600][120];
    static char *paths[600];
    for (int i = 0; i < 600; i++) {
        snprintf(text[i], sizeof text[i],
                 "r/%03d \xC3\xA9\xC3\xA9\xC3\xA9\xC3\xA9\xC3\xA9\xC3\xA9\xC3\xA9 a very long name "
                 "of a recording of a fan, all alike at their ends.wav",
                 i / 2);
        if (i % 2)
            snprintf(text[i] + strlen(text[i]) - 4, 20, " x.wav");
        paths[i] = text[i];
    }
    assert_int_equal(names_from_paths(paths, 600, names), 0);
    for (int i = 0; i < 600; i++) {
        char copy[NAMES_ROOM];
        assert_in_range(strlen(names[i]), 1, 40);
        memcpy(copy, names[i], sizeof copy);
        names_make_utf8(copy);
        assert_string_equal(copy, names[i]); /* no character is cut in two */
        for (int j = 0; j < i; j++)
            assert_string_not_equal(names[i], names[j]);
    }
}

int main(void)
{
    const struct CMUnitTest tests[] = {
        cmocka_unit_test(test_stems),
        cmocka_unit_test(test_deeper_and_endings),
        cmocka_unit_test(test_forbidden),
        cmocka_unit_test(test_long_names_stay_different),
    };
    return cmocka_run_group_tests(tests, NULL, NULL);
}
