#include <math.h>
#include <stdio.h>
#include <string.h>

#include "base/angle.h"
#include "report/draw.h"
#include "report/runout.h"
#include "report/shown.h"
#include "report/text_readings.h"
#include "sheet/units.h"

#define WIDE 430.0
#define MIDDLE_X 215.0
#define MIDDLE_Y 190.0
#define RIM 150.0
#define LINE 15.0 /* of the legend */
#define NAMES_MOST 64

struct polar {
    const struct dossier *d;
    const struct job_sensor *sensor;
    size_t index;
    const char *condition;
    double scale; /* pixels per shown unit */
    double most;  /* shown units at the rim */
    struct buffer *out;
    struct svg_point names[NAMES_MOST]; /* middles of the numbers written so far */
    size_t name_count;
};

/* A reading with phase that says something of its sensor: a slow roll does so of probes only. */
static bool is_drawn(const struct dossier *d, const struct reading_record *r)
{
    return r->has_phase && (!dossier_is_runout(d, r->run) || runout_has_effect(d, r->sensor));
}

static bool is_here(const struct polar *p, const struct dossier_reading *r)
{
    return (size_t)r->reading.sensor == p->index && is_drawn(p->d, &r->reading) &&
           strcmp(r->reading.condition, p->condition) == 0;
}

/* Reading i as it is drawn: without runout, as the forecast is. */
static struct dossier_reading drawn(const struct polar *p, size_t i)
{
    return runout_off(p->d, &p->d->readings.items[i]);
}

static bool forecast_here(const struct polar *p, const struct forecast_record *f)
{
    return f->sensor == (int)p->index && strcmp(f->condition, p->condition) == 0;
}

static struct svg_point place(const struct polar *p, double complex z, double rpm)
{
    struct shown s = shown_vector(z, NULL, p->sensor->quantity, rpm, &p->sensor->show, NAN);
    return draw_plane_at(p->d->job, MIDDLE_X, MIDDLE_Y, s.amplitude * p->scale, s.lag_deg);
}

static double peak(const struct polar *p, double amplitude, double rpm)
{
    return shown_amplitude(amplitude, NAN, p->sensor->quantity, rpm, &p->sensor->show).amplitude;
}

/* 1, 2 or 5 times a power of ten, at least `most`. */
static double rim(double most)
{
    double power = pow(10, floor(log10(most)));
    double steps[] = {1, 1.5, 2, 3, 4, 5, 6, 8, 10};
    for (size_t i = 0; i < sizeof steps / sizeof *steps; i++) {
        if (steps[i] * power >= most)
            return steps[i] * power;
    }
    return 10 * power;
}

static void measure(struct polar *p)
{
    double most = 0;
    for (size_t i = 0; i < p->d->readings.count; i++) {
        const struct dossier_reading item = drawn(p, i);
        if (is_here(p, &item))
            most = fmax(most, peak(p, item.reading.amplitude, item.reading.speed_rpm));
    }
    for (size_t i = 0; i < p->d->forecasts.count; i++) {
        const struct forecast_record *f = &p->d->forecasts.items[i];
        if (forecast_here(p, f)) {
            most = fmax(most, peak(p, fmax(cabs(f->before), cabs(f->after)), f->speed_rpm));
            most = fmax(most, peak(p, isfinite(f->after_95[1]) ? f->after_95[1] : 0, f->speed_rpm));
        }
    }
    p->most = most > 0 ? rim(1.05 * most) : 1;
    p->scale = RIM / p->most;
}

static void web(const struct polar *p)
{
    char text[DIGITS_ROOM], unit[24];
    for (int i = 1; i <= 4; i++) {
        svg_circle(p->out, i == 4 ? "axis" : "thin", MIDDLE_X, MIDDLE_Y, RIM * i / 4);
        struct svg_point at = draw_plane_at(p->d->job, MIDDLE_X, MIDDLE_Y, RIM * i / 4, 15);
        svg_text(p->out, "small", "middle", at.x, at.y, "%s",
                 digits_text(text, p->most * i / 4, NAN));
    }
    for (int lag = 0; lag < 360; lag += 30) {
        struct svg_point end = draw_plane_at(p->d->job, MIDDLE_X, MIDDLE_Y, RIM, lag);
        struct svg_point name = draw_plane_at(p->d->job, MIDDLE_X, MIDDLE_Y, RIM + 17, lag);
        svg_line(p->out, "thin", MIDDLE_X, MIDDLE_Y, end.x, end.y);
        svg_text(p->out, "small", "middle", name.x, name.y + 4, "%d", lag);
    }
    svg_text(p->out, "bold", "start", 6, 14, "%s", p->sensor->name);
    svg_text(p->out, "small", "end", WIDE - 6, 14, "1x, %s; angle: lag, deg",
             units_show_text(&p->sensor->show, unit));
}

/* The 95 % region of both components: chi-squared with two degrees of freedom, -2 ln 0.05. A
 * reading's covariance is made for it, few blocks allowed for. */
