/* The records survive printing and parsing, and the input keeps the rules of the stream. */
#include <setjmp.h>
#include <stdarg.h>
#include <stddef.h>
#include <stdint.h>
#include <cmocka.h>

#include <fcntl.h>
#include <math.h>
#include <stdio.h>
#include <stdlib.h>
#include <string.h>
#include <unistd.h>

#include "close_to.h"
#include "stream/outcomes.h"
#include "stream/records.h"
#include "stream/stream.h"

#define JOB                                                                                        \
    "{\"kind\":\"job\",\"lopside\":1,\"title\":\"t\",\"angles\":\"with rotation\",\"phase\":null," \
    "\"units\":\"metric\",\"rotor\":{\"mass\":340,\"service_speed_rpm\":1480},\"tacho\":{"         \
    "\"channel\":\"4\",\"edge\":\"falling\",\"marks\":1},\"sensors\":[{\"name\":\"DE-V\","         \
    "\"channel\":\"1\",\"quantity\":\"velocity\",\"show\":\"mm/s rms\",\"show_quantity\":"         \
    "\"velocity\",\"show_si\":0.001}],\"planes\":[{\"name\":\"wheel\",\"radius_m\":0.41,"          \
    "\"positions\":[{\"number\":1,\"angle_deg\":30,\"taken\":true}],\"stock\":[{\"mass\":0.01,"    \
    "\"count\":4}],\"pieces\":3,\"most\":0.15,\"most_in_all\":null,\"work\":\"add\"}],\"runs\":["  \
    "{\"run\":\"a\",\"condition\":\"service\",\"weights\":[{\"plane\":\"wheel\",\"mass\":0.06,"    \
    "\"angle_deg\":30,\"mounted_mass\":0.06,\"radius_m\":0.41}],\"by_hand\":[],\"without\":["      \
    "\"DE-V\"]}],\"aim\":{\"targets\":[],\"minimise\":\"worst\",\"mounted\":\"a\","                \
    "\"repeatability\":0.03},\"limits\":[{\"check\":\"length\",\"caution\":90,\"refuse\":null}]}\n"

/* Writes bytes to a file of its own and gives its name (static). */
static const char *put(const void *bytes, size_t length)
{
    static char path[64];
    snprintf(path, sizeof path, "test_stream.%d", (int)getpid());
    FILE *file = fopen(path, "wb");
    assert_non_null(file);
    assert_int_equal(fwrite(bytes, 1, length, file), length);
    assert_int_equal(fclose(file), 0);
    return path;
}

/* Reads a whole input, counting its records; gives the status. */
static int count(const void *bytes, size_t length, int *records)
{
    const char *path = put(bytes, length);
    struct stream stream;
    struct record record;
    *records = 0;
    int status = stream_open(&stream, &path, 1, false);
    while (status == STATUS_DONE && stream_next(&stream, &record))
        ++*records;
    if (status == STATUS_DONE)
        status = stream.status;
    stream_close(&stream);
    unlink(path);
    return status;
}

static int count_text(const char *text, int *records)
{
    return count(text, strlen(text), records);
}

static void quiet(void)
{
    int null = open("/dev/null", O_WRONLY);
    dup2(null, STDERR_FILENO);
    close(null);
}

static void test_whole_streams(void **state)
{
    (void)state;
    int n;
    assert_int_equal(count_text(JOB "{\"kind\":\"end\",\"records\":1}\n", &n), STATUS_DONE);
    assert_int_equal(n, 0);
    assert_int_equal(count_text(JOB "{\"kind\":\"run\",\"run\":\"a\"}\n{\"kind\":\"strange\"}\n"
                                    "{\"kind\":\"end\",\"records\":3}\n" JOB
                                    "{\"kind\":\"run\",\"run\":\"b\"}\n{\"kind\":\"end\",\"records\":2}\n",
                                &n),
                     STATUS_DONE);
    assert_int_equal(n, 3);
    /* somebody's own record may hold whole numbers beyond 64 bits; what we count with may not */
    assert_int_equal(count_text(JOB "{\"kind\":\"strange\",\"n\":123456789012345678901234567890}\n"
                                    "{\"kind\":\"end\",\"records\":2}\n",
                                &n),
                     STATUS_DONE);
    assert_int_equal(n, 1);
    assert_int_equal(count_text(JOB "{\"kind\":\"end\",\"records\":123456789012345678901234567890}\n", &n),
                     STATUS_USAGE);
    assert_int_equal(count_text(JOB "{\"kind\":\"strange\",\"x\":1e999}\n{\"kind\":\"end\",\"records\":2}\n",
                                &n),
                     STATUS_USAGE);
}

