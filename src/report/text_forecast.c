#include "report/text_forecast.h"

#include <complex.h>
#include <math.h>
#include <stdio.h>
#include <string.h>

#include "report/paper.h"
#include "report/phrase.h"
#include "report/runout.h"
#include "report/shown.h"

static bool one_condition(const struct dossier *d)
{
    for (size_t i = 1; i < d->forecasts.count; i++) {
        if (strcmp(d->forecasts.items[i].condition, d->forecasts.items[0].condition) != 0)
            return false;
    }
    return true;
}

/* A forecast as its sensor shows it. */
struct outlook {
    double before, after, low, high, target;
    int place; /* the last digit of what is expected */
};

static struct outlook outlook_of(const struct dossier *d, const struct forecast_record *f)
{
    const struct job_sensor *sensor = &d->job->sensors[f->sensor];
    double peaks[5] = {cabs(f->before), cabs(f->after), f->after_95[0], f->after_95[1], f->target};
    for (int i = 0; i < 5; i++)
        peaks[i] =
            shown_amplitude(peaks[i], NAN, sensor->quantity, f->speed_rpm, &sensor->show).amplitude;
    /* Never finer than four digits of what there is now: a forecast of nothing left is "0.000". */
    int place = digits_place(peaks[1], (peaks[3] - peaks[2]) / 2);
    int coarse = digits_place(peaks[0], NAN);
    return (struct outlook){peaks[0], peaks[1], peaks[2],
                            peaks[3], peaks[4], place > coarse ? place : coarse};
}

void text_forecast_missed(const struct dossier *dossier, size_t forecast, struct buffer *text)
{
    const struct forecast_record *f = &dossier->forecasts.items[forecast];
    /* Below even odds it is not to be hoped for, and below 5 % it will not be: our choice. */
    if (!(f->chance < 0.5) || f->sensor < 0 || (size_t)f->sensor >= dossier->job->sensor_count)
        return;
    const struct job_sensor *sensor = &dossier->job->sensors[f->sensor];
    const struct outlook o = outlook_of(dossier, f);
    const bool single = one_condition(dossier);
    char after[DIGITS_ROOM], target[DIGITS_ROOM], chance[DIGITS_ROOM];
    buffer_format(text, "This %s the target at %s%s%s: %s expected, target %s %s %s",
                  f->chance < 0.05 ? "will not meet" : "is not likely to meet", sensor->name,
                  single ? "" : ", ", single ? "" : f->condition,
                  digits_at(after, o.after, o.place), digits_text(target, o.target, NAN),
                  sensor->show.unit, detection_text(sensor->show.detection));
    if (f->chance >= 0.05)
        buffer_format(text, ", chance %s", digits_chance(chance, f->chance));
    buffer_text(text, ".");
}

static void forecast_row(const struct dossier *d, const struct forecast_record *f, bool single,
                         struct table *table)
{
    if (f->sensor < 0 || (size_t)f->sensor >= d->job->sensor_count)
        return;
    const struct job_sensor *sensor = &d->job->sensors[f->sensor];
    const struct outlook o = outlook_of(d, f);
    int first = digits_place(o.before, (o.high - o.low) / 2);
    char text[DIGITS_ROOM], low[DIGITS_ROOM], high[DIGITS_ROOM];
    table_cell(table, "%s%s%s", sensor->name, single ? "" : ", ", single ? "" : f->condition);
    table_cell(table, "%s %s", sensor->show.unit, detection_text(sensor->show.detection));
    table_cell(table, "%s", digits_at(text, o.before, first));
    table_cell(table, "%s", digits_at(text, o.after, o.place));
    table_cell(table, "%s to %s", digits_at(low, o.low, o.place), digits_at(high, o.high, o.place));
    table_cell(table, "%s", digits_text(text, o.target, NAN));
    table_cell(table, "%s", digits_chance(text, f->chance));
}

/* Readings and what is fitted to all runs differ a little wherever runs are spare; by 2 % it is
 * seen in the figures that people compare: our choice. */
static const double FITTED_APART = 0.02;

/* What the sensor shows where the rotor is as the answer takes it: the mean of the used
 * readings, as shown; NaN: there are none. */
