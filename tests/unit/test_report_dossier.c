/* What the report makes of whole streams: order, rulings, exit codes, layout of the golden streams.
 */
#include <setjmp.h>
#include <stdarg.h>
#include <stddef.h>
#include <stdint.h>
#include <cmocka.h>

#include <math.h>
#include <stdio.h>
#include <stdlib.h>
#include <string.h>

#include "base/status.h"
#include "report/dossier.h"
#include "report/draw.h"
#include "report/phrase.h"
#include "report/text.h"
#include "report/tidy.h"
#include "report/whole.h"

struct loaded {
    struct job job;
    struct dossier dossier;
    struct buffer job_line;
};

static void load_line(struct loaded *l, const char *line, size_t length)
{
    const char *why = "";
    json_t *json = json_loadb(line, length, JSON_REJECT_DUPLICATES, NULL);
    assert_non_null(json);
    const char *kind = json_string_value(json_object_get(json, "kind"));
    if (strcmp(kind, "job") == 0) {
        assert_int_equal(job_parse(&l->job, json, &why), 0);
        buffer_add(&l->job_line, line, length);
    } else if (strcmp(kind, "end") != 0) {
        assert_int_equal(dossier_add(&l->dossier, json, line, length, &why), 0);
    }
    json_decref(json);
}

/* The golden stream of that name. */
static void load_as(struct loaded *l, const char *name, bool sparse)
{
    char path[512];
    snprintf(path, sizeof path, GOLDEN "/%s.jsonl", name);
    FILE *file = fopen(path, "r");
    assert_non_null(file);
    memset(l, 0, sizeof *l);
    job_init(&l->job);
    dossier_init(&l->dossier, &l->job);
    l->dossier.keep_lines = true;
    l->dossier.keep_traces = true;
    l->dossier.sparse = sparse;
    char *line = NULL;
    size_t room = 0;
    ssize_t length;
    while ((length = getline(&line, &room, file)) > 0)
        load_line(l, line, (size_t)length);
    free(line);
    fclose(file);
}

static void load(struct loaded *l, const char *name)
{
    load_as(l, name, false);
}

static void unload(struct loaded *l)
{
    dossier_release(&l->dossier);
    job_release(&l->job);
    buffer_release(&l->job_line);
}

static void exit_codes(void **state)
{
    (void)state;
    struct job_weight weight = {.mass = 0.06, .mounted_mass = 0.06, .radius_m = 0.4};
    struct job_plane plane = {.name = "wheel", .radius_m = 0.4};
    static const struct {
        const char *step, *stage, *check; /* the next step, and who refused what */
        bool lost, trials;                /* a reading is not used; a run carries a weight */
        size_t placements;
        int status;
    } cases[] = {
        {"trial", "", "", false, false, 0, STATUS_DONE},    /* as found alone */
        {"trial", "", "", false, true, 0, STATUS_UNSOLVED}, /* a run is missing */
        {"trial", "solve", "conditioning", false, true, 0, STATUS_UNSOLVED},
        {"repeat", "solve", "conditioning", true, true, 0, STATUS_REFUSED}, /* a sensor was lost */
        {"repeat", "vet", "length", true, true, 0, STATUS_REFUSED},
        {"repeat", "solve", "linearity", false, true, 0, STATUS_REFUSED},
        {"repeat", "solve", "correction-force", false, true, 0, STATUS_UNSOLVED},
        {"repeat", "solve", "correction", true, true, 0, STATUS_UNSOLVED},
        {"repeat", "", "", false, true, 0, STATUS_UNSOLVED},      /* nothing placed helps */
        {"correct", "vet", "length", true, true, 2, STATUS_DONE}, /* it goes on without */
        {"correct", "solve", "linearity", false, true, 2, STATUS_DONE},
        {"correct", "", "", false, true, 0, STATUS_DONE},
        {"trim", "", "", false, true, 1, STATUS_DONE},
        {"done", "", "", false, true, 0, STATUS_DONE},
        {"correct", "read", "readable", false, true, 2, STATUS_RECORDING},
        {"repeat", "read", "readable", true, true, 0, STATUS_RECORDING},
        {"", "vet", "length", true, true, 0, STATUS_DONE}, /* not solved: nothing was asked */
        {"", "", "", false, false, 0, STATUS_DONE},
    };
    for (size_t i = 0; i < sizeof cases / sizeof *cases; i++) {
        struct job_run run = {.name = "trial", .weights = &weight, .weight_count = cases[i].trials};
        struct job job;
        job_init(&job);
        job.runs = &run;
        job.planes = &plane;
        job.run_count = job.plane_count = 1;
        struct finding_record finding = {.verdict = VERDICT_REFUSE};
        struct placement_record placement = {0};
        struct dossier_reading reading = {.use = !cases[i].lost, .reading = {.has_phase = true}};
        struct dossier d;
        dossier_init(&d, &job);
        d.has_next = cases[i].step[0] != '\0';
        strcpy(d.next.step, cases[i].step);
        strcpy(finding.stage, cases[i].stage);
        strcpy(finding.check, cases[i].check);
        d.findings.items = &finding;
        d.findings.count = cases[i].stage[0] != '\0';
        d.placements.items = &placement;
        d.placements.count = cases[i].placements;
        d.readings.items = &reading;
        d.readings.count = 1;
        assert_int_equal(dossier_status(&d), cases[i].status);
        reading.reading.has_phase = false; /* an amplitude alone is a reading that is lost */
        if (strcmp(cases[i].step, "repeat") == 0 && cases[i].stage[0] == '\0')
            assert_int_equal(dossier_status(&d), STATUS_REFUSED);
        reading.reading.has_phase = true;
        finding.verdict = VERDICT_CAUTION; /* a caution alone never refuses */
        if (cases[i].placements > 0)
            assert_int_equal(dossier_status(&d), STATUS_DONE);
    }
}

