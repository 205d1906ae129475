#include "report/html.h"

#include <math.h>
#include <stdio.h>
#include <stdlib.h>
#include <string.h>

#include "report/draw.h"
#include "report/html_answer.h"
#include "report/html_judged.h"
#include "report/html_others.h"
#include "report/html_part.h"
#include "report/phrase.h"
#include "report/runout.h"
#include "report/text_answer.h"
#include "report/text_forecast.h"
#include "report/text_audit.h"
#include "report/text_readings.h"
#include "sheet/units.h"

static const char page_style[] =
    "@page{margin:14mm}*{box-sizing:border-box}"
    "body{font:15px/1.4 sans-serif;color:#111;background:#fff;margin:0 auto;padding:12px;"
    "max-width:1000px;overflow-wrap:anywhere}"
    "h1{font-size:1.5em;margin:.2em 0}h3{font-size:1em;margin:.8em 0 "
    ".2em;break-after:avoid}h2{font-size:1.15em;border-bottom:2px solid #111;"
    "margin:1.4em 0 .5em;break-after:avoid}"
    ".answer{border:3px solid #111;padding:4px 14px;margin:10px 0}.answer h2{border:0;margin:.4em "
    "0}"
    ".warn{font-weight:bold;border-left:8px double #d55e00;padding-left:8px}"
    ".wide{overflow-x:auto;max-width:100%}table{border-collapse:collapse;margin:.4em 0;"
    "font-size:.9em}th,td{padding:2px 8px;border-bottom:1px solid #bbb;text-align:left;"
    "overflow-wrap:normal}th{border-bottom:1.5px solid #111}.r{text-align:right}"
    ".no{font-weight:bold}.verdicts th:last-child,.verdicts td:last-child{position:sticky;right:0;"
    "background:#fff;box-shadow:-1px 0 #666}h2+p,h3+p,.note{break-after:avoid}"
    ".pictures{display:flex;flex-wrap:wrap;gap:8px}.pictures "
    "svg{max-width:100%;height:auto}.pictures svg,tr,li{break-inside:avoid}"
    "pre{white-space:pre-wrap;font-size:.75em;border:1px solid #bbb;padding:6px}.note{color:#333;"
    "font-size:.9em}.k{white-space:nowrap}@media(min-width:501px){.r{white-space:nowrap}}@media("
    "max-width:500px){th,td{"
    "padding:2px 3px;font-size:11px}.verdicts th,.verdicts td{padding:2px "
    "1px;font-size:10px}.verdicts td:last-child{padding-left:4px}}@media "
    "print{body{padding:0;max-width:none;font-size:10pt}"
    ".wide{overflow:visible}.pictures svg{max-width:49%}.many svg{max-width:32%}"
    ".planes svg{max-width:100%}}";

static void head(const struct dossier *d, struct buffer *out)
{
    const char *title = d->job->title[0] ? d->job->title : "(no title)";
    buffer_text(out, "<!DOCTYPE html>\n<html lang=\"en\"><head><meta charset=\"utf-8\">\n"
                     "<meta name=\"viewport\" content=\"width=device-width,initial-scale=1\">\n"
                     "<link rel=\"icon\" href=\"data:,\">\n<title>");
    svg_escape(out, title);
    buffer_format(out, "</title>\n<style>%s%s</style></head><body>\n<h1>", page_style, svg_style());
    svg_escape(out, title);
    buffer_format(out, "</h1>\n<p>%s",
                  dossier_is_audit(d) ? "Audit of recordings" : "Balance report");
    char number[DIGITS_ROOM];
    bool us = d->job->units == UNITS_US;
    if (isfinite(d->job->rotor_mass))
        buffer_format(out, "; rotor %s %s",
                      digits_text(number, d->job->rotor_mass / (us ? 0.45359237 : 1), NAN),
                      us ? "lb" : "kg");
    if (isfinite(d->job->service_rpm))
        buffer_format(out, "; service speed %s rpm", shown_speed(number, d->job->service_rpm));
    if (isfinite(d->job->grade))
        buffer_format(out, "; grade G%s", digits_text(number, d->job->grade, NAN));
    buffer_text(out, ".</p>\n");
}

