#include "report/draw.h"

const char *const draw_names[] = {"polar", "plane", "time", "spectrum", "speed", NULL};

static double all_time(const struct dossier *d, double y, struct buffer *out)
{
    for (size_t r = 0; r < d->runs.count; r++) {
        for (size_t s = 0; s < d->job->sensor_count; s++)
            y += draw_lines_time(d, r, s, false, y, out);
    }
    return y;
}

static double all(const struct dossier *d, enum draw_what what, double y, struct buffer *out)
{
    switch (what) {
    case DRAW_POLAR:
        for (size_t i = 0; i < d->readings.count; i++) {
            const struct reading_record *r = &d->readings.items[i].reading;
            if (draw_polar_begins(d, i))
                y += draw_polar(d, (size_t)r->sensor, r->condition, y, out);
        }
        return y;
    case DRAW_PLANE:
        for (size_t i = 0; i < d->job->plane_count; i++)
            y += draw_plane(d, i, y, out);
        return y;
    case DRAW_TIME:
        return all_time(d, y, out);
    case DRAW_SPECTRUM:
        for (size_t i = 0; i < d->spectra.count; i++)
            y += draw_spectrum(d, i, y, out);
        return y;
    case DRAW_SPEED:
        for (size_t i = 0; i < d->curves.count; i++)
            y += draw_lines_speed(d, i, y, out);
        return y;
    }
    return y;
}

void draw_file(const struct dossier *d, enum draw_what what, struct buffer *out)
{
    struct buffer inner = BUFFER_INIT;
    double high = all(d, what, 0, &inner);
    if (!(high > 0)) {
        high = 40;
        svg_text(&inner, "", "start", 10, 25, "Nothing of that sort is in this stream.");
    }
    buffer_format(out,
                  "<?xml version=\"1.0\" encoding=\"UTF-8\"?>\n<svg "
                  "xmlns=\"http://www.w3.org/2000/svg\" width=\"480\" height=\"%.0f\" "
                  "viewBox=\"0 0 480 %.0f\">\n<title>",
                  high, high);
    svg_escape(out, d->job->title);
    buffer_format(out, "</title>\n<style>%s</style>\n", svg_style());
    if (inner.failed || !inner.bytes)
        out->failed = 1;
    else
        buffer_add(out, inner.bytes, inner.length);
    svg_end(out);
    buffer_release(&inner);
}
