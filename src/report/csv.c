#include "report/csv.h"

#include <math.h>
#include <string.h>

static void begin(struct csv *csv)
{
    if (csv->cells++ > 0)
        buffer_add(csv->out, ",", 1);
}

static void quoted(struct csv *csv, const char *text, int guard)
{
    if (!guard && text[strcspn(text, "\",\r\n")] == '\0') {
        buffer_text(csv->out, text);
        return;
    }
    buffer_text(csv->out, guard ? "\"'" : "\"");
    for (; *text; text++) {
        if (*text == '"')
            buffer_add(csv->out, "\"", 1);
        buffer_add(csv->out, text, 1);
    }
    buffer_add(csv->out, "\"", 1);
}

void csv_text(struct csv *csv, const char *text)
{
    begin(csv);
    if (!text || !*text)
        return;
    char first = text[strspn(text, " ")];
    quoted(csv, text, first != '\0' && strchr("=+-@\t\r", first) != NULL);
}

void csv_plain(struct csv *csv, const char *text)
{
    begin(csv);
    quoted(csv, text, 0);
}

void csv_number(struct csv *csv, double value)
{
    begin(csv);
    if (isfinite(value))
        buffer_format(csv->out, "%.6g", value == 0 ? 0.0 : value);
}

void csv_integer(struct csv *csv, long long value)
{
    begin(csv);
    buffer_format(csv->out, "%lld", value);
}

void csv_row(struct csv *csv)
{
    buffer_add(csv->out, "\r\n", 2);
    csv->cells = 0;
}

void csv_head(struct csv *csv, const char *const *heads)
{
    for (; *heads; heads++)
        csv_plain(csv, *heads);
    csv_row(csv);
}