static void forecast(const struct dossier *d, struct buffer *out)
{
    struct table table;
    if (d->forecasts.count > 0) {
        char heading[80];
        snprintf(heading, sizeof heading, "Forecast: 1x amplitudes %s", phrase_fitted(d));
        html_part_heading(out, heading);
        text_forecast_table(d, &table);
        const char *blind = text_forecast_blind(&table);
        html_part_table(out, &table);
        if (blind)
            html_part_say(out, "note", "%s", blind);
        html_part_say(out, "note", "%s", text_forecast_after);
        struct buffer fitted = BUFFER_INIT;
        text_forecast_fitted(d, &fitted);
        if (fitted.failed || fitted.length > 0)
            html_part_take(out, "p", &fitted);
        buffer_release(&fitted);
        if (runout_forecast(d))
            html_part_say(out, "note", "%s", runout_forecast(d));
        html_part_say(out, "note", "%s", text_forecast_1x_only);
    }
    if (d->residuals.count > 0) {
        html_part_heading(out, "Tolerance: estimated residual unbalance");
        text_answer_tolerance_table(d, &table);
        html_part_table(out, &table);
        struct buffer words = BUFFER_INIT;
        text_answer_tolerance_words(d, &words);
        buffer_format(&words, " Basis: %s.", d->residuals.items[0].basis);
        html_part_say(out, "note", "%s", words.bytes && !words.failed ? words.bytes : "");
        out->failed = out->failed || words.failed;
        buffer_release(&words);
    }
}

/* What the text report says first of an audit, as one paragraph. */
static void summary(const struct dossier *d, struct buffer *out)
{
    struct buffer text = BUFFER_INIT, joined = BUFFER_INIT;
    text_audit_summary(d, &text);
    const char *line = text.bytes && !text.failed ? text.bytes : "";
    line += strspn(line, "\n");
    line += strcspn(line, "\n"); /* the text's own heading */
    while (*(line += strspn(line, " \n"))) {
        size_t length = strcspn(line, "\n");
        buffer_text(&joined, joined.length ? " " : "");
        buffer_add(&joined, line, length);
        line += length;
    }
    if (text.failed)
        out->failed = 1;
    html_part_heading(out, "Can these readings be trusted?");
    html_part_take(out, "p", &joined);
    buffer_release(&text);
}

static void readings(const struct dossier *d, struct buffer *out)
{
    struct table table;
    if (d->readings.count == 0)
        return;
    html_part_heading(out, "Readings");
    html_part_say(out, "note", "%s", text_readings_note);
    for (size_t i = 0; i < d->readings.count;) {
        struct buffer text = BUFFER_INIT, overall = BUFFER_INIT;
        text_readings_group_heading(d, &d->readings.items[i].reading, &text);
        html_part_take(out, "h3", &text);
        size_t first = i;
        i = text_readings_group(d, i, &table);
        html_part_table(out, &table);
        text_readings_overall(d, first, i, &overall);
        if (overall.failed || overall.length > 0)
            html_part_take(out, "p", &overall);
        buffer_release(&overall);
        runout_words(d, first, i, &overall);
        if (overall.failed || overall.length > 0)
            html_part_take(out, "p", &overall);
        buffer_release(&overall);
    }
    if (text_readings_words(d))
        html_part_say(out, "note", "%s", text_readings_words(d));
    html_part_say(out, "note",
                  "In the polar plots lag grows against rotation from the top, seen "
                  "as the planes are.");
    buffer_text(out, "<div class=\"pictures\">\n");
    for (size_t i = 0; i < d->readings.count; i++) {
        const struct reading_record *r = &d->readings.items[i].reading;
        if (draw_polar_begins(d, i))
            draw_polar(d, (size_t)r->sensor, r->condition, 0, out);
    }
    buffer_text(out, "</div>\n");
    if (d->responses.count == 0)
        return;
    struct buffer mass = BUFFER_INIT;
    html_part_heading(out, "Responses");
    phrase_mass(&mass, d->job, text_readings_response_table(d, &table), NAN);
    html_part_say(out, "note", "What %s at the mark (0 deg %s) adds at the plane's radius.",
                  mass.bytes ? mass.bytes : "", job_sense_text(d->job));
    buffer_release(&mass);
    html_part_table(out, &table);
}

