#include "report/text.h"

#include <math.h>

#include "report/paper.h"
#include "report/shown.h"
#include "report/text_answer.h"
#include "report/text_forecast.h"
#include "report/text_audit.h"
#include "report/text_others.h"
#include "report/text_outcomes.h"
#include "report/text_readings.h"

static void header(const struct dossier *d, struct buffer *out)
{
    const struct job *job = d->job;
    struct buffer text = BUFFER_INIT;
    char number[DIGITS_ROOM];
    bool audit = dossier_is_audit(d);
    paper_wrap(out, 0, 0, job->title[0] ? job->title : "(no title)");
    buffer_text(&text, audit ? "Audit of recordings" : "Balance report");
    if (isfinite(job->rotor_mass)) {
        bool us = job->units == UNITS_US;
        double mass = us ? job->rotor_mass / 0.45359237 : job->rotor_mass;
        buffer_format(&text, "; rotor %s %s", digits_text(number, mass, NAN), us ? "lb" : "kg");
    }
    if (isfinite(job->service_rpm))
        buffer_format(&text, "; service speed %s rpm", shown_speed(number, job->service_rpm));
    if (isfinite(job->grade))
        buffer_format(&text, "; grade G%s", digits_text(number, job->grade, NAN));
    if (text.failed)
        out->failed = 1;
    else
        paper_wrap(out, 0, 2, text.bytes);
    buffer_release(&text);
}

static void files(const struct dossier *d, struct buffer *out)
{
    for (size_t i = 0; i < d->runs.count; i++) {
        const struct run_record *run = &d->runs.items[i].record;
        if (run->file_count == 0)
            paper_say(out, 2, 4, "Run '%s': readings by hand.", run->run);
        for (size_t f = 0; f < run->file_count; f++) {
            const struct file_record *file = &run->files[f];
            char rate[DIGITS_ROOM];
            digits_at(rate, file->rate_hz,
                      fabs(file->rate_hz - round(file->rate_hz)) < 5e-4 ? 0 : -3);
            paper_say(out, 2, 4, "Run '%s': %s, %lld samples at %s Hz, SHA-256 %.12s...", run->run,
                      file->path, file->frames, rate, file->sha256);
        }
    }
}

static void provenance(const struct dossier *d, struct buffer *out)
{
    paper_heading(out, "MADE FROM");
    files(d, out);
    paper_say(out, 2, 4, "By lopside " LOPSIDE_VERSION ".");
}

void text_write(const struct dossier *dossier, struct buffer *out)
{
    header(dossier, out);
    if (dossier_is_audit(dossier)) {
        text_audit_summary(dossier, out);
        text_audit_table(dossier, out);
    } else {
        text_answer_now(dossier, out);
        text_answer_safety(dossier, out);
        text_forecast_write(dossier, out);
        text_outcomes_zones(dossier, out);
        text_others_write(dossier, out);
        text_answer_ideal(dossier, out);
        text_others_same(dossier, out);
        text_outcomes_parts(dossier, out);
        text_answer_tolerance(dossier, out);
        text_outcomes_compared(dossier, out);
        text_readings_all(dossier, out);
        text_readings_responses(dossier, out);
    }
    text_readings_findings(dossier, out);
    provenance(dossier, out);
}
