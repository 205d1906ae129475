#include "read/csv_rows.h"

#include <stdint.h>
#include <stdlib.h>
#include <string.h>

#include "read/decimal.h"

#define CELL_MOST (1024u * 1024u) /* a longer cell is an open quote */
#define SHOWN_MOST 24             /* bytes of a cell in a message */

static void *bounded_realloc(void *memory, size_t size)
{
    return size > CELL_MOST ? NULL : realloc(memory, size);
}

static void bad_cell(struct csv_rows *rows, const char *text, size_t length, int result)
{
    const int shown = length > SHOWN_MOST ? SHOWN_MOST : (int)length;
    fault_set(rows->fault, STATUS_RECORDING, "%s, '%.*s%s': '%s' (line %ld, column %zu)",
              result == DECIMAL_OUT_OF_RANGE ? "a number is out of range" : "a cell is no number",
              shown, text, length > SHOWN_MOST ? "..." : "", rows->path, rows->line,
              rows->column + 1);
}

static void empty_line(struct csv_rows *rows)
{
    fault_set(rows->fault, STATUS_RECORDING, "an empty line within the data: '%s' (line %ld)",
              rows->path, rows->empty_line);
}

static void take_time(struct csv_rows *rows, const char *text, size_t length, double value)
{
    static const char *const what[] = {
        [EVEN_BACKWARDS] = "the time goes backwards",
        [EVEN_GAP] = "the time column has a gap or an uneven step",
    };
    if (rows->empty_line) { /* before the gap that it makes */
        empty_line(rows);
        return;
    }
    const int result =
        even_next(rows->even, value * rows->time_si, decimal_grain(text, length, rows->decimal));
    if (result != EVEN_DONE)
        fault_set(rows->fault, STATUS_RECORDING, "%s at '%.*s': '%s' (line %ld, column %zu)",
                  what[result], length > SHOWN_MOST ? SHOWN_MOST : (int)length, text, rows->path,
                  rows->line, rows->column + 1);
}

static void on_cell(void *cell, size_t length, void *data)
{
    struct csv_rows *rows = data;
    const char *text = cell;
    const size_t column = rows->column;
    rows->row_open = true;
    if (length > 0)
        rows->filled = column + 1;
    if (column < rows->width && rows->fault->status == STATUS_DONE) {
        const int slot = rows->slot_of[column];
        const bool is_time = column == rows->time_column;
        if (slot >= 0 || is_time) {
            double value = 0;
            const int result = decimal_parse(text, length, rows->decimal, &value);
            if (length == 0 && rows->empty == 0)
                rows->empty = column + 1;
            if (result != DECIMAL_DONE && length > 0)
                bad_cell(rows, text, length, result);
            else if (slot >= 0)
                rows->values[rows->count * rows->slots + (size_t)slot] = value;
            if (is_time && result == DECIMAL_DONE)
                take_time(rows, text, length, value);
        }
    }
    rows->column = column + 1;
}

/* The row at hand is complete. */
static void end_row(struct csv_rows *rows)
{
    if (rows->fault->status != STATUS_DONE)
        return;
    if (rows->filled == 0) {
        if (!rows->empty_line)
            rows->empty_line = rows->line;
    } else if (rows->empty_line) {
        empty_line(rows);
    } else if (rows->filled != rows->width) {
        fault_set(rows->fault, STATUS_RECORDING,
                  "a row has %zu cells instead of %zu: '%s' (line %ld)", rows->filled, rows->width,
                  rows->path, rows->line);
    } else if (rows->empty) {
        fault_set(rows->fault, STATUS_RECORDING, "a cell is empty: '%s' (line %ld, column %zu)",
                  rows->path, rows->line, rows->empty);
    } else {
        rows->count++;
    }
}

/* Every newline and carriage return that stands outside of quotes. */
static void on_end(int mark, void *data)
{
    struct csv_rows *rows = data;
    if (rows->row_open) {
        end_row(rows);
        rows->fresh = false;
    } else if (mark == '\n' && rows->fresh && !rows->empty_line) {
        rows->empty_line = rows->line;
    }
    rows->row_open = false;
    rows->column = rows->filled = rows->empty = 0;
    if (mark == '\n') {
        rows->line++;
        rows->fresh = true;
    }
}

int csv_rows_init(struct csv_rows *rows, const struct csv_layout *layout, const size_t *columns,
                  size_t count, struct even *even, const char *path, struct fault *fault)
{
    *rows = (struct csv_rows){.slots = count,
                              .width = layout->width,
                              .time_column = layout->has_time ? layout->time_column : SIZE_MAX,
                              .time_si = layout->time_si,
                              .even = even,
                              .decimal = layout->decimal,
                              .line = layout->data_line,
                              .first_line = layout->data_line,
                              .fresh = true,
                              .path = path,
                              .fault = fault};
    /* a wanted cell takes a byte and a separator at least; one row may have begun before */
    const size_t room = CSV_ROWS_FEED_MOST / 2 + 2 * count + 2;
    rows->slot_of = malloc((layout->width ? layout->width : 1) * sizeof *rows->slot_of);
    rows->values = malloc(room * sizeof *rows->values);
    if (!rows->slot_of || !rows->values)
        return fault_no_memory(fault);
    for (size_t c = 0; c < layout->width; c++)
        rows->slot_of[c] = -1;
    for (size_t s = 0; s < count; s++)
        rows->slot_of[columns[s]] = (int)s;
    if (csv_init(&rows->parser, CSV_REPALL_NL) != 0)
        return fault_no_memory(fault);
    rows->parser_ready = true;
    csv_set_delim(&rows->parser, (unsigned char)layout->separator);
    csv_set_realloc_func(&rows->parser, bounded_realloc);
    return STATUS_DONE;
}

int csv_rows_feed(struct csv_rows *rows, const char *bytes, size_t length)
{
    /* the row that had begun moves to the front */
    const double *begun = rows->values + rows->count * rows->slots;
    memmove(rows->values, begun, rows->slots * sizeof *rows->values);
    rows->count = 0;
    if (csv_parse(&rows->parser, bytes, length, on_cell, on_end, rows) != length)
        return fault_set(rows->fault, STATUS_RECORDING,
                         "a cell is longer than 1 MiB, a quote may be open: '%s' (line %ld)",
                         rows->path, rows->line);
    return rows->fault->status;
}

int csv_rows_finish(struct csv_rows *rows)
{
    const double *begun = rows->values + rows->count * rows->slots;
    memmove(rows->values, begun, rows->slots * sizeof *rows->values);
    rows->count = 0;
    if (csv_fini(&rows->parser, on_cell, on_end, rows) != 0)
        return fault_no_memory(rows->fault);
    if (rows->even && rows->fault->status == STATUS_DONE && even_finish(rows->even) != EVEN_DONE)
        fault_set(rows->fault, STATUS_RECORDING, "the time column is uneven: '%s' (line %ld)",
                  rows->path, rows->first_line + (long)rows->even->drifted - 1);
    return rows->fault->status;
}

void csv_rows_release(struct csv_rows *rows)
{
    if (rows->parser_ready)
        csv_free(&rows->parser);
    rows->parser_ready = false;
    free(rows->values);
    free(rows->slot_of);
    rows->values = NULL;
    rows->slot_of = NULL;
}
