#include "report/html_part.h"

#include <stdarg.h>
#include <stdbool.h>
#include <stdio.h>
#include <string.h>

#include "report/svg.h"

void html_part_heading(struct buffer *out, const char *heading)
{
    buffer_format(out, "<h2>%s</h2>\n", heading);
}

void html_part_say(struct buffer *out, const char *class, const char *format, ...)
{
    char text[1200]; /* the longest text of a record is 400 bytes */
    va_list list;
    va_start(list, format);
    vsnprintf(text, sizeof text, format, list);
    va_end(list);
    buffer_format(out, "<p class=\"%s\">", class);
    svg_escape(out, text);
    buffer_text(out, "</p>\n");
}

void html_part_take(struct buffer *out, const char *element, struct buffer *text)
{
    if (text->failed)
        out->failed = 1;
    buffer_format(out, "<%s>", element);
    if (!text->failed && text->bytes)
        svg_escape(out, text->bytes);
    buffer_format(out, "</%s>\n", element);
    buffer_release(text);
}

#define WHOLE_MOST 8 /* characters of a cell that stay on one line, also on a phone */

static void cell(struct buffer *out, const char *element, const struct table_column *column,
                 const char *text)
{
    bool bad = strcmp(text, "REFUSED") == 0 || strcmp(text, "UNREAD") == 0;
    /* A figure and its unit, as "fit 40 g": never parted. */
    bool whole = strlen(text) <= WHOLE_MOST && strpbrk(text, "0123456789");
    const char *class = column->right ? (whole ? " class=\"r k\"" : " class=\"r\"")
                        : bad         ? " class=\"no\""
                                      : "";
    buffer_format(out, "<%s%s>", element, class);
    svg_escape(out, text);
    buffer_format(out, "</%s>", element);
}

void html_part_table(struct buffer *out, struct table *table)
{
    if (table->failed)
        out->failed = 1;
    if (!table->failed && table->cell_count > 0) {
        buffer_text(out, "<div class=\"wide\"><table><thead><tr>");
        for (size_t c = 0; c < table->column_count; c++)
            cell(out, "th", &table->columns[c], table->columns[c].head);
        buffer_text(out, "</tr></thead><tbody>\n");
        for (size_t i = 0; i < table->cell_count; i++) {
            size_t c = i % table->column_count;
            buffer_text(out, c == 0 ? "<tr>" : "");
            cell(out, "td", &table->columns[c], table->cells[i]);
            buffer_text(out, c + 1 == table->column_count ? "</tr>\n" : "");
        }
        buffer_text(out, "</tbody></table></div>\n");
    }
    table_release(table);
}
