/* Numbers to digits, layout, CSV cells and conversions of the report. */
#include <setjmp.h>
#include <stdarg.h>
#include <stddef.h>
#include <stdint.h>
#include <cmocka.h>

#include <math.h>
#include <stdlib.h>
#include <string.h>

#include "report/csv.h"
#include "report/digits.h"
#include "report/paper.h"
#include "report/shown.h"
#include "report/table.h"

/* ---- digits ---- */

static void digits_follow_the_uncertainty(void **state)
{
    (void)state;
    /* By hand from the rule: two digits of the half width decide, four digits are the most. */
    static const struct {
        double value, half;
        const char *text;
    } cases[] = {
        {7.23456, 0.083, "7.235"},
        {7.23456, 0.0996, "7.23"},
        {7.23456, 0.5, "7.23"},
        {7.23456, 5, "7.2"},
        {7.23456, 50, "7"},
        {7.23456, 500, "10"},
        {7.23456, 1e-6, "7.235"},
        {12345, 560, "12350"},
        {12345, 9960, "12000"},
        {0.00123456, 1e-5, "0.001235"},
        {0.9996, 0.12, "1.00"},
        {-0.001, 5, "0.0"},
        {0, 0.25, "0.00"},
        {7.2, NAN, "7.2"},
        {7.2, 0, "7.2"},
        {10.05613, NAN, "10.06"},
        {0.1 + 0.2, NAN, "0.3"},
        {123456, NAN, "123500"},
        {0, NAN, "0"},
        {NAN, 1, "-"},
        {INFINITY, NAN, "-"},
    };
    for (size_t i = 0; i < sizeof cases / sizeof *cases; i++) {
        char text[DIGITS_ROOM];
        assert_string_equal(digits_text(text, cases[i].value, cases[i].half), cases[i].text);
    }
}

static void digits_stay_on_their_side(void **state)
{
    (void)state;
    /* By hand: to two digits of its half width the value crosses the limit, as 15753 and 15850 do.
     */
    static const struct {
        double value, half, limit;
        const char *text;
    } cases[] = {
        {15753, 8000, 15850, "15800"},  {15753, 8000, 15740, "15800"},
        {15753, 8000, 20000, "15800"},  {15753, 90000, 15850, "15800"},
        {15753, 90000, 18000, "16000"}, {15753, 90000, 15800, "15800"},
        {15843, 90000, 15840, "16000"}, {15837, 90000, 15840, "15800"},
        {15753, NAN, 15850, "15750"},   {NAN, 1, 2, "-"},
        {15753, 8000, NAN, "15800"},
    };
    for (size_t i = 0; i < sizeof cases / sizeof *cases; i++) {
        char text[DIGITS_ROOM];
        digits_against(text, cases[i].value, cases[i].half, cases[i].limit);
        assert_string_equal(text, cases[i].text);
    }
}

static void digits_round_half_widths_up(void **state)
{
    (void)state;
    /* JCGM 100:2008, 7.2.6: an uncertainty of 10.47 mOhm may be rounded up to 11 mOhm. */
    char text[DIGITS_ROOM];
    assert_string_equal(digits_half(text, 10.47, 0), "11");
    assert_string_equal(digits_half(text, 0.0830, -3), "0.083");
    assert_string_equal(digits_half(text, 0.0831, -3), "0.084");
    assert_string_equal(digits_half(text, 1e-9, -3), "0.001");
    assert_string_equal(digits_half(text, NAN, -3), "-");
}

/* By hand from the rule: below half of the last digit it is less than one of it, and never hidden.
 */
static void digits_small_half_widths(void **state)
{
    (void)state;
    static const struct {
        double half;
        int place;
        const char *text;
    } cases[] = {
        {0.0008, -1, "<0.1"},  {0.003, -1, "<0.1"}, {0.049, -1, "<0.1"}, {0.051, -1, "0.1"},
        {0.11, -1, "0.2"},     {1e-12, 0, "<1"},    {1e-12, 2, "<100"},  {0.6, 0, "1"},
        {1e-9, -4, "<0.0001"}, {0, -1, "-"},        {-1, -1, "-"},       {NAN, -1, "-"},
        {INFINITY, -1, "-"},
    };
    for (size_t i = 0; i < sizeof cases / sizeof *cases; i++) {
        char text[DIGITS_ROOM];
        assert_string_equal(digits_beside(text, cases[i].half, cases[i].place), cases[i].text);
    }
}

/* What is shown, plus or minus what is shown, never excludes the range itself on the half width's
 * side. */
