/* line.h - writes one record of the stream: compact JSON, one line, `kind` first.
 *
 * The only printer of records. Reals are printed with %.17g in the C locale whatever the process's
 * locale, NaN and infinities as null, strings escaped as UTF-8 JSON. Commas and brackets are kept by
 * the writer; a key is NULL inside an array.
 *
 *     struct line line = LINE_INIT;
 *     line_begin(&line, "tacho");
 *     line_text(&line, "run", "trial");
 *     line_integer(&line, "marks", 1200);
 *     line_end(&line);                       // closes the object and adds the newline
 *     stream_write(out, &line);              // writes and clears it
 */
#ifndef LOPSIDE_STREAM_LINE_H
#define LOPSIDE_STREAM_LINE_H

#include <complex.h>
#include <stdbool.h>

#include "base/buffer.h"

struct line {
    struct buffer text;
    bool comma;
};

#define LINE_INIT {BUFFER_INIT, false}

void line_begin(struct line *line, const char *kind);
void line_text(struct line *line, const char *key, const char *value); /* NULL prints null */
void line_real(struct line *line, const char *key, double value);
void line_integer(struct line *line, const char *key, long long value);
void line_boolean(struct line *line, const char *key, bool value);
void line_null(struct line *line, const char *key);
void line_vector(struct line *line, const char *key, double complex z);       /* [re, im]; null if NaN */
void line_covariance(struct line *line, const char *key, const double cov[3]); /* [var re, cov, var im] */
void line_reals(struct line *line, const char *key, const double *values, size_t count);
void line_open(struct line *line, const char *key, char bracket);  /* '{' or '[' */
void line_close(struct line *line, char bracket);                  /* '}' or ']' */
void line_end(struct line *line);
void line_release(struct line *line);

#endif
