#include "report/text_audit.h"

#include <math.h>
#include <string.h>

#include "report/paper.h"
#include "report/phrase.h"
#include "report/table.h"
#include "report/text_readings.h"

static enum verdict verdict_of(const struct dossier *d, const struct dossier_reading *item)
{
    enum verdict verdict = dossier_verdict(d, item->reading.run, item->reading.sensor);
    return item->use ? verdict : VERDICT_REFUSE;
}

/* A recording that has no reading. */
static void empty_row(const char *run, const char *verdict, struct table *table)
{
    table_cell(table, "%s", run);
    for (int i = 0; i < 7; i++)
        table_cell(table, "-");
    table_cell(table, "%s", verdict);
}

/* True where there is a record of that recording and none of a reading in it: `first`, the rank of
 * the first reading that may be its own, goes on to the next recording's. */
static bool is_empty(const struct dossier *d, const char *run, size_t *first)
{
    size_t i = *first;
    while (i < d->readings.count && strcmp(d->readings.items[i].reading.run, run) == 0)
        i++;
    const bool empty = i == *first;
    *first = i;
    return empty;
}

static bool is_unread(const struct dossier *d, const char *run)
{
    for (size_t i = 0; i < d->findings.count; i++)
        if (dossier_is_unreadable(&d->findings.items[i]) &&
            strcmp(d->findings.items[i].run, run) == 0)
            return true;
    return false;
}

/* How many recordings are in the table with neither a reading nor as unread. */
static size_t count_empty(const struct dossier *d)
{
    size_t count = 0, first = 0;
    for (size_t r = 0; r < d->runs.count; r++) {
        const char *run = d->runs.items[r].record.run;
        count += is_empty(d, run, &first) && !is_unread(d, run);
    }
    return count;
}

void text_audit_summary(const struct dossier *dossier, struct buffer *out)
{
    size_t counts[3] = {0, 0, 0}, unreadable = 0, open = 0;
    for (size_t i = 0; i < dossier->readings.count; i++) {
        counts[verdict_of(dossier, &dossier->readings.items[i])]++;
        open += !dossier->readings.items[i].judged;
    }
    for (size_t i = 0; i < dossier->findings.count; i++)
        unreadable += dossier_is_unreadable(&dossier->findings.items[i]);
    const size_t empty = count_empty(dossier);
    paper_heading(out, "CAN THESE READINGS BE TRUSTED?");
    paper_say(out, 2, 2,
              "%zu readings from %zu recordings: %zu in order, %zu with caution, %zu refused.",
              dossier->readings.count, dossier->runs.count, counts[VERDICT_OK],
              counts[VERDICT_CAUTION], counts[VERDICT_REFUSE]);
    if (dossier->readings.count > 0 && counts[VERDICT_REFUSE] == dossier->readings.count)
        paper_say(out, 2, 2, "NONE of these readings is fit to balance on: the findings say why.");
    if (empty > 0)
        paper_say(out, 2, 2,
                  "%zu of the recordings gave no reading: see the table and the findings.", empty);
    if (unreadable > 0)
        paper_say(out, 2, 2, "%zu could not be read: see the end of the table.", unreadable);
    if (open > 0)
        paper_say(out, 2, 2,
                  "%zu readings were not judged: the stream has not been through `lopside "
                  "vet`.",
                  open);
    if (dossier->has_next && strcmp(dossier->next.step, "trial") != 0) {
        struct buffer text = BUFFER_INIT;
        phrase_sentence(&text, dossier->next.text);
        if (text.failed)
            out->failed = 1;
        else
            paper_wrap(out, 2, 2, text.bytes);
        buffer_release(&text);
    }
}

static void percent_cell(struct table *table, double value)
{
    if (isnan(value))
        table_cell(table, "-");
    else
        table_cell(table, value < 9.95 ? "%.1f" : "%.0f", value);
}

static void audit_row(const struct dossier *d, const struct dossier_reading *item,
                      struct table *table)
{
    static const char *const words[] = {"ok", "caution", "REFUSED"};
    const struct reading_record *r = &item->reading;
    const struct job_sensor *sensor = &d->job->sensors[r->sensor];
    struct shown s = text_readings_shown(d, item);
    char text[DIGITS_ROOM];
    table_cell(table, "%s", r->run);
    table_cell(table, "%s", sensor->name);
    table_cell(table, "%s", shown_speed(text, r->speed_rpm));
    if (isnan(s.amplitude))
        table_cell(table, "-");
    else
        table_cell(table, "%s %s %s", digits_text(text, s.amplitude, s.half), sensor->show.unit,
                   detection_text(sensor->show.detection));
    if (isnan(s.lag_deg) || s.lag_open)
        table_cell(table, isnan(s.amplitude) ? "-" : "none");
    else
        table_cell(table, "%s", digits_angle(text, s.lag_deg, s.lag_half));
    percent_cell(table, r->steady.amplitude_pct);
    percent_cell(table, isnan(s.lag_deg) ? NAN : r->steady.phase_deg);
    percent_cell(table, r->steady.drift_pct);
    table_cell(table, "%s", item->judged ? words[verdict_of(d, item)] : "not vetted");
}

void text_audit_rows(const struct dossier *dossier, struct table *table)
{
    static const struct table_column columns[] = {
        {"recording", false, true},    {"sensor", false, true}, {"rpm", true, false},
        {"1x amplitude", true, false}, {"lag", true, false},    {"sd%", true, false},
        {"deg", true, false},          {"drift", true, false},  {"verdict", false, false},
    };
    table_init(table, columns, sizeof columns / sizeof *columns);
    table->gap = 1;
    size_t done = 0;
    for (size_t r = 0; r < dossier->runs.count; r++) {
        const char *run = dossier->runs.items[r].record.run;
        size_t i = done, first = done;
        if (is_empty(dossier, run, &first) && !is_unread(dossier, run))
            empty_row(run, dossier_verdict(dossier, run, -1) == VERDICT_REFUSE ? "REFUSED" : "none",
                      table);
        for (; i < first; i++)
            audit_row(dossier, &dossier->readings.items[i], table);
        done = first;
    }
    for (; done < dossier->readings.count; done++) /* of runs without a record */
        audit_row(dossier, &dossier->readings.items[done], table);
    for (size_t i = 0; i < dossier->findings.count; i++) {
        if (dossier_is_unreadable(&dossier->findings.items[i]))
            empty_row(dossier->findings.items[i].run, "UNREAD", table);
    }
}

void text_audit_table(const struct dossier *dossier, struct buffer *out)
{
    struct table table;
    text_audit_rows(dossier, &table);
    if (table.cell_count > 0) {
        paper_heading(out, "READINGS");
        paper_say(
            out, 2, 2,
            "Phase is lag, in degrees. sd%% and deg: standard deviation of the blocks of a "
            "recording, amplitude in %% and lag in degrees. drift: trend over the recording, %%.");
    }
    table_print(&table, 0, out);
    table_release(&table);
}
