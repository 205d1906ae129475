#include "report/table.h"

#include <stdarg.h>
#include <stdio.h>
#include <stdlib.h>
#include <string.h>

#include "report/paper.h"

void table_init(struct table *table, const struct table_column *columns, size_t column_count)
{
    *table = (struct table){.columns = columns, .column_count = column_count, .gap = 2};
}

void table_release(struct table *table)
{
    for (size_t i = 0; i < table->cell_count; i++)
        free(table->cells[i]);
    free(table->cells);
    *table = (struct table){0};
}

static bool make_room(struct table *table)
{
    if (table->cell_count < table->room)
        return true;
    size_t room = table->room ? 2 * table->room : 64;
    char **cells = realloc(table->cells, room * sizeof *cells);
    if (!cells)
        return false;
    table->cells = cells;
    table->room = room;
    return true;
}

void table_cell(struct table *table, const char *format, ...)
{
    char text[1024]; /* cells hold names (40 bytes) and numbers */
    va_list list;
    va_start(list, format);
    vsnprintf(text, sizeof text, format, list);
    va_end(list);
    struct buffer clean = BUFFER_INIT;
    paper_clean(&clean, text);
    char *copy = clean.failed ? NULL : strdup(clean.bytes ? clean.bytes : "");
    buffer_release(&clean);
    if (!copy || !make_room(table)) {
        free(copy);
        table->failed = true;
        return;
    }
    table->cells[table->cell_count++] = copy;
}

/* Takes columns from the widest of those that may shrink until the row fits, or none can. */
static void shrink(const struct table *table, size_t *widths, size_t room)
{
    size_t total = (table->column_count - 1) * table->gap;
    for (size_t c = 0; c < table->column_count; c++)
        total += widths[c];
    for (; total > room; total--) {
        size_t *widest = NULL;
        for (size_t c = 0; c < table->column_count; c++) {
            bool can = table->columns[c].shrink && widths[c] > TABLE_SHRINK_LEAST;
            if (can && (!widest || widths[c] > *widest))
                widest = &widths[c];
        }
        if (!widest)
            return;
        --*widest;
    }
}

static void measure(const struct table *table, size_t indent, size_t *widths)
{
    for (size_t c = 0; c < table->column_count; c++)
        widths[c] = paper_width(table->columns[c].head);
    for (size_t i = 0; i < table->cell_count; i++) {
        size_t width = paper_width(table->cells[i]);
        if (width > widths[i % table->column_count])
            widths[i % table->column_count] = width;
    }
    shrink(table, widths, PAPER_WIDTH - indent);
}

static void pad(struct buffer *out, size_t columns)
{
    for (size_t i = 0; i < columns; i++)
        buffer_add(out, " ", 1);
}

static void cell_print(struct buffer *out, const char *text, size_t width, bool right)
{
    size_t points = paper_width(text);
    if (points > width) {
        size_t head = width / 2; /* both ends stay: names often differ in the last characters */
        buffer_add(out, text, paper_bytes(text, head));
        buffer_text(out, "\xe2\x80\xa6");
        buffer_text(out, text + paper_bytes(text, points - (width - head - 1)));
        return;
    }
    if (right)
        pad(out, width - points);
    buffer_text(out, text);
    if (!right)
        pad(out, width - points);
}

static void trim(struct buffer *out)
{
    while (out->length > 0 && out->bytes[out->length - 1] == ' ')
        out->bytes[--out->length] = '\0';
}

static void row_print(const struct table *table, size_t indent, const size_t *widths,
                      const char *const *cells, struct buffer *out)
{
    size_t at = indent;
    pad(out, indent);
    for (size_t c = 0; c < table->column_count; c++) {
        if (c > 0 && at + table->gap + widths[c] > PAPER_WIDTH) {
            trim(out);
            buffer_text(out, "\n");
            at = indent + 4;
            pad(out, at);
        } else if (c > 0) {
            pad(out, table->gap);
            at += table->gap;
        }
        cell_print(out, cells[c], widths[c], table->columns[c].right);
        at += widths[c];
    }
    trim(out);
    buffer_text(out, "\n");
}

void table_print(const struct table *table, size_t indent, struct buffer *out)
{
    if (table->failed)
        out->failed = 1;
    if (table->failed || table->cell_count < table->column_count)
        return;
    size_t widths[TABLE_COLUMNS_MOST];
    const char *heads[TABLE_COLUMNS_MOST];
    measure(table, indent, widths);
    for (size_t c = 0; c < table->column_count; c++)
        heads[c] = table->columns[c].head;
    row_print(table, indent, widths, heads, out);
    for (size_t i = 0; i + table->column_count <= table->cell_count; i += table->column_count)
        row_print(table, indent, widths, (const char *const *)table->cells + i, out);
}
