#include "report/html_judged.h"

#include <math.h>
#include <string.h>

#include "report/html_part.h"
#include "report/shown.h"
#include "report/table.h"
#include "report/text_readings.h"
#include "sheet/units.h"

static const char *const verdicts[] = {"in order", "caution", "REFUSED"};

/* "3.2 (limit 3 s.e.)", as far as they are known. */
static void value_cell(const struct finding_record *f, struct table *table)
{
    const char *gap = f->unit[0] ? " " : "";
    if (!isfinite(f->value))
        table_cell(table, "%s", "");
    else if (f->limit > 0 && isfinite(f->limit))
        table_cell(table, "%.3g%s%s (limit %.3g%s%s)", f->value, gap, f->unit, f->limit, gap,
                   f->unit);
    else
        table_cell(table, "%.3g%s%s", f->value, gap, f->unit);
}

void html_judged_findings(const struct dossier *dossier, struct buffer *out)
{
    static const struct table_column columns[] = {
        {"verdict", false, false}, {"check", false, false},
        {"run", false, true},      {"sensor", false, true},
        {"value", true, false},    {"what was seen, what to do", false, true}};
    const struct dossier *d = dossier;
    struct buffer counts = BUFFER_INIT;
    struct table table;
    if (d->findings.count + d->counted == 0)
        return;
    table_init(&table, columns, sizeof columns / sizeof *columns);
    for (int verdict = VERDICT_REFUSE; verdict >= VERDICT_OK; verdict--) {
        for (size_t i = 0; i < d->findings.count; i++) {
            const struct finding_record *f = &d->findings.items[i];
            if ((int)f->verdict != verdict)
                continue;
            const bool open = text_readings_uncheckable(f);
            if (verdict == VERDICT_OK && !open)
                continue;
            table_cell(&table, "%s", open ? "not checkable" : verdicts[verdict]);
            table_cell(&table, "%s", f->check);
            table_cell(&table, "%s", f->run);
            table_cell(&table, "%s", dossier_sensor(d, f->sensor));
            value_cell(f, &table);
            table_cell(&table, "%s", f->text);
        }
    }
    html_part_heading(out, "Findings");
    text_readings_count(d, &counts);
    html_part_take(out, "p", &counts);
    html_part_table(out, &table);
}

/* "at least 50", where the value had to be above it. */
static void limit_cell(const struct finding_record *f, struct table *table)
{
    const bool above = f->value > f->limit, below = f->value < f->limit;
    if (isfinite(f->limit))
        table_cell(table, "%s%.3g", (f->verdict == VERDICT_OK ? above : below) ? "at least " : "",
                   f->limit);
    else
        table_cell(table, "-");
}

void html_judged_checks(const struct dossier *dossier, struct buffer *out)
{
    static const struct table_column columns[] = {{"check", false, true},  {"run", false, true},
                                                  {"sensor", false, true}, {"verdict", false, true},
                                                  {"value", true, false},  {"limit", true, false},
                                                  {"unit", false, false},  {"basis", false, true}};
    struct table table;
    table_init(&table, columns, sizeof columns / sizeof *columns);
    for (size_t i = 0; i < dossier->findings.count; i++) {
        const struct finding_record *f = &dossier->findings.items[i];
        table_cell(&table, "%s", f->check);
        table_cell(&table, "%s", f->run);
        table_cell(&table, "%s", dossier_sensor(dossier, f->sensor));
        table_cell(&table, "%s",
                   text_readings_uncheckable(f) ? "not checkable" : verdicts[f->verdict]);
        table_cell(&table, isfinite(f->value) ? "%.3g" : "-", f->value);
        limit_cell(f, &table);
        table_cell(&table, "%s", f->unit);
        table_cell(&table, "%s", f->basis);
    }
    if (table.cell_count > 0)
        html_part_heading(out, "Every check that was made");
    html_part_table(out, &table);
}

/* The unit of zones, as standards and people have it: rms velocity or displacement. */
static const char *zone_unit(const struct job *job, enum quantity quantity, double *si)
{
    bool us = job->units == UNITS_US;
    if (quantity == QUANTITY_VELOCITY) {
        *si = us ? 0.0254 : 0.001;
        return us ? "in/s rms" : "mm/s rms";
    }
    *si = us ? 25.4e-6 : 1e-6;
    return us ? "mil rms" : "um rms";
}

