#include "report/csv.h"

#include <math.h>
#include <string.h>

#include "report/paper.h"

static void begin(struct csv *csv)
{
    if (csv->cells++ > 0)
        buffer_add(csv->out, ",", 1);
}

/* Nothing of a stream reaches a terminal or a spreadsheet as a control character: as in the text.
 */
static void quoted(struct csv *csv, const char *raw, int guard)
{
    struct buffer clean = BUFFER_INIT;
    paper_clean(&clean, raw);
    const char *text = clean.bytes && !clean.failed ? clean.bytes : "";
    csv->out->failed = csv->out->failed || clean.failed;
    if (!guard && text[strcspn(text, "\",\r\n")] == '\0') {
        buffer_text(csv->out, text);
    } else {
        buffer_text(csv->out, guard ? "\"'" : "\"");
        for (; *text; text++) {
            if (*text == '"')
                buffer_add(csv->out, "\"", 1);
            buffer_add(csv->out, text, 1);
        }
        buffer_add(csv->out, "\"", 1);
    }
    buffer_release(&clean);
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