static void digits_never_narrow_a_range(void **state)
{
    (void)state;
    srand(7);
    for (int i = 0; i < 20000; i++) {
        double value = pow(10, 6.0 * rand() / RAND_MAX - 3),
               half = value * pow(10, -3.0 * rand() / RAND_MAX);
        char shown[DIGITS_ROOM], wide[DIGITS_ROOM];
        int place = digits_place(value, half);
        digits_text(shown, value, half);
        digits_half(wide, half, place);
        assert_true(strtod(wide, NULL) >= half * (1 - 1e-8));
        assert_true(fabs(strtod(shown, NULL) - value) <= 0.5001 * pow(10, place));
        assert_true(half < 100.0001 * pow(10, place)); /* no more than two digits of it matter */
    }
}

static void digits_angles(void **state)
{
    (void)state;
    char text[DIGITS_ROOM];
    assert_string_equal(digits_angle(text, 143.26, 0.4), "143.3");
    assert_string_equal(digits_angle(text, 143.0, 0.4), "143.0");
    assert_string_equal(digits_angle(text, 143.26, 1.0), "143");
    assert_string_equal(digits_angle(text, 143.26, 17), "143");
    assert_string_equal(digits_angle(text, 359.97, 0.4), "0.0");
    assert_string_equal(digits_angle(text, 359.6, 3), "0");
    assert_string_equal(digits_angle(text, -30, NAN), "330");
    assert_string_equal(digits_angle(text, 325.55, NAN), "325.6");
    assert_string_equal(digits_angle(text, NAN, 1), "-");
    assert_string_equal(digits_angle_half(text, 0.41), "0.5");
    assert_string_equal(digits_angle_half(text, 2.3), "3");
    assert_string_equal(digits_chance(text, 0.004), "under 1 %");
    assert_string_equal(digits_chance(text, 1), "over 99 %");
    assert_string_equal(digits_chance(text, 0.914), "91 %");
    assert_string_equal(digits_chance(text, NAN), "-");
}

/* ---- paper and tables ---- */

static void paper_shows_what_is_hostile(void **state)
{
    (void)state;
    static const struct {
        const char *raw, *clean;
    } cases[] = {
        {"plain", "plain"},
        {"a\x1b[31mb\n", "a\\x1b[31mb\\x0a"},
        {"\xc3\xa4 \xe8\xbb\xb8", "\xc3\xa4 \xe8\xbb\xb8"},
        {"\xc2\x9b", "\\x9b"}, /* C1: CSI in one character */
        {"1\xe2\x80\xae"
         "23",
         "1\\u202e23"},                                        /* right-to-left override */
        {"\xff\xc3(", "\\xff\\xc3("},                          /* no UTF-8 */
        {"\xc0\x80\xed\xa0\x80", "\\xc0\\x80\\xed\\xa0\\x80"}, /* overlong; a surrogate */
    };
    for (size_t i = 0; i < sizeof cases / sizeof *cases; i++) {
        struct buffer out = BUFFER_INIT;
        paper_clean(&out, cases[i].raw);
        assert_string_equal(out.bytes, cases[i].clean);
        buffer_release(&out);
    }
}

/* Every line within the width, counted in code points here and not by the code under test. */
static void assert_fits(const char *text)
{
    size_t points = 0;
    for (; *text; text++) {
        if (*text == '\n') {
            assert_true(points <= 80);
            points = 0;
        } else if (((unsigned char)*text & 0xc0) != 0x80) {
            points++;
        }
    }
    assert_int_equal(points, 0); /* the last line has its newline */
}

static void paper_wraps(void **state)
{
    (void)state;
    struct buffer out = BUFFER_INIT;
    paper_wrap(&out, 0, 2, "");
    assert_int_equal(out.length, 0);
    for (size_t word = 1; word < 200; word++) {
        char text[1000] = "";
        for (size_t i = 0; i < 900; i++)
            text[i] = i % (word + 1) == word ? ' ' : 'x';
        buffer_clear(&out);
        paper_wrap(&out, 3, 5, text);
        assert_fits(out.bytes);
        size_t in = 0, kept = 0;
        for (const char *c = text; *c; c++)
            in += *c == 'x';
        for (const char *c = out.bytes; *c; c++)
            kept += *c == 'x';
        assert_int_equal(kept, in); /* nothing is lost */
    }
    buffer_clear(&out);
    paper_wrap(&out, 0, 2, "\xc3\xa4\xc3\xa4  b ");
    assert_string_equal(out.bytes, "\xc3\xa4\xc3\xa4  b\n");
    buffer_release(&out);
}

