#include "report/text_answer.h"

#include <math.h>
#include <stdio.h>
#include <string.h>

#include "base/status.h"
#include "report/heed.h"
#include "report/mounting.h"
#include "report/paper.h"
#include "report/phrase.h"
#include "report/runout.h"
#include "report/shown.h"
#include "report/table.h"
#include "report/text_forecast.h"
#include "report/text_others.h"

static bool step_is(const struct dossier *d, const char *step)
{
    return d->has_next && strcmp(d->next.step, step) == 0;
}

/* The next step's text as a sentence. */
static void advice(const struct dossier *d, size_t indent, struct buffer *out)
{
    struct buffer text = BUFFER_INIT;
    phrase_sentence(&text, d->next.text);
    paper_take(out, indent, indent, &text);
}

/* A trial weight is worth nothing without its angle. */
static void note_angle(const struct dossier *d, struct buffer *out)
{
    if (step_is(d, "trial") && d->job->angles != SENSE_NONE)
        paper_say(out, 2, 2, "Note each weight's mass and its angle from the mark, counted %s.",
                  job_sense_text(d->job));
}

static void relative_to(const struct dossier *d, const char *name, struct buffer *out)
{
    struct buffer text = BUFFER_INIT;
    mounting_relative_to(&text, d->job, name);
    paper_take(out, 2, 2, &text);
}

/* Pieces in stock have their nominal mass; where any mass may be cut, the ideal weight's 95 % half
 * width (kg) says to which digit it deserves to be. NaN: nominal. */
double text_answer_free_half(const struct dossier *d, int plane)
{
    if (plane < 0 || (size_t)plane >= d->job->plane_count || d->job->planes[plane].stock_count > 0)
        return NAN;
    for (size_t i = 0; i < d->corrections.count; i++) {
        const struct correction_record *c = &d->corrections.items[i];
        double half[2];
        phrase_weight_half(c->least_squares[0], c->least_squares[1], c->ellipse, half);
        if (c->plane == plane)
            return half[0];
    }
    return NAN;
}

static void placement(const struct dossier *d, size_t number, const struct placement_record *p,
                      struct buffer *out)
{
    struct buffer text = BUFFER_INIT, holes = BUFFER_INIT;
    bool removed = phrase_is_removed(d->job, p);
    buffer_format(&text, "%zu. Plane '%s', ", number, dossier_plane(d, p->plane));
    if (p->position > 0)
        buffer_format(&text, "position %d: ", p->position);
    phrase_angle(&text, d->job, p->angle_deg, NAN);
    paper_take(out, 2, 5, &text);

    text = (struct buffer)BUFFER_INIT;
    buffer_text(&text, removed ? "remove " : "fit ");
    phrase_mass(&text, d->job, fabs(p->mass), text_answer_free_half(d, p->plane));
    if (!removed) {
        buffer_text(&text, " ");
        phrase_pieces(&text, d->job, p->pieces, p->piece_count);
    } else {
        phrase_holes(&holes, d->job, p);
        if (holes.length > 0)
            buffer_format(&text, "; %s", holes.bytes);
    }
    text.failed = text.failed || holes.failed;
    buffer_release(&holes);
    if (isfinite(p->force_n)) {
        char force[2 * DIGITS_ROOM], speed[DIGITS_ROOM];
        shown_force(d->job, force, fabs(p->force_n));
        buffer_format(&text, "; force %s at %s rpm", force,
                      shown_speed(speed, d->job->service_rpm));
    } else {
        buffer_text(&text, "; force not known, the sheet has no service speed");
    }
    phrase_sits(&text, d->job, p);
    paper_take(out, 5, 5, &text);
}

static size_t count_findings(const struct dossier *d, enum verdict verdict)
{
    size_t count = 0;
    for (size_t i = 0; i < d->findings.count; i++)
        count += d->findings.items[i].verdict == verdict;
    return count;
}

/* No step stands without a word about what speaks against it. */
static void cautions(const struct dossier *d, struct buffer *out)
{
    struct buffer text = BUFFER_INIT;
    size_t count = count_findings(d, VERDICT_CAUTION);
    if (count == 0)
        return;
    buffer_format(&text, "To be read first: cautions (%zu) among the findings below", count);
    phrase_checks(&text, d, VERDICT_CAUTION);
    buffer_text(&text, ".");
    paper_take(out, 2, 2, &text);
}

static void doubts(const struct dossier *d, struct buffer *out)
{
    size_t refused = count_findings(d, VERDICT_REFUSE);
    for (size_t i = 0; i < d->forecasts.count; i++) {
        struct buffer text = BUFFER_INIT;
        text_forecast_missed(d, i, &text);
        paper_take(out, 2, 2, &text);
    }
    if (refused > 0) {
        struct buffer text = BUFFER_INIT;
        buffer_format(&text, "Made WITHOUT what was refused: see the findings (%zu) below",
                      refused);
        phrase_checks(&text, d, VERDICT_REFUSE);
        buffer_text(&text, ".");
        paper_take(out, 2, 2, &text);
    }
    cautions(d, out);
}