static void runs_in_the_sheets_order(void **state)
{
    (void)state;
    struct loaded l;
    load(&l, "report-balance");
    const struct dossier *d = &l.dossier;
    static const char *const late[] = {"{\"kind\":\"run\",\"run\":\"zero\",\"condition\":"
                                       "\"service\",\"weights\":[],\"files\":[],\"when\":null}"};
    load_line(&l, late[0], strlen(late[0]));
    /* Streams joined the other way round. */
    struct dossier_run first = l.dossier.runs.items[0];
    l.dossier.runs.items[0] = l.dossier.runs.items[1];
    l.dossier.runs.items[1] = first;
    for (size_t i = 0; i < 2; i++) {
        struct dossier_reading item = l.dossier.readings.items[i];
        l.dossier.readings.items[i] = l.dossier.readings.items[i + 2];
        l.dossier.readings.items[i + 2] = item;
    }
    l.dossier.vetted.items[1].use = false; /* as-found, NDE-H */
    l.dossier.vetted.items[1].widen[0] = 1;
    dossier_close(&l.dossier);
    assert_string_equal(d->runs.items[0].record.run, "as-found");
    assert_string_equal(d->runs.items[1].record.run, "trial");
    assert_string_equal(d->runs.items[2].record.run, "zero");
    for (size_t i = 0; i < 4; i++) {
        assert_string_equal(d->readings.items[i].reading.run, i < 2 ? "as-found" : "trial");
        assert_int_equal(d->readings.items[i].reading.sensor, i % 2);
        assert_int_equal(d->readings.items[i].use, i != 1);
        assert_true(d->readings.items[i].judged);
    }
    double cov[3];
    dossier_cov(&d->readings.items[1], cov);
    assert_true(cov[0] > 1 && cov[2] < 1);
    assert_int_equal(dossier_verdict(d, "as-found", 1), VERDICT_CAUTION);
    assert_int_equal(dossier_verdict(d, "as-found", 0), VERDICT_OK);
    assert_true(d->has_next && json_is_real(json_object_get(d->figures, "share_pct")));
    unload(&l);
}