static void test_broken_rules(void **state)
{
    (void)state;
    int n;
    /* no end; a wrong count; another job; a run twice; a doubled key; junk behind the end */
    assert_int_equal(count_text("", &n), STATUS_SYSTEM);
    assert_int_equal(count_text(JOB, &n), STATUS_SYSTEM);
    assert_int_equal(count_text(JOB "{\"kind\":\"end\",\"records\":2}\n", &n), STATUS_SYSTEM);
    assert_int_equal(count_text(JOB "{\"kind\":\"end\",\"records\":1}\n" JOB, &n), STATUS_SYSTEM);
    assert_int_equal(count_text(JOB "{\"kind\":\"run\",\"run\":\"a\"}\n" JOB
                                    "{\"kind\":\"end\",\"records\":1}\n",
                                &n),
                     STATUS_SYSTEM);
    assert_int_equal(count_text(JOB "{\"kind\":\"run\",\"run\":\"a\"}\n"
                                    "{\"kind\":\"run\",\"run\":\"a\"}\n{\"kind\":\"end\",\"records\":3}\n",
                                &n),
                     STATUS_USAGE);
    assert_int_equal(count_text(JOB "{\"kind\":\"x\",\"a\":1,\"a\":2}\n{\"kind\":\"end\",\"records\":2}\n",
                                &n),
                     STATUS_USAGE);
    assert_int_equal(count_text(JOB "{\"kind\":\"end\",\"records\":1}\nhello\n", &n), STATUS_USAGE);
    assert_int_equal(count_text("hello\n", &n), STATUS_USAGE);
    assert_int_equal(count_text("{\"kind\":\"run\",\"run\":\"a\"}\n", &n), STATUS_USAGE);
    assert_int_equal(count_text("{\"kind\":\"job\",\"lopside\":2}\n", &n), STATUS_USAGE);
}

/* What would have to be believed or not: a thing said twice, a sense left out, numbers that are none. */
static void test_what_is_not_believed(void **state)
{
    (void)state;
    static const char reading[] =
        "{\"kind\":\"reading\",\"run\":\"a\",\"sensor\":\"DE-V\",\"condition\":\"service\"}\n";
    static const struct {
        const char *from, *to;
    } changes[] = {
        {"\"angles\":\"with rotation\"", "\"angles\":null"},
        {"\"edge\":\"falling\"", "\"edge\":\"faling\""},
        {"\"marks\":1", "\"marks\":4294967297"},
        {"\"radius_m\":0.41", "\"radius_m\":-0.41"},
        {"\"positions\":[{\"number\":1,\"angle_deg\":30,\"taken\":true}]", "\"positions\":\"twelve\""},
        {"\"repeatability\":0.03", "\"repeatability\":-1"},
        {"\"count\":4", "\"count\":4294967296"},
        {"\"pieces\":3", "\"pieces\":-1"},
        {"\"without\":[\"DE-V\"]", "\"without\":[\"DE-W\"]"},
    };
    char text[4096];
    int n;
    snprintf(text, sizeof text, JOB "%s{\"kind\":\"end\",\"records\":2}\n", reading);
    assert_int_equal(count_text(text, &n), STATUS_DONE);
    snprintf(text, sizeof text, JOB "%s%s{\"kind\":\"end\",\"records\":3}\n", reading, reading);
    assert_int_equal(count_text(text, &n), STATUS_USAGE);
    for (size_t i = 0; i < sizeof changes / sizeof *changes; i++) {
        const char *at = strstr(JOB, changes[i].from);
        assert_non_null(at);
        snprintf(text, sizeof text, "%.*s%s%s{\"kind\":\"end\",\"records\":1}\n",
                 (int)(at - JOB), JOB, changes[i].to, at + strlen(changes[i].from));
        if (count_text(text, &n) != STATUS_USAGE)
            fail_msg("believed: %s", changes[i].to);
    }
}

static void test_long_records(void **state)
{
    (void)state;
    size_t length = strlen(JOB), long_text = 300 * 1024;
    char *bytes = malloc(length + long_text + 100);
    int n;
    assert_non_null(bytes);
    memcpy(bytes, JOB, length);
    size_t used = length + (size_t)sprintf(bytes + length, "{\"kind\":\"x\",\"a\":\"");
    memset(bytes + used, 'a', long_text);
    used += long_text;
    used += (size_t)sprintf(bytes + used, "\"}\n{\"kind\":\"end\",\"records\":2}\n");
    assert_int_equal(count(bytes, used, &n), STATUS_USAGE);
    free(bytes);
}

