#include <math.h>
#include <stdio.h>
#include <stdlib.h>
#include <string.h>

#include "report/draw.h"
#include "report/shown.h"
#include "sheet/units.h"

#define WIDE 480.0
#define HIGH 175.0
#define LEFT 58.0
#define RIGHT 462.0
#define TOP 22.0
#define TALL 110.0
#define DECADES 4
#define LINES_TOLD 3  /* what fits below a drawing */
#define LINES_HIGH 13 /* what they take there */

/* Below this order (common practice: near the noise of an integrator) nothing is drawn where the
 * shown quantity is an integral of the measured one, which would lift noise by 1/order. */
#define ORDER_LEAST 0.25

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

/* Amplitudes in the show unit, each at its own frequency; NaN below the least order. New; NULL: no
 * memory. */
static double *shown_amplitudes(const struct spectrum_record *r, const struct job_sensor *sensor,
                                double rpm)
{
    double *shown = calloc(r->count ? r->count : 1, sizeof *shown);
    for (size_t i = 0; shown && i < r->count; i++) {
        double at = rpm * r->orders[i];
        bool low = sensor->show.quantity != sensor->quantity && r->orders[i] < ORDER_LEAST;
        shown[i] = low ? NAN
                       : shown_amplitude(r->amplitude[i], NAN, sensor->quantity, at, &sensor->show)
                             .amplitude;
    }
    return shown;
}

/* As shown_amplitudes, of a line that does not turn with the shaft. */
static double shown_line(const struct spectrum_record *r, size_t line,
                         const struct job_sensor *sensor, double rpm)
{
    const double at = 60 * r->lines[2 * line];
    if (sensor->show.quantity != sensor->quantity && at < ORDER_LEAST * rpm)
        return NAN;
    return shown_amplitude(r->lines[2 * line + 1], NAN, sensor->quantity, at, &sensor->show)
        .amplitude;
}

/* A spectrum to be drawn: shown amplitudes over orders, `top` the power of ten at the upper edge.
 */
struct graph {
    const struct spectrum_record *record;
    const double *shown;
    double last;
    int top;
    struct buffer *out;
};

static struct svg_point at(const struct graph *g, double order, double amplitude)
{
    double below = amplitude > 0 ? g->top - log10(amplitude) : DECADES;
    return (struct svg_point){LEFT + order / g->last * (RIGHT - LEFT),
                              TOP + TALL * fmin(below, DECADES) / DECADES};
}

/* Points first to end; dots where they are few. */
static void trace(const struct graph *g, size_t first, size_t end, bool dots)
{
    struct svg_point *points = calloc(end - first + 1, sizeof *points);
    if (!points) {
        g->out->failed = 1;
        return;
    }
    for (size_t i = first; i < end; i++) {
        points[i - first] = at(g, g->record->orders[i], g->shown[i]);
        if (!isfinite(g->shown[i]))
            points[i - first].y = NAN;
        else if (dots)
            svg_circle(g->out, "moved", points[i - first].x, points[i - first].y, 2);
    }
    if (!dots)
        svg_path(g->out, "trace", points, end - first, 0);
    free(points);
}

static void frame(const struct graph *g)
{
    for (int i = 0; i <= DECADES; i++) {
        double line = TOP + TALL * i / DECADES;
        svg_line(g->out, "thin", LEFT, line, RIGHT, line);
        svg_text(g->out, "small", "end", LEFT - 4, line + 4, "%g", pow(10, g->top - i));
    }
    double step = g->last > 12 ? 5 : 1;
    for (double order = 0; order <= g->last + 1e-9; order += step) {
        double x = LEFT + order / g->last * (RIGHT - LEFT);
        svg_line(g->out, "thin", x, TOP, x, TOP + TALL);
        svg_text(g->out, "small", "middle", x, TOP + TALL + 13, "%.0fx", order);
    }
}

/* The lines that do not turn with the shaft: a diamond each, and below the drawing what they are.
 */
static void lines(const struct graph *g, const struct job_sensor *sensor, double rpm)
{
    const struct spectrum_record *r = g->record;
    struct buffer text = BUFFER_INIT;
    char unit[24], hz[DIGITS_ROOM], size[DIGITS_ROOM];
    size_t told = 0;
    for (size_t i = 0; i < r->line_count && told < LINES_TOLD; i++) {
        const double order = 60 * r->lines[2 * i] / rpm, shown = shown_line(r, i, sensor, rpm);
        if (!(shown > 0) || !isfinite(order))
            continue;
        if (order <= g->last) {
            struct svg_point here = at(g, order, shown);
            svg_diamond(g->out, "moved", here.x, here.y, 4);
        }
        /* Three digits of a frequency, two of a side line's size: our choice. */
        buffer_format(&text, "%s%s Hz %s", told++ ? ", " : "",
                      digits_text(hz, r->lines[2 * i], r->lines[2 * i] / 10),
                      digits_text(size, shown, shown));
    }
    if (told > 0 && !text.failed)
        svg_text(g->out, "small", "middle", (LEFT + RIGHT) / 2, HIGH + 5,
                 "diamonds, not turning with the shaft: %s %s", text.bytes,
                 units_show_text(&sensor->show, unit));
    g->out->failed = g->out->failed || text.failed;
    buffer_release(&text);
}

double draw_spectrum(const struct dossier *d, size_t spectrum, double y, struct buffer *out)
{
    const struct spectrum_record *r = &d->spectra.items[spectrum];
    char title[200], unit[24];
    if (r->sensor < 0 || (size_t)r->sensor >= d->job->sensor_count || r->count == 0 ||
        !(r->orders[r->count - 1] > 0))
        return 0;
    const struct job_sensor *sensor = &d->job->sensors[r->sensor];
    const double rpm = dossier_speed(d, r->run);
    const double high = HIGH + (r->line_count > 0 ? LINES_HIGH : 0);
    double *shown = shown_amplitudes(r, sensor, rpm), most = 0;
    if (!shown) {
        out->failed = 1;
        return 0;
    }
    for (size_t i = 0; i < r->count; i++)
        most = shown[i] > most ? shown[i] : most;
    if (most > 0 && isfinite(most)) {
        struct graph g = {r, shown, r->orders[r->count - 1], (int)ceil(log10(most)), out};
        size_t bands = bands_from(r);
        snprintf(title, sizeof title, "%s, %s: order spectrum", r->run, sensor->name);
        svg_begin(out, y, WIDE, high, title);
        svg_text(out, "bold", "start", 6, 13, "%s", title);
        frame(&g);
        trace(&g, 0, bands, false);
        trace(&g, bands, r->count, true);
        svg_text(out, "small", "middle", (LEFT + RIGHT) / 2, HIGH - 8,
                 "order; amplitude in %s, log scale%s", units_show_text(&sensor->show, unit),
                 bands < r->count ? "; circles: all within a wide band" : "");
        lines(&g, sensor, rpm);
        svg_end(out);
    } else {
        most = 0;
    }
    free(shown);
    return most > 0 ? high : 0;
}