static void malformed_and_unknown(void **state)
{
    (void)state;
    struct loaded l;
    load(&l, "report-balance");
    size_t lines = l.dossier.lines.count;
    static const struct {
        const char *text;
        int result;
    } cases[] = {
        {"{\"kind\":\"horoscope\",\"x\":1}\n", 0},
        {"{\"kind\":\"placement\",\"plane\":\"wheel\"}\n", -1},
        {"{\"kind\":\"reading\",\"run\":\"x\",\"condition\":\"y\",\"sensor\":\"nobody\"}\n", -1},
        {"{\"run\":\"x\"}\n", -1}};
    for (size_t i = 0; i < sizeof cases / sizeof *cases; i++) {
        const char *why = NULL;
        json_t *json = json_loads(cases[i].text, 0, NULL);
        assert_int_equal(dossier_add(&l.dossier, json, cases[i].text, strlen(cases[i].text), &why),
                         cases[i].result);
        assert_true((why != NULL) == (cases[i].result < 0));
        json_decref(json);
    }
    struct dossier_line kept = l.dossier.lines.items[lines];
    assert_memory_equal(l.dossier.text.bytes + kept.at, "{\"kind\":\"horoscope\",\"x\":1}",
                        kept.length);
    unload(&l);
}

/* The same place on the rotor is named by people as the sheet says: x against is 360 - x with
 * rotation. */
static void angles_name_their_sense(void **state)
{
    (void)state;
    struct job job;
    struct buffer out = BUFFER_INIT;
    job_init(&job);
    job.angles = SENSE_AGAINST;
    phrase_angle(&out, &job, 40, NAN);
    buffer_text(&out, "|");
    job.angles = SENSE_WITH;
    phrase_angle(&out, &job, 40, NAN);
    buffer_text(&out, "|");
    phrase_angle(&out, &job, 0, 12);
    assert_string_equal(out.bytes,
                        "40 deg against rotation|320 deg with rotation|0 deg with rotation");
    buffer_release(&out);
    job_release(&job);
}

static void assert_printable(const char *text, size_t most)
{
    size_t points = 0;
    for (; *text; text++) {
        unsigned char c = (unsigned char)*text;
        assert_true(c == '\n' || (c >= 0x20 && c != 0x7f));
        points = c == '\n' ? 0 : points + ((c & 0xc0) != 0x80);
        assert_true(points <= most);
    }
}

static const char *const golden[] = {"report-balance", "report-refused", "report-unsolved",
                                     "report-trial",   "report-audit",   "report-nasty",
                                     "report-outcomes"};

static void text_is_printable(void **state)
{
    (void)state;
    for (size_t i = 0; i < sizeof golden / sizeof *golden; i++) {
        struct loaded l;
        struct buffer out = BUFFER_INIT;
        load(&l, golden[i]);
        dossier_close(&l.dossier);
        text_write(&l.dossier, &out);
        assert_int_equal(out.failed, 0);
        assert_printable(out.bytes, 80);
        buffer_release(&out);
        unload(&l);
    }
}

/* By definition an inch is 25.4 mm and an ounce 28.35 g: 3.4 mm/s are 0.134 in/s, 1.4 are 0.05512,
 * 20 g are 0.705 oz. */
static void outcomes_in_inches(void **state)
{
    (void)state;
    struct loaded l;
    struct buffer out = BUFFER_INIT;
    load(&l, "report-outcomes");
    dossier_close(&l.dossier);
    l.job.units = UNITS_US;
    text_write(&l.dossier, &out);
    assert_int_equal(out.failed, 0);
    assert_non_null(strstr(out.bytes, "in/s rms   0.134  C"));
    assert_non_null(strstr(out.bytes, "0.05512  0.1102"));
    assert_non_null(strstr(out.bytes, " oz in on each: 0.705 oz at 60 deg with rotation"));
    assert_null(strstr(out.bytes, " g mm"));
    buffer_release(&out);
    unload(&l);
}

static void nothing_that_may_not_be_fitted_is_shown(void **state)
{
    (void)state;
    static const char *const names[] = {"report-refused", "report-unsolved"};
    for (size_t i = 0; i < 2; i++) {
        struct loaded l;
        struct buffer out = BUFFER_INIT;
        load(&l, names[i]);
        dossier_close(&l.dossier);
        text_write(&l.dossier, &out);
        const char *no = strstr(out.bytes, "NO CORRECTION"),
                   *now = strstr(out.bytes, "WHAT TO DO NOW");
        assert_true(no && now && no < now);
        assert_null(strstr(out.bytes, "  fit "));
        assert_null(strstr(out.bytes, "FORECAST"));
        buffer_release(&out);
        unload(&l);
    }
}

