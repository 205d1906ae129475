/* Texts of columns in every dialect that instruments and spreadsheets write: the same numbers,
 * printed by the C library, must come back from each; and each damage is named with its line. */
#include <math.h>
#include <setjmp.h>
#include <stdarg.h>
#include <stddef.h>
#include <stdint.h>
#include <stdio.h>
#include <stdlib.h>
#include <string.h>
#include <unistd.h>

#include <cmocka.h>

#include "base/buffer.h"
#include "read/digest.h"
#include "read/recording.h"

#define ROWS 1200

static const char path[] = "read_csv_test.csv";

struct dialect {
    const char *head, *separator;
    char decimal;
    const char *quote, *end, *close, *format;
    bool time;
    double time_unit;
};

static double signal_at(int row, int column)
{
    return column == 0 ? 2.5 * sin(0.37 * row) : row % 20 < 2 ? 4.75 : 0.25;
}

static void add_number(struct buffer *text, const struct dialect *d, const char *format, double x)
{
    char number[40];
    if (!strcmp(format, "%.6e"))
        snprintf(number, sizeof number, "%.6e", x);
    else
        snprintf(number, sizeof number, "%.6f", x);
    char *point = strchr(number, '.');
    if (point)
        *point = d->decimal;
    buffer_format(text, "%s%s%s", d->quote, number, d->quote);
}

static void add_row(struct buffer *text, const struct dialect *d, int row)
{
    if (d->time) {
        add_number(text, d, d->format, row / 2000.0 / d->time_unit);
        buffer_text(text, d->separator);
    }
    add_number(text, d, d->format, signal_at(row, 0));
    buffer_text(text, d->separator);
    add_number(text, d, d->format, signal_at(row, 1));
    buffer_text(text, d->close);
    buffer_text(text, d->end);
}

static void save(const char *bytes, size_t length)
{
    FILE *file = fopen(path, "wb");
    assert_non_null(file);
    assert_int_equal(fwrite(bytes, 1, length, file), length);
    assert_int_equal(fclose(file), 0);
}

static struct csv_wish wish_found(void)
{
    return (struct csv_wish){.skip = -1, .time_column = ""};
}

struct result {
    struct fault fault;
    double rate_hz;
    long long frames;
    float samples[2 * ROWS + 16];
};

/* Reads two columns of the file at `path`. */
static void read_back(struct result *result, const char *first, const char *second, double rate,
                      struct csv_wish csv)
{
    char *const paths[] = {(char *)path};
    const struct recording_column columns[] = {
        {.name = "DE-V", .channel = first, .si = 1},
        {.name = "tacho", .channel = second, .si = 1, .plain = true, .volts = true}};
    memset(result, 0, sizeof *result);
    struct digest_queue *queue = digest_queue_new(paths, 1);
    assert_non_null(queue);
    const struct digest *digest = digest_queue_wait(queue, 0);
    assert_int_equal(digest->fault.status, STATUS_DONE);
    const struct recording_wish wish = {.paths = paths,
                                        .digests = &digest,
                                        .path_count = 1,
                                        .columns = columns,
                                        .column_count = 2,
                                        .full_scale = NAN,
                                        .rate_hz = rate,
                                        .csv = csv};
    struct recording recording = {0};
    size_t got = 1;
    int status = recording_open(&recording, &wish, &result->fault);
    while (status == STATUS_DONE && got > 0 && result->frames + 7 <= ROWS + 8) {
        status = recording_read(&recording, result->samples + 2 * result->frames, 7, &got,
                                &result->fault);
        result->frames += (long long)got;
    }
    result->rate_hz = recording.rate_hz;
    recording_close(&recording);
    digest_queue_free(queue);
}

static void expect_signal(const struct result *result)
{
    if (result->fault.status != STATUS_DONE)
        fail_msg("%s", result->fault.text);
    assert_int_equal(result->frames, ROWS);
    assert_true(fabs(result->rate_hz / 2000 - 1) < 1e-6);
    for (int i = 0; i < ROWS; i++)
        for (int c = 0; c < 2; c++) /* six digits are printed, float32 holds 2.5 to 1.2e-7 */
            assert_true(fabs(result->samples[2 * i + c] - signal_at(i, c)) < 1.5e-6);
}

