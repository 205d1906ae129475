#include "report/tidy.h"

#include <math.h>
#include <stdio.h>

#include "report/csv.h"
#include "report/runout.h"
#include "report/shown.h"
#include "report/text_readings.h"
#include "sheet/units.h"

#define WIDE_BAND 0.5 /* orders: points so far apart stand for a band, as in the drawing */

const char *const tidy_names[] = {"readings", "responses", "correction", "placement",
                                  "forecast", "findings",  "spectrum",   NULL};

static const char *const verdicts[] = {"ok", "caution", "refuse"};

static const struct job_sensor *sensor_of(const struct dossier *d, int sensor)
{
    return &d->job->sensors[sensor];
}

static void unit_cell(struct csv *csv, const struct show *show)
{
    char text[32];
    csv_plain(csv, units_show_text(show, text));
}

static void vector_cells(struct csv *csv, const struct shown *s)
{
    csv_number(csv, s->amplitude);
    csv_number(csv, s->half);
    csv_number(csv, s->lag_deg);
    csv_number(csv, s->lag_half);
}

static const char *used(const struct dossier *d, const struct dossier_reading *item)
{
    const struct reading_record *r = &item->reading;
    if (!item->judged)
        return "not vetted";
    if (dossier_is_runout(d, r->run) && !runout_has_effect(d, r->sensor))
        return "no";
    return item->use ? "yes" : "no";
}

/* What the sheet says of the run: nothing of an ordinary one. */
static const char *role(const struct dossier *d, const char *run)
{
    const int index = job_find_run(d->job, run);
    return index >= 0 ? d->job->runs[index].role : "";
}

static void without_runout_cells(const struct dossier *d, const struct dossier_reading *item,
                                 struct csv *csv)
{
    struct shown left = {.amplitude = NAN, .lag_deg = NAN};
    if (runout_comes_off(d, item)) {
        const struct dossier_reading off = runout_off(d, item);
        left = text_readings_shown(d, &off);
    }
    csv_number(csv, left.amplitude);
    csv_number(csv, left.lag_deg);
}

/* Of an audit: a recording without a reading. */
static void unreadable_row(const struct finding_record *f, struct csv *csv)
{
    csv_text(csv, f->run);
    for (int i = 1; i < 14; i++)
        csv_plain(csv, "");
    csv_plain(csv, "no");
    csv_plain(csv, verdicts[f->verdict]);
    for (int i = 0; i < 3; i++)
        csv_plain(csv, "");
    csv_row(csv);
}

static void readings(const struct dossier *d, struct csv *csv)
{
    static const char *const heads[] = {"run",
                                        "condition",
                                        "sensor",
                                        "speed (rpm)",
                                        "unit",
                                        "1x amplitude (unit)",
                                        "amplitude 95 % half width (unit)",
                                        "lag (deg)",
                                        "lag 95 % half width (deg)",
                                        "turns",
                                        "blocks",
                                        "amplitude scatter (%)",
                                        "lag scatter (deg)",
                                        "drift (%)",
                                        "used",
                                        "verdict",
                                        "role",
                                        "1x amplitude without runout (unit)",
                                        "lag without runout (deg)",
                                        NULL};
    csv_head(csv, heads);
    for (size_t i = 0; i < d->readings.count; i++) {
        const struct dossier_reading *item = &d->readings.items[i];
        const struct reading_record *r = &item->reading;
        struct shown s = text_readings_shown(d, item);
        csv_text(csv, r->run);
        csv_text(csv, r->condition);
        csv_text(csv, sensor_of(d, r->sensor)->name);
        csv_number(csv, r->speed_rpm);
        unit_cell(csv, &sensor_of(d, r->sensor)->show);
        vector_cells(csv, &s);
        csv_integer(csv, r->steady.turns);
        csv_integer(csv, r->blocks);
        csv_number(csv, r->steady.amplitude_pct);
        csv_number(csv, r->steady.phase_deg);
        csv_number(csv, r->steady.drift_pct);
        csv_plain(csv, used(d, item));
        csv_plain(csv,
                  verdicts[item->use ? dossier_verdict(d, r->run, r->sensor) : VERDICT_REFUSE]);
        csv_plain(csv, role(d, r->run));
        without_runout_cells(d, item, csv);
        csv_row(csv);
    }
    for (size_t i = 0; dossier_is_audit(d) && i < d->findings.count; i++) {
        if (dossier_is_unreadable(&d->findings.items[i]))
            unreadable_row(&d->findings.items[i], csv);
    }
}