/* A job, a wave and two blocks, the first behind a line of odd length so that floats lie unaligned. */
static size_t sample_stream(char *bytes, size_t room)
{
    const char *head = JOB "{\"kind\":\"run\",\"run\":\"a\"}\n{\"kind\":\"wave\",\"run\":\"a\","
                           "\"rate_hz\":100,\"columns\":[{\"name\":\"DE-V\",\"quantity\":\"velocity\"},"
                           "{\"name\":\"tacho\",\"quantity\":\"tacho\"}]}\n";
    size_t used = strlen(head);
    assert_true(room > used + 4096);
    memcpy(bytes, head, used);
    for (int block = 0; block < 2; block++) {
        used += (size_t)sprintf(bytes + used, "{\"kind\":\"block\",\"run\":\"a\",\"frames\":%d}\n",
                                100 + block);
        for (int i = 0; i < 2 * (100 + block); i++, used += sizeof(float)) {
            float value = (float)i;
            memcpy(bytes + used, &value, sizeof value);
        }
    }
    return used + (size_t)sprintf(bytes + used, "{\"kind\":\"end\",\"records\":5}\n");
}

static void test_every_prefix_ends_early(void **state)
{
    (void)state;
    static char bytes[16384];
    size_t length = sample_stream(bytes, sizeof bytes);
    int n;
    assert_int_equal(count(bytes, length, &n), STATUS_DONE);
    assert_int_equal(n, 4);
    for (size_t cut = 0; cut < length; cut += cut < length - 40 ? 7 : 1)
        if (count(bytes, cut, &n) != STATUS_SYSTEM)
            fail_msg("a stream cut to %zu of %zu bytes does not end early", cut, length);
}

static void test_samples_are_whole_and_aligned(void **state)
{
    (void)state;
    static char bytes[16384];
    size_t length = sample_stream(bytes, sizeof bytes);
    const char *path = put(bytes, length);
    struct stream stream;
    struct record record;
    int blocks = 0;
    assert_int_equal(stream_open(&stream, &path, 1, false), STATUS_DONE);
    while (stream_next(&stream, &record)) {
        if (strcmp(record.kind, "block") != 0)
            continue;
        size_t want = 2 * (size_t)(100 + blocks++), got = 0;
        while (got < want) {
            const float *samples;
            size_t part;
            assert_int_equal(stream_samples(&stream, 52, &samples, &part), STATUS_DONE);
            assert_int_equal((uintptr_t)samples % 4, 0);
            for (size_t i = 0; i < part / 4; i++)
                assert_true(samples[i] == (float)(got + i));
            got += part / 4;
        }
        assert_int_equal(got, want);
    }
    assert_int_equal(stream.status, STATUS_DONE);
    assert_int_equal(blocks, 2);
    stream_close(&stream);
    unlink(path);
}

static void test_job_round_trip(void **state)
{
    (void)state;
    struct job job, again;
    struct buffer first = BUFFER_INIT, second = BUFFER_INIT;
    const char *why = NULL;
    job_init(&job);
    job_init(&again);
    json_t *json = json_loads(JOB, 0, NULL);
    assert_int_equal(job_parse(&job, json, &why), 0);
    assert_int_equal(job.angles, SENSE_WITH);
    assert_int_equal(job.tacho_edge, -1);
    assert_true(job.planes[0].positions[0].taken);
    assert_true(isinf(job.planes[0].most_in_all));
    assert_int_equal(job.planes[0].stock[0].count, 4);
    assert_int_equal(job.aim.mounted, 0);
    assert_true(job.runs[0].without[0]);
    assert_true(isnan(job.limits[0].refuse));
    assert_int_equal(job_print(&job, &first), 0);
    json_decref(json);
    json = json_loadb(first.bytes, first.length, JSON_REJECT_DUPLICATES, NULL);
    assert_non_null(json);
    assert_int_equal(job_parse(&again, json, &why), 0);
    assert_int_equal(job_print(&again, &second), 0);
    assert_string_equal(first.bytes, second.bytes);
    json_decref(json);
    buffer_release(&first);
    buffer_release(&second);
    job_release(&job);
    job_release(&again);
}