/* No further from the middle than the rim. */
static struct svg_point inside(struct svg_point at)
{
    const double far = hypot(at.x - MIDDLE_X, at.y - MIDDLE_Y);
    if (!(far > RIM))
        return at;
    return (struct svg_point){MIDDLE_X + RIM / far * (at.x - MIDDLE_X),
                              MIDDLE_Y + RIM / far * (at.y - MIDDLE_Y)};
}

static void region(const struct polar *p, const struct dossier_reading *item)
{
    const struct reading_record *r = &item->reading;
    double cov[3];
    struct svg_point points[48];
    dossier_cov(item, cov);
    if (!(cov[0] > 0) || !(cov[2] > 0))
        return;
    double a = sqrt(cov[0]), b = cov[1] / a, c = sqrt(fmax(0, cov[2] - b * b));
    double k = sqrt(-2 * log(0.05));
    for (int i = 0; i < 48; i++) {
        double u = cos(2 * PI * i / 48), v = sin(2 * PI * i / 48);
        points[i] = inside(place(p, r->vector + k * CMPLX(a * u, b * u + c * v), r->speed_rpm));
    }
    buffer_text(p->out, "<g data-what=\"region\">");
    svg_path(p->out, "region", points, 48, 1);
    buffer_text(p->out, "</g>\n");
}

static bool is_bare(const struct polar *p, const char *run)
{
    int index = job_find_run(p->d->job, run);
    return index < 0 || job_run_is_bare(p->d->job, (size_t)index);
}

/* True where a number with its middle at `at` would cover no point and no other number. */
static bool is_clear(const struct polar *p, struct svg_point at)
{
    if (at.x < 8 || at.x > WIDE - 8 || at.y < 24 || at.y > MIDDLE_Y + RIM + 30)
        return false;
    for (size_t i = 0; i < p->name_count; i++) {
        if (fabs(at.x - p->names[i].x) < 17 && fabs(at.y - p->names[i].y) < 14)
            return false;
    }
    for (size_t i = 0; i < p->d->readings.count; i++) {
        const struct dossier_reading item = drawn(p, i);
        if (!is_here(p, &item))
            continue;
        struct svg_point other = place(p, item.reading.vector, item.reading.speed_rpm);
        if (fabs(at.x - other.x) < 10 && fabs(at.y - other.y) < 10)
            return false;
    }
    return true;
}

/* Where a point's number goes: outwards from the plot's middle if that is clear, else turned from
 * there to either side, else further away. */
static struct svg_point name_at(const struct polar *p, struct svg_point at)
{
    double outwards = atan2(at.y - MIDDLE_Y, at.x - MIDDLE_X);
    for (double far = 14; far < 80; far += 8) {
        for (int i = 0; i < 12; i++) {
            double angle = outwards + PI / 6 * (i % 2 ? -(i + 1) / 2 : i / 2);
            struct svg_point name = {at.x + far * cos(angle), at.y + far * sin(angle)};
            if (is_clear(p, name))
                return name;
        }
    }
    return (struct svg_point){at.x + 14, at.y};
}

static void point(struct polar *p, const struct dossier_reading *item, int number)
{
    const struct reading_record *r = &item->reading;
    struct svg_point at = place(p, r->vector, r->speed_rpm), name = name_at(p, at);
    buffer_text(p->out, "<g data-what=\"reading\" data-run=\"");
    svg_escape(p->out, r->run);
    buffer_text(p->out, "\">");
    double far = hypot(name.x - at.x, name.y - at.y);
    if (far > 18)
        svg_line(p->out, "thin", at.x, at.y, name.x + 8 / far * (at.x - name.x),
                 name.y + 8 / far * (at.y - name.y));
    if (dossier_is_runout(p->d, r->run)) {
        svg_line(p->out, "axis", at.x - 5, at.y - 5, at.x + 5, at.y + 5);
        svg_line(p->out, "axis", at.x - 5, at.y + 5, at.x + 5, at.y - 5);
    } else if (is_bare(p, r->run))
        svg_circle(p->out, item->use ? "now" : "moved", at.x, at.y, 4);
    else
        svg_square(p->out, "moved", at.x, at.y, 4);
    svg_text(p->out, "bold", "middle", name.x, name.y + 4, "%d", number);
    buffer_text(p->out, "</g>\n");
    if (p->name_count < NAMES_MOST)
        p->names[p->name_count++] = name;
}

/* What stands behind a reading's name: a slow roll is none of as found. */
static const char *kind_of(const struct polar *p, const char *run)
{
    if (dossier_is_runout(p->d, run))
        return " (runout)";
    return is_bare(p, run) ? "" : " (weights on)";
}

static void legend(const struct polar *p, const struct dossier_reading *item, int number, double y)
{
    struct shown s = text_readings_shown(p->d, item);
    char amplitude[DIGITS_ROOM], lag[DIGITS_ROOM], unit[24];
    svg_text(p->out, "small", "start", 14, y, "%d  %s: %s %s at %s deg lag%s%s", number,
             item->reading.run, digits_text(amplitude, s.amplitude, s.half),
             units_show_text(&p->sensor->show, unit), digits_angle(lag, s.lag_deg, s.lag_half),
             kind_of(p, item->reading.run), item->use ? "" : " REFUSED");
}

