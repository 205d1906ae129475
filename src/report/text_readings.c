#include "report/text_readings.h"

#include <math.h>
#include <stdio.h>
#include <string.h>

#include "base/status.h"
#include "report/paper.h"
#include "report/phrase.h"
#include "report/runout.h"
#include "report/table.h"
#include "sheet/units.h"

struct shown text_readings_shown(const struct dossier *dossier,
                                 const struct dossier_reading *reading)
{
    const struct reading_record *r = &reading->reading;
    const struct job_sensor *sensor = &dossier->job->sensors[r->sensor];
    double cov[3];
    dossier_cov(reading, cov);
    if (r->blocks > 0 && (r->has_phase ? cabs(r->vector) : r->amplitude) == 0) /* a dead sensor's */
        return (struct shown){.amplitude = NAN, .half = NAN, .lag_deg = NAN, .lag_half = NAN};
    if (r->has_phase)
        return shown_vector(r->vector, cov, sensor->quantity, r->speed_rpm, &sensor->show, NAN);
    double half = cov[0] > 0 ? shown_t95(NAN) * sqrt(cov[0]) : NAN;
    return shown_amplitude(r->amplitude, half, sensor->quantity, r->speed_rpm, &sensor->show);
}

/* Amplitude, its half width, lag, its half width: four cells. */
static void vector_cells(struct table *table, const struct shown *s, const char *unit)
{
    char text[DIGITS_ROOM];
    int place = digits_place(s->amplitude, s->half);
    if (isnan(s->amplitude))
        table_cell(table, "no signal");
    else
        table_cell(table, "%s %s", digits_text(text, s->amplitude, s->half), unit);
    table_cell(table, "%s", digits_beside(text, s->half, place));
    if (isnan(s->lag_deg)) {
        table_cell(table, "no phase");
        table_cell(table, "-");
    } else if (s->lag_open) {
        table_cell(table, "not known");
        table_cell(table, "-");
    } else {
        table_cell(table, "%s deg", digits_angle(text, s->lag_deg, s->lag_half));
        table_cell(table, "%s", digits_beside(text, s->lag_half, digits_angle_place(s->lag_half)));
    }
}

/* What became of a reading. A slow roll is for all conditions, so it is not told from them. */
static const char *use_text(const struct dossier *d, const struct dossier_reading *item)
{
    const struct reading_record *r = &item->reading;
    if (!item->judged)
        return "not vetted";
    if (!item->use)
        return "REFUSED";
    if (dossier_is_runout(d, r->run))
        return runout_has_effect(d, r->sensor) ? "taken off" : "no effect";
    if (d->responses.count == 0 && dossier_answer(d) != STATUS_DONE)
        return "fit"; /* nothing came of it */
    return dossier_left_out(d, r->sensor, r->condition) ? "not used" : "used";
}

static void reading_row(const struct dossier *d, const struct dossier_reading *item,
                        struct table *table)
{
    const struct reading_record *r = &item->reading;
    const struct job_sensor *sensor = &d->job->sensors[r->sensor];
    char unit[32];
    struct shown s = text_readings_shown(d, item);
    snprintf(unit, sizeof unit, "%s %s", sensor->show.unit, detection_text(sensor->show.detection));
    table_cell(table, "%s", sensor->name);
    vector_cells(table, &s, unit);
    if (r->blocks > 0)
        table_cell(table, "%ld/%ld", r->steady.turns, r->blocks);
    else
        table_cell(table, "by hand");
    table_cell(table, "%s", use_text(d, item));
}

static bool same_group(const struct dossier_reading *a, const struct dossier_reading *b)
{
    return strcmp(a->reading.run, b->reading.run) == 0 &&
           strcmp(a->reading.condition, b->reading.condition) == 0;
}

void text_readings_group_heading(const struct dossier *d, const struct reading_record *r,
                                 struct buffer *text)
{
    char speed[DIGITS_ROOM];
    int run = job_find_run(d->job, r->run);
    buffer_format(text, "Run '%s'%s: ", r->run,
                  dossier_is_runout(d, r->run) ? ", slow roll (runout)" : "");
    if (run >= 0) {
        phrase_weights(text, d->job, (size_t)run);
        buffer_text(text, "; ");
    }
    buffer_format(text, "%s rpm", shown_speed(speed, r->speed_rpm));
    if (strcmp(r->condition, "service") != 0)
        buffer_format(text, "; condition '%s'", r->condition);
    if (run >= 0 && d->job->runs[run].when[0])
        buffer_format(text, "; %s", d->job->runs[run].when);
}

size_t text_readings_group(const struct dossier *dossier, size_t i, struct table *table)
{
    static const struct table_column columns[] = {
        {"sensor", false, true}, {"1x amplitude", true, false}, {"+/-", true, false},
        {"lag", true, false},    {"+/-", true, false},          {"turns/blocks", true, false},
        {"use", false, false},
    };
    const struct dossier_reading *first = &dossier->readings.items[i];
    table_init(table, columns, sizeof columns / sizeof *columns);
    for (; i < dossier->readings.count && same_group(first, &dossier->readings.items[i]); i++)
        reading_row(dossier, &dossier->readings.items[i], table);
    return i;
}