static void responses(const struct dossier *d, struct csv *csv)
{
    static const char *const heads[] = {"condition",
                                        "sensor",
                                        "plane",
                                        "speed (rpm)",
                                        "mass unit",
                                        "unit",
                                        "1x amplitude (unit per mass unit)",
                                        "amplitude 95 % half width (unit per mass unit)",
                                        "lag for a weight at the mark (deg)",
                                        "lag 95 % half width (deg)",
                                        NULL};
    csv_head(csv, heads);
    double mass = 1 / shown_mass(d->job, 1);
    for (size_t i = 0; i < d->responses.count; i++) {
        const struct response_record *r = &d->responses.items[i];
        const struct job_sensor *sensor = sensor_of(d, r->sensor);
        double cov[3];
        for (int c = 0; c < 3; c++)
            cov[c] = r->cov[c] * mass * mass;
        struct shown s =
            shown_vector(r->vector * mass, cov, sensor->quantity, r->speed_rpm, &sensor->show, NAN);
        csv_text(csv, r->condition);
        csv_text(csv, sensor->name);
        csv_text(csv, dossier_plane(d, r->plane));
        csv_number(csv, r->speed_rpm);
        csv_plain(csv, shown_mass_unit(d->job));
        unit_cell(csv, &sensor->show);
        vector_cells(csv, &s);
        csv_row(csv);
    }
}

static void correction(const struct dossier *d, struct csv *csv)
{
    static const char *const heads[] = {
        "plane", "mass",        "mass unit",          "angle (deg)",
        "sense", "relative to", "least squares mass", "least squares angle (deg)",
        NULL};
    csv_head(csv, heads);
    for (size_t i = 0; i < d->corrections.count; i++) {
        const struct correction_record *c = &d->corrections.items[i];
        csv_text(csv, dossier_plane(d, c->plane));
        csv_number(csv, shown_mass(d->job, c->mass));
        csv_plain(csv, shown_mass_unit(d->job));
        csv_number(csv, job_sheet_angle(d->job, c->angle_deg));
        csv_plain(csv, job_sense_text(d->job));
        csv_text(csv, c->relative_to);
        csv_number(csv, shown_mass(d->job, c->least_squares[0]));
        csv_number(csv, job_sheet_angle(d->job, c->least_squares[1]));
        csv_row(csv);
    }
}

static void placement(const struct dossier *d, struct csv *csv)
{
    static const char *const heads[] = {"plane",       "position",  "angle (deg)", "sense",
                                        "mass",        "mass unit", "pieces",      "force (N)",
                                        "relative to", "hole (mm)", "depths (mm)", NULL};
    csv_head(csv, heads);
    for (size_t i = 0; i < d->placements.count; i++) {
        const struct placement_record *p = &d->placements.items[i];
        struct buffer pieces = BUFFER_INIT, depths = BUFFER_INIT;
        const bool drilled = p->piece_count > 0 && p->depths_m[0] > 0;
        for (size_t k = 0; drilled && k < p->piece_count; k++)
            buffer_format(&depths, "%s%.4g", k ? " " : "", 1000 * p->depths_m[k]);
        for (size_t k = 0; k < p->piece_count; k++)
            buffer_format(&pieces, "%s%.6g", k ? " " : "", shown_mass(d->job, p->pieces[k]));
        csv_text(csv, dossier_plane(d, p->plane));
        if (p->position > 0)
            csv_integer(csv, p->position);
        else
            csv_plain(csv, "");
        csv_number(csv, job_sheet_angle(d->job, p->angle_deg));
        csv_plain(csv, job_sense_text(d->job));
        csv_number(csv, shown_mass(d->job, p->mass));
        csv_plain(csv, shown_mass_unit(d->job));
        csv_plain(csv, pieces.bytes ? pieces.bytes : "");
        csv_number(csv, p->force_n);
        csv_text(csv, p->relative_to);
        csv_number(csv, drilled && p->plane >= 0 ? 1000 * d->job->planes[p->plane].hole_m : NAN);
        csv_plain(csv, depths.bytes ? depths.bytes : "");
        csv_row(csv);
        if (pieces.failed || depths.failed)
            csv->out->failed = 1;
        buffer_release(&depths);
        buffer_release(&pieces);
    }
}

