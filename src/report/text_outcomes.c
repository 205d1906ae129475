#include "report/text_outcomes.h"

#include <math.h>
#include <stdio.h>
#include <string.h>

#include "base/angle.h"
#include "report/paper.h"
#include "report/phrase.h"
#include "report/shown.h"
#include "report/table.h"
#include "sheet/units.h"

/* ---- static and couple ---- */

/* 95 % half widths of a part (kg m, and deg) as if both planes erred alike: their covariance is not
 * in the stream, and nothing makes a half sum err more. NaN: not known. */
static void part_half(const struct dossier *d, double complex u, double half[2])
{
    half[0] = half[1] = NAN;
    if (d->corrections.count != 2)
        return;
    half[0] = half[1] = 0;
    for (size_t i = 0; i < 2; i++) {
        const struct correction_record *c = &d->corrections.items[i];
        const double radius = d->job->planes[c->plane].radius_m;
        double own[2];
        phrase_weight_half(cabs(u) / radius, angle_of(u), c->ellipse, own);
        half[0] += own[0] * radius / 2;
        half[1] += own[1] / 2;
    }
}

/* "30 g at 351 deg with rotation on plane 'left'", of an unbalance that is to be added. */
static void part_weight(struct buffer *text, const struct dossier *d, size_t p, double complex u,
                        const double half[2])
{
    const struct job_plane *plane = &d->job->planes[p];
    const bool removed = plane->work == WORK_REMOVE;
    buffer_text(text, removed ? "remove " : "");
    phrase_mass(text, d->job, cabs(u) / plane->radius_m, half[0] / plane->radius_m);
    buffer_text(text, " at ");
    phrase_angle(text, d->job, angle_of(removed ? -u : u), half[1]);
    buffer_format(text, " on plane '%s'", plane->name);
}

/* The part on both planes: `second` is what stands on the second plane. */
static void part(const struct dossier *d, const char *name, double complex first,
                 double complex second, struct buffer *out)
{
    struct buffer text = BUFFER_INIT;
    char number[DIGITS_ROOM];
    double half[2];
    part_half(d, first, half);
    digits_text(number, shown_unbalance(d->job, cabs(first)), shown_unbalance(d->job, half[0]));
    buffer_format(&text, "%s, %s %s on each: ", name, number, shown_unbalance_unit(d->job));
    part_weight(&text, d, 0, first, half);
    buffer_text(&text, "; ");
    part_weight(&text, d, 1, second, half);
    paper_take(out, 2, 4, &text);
}

/* "13 %", a share of the vibration; tenths below 10 %. */
static const char *share(char *text, double of_nothing)
{
    return digits_at(text, 100 * of_nothing, of_nothing < 0.0995 ? -1 : 0);
}

void text_outcomes_parts(const struct dossier *dossier, struct buffer *out)
{
    char alone[DIGITS_ROOM], both[DIGITS_ROOM];
    if (dossier->parts.count == 0)
        return;
    const struct parts_record *r = &dossier->parts.items[0];
    paper_heading(out, "STATIC AND COUPLE");
    paper_say(out, 2, 2,
              "The two parts that the ideal weight is the sum of, not to be fitted "
              "besides it.");
    part(dossier, "Static", r->static_part, r->static_part, out);
    part(dossier, "Couple", r->couple_part, -r->couple_part, out);
    part(dossier, "The best static alone", r->static_alone, r->static_alone, out);
    if (isfinite(r->left_alone) && isfinite(r->left))
        paper_say(
            out, 2, 4,
            "Static alone would leave %s %% of the vibration, both parts %s %%, over all sensors "
            "and with all that is uncertain in the readings to come.",
            share(alone, r->left_alone), share(both, r->left));
}

/* The sensor's name, and the condition where it is not the ordinary one. */
static void sensor_cell(const struct dossier *d, int sensor, const char *condition,
                        struct table *table)
{
    const bool plain = strcmp(condition, "service") == 0;
    table_cell(table, "%s%s%s", dossier_sensor(d, sensor), plain ? "" : ", ",
               plain ? "" : condition);
}

/* ---- zones ---- */

struct zone_unit {
    const char *text;
    double si;
};

/* As standards and people have them: rms velocity or displacement. An inch is 25.4 mm by
 * definition. */
static struct zone_unit zone_unit(const struct job *job, enum quantity quantity)
{
    if (quantity == QUANTITY_VELOCITY)
        return job->units == UNITS_US ? (struct zone_unit){"in/s rms", 0.0254}
                                      : (struct zone_unit){"mm/s rms", 1e-3};
    return job->units == UNITS_US ? (struct zone_unit){"mil rms", 25.4e-6}
                                  : (struct zone_unit){"um rms", 1e-6};
}