static double before_read(const struct dossier *d, size_t sensor, const char *condition)
{
    const char *to = d->corrections.count > 0  ? d->corrections.items[0].relative_to
                     : d->placements.count > 0 ? d->placements.items[0].relative_to
                                               : "";
    const struct job_sensor *s = &d->job->sensors[sensor];
    const int base = dossier_base(d->job, to);
    double complex sum = 0;
    double rpm = NAN;
    size_t count = 0;
    for (size_t i = 0; i < d->readings.count; i++) {
        const struct reading_record *r = &d->readings.items[i].reading;
        const int run = job_find_run(d->job, r->run);
        if (r->sensor != (int)sensor || strcmp(r->condition, condition) != 0 || run < 0 ||
            dossier_is_runout(d, r->run) || !d->readings.items[i].use || !r->has_phase)
            continue;
        if (base >= 0 ? run != base : !job_run_is_bare(d->job, (size_t)run))
            continue;
        const struct dossier_reading left = runout_off(d, &d->readings.items[i]);
        sum += left.reading.vector;
        rpm = r->speed_rpm;
        count++;
    }
    if (count == 0)
        return NAN;
    return shown_amplitude(cabs(sum) / (double)count, NAN, s->quantity, rpm, &s->show).amplitude;
}

/* An aimed sensor about which nothing is foretold. condition: "" where it was never read. */
static void lost_row(const struct dossier *d, size_t sensor, const char *condition, bool single,
                     struct table *table)
{
    const struct job_sensor *s = &d->job->sensors[sensor];
    const struct job_target *target = &d->job->aim.targets[sensor];
    const double before = before_read(d, sensor, condition);
    const double aim =
        shown_amplitude(target->amplitude, NAN, target->quantity, d->job->service_rpm, &s->show)
            .amplitude;
    char text[DIGITS_ROOM];
    bool plain =
        !condition[0] || (single && strcmp(condition, d->forecasts.items[0].condition) == 0);
    table_cell(table, "%s%s%s", s->name, plain ? "" : ", ", plain ? "" : condition);
    table_cell(table, "%s %s", s->show.unit, detection_text(s->show.detection));
    /* Three digits: common practice for one amplitude. */
    table_cell(table, "%s", digits_text(text, before, before / 10));
    table_cell(table, "-");
    table_cell(table, "not forecast");
    table_cell(table, "%s", digits_text(text, aim, NAN));
    table_cell(table, "-");
}

static bool said_before(const struct dossier *d, size_t reading)
{
    const struct reading_record *r = &d->readings.items[reading].reading;
    for (size_t i = 0; i < reading; i++) {
        const struct reading_record *other = &d->readings.items[i].reading;
        if (other->sensor == r->sensor && strcmp(other->condition, r->condition) == 0)
            return true;
    }
    return false;
}

static void lost_rows(const struct dossier *d, bool single, struct table *table)
{
    const struct job *job = d->job;
    for (size_t s = 0; s < job->sensor_count && job->aim.targets; s++) {
        bool known = false;
        if (job->aim.named && !job->aim.targets[s].in_aim)
            continue;
        for (size_t i = 0; i < d->readings.count; i++) {
            const struct reading_record *r = &d->readings.items[i].reading;
            if (r->sensor != (int)s || dossier_is_runout(d, r->run))
                continue;
            known = true;
            if (dossier_left_out(d, (int)s, r->condition) && !said_before(d, i))
                lost_row(d, s, r->condition, single, table);
        }
        for (size_t i = 0; i < d->forecasts.count; i++)
            known = known || d->forecasts.items[i].sensor == (int)s;
        if (!known && d->forecasts.count > 0)
            lost_row(d, s, "", single, table);
    }
}

const char text_forecast_1x_only[] =
    "1x only: whatever else the overall vibration holds stays as it is, and no balance weight "
    "changes it.";

const char text_forecast_after[] =
    "After is what the best estimates give. The next reading holds their uncertainty and the "
    "scatter from run to run, too, so that where little is left it is likely to be more.";