static void test_sheet_angles(void **state)
{
    (void)state;
    struct job job;
    job_init(&job);
    job.angles = SENSE_AGAINST;
    assert_close(job_sheet_angle(&job, 30), 30, 0);
    job.angles = SENSE_WITH; /* 30 deg against rotation is 330 deg with it: geometry of a circle */
    assert_close(job_sheet_angle(&job, 30), 330, 0);
    assert_close(job_sheet_angle(&job, 0), 0, 0);
}

static void test_reals_and_strings(void **state)
{
    (void)state;
    struct line line = LINE_INIT;
    const double values[] = {0.1, NAN, -INFINITY, 1.0};
    line_begin(&line, "x");
    line_reals(&line, "v", values, 4);
    line_text(&line, "s", "a\"b\n\xC3\xA9");
    line_vector(&line, "z", CMPLX(NAN, 0));
    line_end(&line);
    /* 0.1 to 17 digits: IEEE 754 double arithmetic */
    assert_string_equal(line.text.bytes, "{\"kind\":\"x\",\"v\":[0.10000000000000001,null,null,1],"
                                         "\"s\":\"a\\\"b\\n\xC3\xA9\",\"z\":null}\n");
    line_begin(&line, "x");
    line_text(&line, "s", "\xFF");
    line_end(&line);
    assert_true(line.text.failed);
    line_release(&line);
}

static void test_reading_round_trip(void **state)
{
    (void)state;
    struct job job;
    const char *why = NULL;
    job_init(&job);
    json_t *json = json_loads(JOB, 0, NULL);
    assert_int_equal(job_parse(&job, json, &why), 0);
    json_decref(json);
    struct reading_record r = {.run = "a", .condition = "service", .sensor = 0, .speed_rpm = 1480,
                               .has_phase = true, .vector = CMPLX(1e-3, -2e-3),
                               .cov = {1e-12, -2e-13, 3e-12}, .blocks = 30,
                               .steady = {1, 2, .99, 0, .1, 25, 1, 700, 8, 3.5, 24.5, 0, NAN, 1.5},
                               .overall = {NAN, QUANTITY_VELOCITY, 10, 1000}};
    struct reading_record again;
    struct line line = LINE_INIT;
    reading_print(&r, &job, &line);
    json = json_loadb(line.text.bytes, line.text.length, 0, NULL);
    assert_int_equal(reading_parse(&again, &job, json, &why), 0);
    assert_true(again.has_phase && again.vector == r.vector && again.cov[1] == r.cov[1]);
    assert_int_equal(again.steady.turns, 700);
    assert_true(again.steady.beat_pct == 8 && again.steady.beat_s == 3.5);
    assert_true(again.steady.neighbour_hz == 24.5 && again.steady.wander_pct == 1.5);
    assert_true(again.steady.step_pct == 0 && isnan(again.steady.step_s));
    assert_true(isnan(again.overall.rms));
    json_object_set_new(json, "sensor", json_string("nobody"));
    assert_int_equal(reading_parse(&again, &job, json, &why), -1);
    json_decref(json);
    line_release(&line);
    job_release(&job);
}

