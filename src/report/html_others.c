#include "report/html_others.h"

#include <math.h>
#include <stdio.h>
#include <string.h>

#include "base/angle.h"
#include "report/html_part.h"
#include "report/phrase.h"
#include "report/shown.h"
#include "report/table.h"
#include "report/text_answer.h"

/* A cell of what phrases built; releases it. */
static void take_cell(struct table *table, struct buffer *text)
{
    table->failed = table->failed || text->failed;
    if (!text->failed)
        table_cell(table, "%s", text->bytes ? text->bytes : "-");
    buffer_release(text);
}

static void mass_cell(struct table *table, const struct job *job, double kg, double half)
{
    struct buffer text = BUFFER_INIT;
    if (isfinite(kg))
        phrase_signed(&text, job, kg, half);
    take_cell(table, &text);
}

static void angle_cell(struct table *table, const struct job *job, double deg, double half)
{
    struct buffer text = BUFFER_INIT;
    if (isfinite(deg))
        phrase_angle(&text, job, deg, half);
    take_cell(table, &text);
}

static void mass_half_cell(struct table *table, const struct job *job, double kg, double half)
{
    char text[DIGITS_ROOM];
    double wide = shown_mass(job, half);
    if (isfinite(wide) && wide > 0)
        table_cell(table, "%s %s", digits_half(text, wide, digits_place(shown_mass(job, kg), wide)),
                   shown_mass_unit(job));
    else
        table_cell(table, "-");
}

static void angle_half_cell(struct table *table, double half)
{
    char text[DIGITS_ROOM];
    if (isnan(half))
        table_cell(table, "-");
    else if (half < 90)
        table_cell(table, "%s deg", digits_angle_half(text, half));
    else
        table_cell(table, "not known");
}

static void ideal_rows(const struct dossier *d, const struct correction_record *c,
                       struct table *table)
{
    double half[2];
    phrase_weight_half(c->least_squares[0], c->least_squares[1], c->ellipse, half);
    table_cell(table, "%s", dossier_plane(d, c->plane));
    table_cell(table, "ideal");
    mass_cell(table, d->job, c->mass, half[0]);
    table_cell(table, "%s", "");
    angle_cell(table, d->job, c->angle_deg, half[1]);
    table_cell(table, "%s", "");
    if (isnan(c->least_squares[0]))
        return;
    table_cell(table, "%s", dossier_plane(d, c->plane));
    table_cell(table, "least squares%s",
               phrase_weight_useless(c->least_squares[0], half[0]) ? ", of no use" : "");
    mass_cell(table, d->job, c->least_squares[0], half[0]);
    mass_half_cell(table, d->job, c->least_squares[0], half[0]);
    angle_cell(table, d->job, c->least_squares[1], half[1]);
    angle_half_cell(table, half[1]);
}

static void ideal(const struct dossier *d, struct buffer *out)
{
    static const struct table_column columns[] = {{"plane", false, true}, {"weight", false, false},
                                                  {"mass", true, false},  {"+/-", true, false},
                                                  {"angle", true, false}, {"+/-", true, false}};
    struct table table;
    if (d->corrections.count == 0)
        return;
    const char *to = d->corrections.items[0].relative_to;
    bool is_run = dossier_base(d->job, to) >= 0;
    html_part_heading(out, "Ideal weight");
    html_part_say(out, "note",
                  "%s, relative to %s%s%s. Least squares is for a hand check; +/- is its 95 %% "
                  "half width.",
                  d->placements.count > 0 ? "Before it is split over positions and pieces"
                                          : "For the record, not to be fitted as it stands",
                  is_run ? "run '" : "", to, is_run ? "'" : "");
    table_init(&table, columns, sizeof columns / sizeof *columns);
    for (size_t i = 0; i < d->corrections.count; i++)
        ideal_rows(d, &d->corrections.items[i], &table);
    html_part_table(out, &table);
}