static void zone_row(const struct dossier *d, const struct zone_record *r, struct table *table)
{
    double si;
    const char *unit = zone_unit(d->job, r->quantity, &si);
    char text[3][DIGITS_ROOM];
    table_cell(table, "%s", dossier_sensor(d, r->sensor));
    table_cell(table, "%s", r->condition);
    table_cell(table, "%s, %s", r->overall ? "overall" : "1x alone", unit);
    table_cell(table, "%.3g", r->before / si);
    table_cell(table, "%c", r->zone_before);
    table_cell(table, "%.3g", r->after / si);
    table_cell(table, "%c", r->zone_after);
    for (size_t i = 0; i < 3; i++)
        digits_text(text[i], r->limits[i] / si, NAN);
    table_cell(table, "%s, %s, %s", text[0], text[1], text[2]);
}

static void zones(const struct dossier *d, struct buffer *out)
{
    static const struct table_column columns[] = {
        {"sensor", false, true}, {"condition", false, true},    {"of", false, false},
        {"before", true, false}, {"zone", false, false},        {"expected after", true, false},
        {"zone", false, false},  {"A/B, B/C, C/D", true, false}};
    struct table table;
    if (d->zones.count == 0)
        return;
    table_init(&table, columns, sizeof columns / sizeof *columns);
    for (size_t i = 0; i < d->zones.count; i++)
        zone_row(d, &d->zones.items[i], &table);
    html_part_heading(out, "Vibration zones");
    html_part_say(out, "note", "Basis: %s. 1x alone: at least that much.", d->zones.items[0].basis);
    html_part_table(out, &table);
}

/* The reading that `compared` is about; NULL: not in the stream. */
static const struct dossier_reading *reading_of(const struct dossier *d,
                                                const struct compared_record *c)
{
    for (size_t i = 0; i < d->readings.count; i++) {
        const struct reading_record *r = &d->readings.items[i].reading;
        if (r->sensor == c->sensor && strcmp(r->run, d->job->runs[c->run].name) == 0 &&
            strcmp(r->condition, c->condition) == 0)
            return &d->readings.items[i];
    }
    return NULL;
}

/* cov as a reading has it, SI peak; its lag stands only where that tells one, as in the text. */
static void vector_cell(const struct job_sensor *sensor, double complex z, const double cov[3],
                        double rpm, struct table *table)
{
    struct shown s = shown_vector(z, cov, sensor->quantity, rpm, &sensor->show, NAN);
    char unit[24], amplitude[DIGITS_ROOM], lag[DIGITS_ROOM];
    if (isnan(s.amplitude))
        table_cell(table, "-");
    else if (s.lag_open || isnan(s.lag_deg))
        table_cell(table, "%s %s, lag not known", digits_text(amplitude, s.amplitude, s.half),
                   units_show_text(&sensor->show, unit));
    else
        table_cell(table, "%s %s at %s deg lag", digits_text(amplitude, s.amplitude, s.half),
                   units_show_text(&sensor->show, unit), digits_angle(lag, s.lag_deg, s.lag_half));
}

static void compared(const struct dossier *d, struct buffer *out)
{
    static const struct table_column columns[] = {{"run", false, true},
                                                  {"sensor", false, true},
                                                  {"predicted", true, false},
                                                  {"measured", true, false},
                                                  {"apart, s.e.", true, false}};
    struct table table;
    if (d->compared.count == 0)
        return;
    table_init(&table, columns, sizeof columns / sizeof *columns);
    for (size_t i = 0; i < d->compared.count; i++) {
        const struct compared_record *c = &d->compared.items[i];
        const struct job_sensor *sensor = &d->job->sensors[c->sensor];
        const struct dossier_reading *reading = reading_of(d, c);
        double rpm = reading ? reading->reading.speed_rpm : d->job->service_rpm;
        table_cell(&table, "%s", d->job->runs[c->run].name);
        table_cell(&table, "%s", sensor->name);
        double se = c->se > 0 ? cabs(c->measured - c->predicted) / c->se : 0;
        const double guess[3] = {se * se / 2, 0, se * se / 2};
        double own[3] = {0, 0, 0};
        if (reading)
            dossier_cov(reading, own);
        vector_cell(sensor, c->predicted, guess, rpm, &table);
        vector_cell(sensor, c->measured, own, rpm, &table);
        table_cell(&table, isfinite(c->se) ? "%.1f" : "-", c->se);
    }
    html_part_heading(out, "Predicted against measured");
    html_part_say(out, "note",
                  "What the runs before predict for the corrected run, 1x. Apart: the distance "
                  "over its standard error.");
    html_part_table(out, &table);
}

void html_judged_outcomes(const struct dossier *dossier, struct buffer *out)
{
    zones(dossier, out);
    compared(dossier, out);
}