/* Of an audit there may be thousands: what is done goes out between two recordings. */
static int evidence(const struct dossier *d, bool small, struct buffer *out, html_spill spill)
{
    int status = 0;
    if (d->turns.count > 0 || d->spectra.count > 0) { /* else: readings by hand */
        html_part_heading(out, small ? "Lag over time, recording by recording"
                                     : "Evidence: over time, order spectra");
        buffer_format(out, "<div class=\"pictures%s\">\n", small ? " many" : "");
        for (size_t r = 0; r < d->runs.count; r++) {
            for (size_t s = 0; s < d->job->sensor_count; s++)
                draw_lines_time(d, r, s, small, 0, out);
            status = out->length >= HTML_SPILL ? spill(out) : 0;
            if (status != 0)
                return status;
        }
        for (size_t i = 0; !small && i < d->spectra.count; i++)
            draw_spectrum(d, i, 0, out);
        buffer_text(out, "</div>\n");
    }
    if (d->curves.count == 0)
        return 0;
    html_part_heading(out, "Coast-down");
    buffer_text(out, "<div class=\"pictures\">\n");
    for (size_t i = 0; i < d->curves.count; i++)
        draw_lines_speed(d, i, 0, out);
    buffer_text(out, "</div>\n");
    return 0;
}

static void sensor(const struct job *job, const struct job_sensor *s, struct buffer *out)
{
    struct buffer text = BUFFER_INIT;
    char unit[24], at[DIGITS_ROOM];
    buffer_format(&text, "Sensor '%s': channel '%s', measures %s, shown in %s", s->name, s->channel,
                  quantity_text(s->quantity), units_show_text(&s->show, unit));
    if (isfinite(s->at_deg))
        buffer_format(&text, ", sits at %s deg, counted %s", digits_angle(at, s->at_deg, NAN),
                      job->angles == SENSE_NONE ? "as the sheet counts" : job_sense_text(job));
    buffer_text(&text, ".");
    html_part_take(out, "p", &text);
}

static void provenance(const struct dossier *d, const char *job, size_t length, struct buffer *out)
{
    html_part_heading(out, "Made from");
    for (size_t i = 0; i < d->runs.count; i++) {
        const struct run_record *run = &d->runs.items[i].record;
        if (run->file_count == 0)
            html_part_say(out, "note", "Run '%s': readings by hand.", run->run);
        for (size_t f = 0; f < run->file_count; f++)
            html_part_say(out, "note", "Run '%s': %s, %lld samples at %.10g Hz, SHA-256 %s",
                          run->run, run->files[f].path, run->files[f].frames, run->files[f].rate_hz,
                          run->files[f].sha256);
    }
    for (size_t i = 0; i < d->job->sensor_count; i++)
        sensor(d->job, &d->job->sensors[i], out);
    html_part_say(out, "note", "By lopside " LOPSIDE_VERSION ". All settings of the job:");
    char *line = strndup(job, length);
    if (!line) {
        out->failed = 1;
        return;
    }
    line[strcspn(line, "\r\n")] = '\0';
    buffer_text(out, "<pre>");
    svg_escape(out, line);
    buffer_text(out, "</pre>\n");
    free(line);
}

int html_write(const struct dossier *dossier, const char *job, size_t length, struct buffer *out,
               html_spill spill)
{
    const struct dossier *d = dossier;
    bool audit = dossier_is_audit(d);
    head(d, out);
    if (audit) {
        struct table table;
        summary(d, out);
        html_part_heading(out, "Readings");
        html_part_say(out, "note",
                      "Phase is lag, in degrees. sd%% and deg: standard deviation of "
                      "the blocks of a recording, amplitude in %% and lag in degrees. "
                      "drift: trend over the recording, %%.");
        text_audit_rows(d, &table);
        buffer_text(out, "<div class=\"verdicts\">\n");
        html_part_table(out, &table);
        buffer_text(out, "</div>\n");
    } else {
        html_answer_write(d, out);
        forecast(d, out);
        html_judged_outcomes(d, out);
        html_others_write(d, out);
        readings(d, out);
    }
    html_judged_findings(d, out);
    int status = evidence(d, audit, out, spill);
    if (status != 0)
        return status;
    if (!audit)
        html_judged_checks(d, out);
    provenance(d, job, length, out);
    buffer_text(out, "</body></html>\n");
    return spill(out);
}
