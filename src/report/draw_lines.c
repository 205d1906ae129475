#include <math.h>
#include <stdio.h>
#include <stdlib.h>
#include <string.h>

#include "report/draw.h"
#include "report/shown.h"
#include "sheet/units.h"

#define WIDE 480.0
#define LEFT 58.0
#define RIGHT 462.0

/* A strip of a drawing: one quantity over x. */
struct strip {
    double top, high; /* pixels */
    double from, to;  /* of x, in its unit */
    const double *x, *y;
    size_t count;
    const char *name;
};

static double across(const struct strip *s, double x)
{
    return LEFT + (s->to > s->from ? (x - s->from) / (s->to - s->from) : 0.5) * (RIGHT - LEFT);
}

/* Range of the finite values, with some room; never narrower than `least`. */
static bool range(const double *values, size_t count, double least, double to[2])
{
    double low = INFINITY, high = -INFINITY;
    for (size_t i = 0; i < count; i++) {
        if (isfinite(values[i])) {
            low = fmin(low, values[i]);
            high = fmax(high, values[i]);
        }
    }
    if (low > high)
        return false;
    double room = fmax(0.1 * (high - low), (least - (high - low)) / 2);
    to[0] = low - room;
    to[1] = high + room;
    return true;
}

/* Draws the strip with its frame; `least` is the narrowest range of y. */
static void strip(const struct strip *s, double least, struct buffer *out)
{
    double y[2];
    char low[DIGITS_ROOM], high[DIGITS_ROOM];
    const struct svg_point frame[] = {
        {LEFT, s->top}, {RIGHT, s->top}, {RIGHT, s->top + s->high}, {LEFT, s->top + s->high}};
    svg_path(out, "thin", frame, 4, 1);
    svg_text(out, "small bold", "start", LEFT + 4, s->top + 11, "%s", s->name);
    if (!range(s->y, s->count, least, y)) {
        svg_text(out, "small", "middle", (LEFT + RIGHT) / 2, s->top + s->high / 2, "none");
        return;
    }
    int place = (int)floor(log10(y[1] - y[0])) - 1;
    svg_text(out, "small", "end", LEFT - 4, s->top + 10, "%s", digits_at(high, y[1], place));
    svg_text(out, "small", "end", LEFT - 4, s->top + s->high, "%s", digits_at(low, y[0], place));
    struct svg_point *points = calloc(s->count, sizeof *points);
    if (!points) {
        out->failed = 1;
        return;
    }
    for (size_t i = 0; i < s->count; i++) {
        points[i].x = across(s, s->x[i]);
        points[i].y = s->top + s->high * (y[1] - s->y[i]) / (y[1] - y[0]);
    }
    svg_path(out, "trace", points, s->count, 0);
    for (size_t i = 0; s->count <= 200 && i < s->count; i++)
        svg_circle(out, "solid", points[i].x, points[i].y, 1.7);
    free(points);
}

/* What is drawn over time or speed: three arrays in one. */
struct series {
    double *x, *amplitude, *lag, *speed; /* owned by x */
    size_t count;
};

static bool series_init(struct series *s, size_t room)
{
    s->x = calloc(4 * (room ? room : 1), sizeof *s->x);
    s->amplitude = s->x ? s->x + room : NULL;
    s->lag = s->x ? s->x + 2 * room : NULL;
    s->speed = s->x ? s->x + 3 * room : NULL;
    s->count = 0;
    return s->x != NULL;
}

static void series_add(struct series *s, double x, double complex z, double amplitude, double rpm,
                       const struct job_sensor *sensor)
{
    struct shown v = shown_vector(z, NULL, sensor->quantity, rpm, &sensor->show, NAN);
    if (isnan(v.amplitude))
        v = shown_amplitude(amplitude, NAN, sensor->quantity, rpm, &sensor->show);
    double before = s->count ? s->lag[s->count - 1] : NAN;
    s->x[s->count] = x;
    s->amplitude[s->count] = v.amplitude;
    s->lag[s->count] = isnan(before) ? v.lag_deg : before + remainder(v.lag_deg - before, 360);
    s->speed[s->count] = rpm;
    s->count++;
}

static void gather(const struct dossier *d, const char *run, size_t sensor, struct series *s)
{
    for (size_t i = 0; i < d->turns.count; i++) {
        const struct turns_record *t = &d->turns.items[i];
        for (size_t k = 0; strcmp(t->run, run) == 0 && k < t->count; k++) {
            if (t->sensors[k] == (int)sensor)
                series_add(s, t->t_s, t->vectors[k], t->amplitudes ? t->amplitudes[k] : NAN,
                           t->speed_rpm, &d->job->sensors[sensor]);
        }
    }
}

static void foot(const struct strip *s, double y, const char *unit, struct buffer *out)
{
    char from[DIGITS_ROOM], to[DIGITS_ROOM];
    svg_text(out, "small", "start", LEFT, y, "%s", digits_text(from, s->from, NAN));
    svg_text(out, "small", "middle", (LEFT + RIGHT) / 2, y, "%s", unit);
    svg_text(out, "small", "end", RIGHT, y, "%s", digits_text(to, s->to, NAN));
}

