#include "report/html_answer.h"

#include <math.h>
#include <stdio.h>
#include <string.h>

#include "base/status.h"
#include "report/draw.h"
#include "report/heed.h"
#include "report/html_others.h"
#include "report/html_part.h"
#include "report/mounting.h"
#include "report/phrase.h"
#include "report/shown.h"
#include "report/text_answer.h"
#include "report/text_forecast.h"

static bool is_step(const struct dossier *d, const char *step)
{
    return d->has_next && strcmp(d->next.step, step) == 0;
}

static void advice(const struct dossier *d, struct buffer *out)
{
    struct buffer text = BUFFER_INIT;
    if (!d->has_next)
        return;
    phrase_sentence(&text, d->next.text);
    html_part_take(out, "p", &text);
}

static void relative_to(const struct dossier *d, struct buffer *out)
{
    struct buffer text = BUFFER_INIT;
    mounting_relative_to(&text, d->job, d->placements.items[0].relative_to);
    html_part_take(out, "p", &text);
}

static void placement_row(const struct dossier *d, const struct placement_record *p,
                          struct table *table)
{
    struct buffer angle = BUFFER_INIT, mass = BUFFER_INIT, pieces = BUFFER_INIT;
    char force[2 * DIGITS_ROOM];
    phrase_angle(&angle, d->job, p->angle_deg, NAN);
    phrase_mass(&mass, d->job, fabs(p->mass), text_answer_free_half(d, p->plane));
    if (p->mass >= 0)
        phrase_pieces(&pieces, d->job, p->pieces, p->piece_count);
    else
        phrase_holes(&pieces, d->job, p);
    phrase_sits(&pieces, d->job, p);
    table->failed = table->failed || angle.failed || mass.failed || pieces.failed;
    if (!table->failed) {
        table_cell(table, "%s", dossier_plane(d, p->plane));
        if (p->position > 0)
            table_cell(table, "%d", p->position);
        else
            table_cell(table, "-");
        table_cell(table, "%s", angle.bytes);
        table_cell(table, "%s %s", p->mass < 0 ? "remove" : "fit", mass.bytes);
        table_cell(table, "%s", pieces.bytes ? pieces.bytes : "-");
        if (isfinite(p->force_n))
            table_cell(table, "%s", shown_force(d->job, force, fabs(p->force_n)));
        else
            table_cell(table, "not known");
    }
    buffer_release(&angle);
    buffer_release(&mass);
    buffer_release(&pieces);
}

/* No step stands without a word about what speaks against it. */
static void cautions(const struct dossier *d, struct buffer *out)
{
    size_t count = 0;
    for (size_t i = 0; i < d->findings.count; i++)
        count += d->findings.items[i].verdict == VERDICT_CAUTION;
    if (count == 0)
        return;
    struct buffer text = BUFFER_INIT;
    phrase_checks(&text, d, VERDICT_CAUTION);
    html_part_say(out, "warn", "To be read first: cautions (%zu) among the findings%s.", count,
                  text.bytes && !text.failed ? text.bytes : "");
    out->failed = out->failed || text.failed;
    buffer_release(&text);
}

static void missed(const struct dossier *d, struct buffer *out)
{
    for (size_t i = 0; i < d->forecasts.count; i++) {
        struct buffer text = BUFFER_INIT;
        text_forecast_missed(d, i, &text);
        if (text.failed)
            out->failed = 1;
        else if (text.length > 0)
            html_part_say(out, "warn", "%s", text.bytes);
        buffer_release(&text);
    }
}

static void heed(const struct dossier *d, struct buffer *out)
{
    for (size_t i = 0; i < HEED_COUNT; i++) {
        struct buffer text = BUFFER_INIT;
        heed_line(&text, d, i);
        if (text.failed)
            out->failed = 1;
        else if (text.length > 0)
            html_part_say(out, "warn", "%s", text.bytes);
        buffer_release(&text);
    }
}