/* A coast-down: its speeds, names of conditions, curve, and rulings that name the condition. */
static void test_coast_down_records(void **state)
{
    (void)state;
    struct job job, again;
    struct buffer text = BUFFER_INIT;
    struct line line = LINE_INIT;
    const char *why = NULL;
    char name[NAME_ROOM];
    job_init(&job);
    job_init(&again);
    json_t *json = json_loads(JOB, 0, NULL);
    json_t *run = json_array_get(json_object_get(json, "runs"), 0);
    json_object_set_new(run, "role", json_string("coast-down"));
    json_object_set_new(run, "speeds_rpm", json_pack("[f,f]", 900.0, 1100.5));
    assert_int_equal(job_parse(&job, json, &why), 0);
    assert_int_equal(job_print(&job, &text), 0);
    json_object_set_new(run, "speeds_rpm", json_pack("[f,f]", 900.0, 800.0));
    assert_int_equal(job_parse(&again, json, &why), -1);
    json_decref(json);
    job_release(&again);
    job_init(&again);
    json = json_loadb(text.bytes, text.length, 0, NULL);
    assert_int_equal(job_parse(&again, json, &why), 0);
    assert_int_equal(again.runs[0].speed_count, 2);
    assert_true(again.runs[0].speeds_rpm[1] == 1100.5);
    json_decref(json);

    assert_true(job_speed_condition("hot", 900, name));
    assert_string_equal(name, "hot @ 900 rpm");
    assert_true(job_speed_condition("hot", 1100.5, name));
    assert_string_equal(name, "hot @ 1100.5 rpm");
    assert_false(job_speed_condition("a condition with a name of thirty", 1100, name));

    double speeds[2] = {1000, 900};
    double complex vectors[2] = {CMPLX(1, -2), CMPLX(NAN, NAN)};
    struct curve_record curve = {.run = "a", .speed_rpm = speeds, .vectors = vectors, .count = 2};
    struct curve_record back;
    curve_print(&curve, &job, &line);
    json = json_loadb(line.text.bytes, line.text.length, 0, NULL);
    assert_int_equal(curve_parse(&back, &job, json, &why), 0);
    assert_true(back.count == 2 && back.speed_rpm[1] == 900 && back.vectors[0] == vectors[0]);
    assert_true(isnan(creal(back.vectors[1])));
    curve_release(&back);
    json_array_append_new(json_object_get(json, "speed_rpm"), json_real(1));
    assert_int_equal(curve_parse(&back, &job, json, &why), -1);
    json_decref(json);
    line_release(&line);

    struct vetted_record v = {.run = "a", .condition = "hot @ 900 rpm", .use = true}, w;
    struct reading_record r = {.run = "a", .condition = "hot @ 900 rpm"};
    vetted_print(&v, &job, &line);
    json = json_loadb(line.text.bytes, line.text.length, 0, NULL);
    assert_int_equal(vetted_parse(&w, &job, json, &why), 0);
    json_decref(json);
    assert_string_equal(w.condition, v.condition);
    assert_true(vetted_is_of(&w, &r));
    strcpy(r.condition, "hot @ 800 rpm");
    assert_false(vetted_is_of(&w, &r));
    w.condition[0] = '\0';
    assert_true(vetted_is_of(&w, &r));
    line_release(&line);
    buffer_release(&text);
    job_release(&again);
    job_release(&job);
}

/* Blocks without phase carry amplitudes instead of vectors. */
static void test_blocks_without_phase(void **state)
{
    (void)state;
    struct job job;
    const char *why = NULL;
    struct line line = LINE_INIT;
    int sensor = 0;
    double complex vector = CMPLX(NAN, NAN);
    double rest = 1, amplitude = 3;
    struct turns_record r = {.run = "a", .t_s = 1, .turns = 4, .speed_rpm = 900, .count = 1,
                             .sensors = &sensor, .vectors = &vector, .rest = &rest,
                             .amplitudes = &amplitude};
    struct turns_record again;
    job_init(&job);
    json_t *json = json_loads(JOB, 0, NULL);
    assert_int_equal(job_parse(&job, json, &why), 0);
    json_decref(json);
    turns_print(&r, &job, &line);
    json = json_loadb(line.text.bytes, line.text.length, 0, NULL);
    assert_int_equal(turns_parse(&again, &job, json, &why), 0);
    assert_true(isnan(creal(again.vectors[0])) && again.amplitudes[0] == 3 && again.rest[0] == 1);
    turns_release(&again);
    json_object_del(json, "amplitudes");
    assert_int_equal(turns_parse(&again, &job, json, &why), 0);
    assert_true(isnan(again.amplitudes[0]));
    turns_release(&again);
    json_decref(json);
    line_release(&line);
    job_release(&job);
}

/* A spectrum with no lines named, with none found, and with two; the field is not demanded. */
static void test_spectrum_lines(void **state)
{
    (void)state;
    struct job job;
    const char *why = NULL;
    struct line line = LINE_INIT;
    double orders[] = {1, 2}, amplitude[] = {0.5, 0.25}, lines[] = {37.5, 0.125, 100, 0.0625};
    struct spectrum_record r = {.run = "a", .orders = orders, .amplitude = amplitude, .count = 2,
                                .lines = lines}, again;
    job_init(&job);
    json_t *json = json_loads(JOB, 0, NULL);
    assert_int_equal(job_parse(&job, json, &why), 0);
    json_decref(json);
    for (int kind = 0; kind < 3; kind++) {
        r.lines_known = kind > 0;
        r.line_count = kind > 1 ? 2 : 0;
        spectrum_print(&r, &job, &line);
        json = json_loadb(line.text.bytes, line.text.length, JSON_REJECT_DUPLICATES, NULL);
        assert_int_equal(json_array_size(json_object_get(json, "lines")), r.line_count);
        assert_int_equal(spectrum_parse(&again, &job, json, &why), 0);
        assert_int_equal(again.lines_known, kind > 0);
        assert_int_equal(again.line_count, r.line_count);
        assert_int_equal(again.count, 2);
        if (kind > 1)
            assert_memory_equal(again.lines, lines, sizeof lines);
        spectrum_release(&again);
        if (kind > 1) {
            json_array_append_new(json_object_get(json, "lines"), json_pack("[f]", 3.0));
            assert_int_equal(spectrum_parse(&again, &job, json, &why), -1);
            json_object_set_new(json, "lines", json_pack("[[f, s]]", 3.0, "x"));
            assert_int_equal(spectrum_parse(&again, &job, json, &why), -1);
            json_object_set_new(json, "lines", json_true());
            assert_int_equal(spectrum_parse(&again, &job, json, &why), -1);
        }
        json_decref(json);
    }
    line_release(&line);
    job_release(&job);
}

