/* Texts long enough for two threads: the ring hands out what went in, in its order and however the
 * bytes were cut; and a recording read that way gives the samples and the messages of one read in
 * one go, which a single quote in its first row brings about. */
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
#include "read/csv_lanes.h"
#include "read/digest.h"
#include "read/recording.h"

#define ROWS 45000 /* 1.2 MB and more: over twice round the ring */
#define PART CSV_ROWS_FEED_MOST

static const char path[] = "read_lanes_test.csv";

static uint64_t state = 88172645463325252ULL; /* any seed but 0 */

static size_t random_below(size_t limit) /* xorshift64: G. Marsaglia, J. Stat. Softw. 8 (2003) 14 */
{
    state ^= state << 13;
    state ^= state >> 7;
    state ^= state << 17;
    return (size_t)(state % limit);
}

/* ---- the ring ---- */

static const struct csv_layout plain_layout = {
    .separator = ',', .decimal = '.', .width = 3, .data_line = 1, .has_time = true, .time_si = 1};

/* Row i is the time i/4 and the numbers i and -i, all of them exact in binary. */
static void print_rows(struct buffer *text, int rows)
{
    for (int i = 0; i < rows; i++)
        buffer_format(text, "%d.%02d,%d,-%d%s", i / 4, i % 4 * 25, i, i, i % 3 ? "\n" : "\r\n");
}

struct drain {
    struct csv_lanes *lanes;
    int rows;
    long lines;
    size_t bytes;
    bool clean;
};

/* Takes a part out and checks its rows. False: none is full, or it is not clean. */
static bool take_part(struct drain *drain)
{
    struct csv_lanes_part part;
    if (!csv_lanes_next(drain->lanes, &part))
        return false;
    drain->clean = part.clean;
    for (size_t r = 0; r < part.rows->count && part.clean; r++) {
        const int i = drain->rows++;
        assert_true(part.rows->values[2 * r] == i && part.rows->values[2 * r + 1] == -i);
        assert_true(part.rows->times[r] == i / 4.0);
        assert_int_equal(part.rows->grains[r].fraction, 2);
    }
    drain->lines += part.clean ? part.lines : 0;
    drain->bytes += part.clean ? part.length : 0;
    csv_lanes_drop(drain->lanes);
    return part.clean;
}

static struct drain start_drain(void)
{
    static const size_t columns[] = {1, 2};
    struct drain drain = {.lanes = csv_lanes_new(&plain_layout, columns, 2), .clean = true};
    assert_non_null(drain.lanes);
    return drain;
}

/* All of the text in pieces of at most `most` bytes; parts are taken when there is no room, and now
 * and then. */
static void pour(struct drain *drain, const char *bytes, size_t length, size_t most)
{
    size_t at = 0;
    while (at < length && drain->clean) {
        size_t room;
        char *to = csv_lanes_room(drain->lanes, &room);
        if (!to || random_below(16) == 0) {
            (void)take_part(drain);
            continue;
        }
        size_t piece = 1 + random_below(most);
        piece = piece < room ? piece : room;
        piece = piece < length - at ? piece : length - at;
        memcpy(to, bytes + at, piece);
        assert_true(csv_lanes_fill(drain->lanes, piece));
        at += piece;
    }
    while (drain->clean && take_part(drain))
        ;
}

static void test_ring_keeps_order_however_it_is_cut(void **unused)
{
    (void)unused;
    static const size_t most[] = {40, 1000, PART / 2, PART};
    struct buffer text = BUFFER_INIT;
    print_rows(&text, ROWS);
    for (size_t k = 0; k < sizeof most / sizeof *most; k++) {
        struct drain drain = start_drain();
        pour(&drain, text.bytes, text.length, most[k]);
        assert_true(drain.clean);
        assert_int_equal(drain.rows, ROWS);
        assert_int_equal(drain.lines, ROWS);
        assert_int_equal(drain.bytes, text.length);
        csv_lanes_free(drain.lanes);
    }
    buffer_release(&text);
}

