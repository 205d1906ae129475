/* svg.h - the strokes that pages and pictures are made of: escaped text, and SVG elements.
 *
 * Every text from a stream passes svg_escape, in attributes as in content. Coordinates are printed
 * with two decimals, so that equal input gives equal bytes. Classes are named by us, never by input.
 */
#ifndef LOPSIDE_REPORT_SVG_H
#define LOPSIDE_REPORT_SVG_H

#include "base/buffer.h"

struct svg_point {
    double x, y;
};

/* Appends `text` fit for HTML and SVG, content and quoted attributes alike: what is hostile made
 * visible (paper_clean), then & < > " ' as entities. */
void svg_escape(struct buffer *out, const char *text);

/* The rules that colour and hatch every drawing; borrowed. */
const char *svg_style(void);

/* A picture of w by h at height y of what it stands in; `label` is read aloud instead of it. */
void svg_begin(struct buffer *out, double y, double w, double h, const char *label);
void svg_end(struct buffer *out);

void svg_line(struct buffer *out, const char *class, double x1, double y1, double x2, double y2);
void svg_circle(struct buffer *out, const char *class, double x, double y, double r);
void svg_square(struct buffer *out, const char *class, double x, double y, double r);
void svg_diamond(struct buffer *out, const char *class, double x, double y, double r);
/* An open (closed: 0) or closed line through points; a NaN breaks it. */
void svg_path(struct buffer *out, const char *class, const struct svg_point *points, size_t count,
              int closed);
/* anchor: "start", "middle", "end". The text is escaped. */
void svg_text(struct buffer *out, const char *class, const char *anchor, double x, double y,
              const char *format, ...) __attribute__((format(printf, 6, 7)));

#endif