static const struct dialect dialects[] = {
    {"Time,DE-V,Tacho\n", ",", '.', "", "\n", "", "%.6f", true, 1},
    {"Time;DE-V;Tacho\n", ";", ',', "", "\n", "", "%.6f", true, 1},
    {"Time;DE-V;Tacho\n", ";", '.', "", "\n", "", "%.6f", true, 1},
    {"Time\tDE-V\tTacho\n", "\t", ',', "", "\r\n", "", "%.6f", true, 1},
    {"Time\tDE-V\tTacho\r\n", "\t", '.', "", "\r\n", "", "%.6e", true, 1},
    {"\xEF\xBB\xBFZeit;DE-V;Tacho\r\ns;g;V\r\n", ";", ',', "", "\r\n", "", "%.6f", true, 1},
    {"Zeit;DE-V;Tacho\r\nms;g;V\r\n", ";", ',', "", "\r\n", "", "%.6f", true, 1e-3},
    {"Time [ms];DE-V [g];Tacho [V]\n", ";", ',', "", "\n", "", "%.6f", true, 1e-3},
    {"time_ms,DE-V,Tacho\n", ",", '.', "", "\n", "", "%.6f", true, 1e-3},
    {"\"Time\",\"DE-V\",\"Tacho\"\n", ",", ',', "\"", "\n", "", "%.6f", true, 1},
    {"\"Time\";\"DE-V\";\"Tacho\"\n", ";", '.', "\"", "\n", "", "%.6e", true, 1},
    {"Time;DE-V;Tacho;\n", ";", ',', "", "\n", ";", "%.6f", true, 1},
    {"Time;DE-V;Tacho\n", ";", ',', "", "\n", "  ;  ; ", "%.6f", true, 1},
    {"Time , DE-V , Tacho \n", " , ", '.', "", "\n", "  ", "%.6f", true, 1},
    {"Logger 7\nDate;2025-03-14\n\nSerial;12;13;14\nChannels;2\nTime;DE-V;Tacho\n", ";", ',', "",
     "\n", "", "%.6f", true, 1},
    {"Time,DE-V,Tacho\n", ",", '.', "", "\r\r\n", "", "%.6f", true, 1},
    {"DE-V;Tacho\n", ";", ',', "", "\n", "", "%.6f", false, 1},
    {"DE-V,Tacho\n", ",", '.', "", "\n", "", "%.6f", false, 1},
};

static void print_dialect(struct buffer *text, const struct dialect *d)
{
    buffer_clear(text);
    buffer_text(text, d->head);
    for (int i = 0; i < ROWS; i++)
        add_row(text, d, i);
}

static void test_dialects(void **unused)
{
    (void)unused;
    static const char *const tails[] = {"", "\n", "\r\n  \r\n", "\n \n", "SSS\n\n"};
    struct buffer text = BUFFER_INIT;
    static struct result result;
    for (size_t k = 0; k < sizeof dialects / sizeof *dialects; k++)
        for (size_t t = 0; t < 5; t++) {
            const struct dialect *d = &dialects[k];
            print_dialect(&text, d);
            const char separator = d->separator[strspn(d->separator, " ")];
            for (const char *tail = tails[t]; *tail; tail++)
                buffer_add(&text, *tail == 'S' ? &separator : tail, 1);
            save(text.bytes, text.length);
            const double rate = d->time ? NAN : 2000;
            read_back(&result, "DE-V", "Tacho", rate, wish_found());
            expect_signal(&result);
            read_back(&result, d->time ? "2" : "1", d->time ? "3" : "2", rate, wish_found());
            expect_signal(&result);
            /* all that was found, stated */
            struct csv_wish stated = wish_found();
            stated.separator = separator;
            stated.decimal = d->decimal;
            stated.time_column = d->time ? "1" : "none";
            read_back(&result, "DE-V", "Tacho", rate, stated);
            expect_signal(&result);
        }
    buffer_release(&text);
    unlink(path);
}

static void test_without_last_newline_and_header(void **unused)
{
    (void)unused;
    struct dialect d = dialects[1];
    static struct result result;
    struct buffer text = BUFFER_INIT;
    print_dialect(&text, &d);
    save(text.bytes, text.length - 1);
    read_back(&result, "DE-V", "Tacho", NAN, wish_found());
    expect_signal(&result);
    d.head = "";
    print_dialect(&text, &d);
    save(text.bytes, text.length);
    read_back(&result, "2", "3", NAN, wish_found());
    expect_signal(&result);
    buffer_release(&text);
    unlink(path);
}

static void expect_fault(const char *bytes, const char *first, const char *second, double rate,
                         struct csv_wish wish, const char *part)
{
    static struct result result;
    save(bytes, strlen(bytes));
    read_back(&result, first, second, rate, wish);
    assert_int_equal(result.fault.status, STATUS_RECORDING);
    if (!strstr(result.fault.text, part))
        fail_msg("'%s' is not in: %s", part, result.fault.text);
}

/* Replaces row `row` of the plain dialect by `with`. */
static void expect_damage(int row, const char *with, const char *part)
{
    struct buffer text = BUFFER_INIT;
    buffer_text(&text, dialects[0].head);
    for (int i = 0; i < ROWS; i++)
        if (i == row)
            buffer_text(&text, with);
        else
            add_row(&text, &dialects[0], i);
    expect_fault(text.bytes, "DE-V", "Tacho", NAN, wish_found(), part);
    buffer_release(&text);
}

