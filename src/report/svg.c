#include "report/svg.h"

#include <math.h>
#include <stdarg.h>
#include <stdio.h>
#include <string.h>

#include "report/paper.h"

void svg_escape(struct buffer *out, const char *text)
{
    struct buffer clean = BUFFER_INIT;
    paper_clean(&clean, text);
    if (clean.failed)
        out->failed = 1;
    for (size_t i = 0; !clean.failed && i < clean.length; i++) {
        switch (clean.bytes[i]) {
        case '&':
            buffer_text(out, "&amp;");
            break;
        case '<':
            buffer_text(out, "&lt;");
            break;
        case '>':
            buffer_text(out, "&gt;");
            break;
        case '"':
            buffer_text(out, "&quot;");
            break;
        case '\'':
            buffer_text(out, "&#39;");
            break;
        default:
            buffer_add(out, clean.bytes + i, 1);
        }
    }
    buffer_release(&clean);
}

static void say(struct buffer *out, const char *format, va_list list)
{
    char text[1200]; /* the longest text of a record is 400 bytes */
    vsnprintf(text, sizeof text, format, list);
    svg_escape(out, text);
}

/* Blue and orange as in Okabe & Ito's palette for the colour-blind; every use has a shape or a line
 * style of its own besides. */
const char *svg_style(void)
{
    return "svg{font-family:sans-serif;font-size:12px}"
           "svg text{fill:#111;unicode-bidi:isolate}.small{font-size:10px}.bold{font-weight:bold}"
           ".disc{fill:#f6f6f2;stroke:#222;stroke-width:2}.thin{fill:none;stroke:#999;stroke-width:"
           ".7}"
           ".axis{fill:none;stroke:#333;stroke-width:1}.arrow{fill:none;stroke:#111;stroke-width:2."
           "5}"
           ".solid{fill:#111;stroke:none}.free{fill:#fff;stroke:#444;stroke-width:1.2}"
           ".fit{fill:#0072b2;stroke:#111;stroke-width:2}.cut{fill:#fff;stroke:#d55e00;stroke-"
           "width:3}"
           ".on{fill:#999;stroke:#111}.now{fill:#111;stroke:#111}.moved{fill:#fff;stroke:#111;"
           "stroke-width:1.6}.left{fill:#0072b2;stroke:#111}.region{fill:#0072b2;fill-opacity:.15;"
           "stroke:#0072b2;stroke-width:1}.to{fill:none;stroke:#0072b2;stroke-width:2.2}"
           ".trial{fill:none;stroke:#555;stroke-width:1.2;stroke-dasharray:5 3}"
           ".target{fill:none;stroke:#d55e00;stroke-width:1.6;stroke-dasharray:8 3 2 3}"
           ".range{fill:none;stroke:#0072b2;stroke-width:1.2;stroke-dasharray:2 3}"
           ".trace{fill:none;stroke:#0072b2;stroke-width:1.4}";
}

void svg_begin(struct buffer *out, double y, double w, double h, const char *label)
{
    buffer_format(out,
                  "<svg xmlns=\"http://www.w3.org/2000/svg\" y=\"%.0f\" width=\"%.0f\" "
                  "height=\"%.0f\" viewBox=\"0 0 %.0f %.0f\" role=\"img\" aria-label=\"",
                  y, w, h, w, h);
    svg_escape(out, label);
    buffer_text(out, "\">\n");
}

void svg_end(struct buffer *out)
{
    buffer_text(out, "</svg>\n");
}

void svg_line(struct buffer *out, const char *class, double x1, double y1, double x2, double y2)
{
    if (isfinite(x1 + y1 + x2 + y2))
        buffer_format(out, "<line class=\"%s\" x1=\"%.2f\" y1=\"%.2f\" x2=\"%.2f\" y2=\"%.2f\"/>\n",
                      class, x1, y1, x2, y2);
}

void svg_circle(struct buffer *out, const char *class, double x, double y, double r)
{
    if (isfinite(x + y + r))
        buffer_format(out, "<circle class=\"%s\" cx=\"%.2f\" cy=\"%.2f\" r=\"%.2f\"/>\n", class, x,
                      y, r);
}

void svg_path(struct buffer *out, const char *class, const struct svg_point *points, size_t count,
              int closed)
{
    int down = 0;
    buffer_format(out, "<path class=\"%s\" d=\"", class);
    for (size_t i = 0; i < count; i++) {
        if (!isfinite(points[i].x + points[i].y)) {
            down = 0;
            continue;
        }
        buffer_format(out, "%c%.2f %.2f", down ? 'L' : 'M', points[i].x, points[i].y);
        down = 1;
    }
    buffer_format(out, "%s\"/>\n", closed && down ? "Z" : "");
}

void svg_square(struct buffer *out, const char *class, double x, double y, double r)
{
    const struct svg_point p[] = {{x - r, y - r}, {x + r, y - r}, {x + r, y + r}, {x - r, y + r}};
    svg_path(out, class, p, 4, 1);
}

void svg_diamond(struct buffer *out, const char *class, double x, double y, double r)
{
    const struct svg_point p[] = {{x, y - r}, {x + r, y}, {x, y + r}, {x - r, y}};
    svg_path(out, class, p, 4, 1);
}

void svg_text(struct buffer *out, const char *class, const char *anchor, double x, double y,
              const char *format, ...)
{
    va_list list;
    buffer_format(out, "<text class=\"%s\" text-anchor=\"%s\" x=\"%.2f\" y=\"%.2f\">", class,
                  anchor, x, y);
    va_start(list, format);
    say(out, format, list);
    va_end(list);
    buffer_text(out, "</text>\n");
}