static void zone_row(const struct dossier *d, const struct zone_record *r, struct table *table)
{
    const struct zone_unit unit = zone_unit(d->job, r->quantity);
    char text[DIGITS_ROOM];
    sensor_cell(d, r->sensor, r->condition, table);
    table_cell(table, "%s", r->overall ? "overall" : "1x alone");
    table_cell(table, "%s", unit.text);
    /* Three digits of what was measured, two of what is expected (common practice). */
    double before = r->before / unit.si, after = r->after / unit.si;
    table_cell(table, "%s", digits_text(text, before, before / 10));
    table_cell(table, "%c", r->zone_before);
    table_cell(table, "%s", digits_text(text, after, after));
    table_cell(table, "%c", r->zone_after);
    for (int i = 0; i < 3; i++)
        table_cell(table, "%s", digits_text(text, r->limits[i] / unit.si, NAN));
}

void text_outcomes_zones(const struct dossier *dossier, struct buffer *out)
{
    static const struct table_column columns[] = {
        {"sensor", false, true}, {"of", false, false},   {"unit", false, false},
        {"before", true, false}, {"zone", false, false}, {"after", true, false},
        {"zone", false, false},  {"A/B", true, false},   {"B/C", true, false},
        {"C/D", true, false},
    };
    struct table table;
    char heading[80];
    bool least = false;
    if (dossier->zones.count == 0)
        return;
    table_init(&table, columns, sizeof columns / sizeof *columns);
    for (size_t i = 0; i < dossier->zones.count; i++) {
        zone_row(dossier, &dossier->zones.items[i], &table);
        least = least || !dossier->zones.items[i].overall;
    }
    snprintf(heading, sizeof heading, "VIBRATION ZONES: after is expected %s",
             phrase_fitted(dossier));
    paper_heading(out, heading);
    table_print(&table, 2, out);
    table_release(&table);
    if (least)
        paper_say(out, 2, 2,
                  "1x alone: the overall vibration is at least that, and its zone may be "
                  "a worse one.");
    if (dossier->zones.items[0].basis[0])
        paper_say(out, 2, 2, "Basis: %s.", dossier->zones.items[0].basis);
}

/* ---- predicted and measured ---- */

static const struct dossier_reading *reading_of(const struct dossier *d,
                                                const struct compared_record *r)
{
    for (size_t i = 0; i < d->readings.count; i++) {
        const struct reading_record *own = &d->readings.items[i].reading;
        if (own->sensor == r->sensor && strcmp(own->run, d->job->runs[r->run].name) == 0 &&
            strcmp(own->condition, r->condition) == 0)
            return &d->readings.items[i];
    }
    return NULL;
}

static void vector_cells(const struct shown *s, struct table *table)
{
    char text[DIGITS_ROOM];
    table_cell(table, "%s", digits_text(text, s->amplitude, s->half));
    if (isnan(s->lag_deg) || s->lag_open)
        table_cell(table, "not known");
    else
        table_cell(table, "%s deg", digits_angle(text, s->lag_deg, s->lag_half));
}

static void compared_row(const struct dossier *d, const struct compared_record *r,
                         struct table *table)
{
    const struct job_sensor *sensor = &d->job->sensors[r->sensor];
    const struct dossier_reading *reading = reading_of(d, r);
    const double rpm = reading ? reading->reading.speed_rpm : d->job->service_rpm;
    /* The standard error holds the prediction's and the reading's; per component half its square.
     */
    const double error = r->se > 0 ? cabs(r->predicted - r->measured) / r->se : 0;
    const double guess[3] = {error * error / 2, 0, error * error / 2};
    double cov[3] = {0, 0, 0};
    char unit[24], apart[DIGITS_ROOM];
    if (reading)
        dossier_cov(reading, cov);
    struct shown predicted =
        shown_vector(r->predicted, guess, sensor->quantity, rpm, &sensor->show, NAN);
    struct shown measured =
        shown_vector(r->measured, cov, sensor->quantity, rpm, &sensor->show, NAN);
    sensor_cell(d, r->sensor, r->condition, table);
    table_cell(table, "%s", units_show_text(&sensor->show, unit));
    vector_cells(&predicted, table);
    vector_cells(&measured, table);
    table_cell(table, "%s s.e.", digits_at(apart, r->se, -1));
}

/* One run's rows from `i` on; gives the next run's first. */
static size_t compared_run(const struct dossier *d, size_t i, struct buffer *out)
{
    static const struct table_column columns[] = {
        {"sensor", false, true}, {"unit", false, false},    {"predicted", true, false},
        {"lag", true, false},    {"measured", true, false}, {"lag", true, false},
        {"apart", true, false},
    };
    const int run = d->compared.items[i].run;
    struct table table;
    table_init(&table, columns, sizeof columns / sizeof *columns);
    for (; i < d->compared.count && d->compared.items[i].run == run; i++)
        compared_row(d, &d->compared.items[i], &table);
    paper_say(out, 2, 4, "Run '%s', predicted from the runs before it:", d->job->runs[run].name);
    table_print(&table, 4, out);
    table_release(&table);
    return i;
}

void text_outcomes_compared(const struct dossier *dossier, struct buffer *out)
{
    if (dossier->compared.count == 0)
        return;
    paper_heading(out, "PREDICTED AND MEASURED: 1x of a corrected run");
    for (size_t i = 0; i < dossier->compared.count;)
        i = compared_run(dossier, i, out);
    paper_say(out, 2, 2,
              "Apart: the distance of the two vectors over its standard error, what differs "
              "from run to run included.");
}