static void test_damage_is_named_with_its_line(void **unused)
{
    (void)unused;
    static const int rows[] = {0, 1, 2, 600, ROWS - 2};
    for (size_t k = 0; k < sizeof rows / sizeof *rows; k++) {
        char line[32], cell[48], bad[80];
        snprintf(line, sizeof line, "(line %d)", rows[k] + 2);
        snprintf(cell, sizeof cell, "(line %d, column 2)", rows[k] + 2);
        snprintf(bad, sizeof bad, "%.6f,0.1\n", rows[k] / 2000.0);
        expect_damage(rows[k], bad, line);
        snprintf(bad, sizeof bad, "%.6f,0.1,0.2,0.3\n", rows[k] / 2000.0);
        expect_damage(rows[k], bad, line);
        snprintf(bad, sizeof bad, "%.6f,oops,0.2\n", rows[k] / 2000.0);
        expect_damage(rows[k], bad, cell);
        snprintf(bad, sizeof bad, "%.6f,NaN,0.2\n", rows[k] / 2000.0);
        expect_damage(rows[k], bad, cell);
        snprintf(bad, sizeof bad, "%.6f,1e999,0.2\n", rows[k] / 2000.0);
        expect_damage(rows[k], bad, cell);
    }
    expect_damage(600, "0.300000,,0.2\n", "(line 602, column 2)");
    expect_damage(600, "\n", "empty line within the data");
    expect_damage(600, "", "(line 602, column 1)");
    expect_damage(600, "0.299000,0.1,0.2\n", "backwards at '0.299000'");
    expect_damage(600, "0.299000,0.1,0.2\n", "(line 602, column 1)");
    expect_damage(ROWS - 1, "0.599500,0.1", "(line 1201)");
    expect_damage(600, "0.300000,\"0.1,0.2\n", "(line 602");
    unlink(path);
}

static void test_guesses_are_refused(void **unused)
{
    (void)unused;
    struct csv_wish wish = wish_found();
    expect_fault("1,5,2,5\n1,6,2,6\n1,7,2,7\n", "1", "2", 100, wish,
                 "separate columns or decimals");
    expect_fault("a,b\n1,5,2,5\n1,6,2,6\n1,7,2,7\n", "a", "b", 100, wish, "columns or decimals");
    expect_fault("only words\nand more\n", "1", "2", 100, wish, "rows of numbers");
    expect_fault("a,a\n1.5,2.5\n1.6,2.6\n", "a", "2", 100, wish, "several columns");
    expect_fault("a,b\n1.5,2.5\n1.6,2.6\n", "c", "2", 100, wish, "no column is named 'c'");
    expect_fault("a,b\n1.5,2.5\n1.6,2.6\n", "1", "3", 100, wish, "no channel 3");
    expect_fault("a,b\r1.5,2.5\r1.6,2.6\r", "1", "2", 100, wish, "carriage return");
    expect_fault("t,a,b\nlap,g,V\n0.1,1.5,2.5\n0.2,1.6,2.6\n", "2", "3", 100, wish,
                 "unit of the time");
    expect_fault("t,a,b\n0.1,1.5,2.5\n0.2,1.6,2.6\n", "1", "3", NAN, wish, "time column");
    expect_fault("t,a,b\n0.1,1.5,2.5\n", "2", "3", NAN, wish, "only one row");
    wish.time_column = "q";
    expect_fault("t,a,b\n0.1,1.5,2.5\n0.2,1.6,2.6\n", "2", "3", 100, wish, "'q'");
    wish = wish_found();
    wish.decimal = ',';
    expect_fault("1,5,2,5\n1,6,2,6\n1,7,2,7\n", "1", "2", 100, wish, "rows of numbers");
    unlink(path);
}

/* The sheet's word on separator and decimal wins. */
static void test_statements_decide(void **unused)
{
    (void)unused;
    static struct result result;
    struct csv_wish wish = wish_found();
    wish.separator = ',';
    const char *text = "1,5,2,5\n3,6,4,6\n";
    save(text, strlen(text));
    read_back(&result, "1", "3", 100, wish);
    assert_int_equal(result.fault.status, STATUS_DONE);
    assert_true(result.samples[0] == 1 && result.samples[1] == 2 && result.samples[2] == 3);
    assert_true(result.rate_hz == 100);
    unlink(path);
}

int main(void)
{
    const struct CMUnitTest tests[] = {
        cmocka_unit_test(test_dialects),
        cmocka_unit_test(test_without_last_newline_and_header),
        cmocka_unit_test(test_damage_is_named_with_its_line),
        cmocka_unit_test(test_guesses_are_refused),
        cmocka_unit_test(test_statements_decide),
    };
    return cmocka_run_group_tests(tests, NULL, NULL);
}