static const struct table_column columns[] = {
    {"sensor", false, true}, {"amplitude", true, false}, {"lag", true, false}};

static void table_aligns_and_shortens(void **state)
{
    (void)state;
    struct buffer out = BUFFER_INIT;
    struct table table;
    table_init(&table, columns, 3);
    table_print(&table, 2, &out);
    assert_int_equal(out.length, 0); /* no rows: not even a head */
    table_cell(&table, "\xc3\xa4\x1b");
    table_cell(&table, "7.2 mm/s rms");
    table_cell(&table, "%d deg", 143);
    table_print(&table, 2, &out);
    assert_string_equal(out.bytes, "  sensor     amplitude      lag\n"
                                   "  \xc3\xa4\\x1b   7.2 mm/s rms  143 deg\n");
    char name[101];
    memset(name, 'n', 100);
    memcpy(name + 97, "end", 4);
    table_cell(&table, "%s", name);
    table_cell(&table, "7.2 mm/s rms");
    table_cell(&table, "143 deg");
    buffer_clear(&out);
    table_print(&table, 2, &out);
    assert_fits(out.bytes);
    assert_non_null(strstr(out.bytes, "n\xe2\x80\xa6n"));
    assert_non_null(strstr(out.bytes, "end  7.2 mm/s rms  143 deg\n"));
    table_release(&table);
    buffer_release(&out);
}

static void table_never_cuts_a_number(void **state)
{
    (void)state;
    static const struct table_column wide[] = {
        {"name", false, true}, {"a", true, false}, {"b", true, false}};
    char number[61];
    memset(number, '7', 60);
    number[60] = '\0';
    struct buffer out = BUFFER_INIT;
    struct table table;
    table_init(&table, wide, 3);
    table_cell(&table, "a name that is long");
    table_cell(&table, "%s", number);
    table_cell(&table, "%s", number);
    table_print(&table, 2, &out);
    assert_fits(out.bytes);
    const char *first = strstr(out.bytes, number);
    assert_non_null(first);
    assert_non_null(strstr(first + 60, number));
    table_release(&table);
    buffer_release(&out);
}

/* ---- csv ---- */

static void csv_escapes(void **state)
{
    (void)state;
    /* Quoting after RFC 4180, 2.6 and 2.7; the characters that start a formula: common practice.
     * Control characters are shown, not sent, as everywhere: a row is a line. */
    struct buffer out = BUFFER_INIT;
    struct csv csv = {&out, 0};
    csv_text(&csv, "plain");
    csv_text(&csv, "a,b");
    csv_text(&csv, "say \"go\"");
    csv_text(&csv, "two\r\nlines");
    csv_text(&csv, "=1+1");
    csv_text(&csv, " +1");
    csv_text(&csv, "-x\"");
    csv_text(&csv, "@SUM");
    csv_text(&csv, "\tx");
    csv_text(&csv, "\x1b[31mred\x07");
    csv_plain(&csv, "\x1b]0;");
    csv_text(&csv, "");
    csv_text(&csv, NULL);
    csv_number(&csv, -1.5);
    csv_number(&csv, NAN);
    csv_number(&csv, -0.0);
    csv_integer(&csv, 12);
    csv_row(&csv);
    assert_string_equal(out.bytes,
                        "plain,\"a,b\",\"say \"\"go\"\"\",two\\x0d\\x0alines,\"'=1+1\",\"' +1\","
                        "\"'-x\"\"\",\"'@SUM\",\"'\\x09x\",\\x1b[31mred\\x07,\\x1b]0;,,,-1.5,,0,12"
                        "\r\n");
    buffer_release(&out);
}

/* ---- shown ---- */

static void shown_t_quantiles(void **state)
{
    (void)state;
    /* scipy.stats.t.ppf(0.975, df), SciPy 1.10.1 */
    static const double table[][2] = {{1, 12.7062},  {2, 4.30265},  {3, 3.18245},
                                      {4, 2.77645},  {5, 2.57058},  {7.5, 2.33331},
                                      {10, 2.22814}, {30, 2.04227}, {100, 1.98397}};
    for (size_t i = 0; i < sizeof table / sizeof *table; i++)
        assert_true(fabs(shown_t95(table[i][0]) - table[i][1]) < 0.003);
    assert_true(shown_t95(0.3) > 12.7 && shown_t95(1.5) > 4.3027 && shown_t95(1.5) < 12.7062);
    assert_true(fabs(shown_t95(NAN) - 1.959964) < 1e-6);
    for (double v = 1; v < 50; v += 0.01)
        assert_true(shown_t95(v) >= shown_t95(v + 0.01) - 0.003);
}