static void json_keeps_every_byte(void **state)
{
    (void)state;
    for (size_t i = 0; i < sizeof golden / sizeof *golden; i++) {
        struct loaded l;
        struct buffer out = BUFFER_INIT;
        load(&l, golden[i]);
        whole_head(l.job_line.bytes, l.job_line.length, &out);
        buffer_add(&out, l.dossier.text.bytes, l.dossier.text.length);
        whole_tail(&l.dossier, &out);
        json_t *all = json_loads(out.bytes, JSON_REJECT_DUPLICATES, NULL);
        assert_non_null(all);
        size_t count = json_array_size(all);
        const json_t *end = json_array_get(all, count - 1);
        assert_int_equal(json_integer_value(json_object_get(end, "records")), count - 1);
        assert_string_equal(json_string_value(json_object_get(json_array_get(all, 0), "kind")),
                            "job");
        for (size_t k = 0; k < l.dossier.lines.count; k++) {
            json_t *line = json_loadb(l.dossier.text.bytes + l.dossier.lines.items[k].at,
                                      l.dossier.lines.items[k].length, 0, NULL);
            assert_true(json_equal(line, json_array_get(all, k + 1)));
            json_decref(line);
        }
        json_decref(all);
        buffer_release(&out);
        unload(&l);
    }
}

/* What is only counted of an audit is not missed in its text and its table of readings. */
static void an_audit_may_be_kept_sparsely(void **state)
{
    (void)state;
    struct loaded whole, sparse;
    struct buffer text[2] = {BUFFER_INIT, BUFFER_INIT};
    static const char in_order[] =
        "{\"kind\":\"finding\",\"stage\":\"vet\",\"check\":\"length\",\"verdict\":\"ok\","
        "\"run\":null,\"sensor\":null,\"value\":300,\"limit\":100,\"unit\":\"turns\","
        "\"basis\":\"common practice\",\"text\":\"long enough\"}";
    load(&whole, "report-audit");
    load_as(&sparse, "report-audit", true);
    load_line(&whole, in_order, strlen(in_order));
    load_line(&sparse, in_order, strlen(in_order));
    dossier_close(&whole.dossier);
    dossier_close(&sparse.dossier);
    assert_true(sparse.dossier.counted > 0);
    assert_int_equal(sparse.dossier.findings.count + sparse.dossier.counted,
                     whole.dossier.findings.count);
    text_write(&whole.dossier, &text[0]);
    text_write(&sparse.dossier, &text[1]);
    assert_string_equal(text[0].bytes, text[1].bytes);
    buffer_clear(&text[0]);
    buffer_clear(&text[1]);
    tidy_write(&whole.dossier, TIDY_READINGS, &text[0]);
    tidy_write(&sparse.dossier, TIDY_READINGS, &text[1]);
    assert_string_equal(text[0].bytes, text[1].bytes);
    buffer_release(&text[0]);
    buffer_release(&text[1]);
    unload(&whole);
    unload(&sparse);
    load_as(&sparse, "report-balance", true); /* of a job with an answer all is kept */
    load_line(&sparse, in_order, strlen(in_order));
    assert_int_equal(sparse.dossier.counted, 0);
    unload(&sparse);
}

static size_t count(const char *text, const char *what)
{
    size_t n = 0;
    for (; (text = strstr(text, what)); text++)
        n++;
    return n;
}

static void tables_have_their_rows(void **state)
{
    (void)state;
    static const size_t rows[] = {4, 2, 1, 2, 2, 4}; /* counted in report-balance.jsonl by hand */
    struct loaded l;
    load(&l, "report-balance");
    dossier_close(&l.dossier);
    for (int what = TIDY_READINGS; what <= TIDY_FINDINGS; what++) {
        struct buffer out = BUFFER_INIT;
        tidy_write(&l.dossier, (enum tidy_what)what, &out);
        assert_int_equal(count(out.bytes, "\r\n"), rows[what] + 1);
        buffer_release(&out);
    }
    struct buffer out = BUFFER_INIT;
    tidy_write(&l.dossier, TIDY_PLACEMENT, &out);
    assert_non_null(strstr(out.bytes, "\r\nwheel,3,60,with rotation,60,g,50 10,590.9"));
    buffer_release(&out);
    unload(&l);
}

