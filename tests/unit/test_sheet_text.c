/* The sheet as text: comments, quotes, long lines, marks and line ends, junk, and mutated sheets.
 */
#include <locale.h>
#include <math.h>
#include <stdarg.h>
#include <stddef.h>
#include <stdint.h>
#include <stdio.h>
#include <setjmp.h>
#include <stdlib.h>
#include <string.h>
#include <cmocka.h>

#include "sheet_desk.h"

/* Reads; on success gives the title, on failure the errors behind the path. */
static int read_text(const char *text, size_t length, struct sheet *sheet, char *said, size_t room)
{
    struct buffer errors = BUFFER_INIT;
    int result = sheet_desk_read(sheet, text, length, false, &errors);
    const char *from = errors.bytes ? strstr(errors.bytes, "fan.ini") : NULL;
    snprintf(said, room, "%s", from ? from : "");
    buffer_release(&errors);
    return result;
}

static void takes_title(const char *written, const char *wanted)
{
    char text[6000], said[400];
    struct sheet sheet;
    snprintf(text, sizeof text, "[job]\n%s\n%s", written, SHEET_DESK_LEAST);
    if (read_text(text, strlen(text), &sheet, said, sizeof said) != 0)
        fail_msg("'%s' not taken: %s", written, said);
    assert_string_equal(sheet.job.title, wanted);
    sheet_release(&sheet);
}

static void refuses(const char *text, size_t length, const char *wanted)
{
    sheet_desk_expect_bytes(text, length, false, wanted);
}

static void test_comments_and_quotes(void **state)
{
    (void)state;
    takes_title("title = Fan # 3", "Fan");
    takes_title("title = Fan #3", "Fan #3");
    takes_title("title = Fan# 3", "Fan# 3");
    takes_title("title = Fan #", "Fan");
    takes_title("title = Fan\t#\tnumber # 3", "Fan");
    takes_title("title = \"Fan # 3\" # the third", "Fan # 3");
    takes_title("title = \"  Fan \"", "  Fan ");
    takes_title("title = Fan \"3\"", "Fan \"3\"");
    takes_title("title = a; b ; c", "a; b ; c");
    takes_title("title = a = b : c [d]", "a = b : c [d]");
    takes_title("title=tight", "tight");
    takes_title("# title = no\n   # nor this\n\n \t \n   title = indented", "indented");
    takes_title("units = metric\n  title = Fan", "Fan"); /* no continuation of the line before */
    takes_title("title = M\xc3\xbchle \xe2\x84\x96 3", "M\xc3\xbchle \xe2\x84\x96 3");
}

static void test_quote_errors(void **state)
{
    (void)state;
    char text[600];
    snprintf(text, sizeof text, "%s[job]\ntitle = \"open\n", SHEET_DESK_LEAST);
    refuses(text, strlen(text), "fan.ini:11: quote not closed: 'title'\n");
    snprintf(text, sizeof text, "%s[job]\ntitle = \"a\" b\n", SHEET_DESK_LEAST);
    refuses(text, strlen(text), "fan.ini:11: text behind the closing quote: 'title'\n");
    snprintf(text, sizeof text, "%s[job]\ntitle =   # nothing\n", SHEET_DESK_LEAST);
    refuses(text, strlen(text), "fan.ini:11: no value: 'title'\n");
    snprintf(text, sizeof text, "%s[job]\n; title = x\n", SHEET_DESK_LEAST);
    refuses(text, strlen(text), "fan.ini:11: a comment begins with '#', not with ';': '; title'\n");
    snprintf(text, sizeof text, "%s[job]\ntitle\n", SHEET_DESK_LEAST);
    refuses(text, strlen(text), "fan.ini:11: neither a section nor 'key = value'\n");
}

/* inih alone would cut these: a line at 200 bytes, a section's name at 49. */
static void test_long_lines(void **state)
{
    (void)state;
    char title[300], text[12000];
    memset(title, 'x', sizeof title);
    memcpy(title, "title = ", 8);
    title[8 + 200] = '\0';
    takes_title(title, title + 8);
    title[8 + 200] = 'x';
    title[8 + 201] = '\0';
    snprintf(text, sizeof text, "%s[job]\n%s\n", SHEET_DESK_LEAST, title);
    char said[400];
    struct sheet sheet;
    assert_int_equal(read_text(text, strlen(text), &sheet, said, sizeof said), 1);
    assert_non_null(strstr(said, "fan.ini:11: longer than 200 bytes: 'title = x"));

    /* 200 positions on one line of more than 1000 bytes, each of them there */
    size_t made = (size_t)snprintf(text, sizeof text, "[job]\nangles = against rotation\n%s",
                                   SHEET_DESK_LEAST);
    char list[3000] = "radius = 1 m\npositions =";
    for (int i = 0; i < 200; i++)
        sprintf(list + strlen(list), " %d.25", i);
    strcat(list, " deg");
    char *whole = sheet_desk_swap(text, "radius = 1 m", list);
    assert_true(strlen(whole) > made + 1000);
    assert_int_equal(read_text(whole, strlen(whole), &sheet, said, sizeof said), 0);
    assert_int_equal(sheet.job.planes[0].position_count, 200);
    assert_true(sheet.job.planes[0].positions[199].angle_deg == 199.25);
    sheet_release(&sheet);
    free(whole);

    made = (size_t)snprintf(text, sizeof text, "%s[job]\ntitle = ", SHEET_DESK_LEAST);
    memset(text + made, 'y', 5000);
    strcpy(text + made + 5000, "\n");
    refuses(
        text, strlen(text),
        "fan.ini:11: line longer than 4000 bytes: 'title = yyyyyyyyyyyyyyyyyyyyyyyyyyyyyyyy...'\n");
}

