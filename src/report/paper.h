/* paper.h - plain text for a terminal or a printer: at most 80 columns, nothing hostile in it.
 *
 * Width is counted in code points. Control characters (C0, DEL, C1), bytes that are no UTF-8, and
 * the invisible marks that turn the reading direction (which could reorder the digits of a number)
 * are shown as \xNN or \uNNNN.
 */
#ifndef LOPSIDE_REPORT_PAPER_H
#define LOPSIDE_REPORT_PAPER_H

#include <stddef.h>

#include "base/buffer.h"

#define PAPER_WIDTH 80

/* Appends `text` with everything hostile made visible. */
void paper_clean(struct buffer *out, const char *text);

/* Code points of a text that is already clean. */
size_t paper_width(const char *clean);

/* Bytes of the first `points` code points of a clean text (or all of it). */
size_t paper_bytes(const char *clean, size_t points);

/* Appends `text`, cleaned and wrapped at blanks to PAPER_WIDTH columns, ending with a newline. The
 * first line is indented by `first` columns, the others by `rest` (both < 40). A word that is
 * longer than a line is broken. An empty text appends nothing. */
void paper_wrap(struct buffer *out, size_t first, size_t rest, const char *text);

/* The same from a format. */
void paper_say(struct buffer *out, size_t first, size_t rest, const char *format, ...)
    __attribute__((format(printf, 4, 5)));

/* Wraps what a phrase built and releases it; takes over its failure. */
void paper_take(struct buffer *out, size_t first, size_t rest, struct buffer *text);

/* A blank line and a heading. */
void paper_heading(struct buffer *out, const char *heading);

#endif
