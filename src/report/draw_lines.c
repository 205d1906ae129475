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
#define SMALL_WIDE 320.0 /* three beside each other on a page */
#define SMALL_RIGHT 308.0

/* A strip of a drawing: one quantity over x. */
struct strip {
    double top, high; /* pixels */
    double right;     /* pixels */
    double from, to;  /* of x, in its unit */
    const double *x, *y;
    size_t count;
    const char *name;
};

static double across(const struct strip *s, double x)
{
    return LEFT + (s->to > s->from ? (x - s->from) / (s->to - s->from) : 0.5) * (s->right - LEFT);
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
        {LEFT, s->top}, {s->right, s->top}, {s->right, s->top + s->high}, {LEFT, s->top + s->high}};
    svg_path(out, "thin", frame, 4, 1);
    svg_text(out, "small bold", "start", LEFT, s->top - 4, "%s", s->name);
    if (!range(s->y, s->count, least, y)) {
        svg_text(out, "small", "middle", (LEFT + s->right) / 2, s->top + s->high / 2, "none");
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
    svg_text(out, "small", "middle", (LEFT + s->right) / 2, y, "%s", unit);
    svg_text(out, "small", "end", s->right, y, "%s", digits_text(to, s->to, s->to / 10));
}

/* From the start of the recording to its end (s; NaN: not known), else as far as blocks tell. */
static void whole_time(const struct series *s, double end, double to[2])
{
    double first = INFINITY, last = 0;
    for (size_t i = 0; i < s->count; i++) {
        first = fmin(first, s->x[i]);
        last = fmax(last, s->x[i]);
    }
    to[0] = 0;
    to[1] = end >= last ? end : last + fmax(0, first);
}

/* How long a run's recording is, s; NaN: it has none. Its files are of one length. */
static double recorded(const struct run_record *run)
{
    const struct file_record *file = run->file_count > 0 ? &run->files[0] : NULL;
    return file && file->rate_hz > 0 ? (double)file->frames / file->rate_hz : NAN;
}

/* Amplitude and lag, and speed where it is over time; `end`: as in whole_time. */
static double strips(const struct series *s, const struct job_sensor *sensor, const char *title,
                     bool time, double end, bool small, double y, struct buffer *out)
{
    double high = small ? 108 : time ? 272 : 245, x[2];
    char unit[24], name[40];
    if (!range(s->x, s->count, 0, x))
        return 0;
    x[0] = fmax(0, x[0]);
    if (time) /* each block's middle; the first is as far from the start as the last from the end */
        whole_time(s, end, x);
    svg_begin(out, y, small ? SMALL_WIDE : WIDE, high, title);
    svg_text(out, small ? "small bold" : "bold", "start", 6, 13, "%s", title);
    snprintf(name, sizeof name, "1x, %s", units_show_text(&sensor->show, unit));
    struct strip a = {32, 85, RIGHT, x[0], x[1], s->x, s->amplitude, s->count, name};
    double least = 0;
    for (size_t i = 0; i < s->count; i++)
        least = fmax(least, isfinite(s->amplitude[i]) ? 0.02 * s->amplitude[i] : 0);
    struct strip lag = {small ? 32 : 135,
                        small  ? 60
                        : time ? 50
                               : 85,
                        small ? SMALL_RIGHT : RIGHT,
                        x[0],
                        x[1],
                        s->x,
                        s->lag,
                        s->count,
                        "lag, deg"};
    struct strip rpm = {203, 50, RIGHT, x[0], x[1], s->x, s->speed, s->count, "speed, rpm"};
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
    double high = strips(&s, &d->job->sensors[sensor], title, true,
                         recorded(&d->runs.items[run].record), small, y, out);
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
    double high = strips(&s, &d->job->sensors[c->sensor], title, false, NAN, false, y, out);
    free(s.x);
    return high;
}