/* Amplitude and lag, and speed where `over` is time. */
static double strips(const struct series *s, const struct job_sensor *sensor, const char *title,
                     bool time, bool small, double y, struct buffer *out)
{
    double high = small ? 100 : time ? 235 : 215, x[2];
    char unit[24], name[40];
    if (!range(s->x, s->count, 0, x))
        return 0;
    x[0] = fmax(0, x[0]);
    svg_begin(out, y, WIDE, high, title);
    svg_text(out, "bold", "start", 6, 13, "%s", title);
    snprintf(name, sizeof name, "1x, %s", units_show_text(&sensor->show, unit));
    struct strip a = {20, 85, x[0], x[1], s->x, s->amplitude, s->count, name};
    double least = 0;
    for (size_t i = 0; i < s->count; i++)
        least = fmax(least, isfinite(s->amplitude[i]) ? 0.02 * s->amplitude[i] : 0);
    struct strip lag = {
        small ? 20 : 110, small ? 60 : time ? 50 : 85, x[0], x[1], s->x, s->lag, s->count,
        "lag, deg"};
    struct strip rpm = {165, 50, x[0], x[1], s->x, s->speed, s->count, "speed, rpm"};
    if (!small)
        strip(&a, least > 0 ? least : 1e-9, out);
    strip(&lag, 4, out);
    if (time && !small)
        strip(&rpm, 4, out);
    foot(&lag, high - 6, time ? "time, s" : "speed, rpm", out);
    svg_end(out);
    return high;
}

double draw_lines_time(const struct dossier *d, size_t run, size_t sensor, bool small, double y,
                       struct buffer *out)
{
    struct series s;
    char title[200];
    const char *name = d->runs.items[run].record.run;
    if (!series_init(&s, d->turns.count)) {
        out->failed = 1;
        return 0;
    }
    gather(d, name, sensor, &s);
    snprintf(title, sizeof title, "%s, %s", name, d->job->sensors[sensor].name);
    double high = strips(&s, &d->job->sensors[sensor], title, true, small, y, out);
    free(s.x);
    return high;
}

double draw_lines_speed(const struct dossier *d, size_t curve, double y, struct buffer *out)
{
    const struct curve_record *c = &d->curves.items[curve];
    struct series s;
    char title[200];
    if (c->sensor < 0 || (size_t)c->sensor >= d->job->sensor_count)
        return 0;
    if (!series_init(&s, c->count)) {
        out->failed = 1;
        return 0;
    }
    for (size_t i = 0; i < c->count; i++)
        series_add(&s, c->speed_rpm[i], c->vectors[i], NAN, c->speed_rpm[i],
                   &d->job->sensors[c->sensor]);
    snprintf(title, sizeof title, "%s, %s: coast-down", c->run, dossier_sensor(d, c->sensor));
    double high = strips(&s, &d->job->sensors[c->sensor], title, false, false, y, out);
    free(s.x);
    return high;
}

/* Index of the first point that stands for a band (half an order or more from the one before), not
 * for a line: its amplitude is that of all within the band, and must not look like a rise. */
static size_t bands_from(const struct spectrum_record *r)
{
    for (size_t i = 1; i < r->count; i++) {
        if (r->orders[i] - r->orders[i - 1] >= 0.5)
            return i;
    }
    return r->count;
}

/* Points first to end over the last four decades below the largest; dots where they are few. */
static void spectrum_trace(const struct spectrum_record *r, size_t first, size_t end, double most,
                           double top, double high, bool dots, struct buffer *out)
{
    double last = r->orders[r->count - 1];
    struct svg_point *points = calloc(end - first + 1, sizeof *points);
    if (!points) {
        out->failed = 1;
        return;
    }
    for (size_t i = first; i < end; i++) {
        double decades = r->amplitude[i] > 0 ? fmax(-4, log10(r->amplitude[i] / most)) : -4;
        points[i - first] = (struct svg_point){LEFT + r->orders[i] / last * (RIGHT - LEFT),
                                               top - high * decades / 4};
        if (dots)
            svg_circle(out, "moved", points[i - first].x, points[i - first].y, 2);
    }
    if (!dots)
        svg_path(out, "trace", points, end - first, 0);
    free(points);
}

double draw_lines_spectrum(const struct dossier *d, size_t spectrum, double y, struct buffer *out)
{
    static const char *const units[] = {"m/s2 pk", "m/s pk", "m pk", ""};
    const struct spectrum_record *r = &d->spectra.items[spectrum];
    double most = 0, top = 22, high = 110;
    char title[200];
    if (r->sensor < 0 || (size_t)r->sensor >= d->job->sensor_count)
        return 0;
    for (size_t i = 0; i < r->count; i++)
        most = r->amplitude[i] > most ? r->amplitude[i] : most;
    if (!(most > 0) || !(r->orders[r->count - 1] > 0))
        return 0;
    snprintf(title, sizeof title, "%s, %s: order spectrum", r->run, dossier_sensor(d, r->sensor));
    svg_begin(out, y, WIDE, 170, title);
    svg_text(out, "bold", "start", 6, 13, "%s", title);
    for (int i = 0; i <= 4; i++) {
        double line = top + high * i / 4;
        svg_line(out, "thin", LEFT, line, RIGHT, line);
        svg_text(out, "small", "end", LEFT - 4, line + 4, "%.1e", most / pow(10, i));
    }
    double last = r->orders[r->count - 1], step = last > 12 ? 5 : 1;
    for (double order = 0; order <= last + 1e-9; order += step) {
        double x = LEFT + order / last * (RIGHT - LEFT);
        svg_line(out, "thin", x, top, x, top + high);
        svg_text(out, "small", "middle", x, top + high + 13, "%.0fx", order);
    }
    size_t bands = bands_from(r);
    spectrum_trace(r, 0, bands, most, top, high, false, out);
    spectrum_trace(r, bands, r->count, most, top, high, true, out);
    svg_text(out, "small", "middle", (LEFT + RIGHT) / 2, 163, "order; amplitude in %s, log scale%s",
             units[d->job->sensors[r->sensor].quantity],
             bands < r->count ? "; circles: all within a wide band" : "");
    svg_end(out);
    return 170;
}