static void heed(const struct dossier *d, struct buffer *out)
{
    for (size_t i = 0; i < HEED_COUNT; i++) {
        struct buffer text = BUFFER_INIT;
        heed_line(&text, d, i);
        paper_take(out, 2, 2, &text);
    }
}

static void placements(const struct dossier *d, struct buffer *out)
{
    paper_heading(out, "WHAT TO DO NOW");
    relative_to(d, d->placements.items[0].relative_to, out);
    heed(d, out);
    for (size_t i = 0; i < d->placements.count; i++)
        placement(d, i + 1, &d->placements.items[i], out);
    paper_say(out, 2, 2, "Angles are counted from the mark, %s.", job_sense_text(d->job));
    doubts(d, out);
}

static bool is_reason(const struct finding_record *f, bool solve_only)
{
    return f->verdict == VERDICT_REFUSE && (!solve_only || strcmp(f->stage, "solve") == 0);
}

/* Why there is no correction: solve's refusals where it is 5, everybody's where it is 4. */
static void reasons(const struct dossier *d, bool solve_only, struct buffer *out)
{
    for (size_t i = 0, listed = 0; i < d->findings.count; i++) {
        const struct finding_record *f = &d->findings.items[i];
        if (!is_reason(f, solve_only))
            continue;
        if (listed++ == 0)
            paper_say(out, 2, 2, "Why:");
        struct buffer text = BUFFER_INIT;
        buffer_format(&text, "- %s", f->check);
        if (f->run[0])
            buffer_format(&text, ", run '%s'", f->run);
        if (f->sensor >= 0)
            buffer_format(&text, ", sensor '%s'", dossier_sensor(d, f->sensor));
        buffer_format(&text, ": %s", f->text);
        paper_take(out, 2, 4, &text);
    }
}

static void nothing(const struct dossier *d, bool refused, struct buffer *out)
{
    paper_heading(out, refused ? "NO CORRECTION: the readings are not fit to balance on"
                               : "NO CORRECTION: none can be given from these runs");
    paper_say(out, 2, 2, "Do not fit a correction weight on the strength of these readings.");
    reasons(d, !refused, out);
    paper_heading(out, "WHAT TO DO NOW");
    if (d->has_next)
        advice(d, 2, out);
    else
        paper_wrap(out, 2, 2, "Mend what is listed above and record those runs again.");
    cautions(d, out);
    text_others_trials(d, out);
    note_angle(d, out);
}

/* Neither a weight nor a refusal: a trial weight first, or nothing left to do. */
static void step_only(const struct dossier *d, struct buffer *out)
{
    paper_heading(out, "WHAT TO DO NOW");
    if (step_is(d, "done"))
        paper_wrap(out, 2, 2, "Nothing: no weight is to be fitted.");
    else if (!d->has_next)
        paper_wrap(out, 2, 2,
                   "No answer is in this stream: it has not been through `lopside solve`.");
    if (d->has_next)
        advice(d, 2, out);
    heed(d, out);
    cautions(d, out);
    text_others_trials(d, out);
    note_angle(d, out);
}

void text_answer_now(const struct dossier *dossier, struct buffer *out)
{
    int answer = dossier_answer(dossier);
    if (dossier->placements.count > 0) {
        placements(dossier, out);
        if (dossier->has_next) {
            paper_heading(out, "NEXT");
            advice(dossier, 2, out);
        }
    } else if (answer != STATUS_DONE) {
        nothing(dossier, answer == STATUS_REFUSED, out);
    } else {
        step_only(dossier, out);
    }
}

const char *text_answer_caution(const struct dossier *dossier, size_t i)
{
    static const char *const lines[] = {
        "Isolate and lock out the drive before anybody reaches into the machine.",
        "Each fixing must hold its weight's force, and more at overspeed: it grows with the square "
        "of speed.",
        "Nobody stands in the plane of rotation at the start.",
        "Agree beforehand at which vibration the start is broken off.",
        "Never balance over a crack, a rub, looseness or build-up: find and mend it first.",
        "Local codes and the site's licensed engineer decide.",
    };
    if (i >= sizeof lines / sizeof *lines)
        return NULL;
    return i == 1 && phrase_only_removed(dossier)
               ? "Nothing is drilled or cut off where the rotor's strength or what lies beneath "
                 "does not allow it, and no chip stays in the machine."
               : lines[i];
}

void text_answer_safety(const struct dossier *dossier, struct buffer *out)
{
    const char *line;
    if (dossier->placements.count == 0 && !step_is(dossier, "trial"))
        return;
    paper_heading(out, phrase_only_removed(dossier) ? "BEFORE REMOVING" : "BEFORE FITTING");
    for (size_t i = 0; (line = text_answer_caution(dossier, i)); i++)
        paper_say(out, 2, 4, "- %s", line);
}

static void half_text(struct buffer *out, const struct job *job, double kg, const double half[2])
{
    char mass[DIGITS_ROOM], angle[DIGITS_ROOM];
    double shown = shown_mass(job, kg), wide = shown_mass(job, half[0]);
    int place = digits_place(shown, wide);
    if (!digits_half_counts(wide, place))
        return;
    digits_half(mass, wide, place);
    buffer_format(out, " (+/-%s %s", mass, shown_mass_unit(job));
    if (half[1] < 90)
        buffer_format(out, ", +/-%s deg)", digits_angle_half(angle, half[1]));
    else
        buffer_text(out, ", at an angle that is not known)");
}