/* "12.3 mm/s rms": an overall value, in the unit its sensor is shown in where that is of the same
 * quantity. */
static void overall_value(const struct dossier *d, const struct reading_record *r,
                          struct buffer *text)
{
    const struct overall *o = &r->overall;
    const bool us = d->job->units == UNITS_US;
    struct show show = d->job->sensors[r->sensor].show;
    char number[DIGITS_ROOM];
    if (show.quantity != o->quantity)
        (void)units_vibration(o->quantity == QUANTITY_VELOCITY       ? (us ? "in/s" : "mm/s")
                              : o->quantity == QUANTITY_DISPLACEMENT ? (us ? "mil" : "um")
                              : us                                   ? "g"
                                                                     : "m/s2",
                              &show);
    /* Three digits: common practice for an overall value. */
    double value = o->rms / show.si;
    buffer_format(text, "%s %s rms", digits_text(number, value, value / 10), show.unit);
}

static bool same_band(const struct overall *a, const struct overall *b)
{
    return a->from_hz == b->from_hz && a->to_hz == b->to_hz;
}

void text_readings_overall(const struct dossier *dossier, size_t first, size_t end,
                           struct buffer *text)
{
    const struct overall *band = NULL;
    for (size_t i = first; i < end; i++) {
        const struct reading_record *r = &dossier->readings.items[i].reading;
        char from[DIGITS_ROOM], to[DIGITS_ROOM];
        if (!isfinite(r->overall.rms))
            continue;
        if (!band || !same_band(band, &r->overall))
            buffer_format(text, "%sOverall, %s to %s Hz: ", band ? ". " : "",
                          digits_text(from, round(10 * r->overall.from_hz) / 10, NAN),
                          digits_text(to, r->overall.to_hz, NAN));
        else
            buffer_text(text, ", ");
        band = &r->overall;
        buffer_format(text, "%s ", dossier_sensor(dossier, r->sensor));
        overall_value(dossier, r, text);
    }
    if (band)
        buffer_text(text, ".");
}

const char text_readings_note[] =
    "Phase is lag: how far the shaft turns from the mark to the vibration's peak. +/- is the 95 % "
    "half width of one reading; what differs from run to run is not in it. Turns/blocks: the turns "
    "that a reading rests on, and the blocks they were cut into to see its scatter.";

const char *text_readings_words(const struct dossier *dossier)
{
    for (size_t i = 0; i < dossier->readings.count; i++) {
        const char *use = use_text(dossier, &dossier->readings.items[i]);
        if (strcmp(use, "not used") == 0)
            return "Not used: fit to be used, but the answer is given without this sensor, because "
                   "another reading that it needs was refused or is missing.";
        if (strcmp(use, "fit") == 0)
            return "Fit: it might be used, but there is no answer that it could be used for.";
    }
    return NULL;
}

/* What stands below a table; releases it. */
static void below(struct buffer *text, struct buffer *out)
{
    if (text->failed)
        out->failed = 1;
    else if (text->length > 0)
        paper_wrap(out, 4, 6, text->bytes);
    buffer_release(text);
}

void text_readings_all(const struct dossier *dossier, struct buffer *out)
{
    if (dossier->readings.count == 0)
        return;
    paper_heading(out, "READINGS");
    paper_wrap(out, 2, 2, text_readings_note);
    for (size_t i = 0; i < dossier->readings.count;) {
        struct table table;
        struct buffer text = BUFFER_INIT;
        text_readings_group_heading(dossier, &dossier->readings.items[i].reading, &text);
        if (text.failed)
            out->failed = 1;
        else
            paper_wrap(out, 2, 4, text.bytes);
        buffer_release(&text);
        size_t first = i;
        i = text_readings_group(dossier, i, &table);
        table_print(&table, 4, out);
        table_release(&table);
        text = (struct buffer)BUFFER_INIT;
        text_readings_overall(dossier, first, i, &text);
        below(&text, out);
        runout_words(dossier, first, i, &text);
        below(&text, out);
    }
    if (text_readings_words(dossier))
        paper_wrap(out, 2, 2, text_readings_words(dossier));
}

static void response_row(const struct dossier *d, const struct response_record *r, double mass,
                         struct table *table)
{
    if (r->sensor < 0 || (size_t)r->sensor >= d->job->sensor_count)
        return;
    const struct job_sensor *sensor = &d->job->sensors[r->sensor];
    double cov[3];
    char unit[32];
    for (int i = 0; i < 3; i++)
        cov[i] = r->cov[i] * mass * mass;
    struct shown s =
        shown_vector(r->vector * mass, cov, sensor->quantity, r->speed_rpm, &sensor->show, NAN);
    snprintf(unit, sizeof unit, "%s %s", sensor->show.unit, detection_text(sensor->show.detection));
    table_cell(table, "%s", sensor->name);
    table_cell(table, "%s", dossier_plane(d, r->plane));
    table_cell(table, "%s", r->condition);
    vector_cells(table, &s, unit);
}