static void test_long_names(void **state)
{
    (void)state;
    char text[800];
    struct sheet sheet;
    char said[400];
    const char *forty = "1234567890123456789012345678901234567890";
    snprintf(text, sizeof text, "%s[sensor %s]\nchannel = 3\nunit = g\n[aim]\ntarget %s = 1 g pk\n",
             SHEET_DESK_LEAST, forty, forty);
    assert_int_equal(read_text(text, strlen(text), &sheet, said, sizeof said), 0);
    assert_string_equal(sheet.job.sensors[1].name, forty);
    sheet_release(&sheet);
    snprintf(text, sizeof text, "%s[sensor %s1]\nchannel = 3\nunit = g\n", SHEET_DESK_LEAST, forty);
    char wanted[200];
    snprintf(wanted, sizeof wanted, "fan.ini:10: name longer than 40 bytes: '[sensor %s1]'\n",
             forty);
    refuses(text, strlen(text), wanted);
}

/* Byte order mark, CRLF, no line end at the end: the same sheet. */
static void test_line_ends(void **state)
{
    (void)state;
    char text[2 * 4000] = "\xef\xbb\xbf", said[400];
    struct sheet sheet;
    size_t made = 3;
    for (const char *at = SHEET_DESK_FULL; *at; at++) {
        if (*at == '\n')
            text[made++] = '\r';
        text[made++] = *at;
    }
    assert_int_equal(read_text(text, made, &sheet, said, sizeof said), 0);
    assert_string_equal(sheet.job.title, "Grain dryer, exhaust fan 3");
    assert_string_equal(sheet.job.runs[2].condition, "hot");
    assert_int_equal(sheet.runs[1].line, sheet_desk_line(SHEET_DESK_FULL, "[run trial]"));
    sheet_release(&sheet);
    assert_int_equal(read_text(text, made - 2, &sheet, said, sizeof said), 0);
    assert_int_equal(sheet.job.limit_count, 5);
    sheet_release(&sheet);
}

static void test_junk(void **state)
{
    (void)state;
    char text[2000];
    refuses("\x7f"
            "ELF\x02\0\0\0junk\n\n[x",
            17, "fan.ini:1: not a text file: a NUL byte\n");
    refuses("RIFF\x24\0\0\0WAVEfmt ", 16,
            "fan.ini: this is a recording: 'lopside new' makes a sheet\n");
    size_t length = (size_t)snprintf(text, sizeof text, "%s[job]\ntitle = x\n", SHEET_DESK_LEAST);
    text[length - 2] = '\0';
    refuses(text, length, "fan.ini:11: not a text file: a NUL byte\n");
    refuses("\x01\x02\xff\xfe\n\x80\x81\n\xc3\n", 10, "fan.ini:1: not a text file\n");
    /* RFC 3629, section 4: overlong, surrogate, above U+10FFFF; and a Latin-1 letter */
    static const char *const BAD[] = {"\xc0\xaf", "\xed\xa0\x80", "\xf4\x90\x80\x80", "M\xfchle",
                                      "\xe2\x82"};
    for (size_t i = 0; i < sizeof BAD / sizeof BAD[0]; i++) {
        length = (size_t)snprintf(text, sizeof text, "%s[job]\nunits = US\ntitle = %s\n",
                                  SHEET_DESK_LEAST, BAD[i]);
        refuses(text, length, "fan.ini:12: not UTF-8 text in the line\n");
    }
    length = (size_t)snprintf(text, sizeof text, "%s[job]\nunits = US\ntitle = a\x1b[31m\n",
                              SHEET_DESK_LEAST);
    refuses(text, length, "fan.ini:12: control character in the line\n");
    refuses("", 0,
            "fan.ini:1: missing section: '[sensor NAME]'\n"
            "fan.ini:1: missing section: '[plane NAME]'\n"
            "fan.ini:1: missing section: '[run NAME]' (without one, name recordings: 'lopside read "
            "SHEET RECORDING...')\n");
}

static void test_too_long(void **state)
{
    (void)state;
    size_t length = (1 << 20) + 1;
    char *text = malloc(length);
    assert_non_null(text);
    memset(text, '\n', length);
    refuses(text, length, "fan.ini: not a job sheet: longer than 1 MiB\n");
    free(text);
}