static void ideal(const struct dossier *d, const struct correction_record *c, struct buffer *out)
{
    double half[2];
    struct buffer text = BUFFER_INIT;
    phrase_weight_half(c->least_squares[0], c->least_squares[1], c->ellipse, half);
    buffer_format(&text, "Plane '%s': ", dossier_plane(d, c->plane));
    phrase_signed(&text, d->job, c->mass, half[0]);
    buffer_text(&text, " at ");
    phrase_angle(&text, d->job, c->angle_deg, half[1]);
    paper_take(out, 2, 4, &text);
    if (isnan(c->least_squares[0]))
        return;
    text = (struct buffer)BUFFER_INIT;
    buffer_format(&text, "least squares, %s: ",
                  phrase_weight_useless(c->least_squares[0], half[0]) ? "of no use for a hand check"
                                                                      : "for a hand check");
    phrase_signed(&text, d->job, c->least_squares[0], half[0]);
    buffer_text(&text, " at ");
    phrase_angle(&text, d->job, c->least_squares[1], half[1]);
    half_text(&text, d->job, c->least_squares[0], half);
    paper_take(out, 4, 6, &text);
}

void text_answer_ideal(const struct dossier *dossier, struct buffer *out)
{
    if (dossier->corrections.count == 0)
        return;
    const char *to = dossier->corrections.items[0].relative_to;
    paper_heading(out, "IDEAL WEIGHT");
    paper_say(out, 2, 2, "%s, relative to %s%s%s.",
              dossier->placements.count > 0 ? "Before it is split over positions and pieces"
                                            : "For the record, not to be fitted as it stands",
              dossier_base(dossier->job, to) >= 0 ? "run '" : "", to,
              dossier_base(dossier->job, to) >= 0 ? "'" : "");
    for (size_t i = 0; i < dossier->corrections.count; i++)
        ideal(dossier, &dossier->corrections.items[i], out);
}

void text_answer_tolerance_table(const struct dossier *dossier, struct table *table)
{
    static const struct table_column columns[] = {
        {"plane", false, true},      {"unit", false, false},      {"before", true, false},
        {"after", true, false},      {"95 % below", true, false}, {"permissible", true, false},
        {"tolerance", false, false},
    };
    table_init(table, columns, sizeof columns / sizeof *columns);
    for (size_t i = 0; i < dossier->residuals.count; i++) {
        const struct residual_record *r = &dossier->residuals.items[i];
        double half = shown_unbalance(dossier->job, r->after_95 - r->after);
        double values[4] = {r->before, r->after, r->after_95, r->permissible};
        const double most = shown_unbalance(dossier->job, r->permissible);
        table_cell(table, "%s", dossier_plane(dossier, r->plane));
        table_cell(table, "%s", shown_unbalance_unit(dossier->job));
        for (int v = 0; v < 4; v++) {
            char text[DIGITS_ROOM];
            double value = shown_unbalance(dossier->job, values[v]);
            table_cell(table, "%s",
                       v < 3 ? digits_against(text, value, half, most)
                             : digits_text(text, value, NAN));
        }
        table_cell(table, "%s", heed_within(r));
    }
}

void text_answer_tolerance_words(const struct dossier *dossier, struct buffer *text)
{
    bool unproven = false, unknown = false;
    buffer_text(text, "95 % below: the residual is below it 95 times in 100.");
    for (size_t i = 0; i < dossier->residuals.count; i++) {
        const char *word = heed_within(&dossier->residuals.items[i]);
        unproven = unproven || strcmp(word, "not proven") == 0;
        unknown = unknown || strcmp(word, "not known") == 0;
    }
    if (unproven)
        buffer_text(text, " Not proven: the estimate is permissible, but that bound is not.");
    if (unknown)
        buffer_text(text, " Not known: there is no estimate, or none that tells.");
    const struct job *job = dossier->job;
    if (job->plane_count == 2 && job->span_m > 0 && isfinite(job->centre_m))
        buffer_format(
            text,
            " Plane '%s' is counted to bearing A, from which the mass centre is measured, "
            "because the sheet names it first, and '%s' to bearing B: if it is the other "
            "way, change the order of the planes.",
            job->planes[0].name, job->planes[1].name);
}

void text_answer_tolerance(const struct dossier *dossier, struct buffer *out)
{
    struct table table;
    struct buffer words = BUFFER_INIT;
    if (dossier->residuals.count == 0)
        return;
    text_answer_tolerance_table(dossier, &table);
    paper_heading(out, "TOLERANCE: estimated residual unbalance");
    table_print(&table, 2, out);
    text_answer_tolerance_words(dossier, &words);
    paper_take(out, 2, 2, &words);
    if (dossier->residuals.items[0].basis[0])
        paper_say(out, 2, 2, "Basis: %s.", dossier->residuals.items[0].basis);
    table_release(&table);
}