static void test_what_is_not_clean_is_said(void **unused)
{
    (void)unused;
    static const char *const odd[] = {"\n",        "1.00,2\n",       "1.00,2,x\n",    "1.00,,2\n",
                                      "1,2,3,4\n", "1.00,\"2\",3\n", "1.00,nan,3\n",  "1.00,\"2\n",
                                      "\r\n",      "x,1,2\n",        "1.00,1e999,3\n"};
    for (size_t k = 0; k < 2 * (sizeof odd / sizeof *odd); k++) {
        struct buffer text = BUFFER_INIT;
        struct drain drain = start_drain();
        print_rows(&text, 9000);
        const size_t before = text.length;
        buffer_text(&text, odd[k / 2]);
        print_rows(&text, k % 2 ? 10 : 0); /* it may stand at the end of its part */
        pour(&drain, text.bytes, text.length, PART);
        assert_false(drain.clean);
        assert_true(drain.bytes <= before && before - drain.bytes < PART);
        csv_lanes_free(drain.lanes);
        buffer_release(&text);
    }
}

static void test_a_line_that_fills_all_room_is_refused(void **unused)
{
    (void)unused;
    struct drain drain = start_drain();
    size_t room;
    char *to = csv_lanes_room(drain.lanes, &room);
    assert_int_equal(room, PART);
    memset(to, '1', room - 1);
    assert_true(csv_lanes_fill(drain.lanes, room - 1)); /* a newline may still come */
    to = csv_lanes_room(drain.lanes, &room);
    assert_int_equal(room, 1);
    *to = '1';
    assert_false(csv_lanes_fill(drain.lanes, 1));
    assert_false(take_part(&drain));
    csv_lanes_free(drain.lanes);
}

static void test_ring_may_end_at_any_time(void **unused)
{
    (void)unused;
    struct buffer text = BUFFER_INIT;
    print_rows(&text, 4000);
    for (int k = 0; k < 200; k++) {
        struct drain drain = start_drain();
        for (int i = 0; i < k % 9; i++) { /* 8 parts, and no room for a ninth */
            size_t room;
            char *to = csv_lanes_room(drain.lanes, &room);
            if (to) {
                memcpy(to, text.bytes, room / 2);
                assert_true(csv_lanes_fill(drain.lanes, room / 2));
            } else {
                assert_int_equal(i, 8);
            }
        }
        csv_lanes_free(drain.lanes);
    }
    csv_lanes_free(NULL);
    buffer_release(&text);
}

/* ---- recordings ---- */

struct result {
    struct fault fault;
    double rate_hz;
    long long frames;
    float samples[2 * (ROWS + 8)];
};

static void read_back(struct result *result, bool time)
{
    char *const paths[] = {(char *)path};
    const struct recording_column columns[] = {
        {.name = "DE-V", .channel = "a", .si = 1},
        {.name = "tacho", .channel = "b", .si = 1, .plain = true, .volts = true}};
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
                                        .rate_hz = time ? NAN : 2000,
                                        .csv = {.skip = -1, .time_column = ""}};
    struct recording recording = {0};
    size_t got = 1;
    int status = recording_open(&recording, &wish, &result->fault);
    while (status == STATUS_DONE && got > 0) {
        size_t ask = 1 + random_below(9000);
        if (result->frames + (long long)ask > ROWS + 8)
            ask = (size_t)(ROWS + 8 - result->frames);
        status = recording_read(&recording, result->samples + 2 * result->frames, ask, &got,
                                &result->fault);
        result->frames += (long long)got;
    }
    result->rate_hz = recording.rate_hz;
    recording_close(&recording);
    digest_queue_free(queue);
}

struct damage {
    int row;          /* from 0; -1: none */
    const char *with; /* instead of the row; "@" before it: the row's time */
    const char *part; /* of the message */
};

/* One text, or the same with quotes round the first row's first number. */
static void save(bool quoted, bool time, const char *end, const struct damage *damage)
{
    FILE *file = fopen(path, "wb");
    assert_non_null(file);
    fputs(time ? "Time,a,b\n" : "a,b\n", file);
    for (int i = 0; i < ROWS; i++) {
        const char *quote = quoted && i == 0 ? "\"" : "";
        char at[32] = "";
        if (time)
            snprintf(at, sizeof at, "%s%.4f%s,", quote, i / 2000.0, quote);
        if (i == damage->row)
            fprintf(file, "%s%s", *damage->with == '@' ? at : "",
                    damage->with + (*damage->with == '@'));
        else
            fprintf(file, "%s%s%.6f%s,%.*f%s", at, time ? "" : quote, 2.5 * sin(0.37 * i),
                    time ? "" : quote, i % 5, i % 20 < 2 ? 4.75 : 0.25,
                    i == ROWS - 1 ? "" : end); /* the last newline is missing */
    }
    assert_int_equal(fclose(file), 0);
}