/* 95 % half widths of the ideal weight on that plane: kg, deg. NaN: not known. */
static void half_of(const struct dossier *d, const char *plane, double half[2])
{
    half[0] = half[1] = NAN;
    for (size_t i = 0; i < d->corrections.count; i++) {
        const struct correction_record *c = &d->corrections.items[i];
        if (strcmp(dossier_plane(d, c->plane), plane) == 0)
            phrase_weight_half(c->least_squares[0], c->least_squares[1], c->ellipse, half);
    }
}

/* How well the weights of a list are known: as named, as the ideal weight, as placed ones. */
enum known { NOMINAL, AS_IDEAL, AS_PLACED };

/* A table of a record's list of weights. */
static void weights(const struct dossier *d, const json_t *items, enum known known,
                    struct buffer *out)
{
    static const struct table_column columns[] = {{"plane", false, true},
                                                  {"position", true, false},
                                                  {"angle from the mark", true, false},
                                                  {"what", true, false}};
    struct table table;
    table_init(&table, columns, sizeof columns / sizeof *columns);
    for (size_t i = 0; i < json_array_size(items); i++) {
        const json_t *item = json_array_get(items, i);
        struct buffer what = BUFFER_INIT;
        double mass = dossier_number(item, "mass"), position = dossier_number(item, "position");
        double half[2] = {NAN, NAN};
        if (known == AS_IDEAL)
            half_of(d, dossier_string(item, "plane"), half);
        else if (known == AS_PLACED)
            half[0] = text_answer_free_half(d, job_find_plane(d->job, dossier_string(item, "plane")));
        table_cell(&table, "%s", dossier_string(item, "plane"));
        table_cell(&table, position > 0 ? "%.0f" : "-", position);
        angle_cell(&table, d->job, dossier_number(item, "angle_deg"), half[1]);
        buffer_text(&what, mass < 0 ? "remove " : "fit ");
        phrase_mass(&what, d->job, fabs(mass), half[0]);
        take_cell(&table, &what);
    }
    html_part_table(out, &table);
}

/* Root of the expected squared vibration, as a share of what it is now, in %. */
static const char *share(char text[DIGITS_ROOM], double of_nothing)
{
    return digits_at(text, 100 * of_nothing, of_nothing < 0.0995 ? -1 : 0);
}

static void others(const struct dossier *d, struct buffer *out)
{
    const json_t *list = json_object_get(d->figures, "others");
    double best = dossier_number(d->figures, "of_nothing");
    char text[DIGITS_ROOM];
    if (d->placements.count == 0 || json_array_size(list) == 0 || isnan(best))
        return;
    html_part_heading(out, "Instead of the placement: the next best");
    html_part_say(out, "note",
                  "Instead of the weights at the top, not besides them. Over all sensors, and "
                  "with all that is uncertain in the readings to come, those leave %s %% of the "
                  "vibration.",
                  share(text, best));
    buffer_text(out, "<div class=\"pictures\">\n");
    for (size_t i = 0; i < json_array_size(list); i++) {
        const json_t *other = json_array_get(list, i);
        const json_t *items = json_object_get(other, "items");
        buffer_text(out, "<div>\n");
        html_part_say(out, "", "Leaves %s %%%s%s", share(text, dossier_number(other, "of_nothing")),
                      json_is_true(json_object_get(other, "unopposed"))
                          ? ", without pieces that work against each other"
                          : "",
                      json_array_size(items) ? ":" : ": nothing added.");
        weights(d, items, AS_PLACED, out);
        buffer_text(out, "</div>\n");
    }
    buffer_text(out, "</div>\n");
}

/* The ideal answer with the mounted weights the other way, and one weight a plane for all. */
static void otherwise(const struct dossier *d, struct buffer *out)
{
    const json_t *instead = dossier_instead(d);
    const json_t *list = json_object_get(instead, "weights");
    const json_t *merged = json_object_get(d->figures, "merged");
    if (d->placements.count == 0)
        return;
    if (json_array_size(list) > 0) {
        const char *to = dossier_string(instead, "relative_to");
        bool is_run = dossier_base(d->job, to) >= 0;
        html_part_heading(out, is_run ? "Ideal weight if the last run's weights stay on"
                                      : "Ideal weight if everything comes off first");
        html_part_say(out, "note", "Instead of the weights at the top. Relative to %s%s%s.",
                      is_run ? "run '" : "", to, is_run ? "'" : "");
        weights(d, list, AS_IDEAL, out);
    }
    if (json_array_size(merged) > 0) {
        html_part_heading(out, "One weight a plane for all that is then on");
        html_part_say(out, "note",
                      "The same as all mounted and placed weights together, for a permanent "
                      "weight in their place.");
        weights(d, merged, NOMINAL, out);
    }
}