/* The JSON of a line, to be released. */
static json_t *json_of(const struct line *line)
{
    json_t *json = json_loadb(line->text.bytes, line->text.length, JSON_REJECT_DUPLICATES, NULL);
    assert_non_null(json);
    return json;
}

/* What is wrong with one field is said of the whole record. */
#define SPOILT(parse, back, json, key, value)                                                      \
    do {                                                                                           \
        json_t *spoilt = json_deep_copy(json);                                                     \
        assert_int_equal(json_object_set_new(spoilt, key, value), 0);                              \
        assert_int_equal(parse(back, &job, spoilt, &why), -1);                                     \
        json_decref(spoilt);                                                                       \
    } while (0)

static void test_outcomes_round_trip(void **state)
{
    (void)state;
    struct job job;
    const char *why = NULL;
    struct line line = LINE_INIT;
    job_init(&job);
    json_t *json = json_loads(JOB, 0, NULL);
    assert_int_equal(job_parse(&job, json, &why), 0);
    json_decref(json);

    struct zone_record z = {.condition = "service", .quantity = QUANTITY_DISPLACEMENT, .before = 3,
                            .after = 1, .zone_before = 'C', .zone_after = 'A',
                            .limits = {1, 2, 4}, .overall = true, .basis = "b"}, y;
    zone_print(&z, &job, &line);
    json = json_of(&line);
    assert_int_equal(zone_parse(&y, &job, json, &why), 0);
    assert_true(y.sensor == 0 && y.quantity == z.quantity && y.before == 3 && y.after == 1);
    assert_true(y.zone_before == 'C' && y.zone_after == 'A' && y.limits[2] == 4 && y.overall);
    assert_string_equal(y.basis, "b");
    SPOILT(zone_parse, &y, json, "before", json_string("E"));
    SPOILT(zone_parse, &y, json, "quantity", json_string("acceleration"));
    SPOILT(zone_parse, &y, json, "sensor", json_string("another"));
    json_decref(json);

    struct compared_record c = {.condition = "hot", .predicted = CMPLX(1, -2),
                                .measured = CMPLX(3, 4), .se = 2.5}, d;
    compared_print(&c, &job, &line);
    json = json_of(&line);
    assert_int_equal(compared_parse(&d, &job, json, &why), 0);
    assert_true(d.run == 0 && d.sensor == 0 && d.predicted == c.predicted &&
                d.measured == c.measured && d.se == 2.5);
    assert_string_equal(d.condition, "hot");
    SPOILT(compared_parse, &d, json, "run", json_string("another"));
    SPOILT(compared_parse, &d, json, "measured", json_string("much"));

    struct parts_record p;
    assert_int_equal(parts_parse(&p, &job, json, &why), -1); /* a job of one plane has none */
    json_decref(json);
    line_release(&line);
    job_release(&job);
}

int main(void)
{
    const struct CMUnitTest tests[] = {
        cmocka_unit_test(test_whole_streams),      cmocka_unit_test(test_broken_rules),
        cmocka_unit_test(test_what_is_not_believed), cmocka_unit_test(test_long_records),
        cmocka_unit_test(test_every_prefix_ends_early), cmocka_unit_test(test_samples_are_whole_and_aligned),
        cmocka_unit_test(test_job_round_trip),     cmocka_unit_test(test_sheet_angles),
        cmocka_unit_test(test_reals_and_strings),  cmocka_unit_test(test_reading_round_trip),
        cmocka_unit_test(test_coast_down_records), cmocka_unit_test(test_blocks_without_phase),
        cmocka_unit_test(test_spectrum_lines),     cmocka_unit_test(test_outcomes_round_trip),
    };
    quiet();
    cmocka_set_message_output(CM_OUTPUT_STDOUT);
    return cmocka_run_group_tests(tests, NULL, NULL);
}