/* The table has a row about which nothing is foretold. */
const char *text_forecast_blind(const struct table *table)
{
    for (size_t i = 0; i < table->cell_count; i++)
        if (table->cells[i] && strcmp(table->cells[i], "not forecast") == 0)
            return "Not forecast: no reading that may be used tells what this sensor will show.";
    return NULL;
}

/* Sensors whose target is of another quantity than they show, each once. */
static void say_converted(const struct dossier *d, struct buffer *text)
{
    size_t said = 0;
    for (size_t s = 0; s < d->job->sensor_count && d->job->aim.targets; s++) {
        const struct job_target *t = &d->job->aim.targets[s];
        bool forecast = false;
        for (size_t i = 0; i < d->forecasts.count; i++)
            forecast = forecast || d->forecasts.items[i].sensor == (int)s;
        if (!forecast || !isfinite(t->amplitude) || t->quantity == d->job->sensors[s].show.quantity)
            continue;
        buffer_format(text, "%s%s",
                      said++ ? ", "
                      : text->length > 0
                          ? " Targets given in another quantity and converted at 1x: "
                          : "Targets given in another quantity and converted at 1x: ",
                      d->job->sensors[s].name);
    }
    if (said > 0)
        buffer_text(text, "; `target` with the sensor's name gives it one of its own.");
}

void text_forecast_fitted(const struct dossier *dossier, struct buffer *text)
{
    const bool single = one_condition(dossier);
    for (size_t i = 0; dossier->placements.count > 0 && i < dossier->forecasts.count; i++) {
        const struct forecast_record *f = &dossier->forecasts.items[i];
        char own[DIGITS_ROOM];
        if (f->sensor < 0 || (size_t)f->sensor >= dossier->job->sensor_count)
            continue;
        const struct job_sensor *sensor = &dossier->job->sensors[f->sensor];
        const double read = before_read(dossier, (size_t)f->sensor, f->condition);
        const double fitted = outlook_of(dossier, f).before;
        if (!(fabs(read - fitted) > FITTED_APART * fmax(read, fitted)))
            continue;
        buffer_text(text, text->length > 0 ? "; "
                                           : "Before is what all runs together say; the readings "
                                             "themselves differ from it: ");
        buffer_format(text, "%s%s%s read %s %s %s", sensor->name, single ? "" : ", ",
                      single ? "" : f->condition, digits_text(own, read, read / 10),
                      sensor->show.unit, detection_text(sensor->show.detection));
    }
    if (text->length > 0)
        buffer_text(text, ".");
    say_converted(dossier, text);
}

void text_forecast_table(const struct dossier *dossier, struct table *table)
{
    static const struct table_column columns[] = {
        {"sensor", false, true},
        {"unit", false, false},
        {"before", true, false},
        {"after", true, false},
        {"next reading, 95 %", true, false},
        {"target", true, false},
        {"chance", true, false},
    };
    bool single = one_condition(dossier);
    table_init(table, columns, sizeof columns / sizeof *columns);
    for (size_t i = 0; i < dossier->forecasts.count; i++)
        forecast_row(dossier, &dossier->forecasts.items[i], single, table);
    lost_rows(dossier, single, table);
}

void text_forecast_write(const struct dossier *dossier, struct buffer *out)
{
    struct table table;
    if (dossier->forecasts.count == 0)
        return;
    char heading[80];
    text_forecast_table(dossier, &table);
    snprintf(heading, sizeof heading, "FORECAST: 1x amplitudes %s", phrase_fitted(dossier));
    paper_heading(out, heading);
    table_print(&table, 2, out);
    const char *blind = text_forecast_blind(&table);
    table_release(&table);
    if (blind)
        paper_wrap(out, 2, 2, blind);
    paper_wrap(out, 2, 2, text_forecast_after);
    struct buffer words = BUFFER_INIT;
    text_forecast_fitted(dossier, &words);
    if (words.failed)
        out->failed = 1;
    else if (words.length > 0)
        paper_wrap(out, 2, 2, words.bytes);
    buffer_release(&words);
    if (runout_forecast(dossier))
        paper_wrap(out, 2, 2, runout_forecast(dossier));
    paper_wrap(out, 2, 2, text_forecast_1x_only);
}
