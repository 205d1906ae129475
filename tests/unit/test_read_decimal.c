/* Decimals against strtod of the C library, which rounds correctly (ISO C Annex F). */
#include <setjmp.h>
#include <stdarg.h>
#include <stddef.h>
#include <stdint.h>
#include <stdio.h>
#include <stdlib.h>
#include <string.h>

#include <cmocka.h>

#include "read/decimal.h"

static uint64_t state = 88172645463325252ULL; /* any seed but 0 */

static uint64_t next_random(void) /* xorshift64: G. Marsaglia, J. Stat. Softw. 8 (2003) 14 */
{
    state ^= state << 13;
    state ^= state >> 7;
    state ^= state << 17;
    return state;
}

static void check_like_strtod(const char *text)
{
    double value = -1;
    assert_int_equal(decimal_parse(text, strlen(text), '.', &value), DECIMAL_DONE);
    const double expected = strtod(text, NULL);
    if (memcmp(&value, &expected, sizeof value) != 0)
        fail_msg("%s: %a instead of %a", text, value, expected);
    double again = -1;
    struct decimal_grain both = {-1, -1};
    assert_int_equal(decimal_parse_grain(text, strlen(text), '.', &again, &both), DECIMAL_DONE);
    const struct decimal_grain alone = decimal_grain(text, strlen(text), '.');
    assert_memory_equal(&again, &value, sizeof value);
    if (both.fraction != alone.fraction || both.significant != alone.significant)
        fail_msg("%s: grain %d, %d instead of %d, %d", text, both.fraction, both.significant,
                 alone.fraction, alone.significant);
}

static void random_digits(char *text, size_t room)
{
    const char *const signs[] = {"", "-", "+"};
    const unsigned before = (unsigned)(next_random() % 22), behind = (unsigned)(next_random() % 22);
    size_t n = (size_t)snprintf(text, room, "%s", signs[next_random() % 3]);
    for (unsigned i = 0; i < before; i++)
        text[n++] = (char)('0' + next_random() % 10);
    if (before == 0 || behind > 0)
        text[n++] = '.';
    for (unsigned i = 0; i < behind + (before == 0); i++)
        text[n++] = (char)('0' + next_random() % 10);
    if (next_random() % 3 == 0)
        n += (size_t)snprintf(text + n, room - n, "%c%d", next_random() % 2 ? 'e' : 'E',
                              (int)(next_random() % 80) - 40);
    text[n] = '\0';
}

static void test_random_texts(void **unused)
{
    (void)unused;
    char text[80];
    for (int i = 0; i < 200000; i++) {
        random_digits(text, sizeof text);
        check_like_strtod(text);
    }
}

static void test_printed_doubles(void **unused)
{
    (void)unused;
    char text[80];
    for (int i = 0; i < 100000; i++) {
        const double x = ((double)(int64_t)next_random()) * 1e-15;
        const int which = i % 4;
        if (which == 0)
            snprintf(text, sizeof text, "%.6f", x);
        else if (which == 1)
            snprintf(text, sizeof text, "%.9g", x);
        else if (which == 2)
            snprintf(text, sizeof text, "%.17g", x);
        else
            snprintf(text, sizeof text, "%.3e", x);
        check_like_strtod(text);
    }
}

static void test_borders(void **unused)
{
    (void)unused;
    const char *const texts[] = {
        "0", "-0", "0.0", ".5", "5.", "1e22", "1e23", "1e-22", "1e-23", "9007199254740992",
        "9007199254740993", "9007199254740993e-5", "9999999999999999999", "99999999999999999999",
        "0.1", "1e-400", "4.9406564584124654e-324", "1.7976931348623157e308",
        "0.000000000000000000000000000000000000123456789012345678901234567890",
        "123456789012345678901234567890", "100000000000000000000000000000000", "8.5e0", "1E+05",
        "1e-05",
        /* a half-way case that a second rounding spoils: Clinger 1990 */
        "9007199254740991.4999999999999999999", "9007199254740991.5000000000000000001"};
    for (size_t i = 0; i < sizeof texts / sizeof *texts; i++)
        check_like_strtod(texts[i]);
}

static void test_decimal_comma(void **unused)
{
    (void)unused;
    double value = 0;
    assert_int_equal(decimal_parse("-12,25", 6, ',', &value), DECIMAL_DONE);
    assert_true(value == -12.25);
    assert_int_equal(decimal_parse("0,12345678901234567890123", 25, ',', &value), DECIMAL_DONE);
    assert_true(value == strtod("0.12345678901234567890123", NULL));
    assert_int_equal(decimal_parse("1.5", 3, ',', &value), DECIMAL_NOT_A_NUMBER);
}

static void test_no_numbers(void **unused)
{
    (void)unused;
    const char *const texts[] = {"",    "-",   ".",    "e5",   "1e",    "1e+",          "1.2.3",
                                 "1,5", "nan", "-inf", "0x10", "1 2",   " 1",           "1 ",
                                 "1f",  "--1", "+-1",  "1e5.", "1e5e5", "\xEF\xBC\x91", "Infinity"};
    for (size_t i = 0; i < sizeof texts / sizeof *texts; i++) {
        double value = 7;
        if (decimal_parse(texts[i], strlen(texts[i]), '.', &value) != DECIMAL_NOT_A_NUMBER)
            fail_msg("'%s' was taken for a number", texts[i]);
        struct decimal_grain grain = {7, 7};
        assert_int_equal(decimal_parse_grain(texts[i], strlen(texts[i]), '.', &value, &grain),
                         DECIMAL_NOT_A_NUMBER);
        assert_true(value == 7 && grain.fraction == 7 && grain.significant == 7);
    }
    double value = 7;
    assert_int_equal(decimal_parse("1e400", 5, '.', &value), DECIMAL_OUT_OF_RANGE);
    assert_int_equal(decimal_parse("-1e99999999999", 14, '.', &value), DECIMAL_OUT_OF_RANGE);
}

static void test_grain(void **unused)
{
    (void)unused;
    const struct decimal_grain a = decimal_grain("0.00125", 7, '.');
    assert_int_equal(a.fraction, 5);
    assert_int_equal(a.significant, 3);
    double value = 0;
    struct decimal_grain c = {-1, -1}; /* short texts take another way to the same */
    assert_int_equal(decimal_parse_grain("-0,00125", 8, ',', &value, &c), DECIMAL_DONE);
    assert_true(value == -0.00125 && c.fraction == 5 && c.significant == 3);
    assert_int_equal(decimal_parse_grain("0,00", 4, ',', &value, &c), DECIMAL_DONE);
    assert_true(value == 0 && c.fraction == 2 && c.significant == 0);
    const struct decimal_grain b = decimal_grain("1,25e-3", 7, ',');
    assert_int_equal(b.fraction, 5);
    assert_int_equal(b.significant, 3);
}

int main(void)
{
    const struct CMUnitTest tests[] = {
        cmocka_unit_test(test_random_texts), cmocka_unit_test(test_printed_doubles),
        cmocka_unit_test(test_borders),      cmocka_unit_test(test_decimal_comma),
        cmocka_unit_test(test_no_numbers),   cmocka_unit_test(test_grain),
    };
    return cmocka_run_group_tests(tests, NULL, NULL);
}