static void placements(const struct dossier *d, struct buffer *out)
{
    char force[40] = "force", speed[DIGITS_ROOM];
    const struct table_column columns[] = {
        {"plane", false, true}, {"position", true, false}, {"angle from the mark", true, false},
        {"what", true, false},  {"pieces", false, false},  {force, true, false}};
    struct table table;
    if (isfinite(d->job->service_rpm))
        snprintf(force, sizeof force, "force at %s rpm", shown_speed(speed, d->job->service_rpm));
    size_t refusals = 0;
    html_part_heading(out, "What to do now");
    relative_to(d, out);
    heed(d, out);
    table_init(&table, columns, sizeof columns / sizeof *columns);
    for (size_t i = 0; i < d->placements.count; i++)
        placement_row(d, &d->placements.items[i], &table);
    html_part_table(out, &table);
    for (size_t i = 0; i < d->findings.count; i++)
        refusals += d->findings.items[i].verdict == VERDICT_REFUSE;
    missed(d, out);
    if (refusals > 0) {
        struct buffer text = BUFFER_INIT;
        phrase_checks(&text, d, VERDICT_REFUSE);
        html_part_say(out, "warn", "Made WITHOUT what was refused: see the findings (%zu)%s.",
                      refusals, text.bytes && !text.failed ? text.bytes : "");
        buffer_release(&text);
    }
    cautions(d, out);
    advice(d, out);
}

static void reasons(const struct dossier *d, bool solve_only, struct buffer *out)
{
    buffer_text(out, "<ul>\n");
    for (size_t i = 0; i < d->findings.count; i++) {
        const struct finding_record *f = &d->findings.items[i];
        struct buffer text = BUFFER_INIT;
        if (f->verdict != VERDICT_REFUSE || (solve_only && strcmp(f->stage, "solve") != 0))
            continue;
        buffer_format(&text, "%s", f->check);
        if (f->run[0])
            buffer_format(&text, ", run '%s'", f->run);
        if (f->sensor >= 0)
            buffer_format(&text, ", sensor '%s'", dossier_sensor(d, f->sensor));
        buffer_format(&text, ": %s", f->text);
        html_part_take(out, "li", &text);
    }
    buffer_text(out, "</ul>\n");
}

static void nothing(const struct dossier *d, int answer, struct buffer *out)
{
    bool refused = answer == STATUS_REFUSED;
    html_part_heading(out, refused ? "No correction: the readings are not fit to balance on"
                                   : "No correction: none can be given from these runs");
    html_part_say(out, "warn",
                  "Do not fit a correction weight on the strength of these readings.");
    reasons(d, !refused, out);
    html_part_heading(out, "What to do now");
    advice(d, out);
    if (!d->has_next)
        html_part_say(out, "", "Mend what is listed above and record those runs again.");
    cautions(d, out);
}

static void drawings(const struct dossier *d, struct buffer *out)
{
    buffer_format(out, "<div class=\"pictures%s\">\n", d->job->plane_count == 1 ? " planes" : "");
    for (size_t i = 0; i < d->job->plane_count; i++)
        draw_plane(d, i, 0, out);
    buffer_text(out, "</div>\n");
}

static void safety(const struct dossier *d, struct buffer *out)
{
    const char *line;
    html_part_heading(out, phrase_only_removed(d) ? "Before removing" : "Before fitting");
    buffer_text(out, "<ul class=\"safety\">\n");
    for (size_t i = 0; (line = text_answer_caution(d, i)); i++) {
        buffer_text(out, "<li>");
        svg_escape(out, line);
        buffer_text(out, "</li>\n");
    }
    buffer_text(out, "</ul>\n");
}

void html_answer_write(const struct dossier *dossier, struct buffer *out)
{
    const struct dossier *d = dossier;
    int answer = dossier_answer(d);
    buffer_text(out, "<section class=\"answer\">\n");
    if (d->placements.count > 0) {
        placements(d, out);
    } else if (answer != STATUS_DONE) {
        nothing(d, answer, out);
    } else {
        html_part_heading(out, "What to do now");
        if (is_step(d, "done"))
            html_part_say(out, "", "Nothing: no weight is to be fitted.");
        if (!d->has_next)
            html_part_say(out, "warn",
                          "No answer is in this stream: it has not been through "
                          "lopside solve.");
        advice(d, out);
        heed(d, out);
        cautions(d, out);
    }
    if (is_step(d, "trial"))
        html_others_trial(d, out);
    if (is_step(d, "trial") && d->job->angles != SENSE_NONE)
        html_part_say(out, "", "Note each weight's mass and its angle from the mark, counted %s.",
                      job_sense_text(d->job));
    buffer_text(out, "</section>\n");
    if (d->placements.count > 0 || is_step(d, "trial")) {
        drawings(d, out);
        safety(d, out);
    }
}
