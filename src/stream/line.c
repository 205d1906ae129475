#include "stream/line.h"

#include <jansson.h>
#include <math.h>
#include <stdio.h>
#include <stdlib.h>
#include <string.h>

/* A JSON string, escaped by jansson; text that is not UTF-8 cannot be written and fails the line. */
static void add_string(struct line *line, const char *value)
{
    json_t *string = json_string(value);
    char *text = string ? json_dumps(string, JSON_ENCODE_ANY) : NULL;
    if (text)
        buffer_text(&line->text, text);
    else
        line->text.failed = 1;
    free(text);
    json_decref(string);
}

static void add_key(struct line *line, const char *key)
{
    if (line->comma)
        buffer_text(&line->text, ",");
    if (key) {
        add_string(line, key);
        buffer_text(&line->text, ":");
    }
    line->comma = true;
}

static void add_real(struct line *line, double value)
{
    char text[40];
    if (!isfinite(value)) {
        buffer_text(&line->text, "null");
        return;
    }
    snprintf(text, sizeof text, "%.17g", value);
    for (char *p = text; *p; p++) /* whatever the locale's decimal sign is */
        if (*p == ',')
            *p = '.';
    buffer_text(&line->text, text);
}

void line_begin(struct line *line, const char *kind)
{
    buffer_clear(&line->text);
    line->comma = false;
    buffer_text(&line->text, "{");
    line_text(line, "kind", kind);
}

void line_text(struct line *line, const char *key, const char *value)
{
    add_key(line, key);
    if (value)
        add_string(line, value);
    else
        buffer_text(&line->text, "null");
}

void line_real(struct line *line, const char *key, double value)
{
    add_key(line, key);
    add_real(line, value);
}

void line_integer(struct line *line, const char *key, long long value)
{
    add_key(line, key);
    buffer_format(&line->text, "%lld", value);
}

void line_boolean(struct line *line, const char *key, bool value)
{
    add_key(line, key);
    buffer_text(&line->text, value ? "true" : "false");
}

void line_null(struct line *line, const char *key)
{
    add_key(line, key);
    buffer_text(&line->text, "null");
}

void line_vector(struct line *line, const char *key, double complex z)
{
    if (!isfinite(creal(z)) || !isfinite(cimag(z))) {
        line_null(line, key);
        return;
    }
    const double parts[2] = {creal(z), cimag(z)};
    line_reals(line, key, parts, 2);
}

void line_covariance(struct line *line, const char *key, const double cov[3])
{
    line_reals(line, key, cov, 3);
}

void line_reals(struct line *line, const char *key, const double *values, size_t count)
{
    add_key(line, key);
    buffer_text(&line->text, "[");
    for (size_t i = 0; i < count; i++) {
        if (i)
            buffer_text(&line->text, ",");
        add_real(line, values[i]);
    }
    buffer_text(&line->text, "]");
}

void line_open(struct line *line, const char *key, char bracket)
{
    add_key(line, key);
    buffer_add(&line->text, &bracket, 1);
    line->comma = false;
}

void line_close(struct line *line, char bracket)
{
    buffer_add(&line->text, &bracket, 1);
    line->comma = true;
}

void line_end(struct line *line)
{
    buffer_text(&line->text, "}\n");
}

void line_release(struct line *line)
{
    buffer_release(&line->text);
}