static void compare(bool time, const char *end, const struct damage *damage)
{
    static struct result fast, plain;
    save(false, time, end, damage);
    read_back(&fast, time);
    save(true, time, end, damage);
    read_back(&plain, time);
    assert_string_equal(fast.fault.text, plain.fault.text);
    assert_int_equal(fast.fault.status, plain.fault.status);
    assert_true(fast.frames == plain.frames || damage->row >= 0);
    const size_t both = (size_t)(fast.frames < plain.frames ? fast.frames : plain.frames);
    assert_memory_equal(fast.samples, plain.samples, 2 * both * sizeof *fast.samples);
    if (!strstr(fast.fault.text, damage->part))
        fail_msg("'%s' is not in: %s", damage->part, fast.fault.text);
    assert_true(fast.rate_hz == plain.rate_hz);
    if (damage->row >= 0) {
        assert_int_equal(fast.fault.status, STATUS_RECORDING);
    } else {
        assert_int_equal(fast.frames, ROWS);
        assert_true(fabs(fast.rate_hz / 2000 - 1) < 1e-6);
    }
    unlink(path);
}

static void test_same_samples(void **unused)
{
    (void)unused;
    const struct damage none = {-1, "", ""};
    static const char *const ends[] = {"\n", "\r\n"};
    for (int time = 0; time < 2; time++)
        for (size_t e = 0; e < 2; e++)
            compare(time != 0, ends[e], &none);
}

/* Row 30000 stands in line 30002, in the ring's second round; row 44998 in the last part but one
 * line. */
static void test_same_damage_same_message(void **unused)
{
    (void)unused;
    static const struct damage cases[] = {
        {30000, "@oops,1\n",
         "a cell is no number, 'oops': 'read_lanes_test.csv' (line 30002, column 2)"},
        {30000, "@1\n", "a row has 2 cells instead of 3: 'read_lanes_test.csv' (line 30002)"},
        {30000, "@1,2,3\n", "a row has 4 cells instead of 3: 'read_lanes_test.csv' (line 30002)"},
        {30000, "@,2\n", "a cell is empty: 'read_lanes_test.csv' (line 30002, column 2)"},
        {30000, "@1e999,2\n", "out of range"},
        {30000, "\n", "an empty line within the data: 'read_lanes_test.csv' (line 30002)"},
        {30000, "\n\n\n", "an empty line within the data: 'read_lanes_test.csv' (line 30002)"},
        {30000, "", "(line 30002, column 1)"}, /* a row is gone: the next one's time jumps */
        {30000, "14.9000,1,2\n",
         "the time goes backwards at '14.9000': 'read_lanes_test.csv' (line 30002, column 1)"},
        {30000, "15.0100,1,2\n",
         "uneven step at '15.0100': 'read_lanes_test.csv' (line 30002, column 1)"},
        {30000, "15.0100,oops,2\n", "uneven step"}, /* the first of two faults in a row */
        {30000, "15.0000,\"0.1,2\n", "line 30002"}, /* the quote is never closed */
        {30000, "15.0000,\"0.1\n\",2\n", "30002"},  /* a cell runs over two lines */
        {44998, "@oops,1\n", "(line 45000, column 2)"},
        {1, "@oops,1\n", "(line 3, column 2)"},
    };
    for (size_t k = 0; k < sizeof cases / sizeof *cases; k++)
        compare(true, "\n", &cases[k]);
}

/* Quotes that are closed are no damage, wherever they begin. */
static void test_quotes_in_the_middle(void **unused)
{
    (void)unused;
    static struct result result;
    const struct damage quotes = {20000, "@\"0.5\",\"1\"\n", ""};
    save(false, true, "\n", &quotes);
    read_back(&result, true);
    assert_string_equal(result.fault.text, "");
    assert_int_equal(result.frames, ROWS);
    assert_true(result.samples[40000] == 0.5f && result.samples[40001] == 1.0f);
    unlink(path);
}

int main(void)
{
    const struct CMUnitTest tests[] = {
        cmocka_unit_test(test_ring_keeps_order_however_it_is_cut),
        cmocka_unit_test(test_what_is_not_clean_is_said),
        cmocka_unit_test(test_a_line_that_fills_all_room_is_refused),
        cmocka_unit_test(test_ring_may_end_at_any_time),
        cmocka_unit_test(test_same_samples),
        cmocka_unit_test(test_same_damage_same_message),
        cmocka_unit_test(test_quotes_in_the_middle),
    };
    return cmocka_run_group_tests(tests, NULL, NULL);
}