double text_readings_response_table(const struct dossier *dossier, struct table *table)
{
    static const struct table_column columns[] = {
        {"sensor", false, true},       {"plane", false, true}, {"condition", false, true},
        {"1x amplitude", true, false}, {"+/-", true, false},   {"lag", true, false},
        {"+/-", true, false},
    };
    bool us = dossier->job->units == UNITS_US;
    double mass = us ? 0.45359237 / 16 : 0.1; /* kg: one ounce, or 100 g */
    table_init(table, columns, sizeof columns / sizeof *columns);
    for (size_t i = 0; i < dossier->responses.count; i++)
        response_row(dossier, &dossier->responses.items[i], mass, table);
    return mass;
}

void text_readings_responses(const struct dossier *dossier, struct buffer *out)
{
    struct table table;
    struct buffer mass = BUFFER_INIT;
    if (dossier->responses.count == 0)
        return;
    phrase_mass(&mass, dossier->job, text_readings_response_table(dossier, &table), NAN);
    paper_heading(out, "RESPONSES");
    paper_say(out, 2, 2,
              "What %s at the mark (0 deg %s) at the plane's radius adds to the vibration.",
              mass.failed ? "" : mass.bytes, job_sense_text(dossier->job));
    buffer_release(&mass);
    table_print(&table, 2, out);
    table_release(&table);
}

static void finding(const struct dossier *d, const struct finding_record *f, struct buffer *out)
{
    struct buffer text = BUFFER_INIT;
    buffer_format(&text, "%s %s", f->verdict == VERDICT_REFUSE ? "REFUSED" : "caution", f->check);
    if (f->run[0])
        buffer_format(&text, ", run '%s'", f->run);
    if (f->sensor >= 0)
        buffer_format(&text, ", sensor '%s'", dossier_sensor(d, f->sensor));
    buffer_format(&text, ": %s", f->text);
    if (isfinite(f->value) && f->limit > 0 && isfinite(f->limit) && !strstr(f->text, "limit"))
        buffer_format(&text, " [%.3g%s%s, limit %.3g%s%s]", f->value, f->unit[0] ? " " : "",
                      f->unit, f->limit, f->unit[0] ? " " : "", f->unit);
    if (text.failed)
        out->failed = 1;
    else
        paper_wrap(out, 2, 4, text.bytes);
    buffer_release(&text);
}

bool text_readings_uncheckable(const struct finding_record *f)
{
    static const char *const starts[] = {"not checkable", "cannot be told", NULL};
    if (f->verdict != VERDICT_OK || isfinite(f->value))
        return false;
    for (size_t i = 0; starts[i]; i++) {
        if (strncmp(f->text, starts[i], strlen(starts[i])) == 0)
            return true;
    }
    return false;
}

/* "Not checkable" is said once only. */
static const char *not_said_yet(const char *text)
{
    static const char start[] = "not checkable ";
    return strncmp(text, start, strlen(start)) == 0 ? text + strlen(start) : text;
}

static void uncheckable(const struct dossier *d, const struct finding_record *f, struct buffer *out)
{
    struct buffer text = BUFFER_INIT;
    buffer_format(&text, "Not checkable: %s", f->check);
    if (f->run[0])
        buffer_format(&text, ", run '%s'", f->run);
    if (f->sensor >= 0)
        buffer_format(&text, ", sensor '%s'", dossier_sensor(d, f->sensor));
    const char *rest = not_said_yet(f->text);
    buffer_format(&text, "%s %s", rest == f->text ? ":" : ",", rest);
    if (text.failed)
        out->failed = 1;
    else
        paper_wrap(out, 2, 4, text.bytes);
    buffer_release(&text);
}

void text_readings_count(const struct dossier *dossier, struct buffer *text)
{
    size_t counts[3] = {dossier->counted, 0, 0}, open = 0;
    for (size_t i = 0; i < dossier->findings.count; i++) {
        const struct finding_record *f = &dossier->findings.items[i];
        bool told = !text_readings_uncheckable(f);
        counts[f->verdict] += told;
        open += !told;
    }
    buffer_format(text, "%zu refused, %zu to be read with caution, %zu in order",
                  counts[VERDICT_REFUSE], counts[VERDICT_CAUTION], counts[VERDICT_OK]);
    if (open > 0)
        buffer_format(text, ", %zu not checkable", open);
    buffer_text(text, ".");
}

void text_readings_findings(const struct dossier *dossier, struct buffer *out)
{
    struct buffer text = BUFFER_INIT;
    if (dossier->findings.count + dossier->counted == 0)
        return;
    paper_heading(out, "FINDINGS");
    for (int verdict = VERDICT_REFUSE; verdict >= VERDICT_OK; verdict--) {
        for (size_t i = 0; i < dossier->findings.count; i++) {
            const struct finding_record *f = &dossier->findings.items[i];
            if ((int)f->verdict != verdict)
                continue;
            if (verdict != VERDICT_OK)
                finding(dossier, f, out);
            else if (text_readings_uncheckable(f))
                uncheckable(dossier, f, out);
        }
    }
    text_readings_count(dossier, &text);
    if (text.failed)
        out->failed = 1;
    else
        paper_wrap(out, 2, 2, text.bytes);
    buffer_release(&text);
}