/* Where the vibration as found lies: the middle of the bare runs that are used; false: none. */
static bool as_found(const struct polar *p, struct svg_point *at)
{
    size_t count = 0;
    *at = (struct svg_point){0, 0};
    for (size_t i = 0; i < p->d->readings.count; i++) {
        const struct dossier_reading item = drawn(p, i);
        if (!is_here(p, &item) || !item.use || !is_bare(p, item.reading.run) ||
            dossier_is_runout(p->d, item.reading.run))
            continue;
        struct svg_point one = place(p, item.reading.vector, item.reading.speed_rpm);
        at->x += one.x;
        at->y += one.y;
        count++;
    }
    at->x /= (double)count;
    at->y /= (double)count;
    return count > 0;
}

/* Dashed lines from as found to every run with weights. */
static void effects(const struct polar *p)
{
    struct svg_point from;
    if (!as_found(p, &from))
        return;
    for (size_t i = 0; i < p->d->readings.count; i++) {
        const struct dossier_reading item = drawn(p, i);
        if (!is_here(p, &item) || is_bare(p, item.reading.run) ||
            dossier_is_runout(p->d, item.reading.run))
            continue;
        struct svg_point to = place(p, item.reading.vector, item.reading.speed_rpm);
        svg_line(p->out, "trial", from.x, from.y, to.x, to.y);
    }
}

static void forecast(const struct polar *p, const struct forecast_record *f)
{
    struct svg_point path[2] = {place(p, f->before, f->speed_rpm),
                                place(p, f->after, f->speed_rpm)};
    svg_path(p->out, "to", path, 2, 0);
    svg_circle(p->out, "range", MIDDLE_X, MIDDLE_Y,
               peak(p, f->after_95[1], f->speed_rpm) * p->scale);
    double target = peak(p, f->target, f->speed_rpm) * p->scale;
    if (target <= RIM)
        svg_circle(p->out, "target", MIDDLE_X, MIDDLE_Y, target);
    svg_diamond(p->out, "left", path[1].x, path[1].y, 5);
}

bool draw_polar_begins(const struct dossier *d, size_t i)
{
    const struct reading_record *r = &d->readings.items[i].reading;
    for (size_t k = 0; k < i; k++) {
        const struct reading_record *o = &d->readings.items[k].reading;
        if (is_drawn(d, o) && o->sensor == r->sensor && strcmp(o->condition, r->condition) == 0)
            return false;
    }
    return is_drawn(d, r);
}

double draw_polar(const struct dossier *d, size_t sensor, const char *condition, double y,
                  struct buffer *out)
{
    struct polar p = {.d = d,
                      .sensor = &d->job->sensors[sensor],
                      .index = sensor,
                      .condition = condition,
                      .out = out};
    int count = 0, number = 0;
    bool off = false;
    char label[200];
    for (size_t i = 0; i < d->readings.count; i++) {
        const struct dossier_reading *item = &d->readings.items[i];
        count += is_here(&p, item);
        off = off || (is_here(&p, item) &&
                      (runout_comes_off(d, item) || dossier_is_runout(d, item->reading.run)));
    }
    double below = MIDDLE_Y + RIM + 40, high = below + LINE * (count + 4);
    snprintf(label, sizeof label, "Polar plot of the 1x vectors of %s", p.sensor->name);
    measure(&p);
    svg_begin(out, y, WIDE, high, label);
    web(&p);
    for (size_t i = 0; i < d->readings.count; i++) {
        const struct dossier_reading item = drawn(&p, i);
        if (is_here(&p, &item))
            region(&p, &item);
    }
    effects(&p);
    for (size_t i = 0; i < d->forecasts.count; i++) {
        if (forecast_here(&p, &d->forecasts.items[i]))
            forecast(&p, &d->forecasts.items[i]);
    }
    for (size_t i = 0; i < d->readings.count; i++) {
        const struct dossier_reading item = drawn(&p, i);
        if (!is_here(&p, &item))
            continue;
        point(&p, &item, ++number);
        legend(&p, &item, number, below + LINE * (number - 1));
    }
    below += LINE * count;
    svg_text(out, "small", "start", 14, below,
             "dot: no weights; square: weights on; diamond: forecast; shaded: 95 %% region");
    svg_text(out, "small", "start", 14, below + LINE,
             "dashed: effect of weights; solid: to the forecast");
    svg_text(out, "small", "start", 14, below + 2 * LINE,
             "dotted ring: 95 %% of next readings; dash-dot ring: target");
    svg_text(out, "small", "start", 14, below + 3 * LINE, "condition: %s%s", condition,
             off ? "; cross: runout, which is taken off the others here" : "");
    svg_end(out);
    return high;
}