static void part_row(const struct dossier *d, const char *name, double complex unbalance,
                     double left, struct table *table)
{
    char text[DIGITS_ROOM];
    double angle = cabs(unbalance) > 0 ? carg(unbalance) * 180 / PI : NAN;
    table_cell(table, "%s", name);
    double half[2] = {NAN, NAN};
    for (size_t p = 0; p < 2; p++) {
        half_of(d, d->job->planes[p].name, half);
        mass_cell(table, d->job, cabs(unbalance) / d->job->planes[p].radius_m, half[0]);
    }
    angle_cell(table, d->job, angle, half[1]);
    if (isfinite(left))
        table_cell(table, "%s %%", share(text, left));
    else
        table_cell(table, "%s", "");
}

static void parts(const struct dossier *d, const struct parts_record *r, struct buffer *out)
{
    char heads[2][2 * NAME_ROOM], text[DIGITS_ROOM];
    const struct job_plane *planes = d->job->planes;
    for (size_t p = 0; p < 2; p++)
        snprintf(heads[p], sizeof heads[p], "plane '%s'", planes[p].name);
    const struct table_column columns[] = {{"part", false, true},
                                           {heads[0], true, true},
                                           {heads[1], true, true},
                                           {"angle", true, false},
                                           {"leaves", true, false}};
    struct table table;
    html_part_heading(out, "Static and couple parts of the ideal weight");
    html_part_say(out, "note",
                  "Static: on both planes at that angle. Couple: on '%s' at that angle, on '%s' "
                  "opposite to it. Leaves: share of the vibration, over all sensors "
                  "and with all that is uncertain in the readings to come.",
                  planes[0].name, planes[1].name);
    table_init(&table, columns, sizeof columns / sizeof *columns);
    part_row(d, "static", r->static_part, NAN, &table);
    part_row(d, "couple", r->couple_part, NAN, &table);
    table_cell(&table, "both together");
    for (int i = 0; i < 3; i++)
        table_cell(&table, "%s", "");
    table_cell(&table, "%s %%", share(text, r->left));
    part_row(d, "static alone, at its best", r->static_alone, r->left_alone, &table);
    html_part_table(out, &table);
}

void html_others_trial(const struct dossier *dossier, struct buffer *out)
{
    static const struct table_column columns[] = {{"plane", false, true},
                                                  {"trial weight", true, false},
                                                  {"force at service speed", true, false},
                                                  {"10 % of the journal load", true, false}};
    const json_t *trials = json_object_get(dossier->figures, "trials");
    struct table table;
    char force[2 * DIGITS_ROOM];
    table_init(&table, columns, sizeof columns / sizeof *columns);
    for (size_t i = 0; i < json_array_size(trials); i++) {
        const json_t *trial = json_array_get(trials, i);
        double newton = dossier_number(trial, "force_n");
        table_cell(&table, "%s", dossier_string(trial, "plane"));
        mass_cell(&table, dossier->job, dossier_number(trial, "mass"), NAN);
        table_cell(&table, "%s",
                   isfinite(newton) ? shown_force(dossier->job, force, newton) : "not known");
        double wanted = dossier_number(trial, "wanted_mass"); /* by a rule of thumb: two digits will do */
        mass_cell(&table, dossier->job, wanted, wanted / 4);
    }
    html_part_table(out, &table);
}

void html_others_write(const struct dossier *dossier, struct buffer *out)
{
    ideal(dossier, out);
    for (size_t i = 0; i < dossier->parts.count; i++)
        parts(dossier, &dossier->parts.items[i], out);
    others(dossier, out);
    otherwise(dossier, out);
}