/* At 1480 rpm: 1x is 24.6667 Hz, 50 Hz are 2.02703 orders, 5 Hz 0.202703. NDE-H measures velocity:
 * 0.01 m/s peak is 7.07107 mm/s rms. DE-V measures acceleration: 1 m/s2 peak at 50 Hz is 1/(2 pi
 * 50)/sqrt 2 m/s = 2.25079 mm/s rms. */
static void lines_that_do_not_turn(void **state)
{
    (void)state;
    static const char *const spectra[] = {
        "{\"kind\":\"spectrum\",\"run\":\"as-found\",\"sensor\":\"NDE-H\",\"orders\":[0.75,1,1.25],"
        "\"amplitude\":[0.001,0.01,0.002],\"lines\":[[50,0.01],[5,0.001]]}",
        "{\"kind\":\"spectrum\",\"run\":\"as-found\",\"sensor\":\"DE-V\",\"orders\":[0.75,1,3],"
        "\"amplitude\":[0.1,2,0.2],\"lines\":[[50,1],[5,0.1]]}",
        "{\"kind\":\"spectrum\",\"run\":\"trial\",\"sensor\":\"NDE-H\",\"orders\":[1,1.25],"
        "\"amplitude\":[0.01,0.002]}"};
    struct loaded l;
    struct buffer table = BUFFER_INIT, drawing = BUFFER_INIT;
    load(&l, "report-balance");
    for (size_t i = 0; i < sizeof spectra / sizeof *spectra; i++)
        load_line(&l, spectra[i], strlen(spectra[i]));
    dossier_close(&l.dossier);
    tidy_write(&l.dossier, TIDY_SPECTRUM, &table);
    assert_int_equal(count(table.bytes, "\r\n"), 1 + 8 + 4);
    assert_int_equal(count(table.bytes, ",not turning with the shaft,"), 4);
    assert_non_null(
        strstr(table.bytes, "as-found,NDE-H,1480,24.6667,1,order,mm/s rms,7.07107\r\n"));
    assert_non_null(strstr(table.bytes, "as-found,NDE-H,1480,50,2.02703,not turning with the shaft,"
                                        "mm/s rms,7.07107\r\n"));
    assert_non_null(strstr(table.bytes, "as-found,DE-V,1480,50,2.02703,not turning with the shaft,"
                                        "mm/s rms,2.25079\r\n"));
    assert_int_equal(count(table.bytes, ",all within a wide band,"), 1); /* DE-V at 3 */
    draw_file(&l.dossier, DRAW_SPECTRUM, &drawing);
    /* 5 Hz is below a quarter of 1x, where the integral of an acceleration is not shown; and beyond
     * the last order no diamond can stand. */
    assert_non_null(strstr(drawing.bytes, "with the shaft: 50.0 Hz 7.1, 5.00 Hz 0.71 mm/s rms"));
    assert_non_null(strstr(drawing.bytes, "with the shaft: 50.0 Hz 2.3 mm/s rms"));
    assert_int_equal(count(drawing.bytes, "not turning with the shaft"), 2);
    buffer_release(&drawing);
    buffer_release(&table);
    unload(&l);
}

int main(void)
{
    const struct CMUnitTest tests[] = {
        cmocka_unit_test(exit_codes),
        cmocka_unit_test(runs_in_the_sheets_order),
        cmocka_unit_test(malformed_and_unknown),
        cmocka_unit_test(angles_name_their_sense),
        cmocka_unit_test(text_is_printable),
        cmocka_unit_test(outcomes_in_inches),
        cmocka_unit_test(nothing_that_may_not_be_fitted_is_shown),
        cmocka_unit_test(json_keeps_every_byte),
        cmocka_unit_test(tables_have_their_rows),
        cmocka_unit_test(lines_that_do_not_turn),
        cmocka_unit_test(an_audit_may_be_kept_sparsely),
    };
    return cmocka_run_group_tests(tests, NULL, NULL);
}