/* A file of lines that are none ends with a bounded list, and at once. */
static void test_too_many_errors(void **state)
{
    (void)state;
    struct sheet sheet;
    struct buffer errors = BUFFER_INIT;
    size_t length = 400000;
    char *text = malloc(length);
    assert_non_null(text);
    for (size_t i = 0; i < length; i++)
        text[i] = "x\n"[i % 2];
    assert_int_equal(sheet_desk_read(&sheet, text, length, false, &errors), 1000);
    assert_non_null(strstr(errors.bytes, "fan.ini: too many errors, of which these came first\n"));
    assert_non_null(strstr(errors.bytes, "fan.ini:999: neither a section nor 'key = value'\n"));
    assert_null(strstr(errors.bytes, "fan.ini:1000:"));
    buffer_release(&errors);
    free(text);
}

static void test_no_file(void **state)
{
    (void)state;
    struct sheet sheet;
    struct buffer errors = BUFFER_INIT;
    assert_int_equal(sheet_read(&sheet, "no/such/sheet.ini", false, &errors), 1);
    assert_non_null(strstr(errors.bytes, "no/such/sheet.ini: cannot be opened"));
    buffer_clear(&errors);
    assert_int_equal(sheet_read(&sheet, ".", false, &errors), 1);
    assert_non_null(strstr(errors.bytes, ".: cannot be"));
    sheet_release(&sheet);
    sheet_release(&sheet);
    buffer_release(&errors);
}

/* Numbers do not follow the process's locale. Where none with a decimal comma is installed the C
 * locale alone is tried. */
static void test_locale(void **state)
{
    (void)state;
    static const char *const LOCALES[] = {"C", "de_DE.UTF-8", "fr_FR.UTF-8", "nl_NL.UTF-8"};
    for (size_t i = 0; i < sizeof LOCALES / sizeof LOCALES[0]; i++) {
        struct sheet sheet;
        char said[400];
        setlocale(LC_ALL, LOCALES[i]);
        assert_int_equal(
            read_text(SHEET_DESK_FULL, strlen(SHEET_DESK_FULL), &sheet, said, sizeof said), 0);
        assert_true(sheet.job.tacho_level == 2.5 && sheet.job.grade == 6.3);
        sheet_release(&sheet);
    }
    setlocale(LC_ALL, "C");
}

/* A short deterministic slice of fuzzing: cut, changed, doubled and dropped bytes never crash, and
 * what is refused says why in whole lines. */
static unsigned next_random(unsigned *seed)
{
    *seed = *seed * 1664525u + 1013904223u; /* Numerical Recipes' quick generator */
    return *seed >> 8;
}

static void try_mutant(const char *text, size_t length)
{
    struct sheet sheet;
    struct buffer errors = BUFFER_INIT;
    int result = sheet_desk_read(&sheet, text, length, length % 5 == 0, &errors);
    int lines = 0;
    for (size_t i = 0; i < errors.length; i++)
        lines += errors.bytes[i] == '\n';
    assert_int_equal(result, lines);
    if (result == 0) {
        struct buffer line = BUFFER_INIT;
        assert_int_equal(job_print(&sheet.job, &line), 0);
        buffer_release(&line);
    }
    sheet_release(&sheet);
    buffer_release(&errors);
}

static void test_mutants(void **state)
{
    (void)state;
    static const char BYTES[] = "[]=:#;\"\n\r\t ,.x-+e0 9\xc3\xff%g";
    size_t length = strlen(SHEET_DESK_FULL);
    char *text = malloc(length + 64);
    unsigned seed = 1;
    assert_non_null(text);
    for (int round = 0; round < 1500; round++) {
        size_t size = length;
        memcpy(text, SHEET_DESK_FULL, length);
        for (unsigned change = next_random(&seed) % 6; change-- > 0;) {
            size_t at = next_random(&seed) % size, run = next_random(&seed) % 12;
            if (at + run > size || size + run > length + 60)
                continue;
            switch (next_random(&seed) % 3) {
            case 0:
                text[at] = BYTES[next_random(&seed) % (sizeof BYTES - 1)];
                break;
            case 1:
                memmove(text + at, text + at + run, size - at - run);
                size -= run;
                break;
            default:
                memmove(text + at + run, text + at, size - at);
                size += run;
            }
        }
        try_mutant(text, round % 4 ? size : next_random(&seed) % size);
    }
    free(text);
}

int main(void)
{
    const struct CMUnitTest tests[] = {cmocka_unit_test(test_comments_and_quotes),
                                       cmocka_unit_test(test_quote_errors),
                                       cmocka_unit_test(test_long_lines),
                                       cmocka_unit_test(test_long_names),
                                       cmocka_unit_test(test_line_ends),
                                       cmocka_unit_test(test_junk),
                                       cmocka_unit_test(test_too_long),
                                       cmocka_unit_test(test_no_file),
                                       cmocka_unit_test(test_too_many_errors),
                                       cmocka_unit_test(test_locale),
                                       cmocka_unit_test(test_mutants)};
    return cmocka_run_group_tests(tests, NULL, NULL);
}