static const struct show ips = {"in/s", QUANTITY_VELOCITY, 0.0254, DETECTION_PEAK};
static const struct show mms = {"mm/s", QUANTITY_VELOCITY, 0.001, DETECTION_RMS};
static const struct show mil = {"mil", QUANTITY_DISPLACEMENT, 25.4e-6, DETECTION_PEAK_TO_PEAK};

static void shown_turns_and_scales(void **state)
{
    (void)state;
    /* Handbook rules, from memory: V = 61.44 g / f in/s pk, D = 19.56 g / f^2 * 1000 mil pk-pk.
     * Velocity comes a quarter turn after acceleration, displacement half a turn: the lag grows by
     * 90 and 180 deg. */
    double complex z = 9.80665 * cexp(I * 0.5235987755982988); /* 1 g pk at 30 deg lag */
    struct shown v = shown_vector(z, NULL, QUANTITY_ACCELERATION, 3600, &ips, NAN);
    struct shown d = shown_vector(z, NULL, QUANTITY_ACCELERATION, 3600, &mil, NAN);
    assert_true(fabs(v.amplitude - 61.44 / 60) < 1e-3);
    assert_true(fabs(d.amplitude - 19560.0 / 3600) < 5e-3);
    assert_true(fabs(v.lag_deg - 120) < 1e-9 && fabs(d.lag_deg - 210) < 1e-9);
    assert_true(isnan(v.half) && isnan(v.lag_half) && !v.lag_open);
    struct shown none = shown_vector(z, NULL, QUANTITY_ACCELERATION, NAN, &ips, NAN);
    assert_true(isnan(none.amplitude) && isnan(none.lag_deg));
    struct shown peak = shown_amplitude(9.80665, NAN, QUANTITY_ACCELERATION, 3600, &ips);
    assert_true(fabs(peak.amplitude - v.amplitude) < 1e-12 && isnan(peak.lag_deg));
}

static void shown_half_widths(void **state)
{
    (void)state;
    /* 1 mm/s rms at 90 deg; along it (imaginary) sd 1 %, across it (real) sd 2 %. Normal 95 %: 1.96
     * sd. */
    double peak = 0.001 * sqrt(2), cov[3] = {4e-4 * peak * peak, 0, 1e-4 * peak * peak};
    struct shown s = shown_vector(I * peak, cov, QUANTITY_VELOCITY, 1480, &mms, NAN);
    assert_true(fabs(s.amplitude - 1) < 1e-12 && fabs(s.lag_deg - 90) < 1e-9);
    assert_true(fabs(s.half - 0.0196) < 1e-5);
    assert_true(fabs(s.lag_half - 0.0392 * 180 / 3.14159265) < 1e-3);
    /* The correlation counts: along 45 deg, variance (a + b + 2c)/2, across (a + b - 2c)/2. */
    double tilted[3] = {1e-4 * peak * peak, 1e-4 * peak * peak, 1e-4 * peak * peak};
    s = shown_vector((1 + I) / sqrt(2) * peak, tilted, QUANTITY_VELOCITY, 1480, &mms, NAN);
    assert_true(fabs(s.half - 1.96 * sqrt(2e-4)) < 1e-5 && s.lag_half < 1e-4);
    double loud[3] = {peak * peak, 0, peak * peak};
    assert_true(shown_vector(peak, loud, QUANTITY_VELOCITY, 1480, &mms, NAN).lag_open);
    assert_true(shown_vector(0, loud, QUANTITY_VELOCITY, 1480, &mms, NAN).lag_open);
}

int main(void)
{
    const struct CMUnitTest tests[] = {
        cmocka_unit_test(digits_follow_the_uncertainty),
        cmocka_unit_test(digits_stay_on_their_side),
        cmocka_unit_test(digits_round_half_widths_up),
        cmocka_unit_test(digits_small_half_widths),
        cmocka_unit_test(digits_never_narrow_a_range),
        cmocka_unit_test(digits_angles),
        cmocka_unit_test(paper_shows_what_is_hostile),
        cmocka_unit_test(paper_wraps),
        cmocka_unit_test(table_aligns_and_shortens),
        cmocka_unit_test(table_never_cuts_a_number),
        cmocka_unit_test(csv_escapes),
        cmocka_unit_test(shown_t_quantiles),
        cmocka_unit_test(shown_turns_and_scales),
        cmocka_unit_test(shown_half_widths),
    };
    return cmocka_run_group_tests(tests, NULL, NULL);
}