static void forecast(const struct dossier *d, struct csv *csv)
{
    static const char *const heads[] = {"sensor",
                                        "condition",
                                        "unit",
                                        "before (unit)",
                                        "after (unit)",
                                        "next reading 95 % from (unit)",
                                        "next reading 95 % to (unit)",
                                        "target (unit)",
                                        "chance",
                                        NULL};
    csv_head(csv, heads);
    for (size_t i = 0; i < d->forecasts.count; i++) {
        const struct forecast_record *f = &d->forecasts.items[i];
        const struct job_sensor *sensor = sensor_of(d, f->sensor);
        double peaks[] = {cabs(f->before), cabs(f->after), f->after_95[0], f->after_95[1],
                          f->target};
        csv_text(csv, sensor->name);
        csv_text(csv, f->condition);
        unit_cell(csv, &sensor->show);
        for (size_t k = 0; k < sizeof peaks / sizeof *peaks; k++)
            csv_number(csv,
                       shown_amplitude(peaks[k], NAN, sensor->quantity, f->speed_rpm, &sensor->show)
                           .amplitude);
        csv_number(csv, f->chance);
        csv_row(csv);
    }
}

static void findings(const struct dossier *d, struct csv *csv)
{
    static const char *const heads[] = {"stage", "check", "verdict", "run",  "sensor", "value",
                                        "limit", "unit",  "basis",   "text", NULL};
    csv_head(csv, heads);
    for (size_t i = 0; i < d->findings.count; i++) {
        const struct finding_record *f = &d->findings.items[i];
        csv_text(csv, f->stage);
        csv_text(csv, f->check);
        csv_plain(csv, verdicts[f->verdict]);
        csv_text(csv, f->run);
        csv_text(csv, dossier_sensor(d, f->sensor));
        csv_number(csv, f->value);
        csv_number(csv, f->limit);
        csv_text(csv, f->unit);
        csv_text(csv, f->basis);
        csv_text(csv, f->text);
        csv_row(csv);
    }
}

/* A line of a spectrum: at hz, of peak amplitude in SI. */
static void spectrum_row(const struct dossier *d, const struct spectrum_record *r, double rpm,
                         double hz, double amplitude, const char *what, struct csv *csv)
{
    const struct job_sensor *sensor = sensor_of(d, r->sensor);
    csv_text(csv, r->run);
    csv_text(csv, sensor->name);
    csv_number(csv, rpm);
    csv_number(csv, hz);
    csv_number(csv, 60 * hz / rpm);
    csv_plain(csv, what);
    unit_cell(csv, &sensor->show);
    /* An integral lifts the noise of the lowest orders without end. */
    csv_number(
        csv,
        hz > 0 ? shown_amplitude(amplitude, NAN, sensor->quantity, 60 * hz, &sensor->show).amplitude
               : NAN);
    csv_row(csv);
}

static void spectrum(const struct dossier *d, struct csv *csv)
{
    static const char *const heads[] = {"run",   "sensor", "speed (rpm)", "frequency (Hz)",
                                        "order", "what",   "unit",        "amplitude (unit)",
                                        NULL};
    csv_head(csv, heads);
    for (size_t i = 0; i < d->spectra.count; i++) {
        const struct spectrum_record *r = &d->spectra.items[i];
        const double rpm = dossier_speed(d, r->run);
        const char *what = "order";
        for (size_t k = 0; k < r->count; k++) {
            if (k > 0 && r->orders[k] - r->orders[k - 1] >= WIDE_BAND)
                what = "all within a wide band";
            spectrum_row(d, r, rpm, r->orders[k] * rpm / 60, r->amplitude[k], what, csv);
        }
        for (size_t k = 0; k < r->line_count; k++)
            spectrum_row(d, r, rpm, r->lines[2 * k], r->lines[2 * k + 1],
                         "not turning with the shaft", csv);
    }
}

void tidy_write(const struct dossier *dossier, enum tidy_what what, struct buffer *out)
{
    static void (*const tables[])(const struct dossier *, struct csv *) = {
        readings, responses, correction, placement, forecast, findings, spectrum};
    struct csv csv = {out, 0};
    tables[what](dossier, &csv);
}
