#include "read/csv_rows.h"

#include <stdlib.h>
#include <string.h>

#include "read/decimal.h"

#define CELL_MOST (1024u * 1024u) /* a longer cell is an open quote */
#define SHOWN_MOST 24             /* bytes of a cell in a message */

enum { SLOT_NONE = -1, SLOT_TIME = -2 };

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

static void judge_time(struct csv_rows *rows, const char *text, size_t length, double time,
                       struct decimal_grain grain)
{
    static const char *const what[] = {
        [EVEN_BACKWARDS] = "the time goes backwards",
        [EVEN_GAP] = "the time column has a gap or an uneven step",
    };
    if (rows->empty_line) { /* before the gap that it makes */
        empty_line(rows);
        return;
    }
    const int result = even_next(rows->even, time * rows->time_si, grain);
    if (result != EVEN_DONE)
        fault_set(rows->fault, STATUS_RECORDING, "%s at '%.*s': '%s' (line %ld, column %zu)",
                  what[result], length > SHOWN_MOST ? SHOWN_MOST : (int)length, text, rows->path,
                  rows->line, rows->column + 1);
}

static void no_number(struct csv_rows *rows, const char *text, size_t length, int result)
{
    if (length > 0)
        bad_cell(rows, text, length, result);
    else if (rows->empty == 0)
        rows->empty = rows->column + 1;
}

static void take_time(struct csv_rows *rows, const char *text, size_t length)
{
    double time;
    struct decimal_grain grain;
    const int result = decimal_parse_grain(text, length, rows->decimal, &time, &grain);
    if (result != DECIMAL_DONE) {
        no_number(rows, text, length, result);
    } else if (rows->even) {
        judge_time(rows, text, length, time, grain);
    } else {
        rows->times[rows->count] = time;
        rows->grains[rows->count] = grain;
    }
}

static void on_cell(void *cell, size_t length, void *data)
{
    struct csv_rows *rows = data;
    const size_t column = rows->column;
    rows->row_open = true;
    if (length > 0)
        rows->filled = column + 1;
    if (column < rows->width && rows->fault->status == STATUS_DONE) {
        const int slot = rows->slot_of[column];
        if (slot >= 0) {
            const int result = decimal_parse(cell, length, rows->decimal, &rows->row[slot]);
            if (result != DECIMAL_DONE)
                no_number(rows, cell, length, result);
        } else if (slot == SLOT_TIME) {
            take_time(rows, cell, length);
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
        rows->row += rows->slots;
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
    if (layout->has_time && !even) { /* a time, too, takes two bytes */
        rows->times = malloc((CSV_ROWS_FEED_MOST / 2 + 2) * sizeof *rows->times);
        rows->grains = malloc((CSV_ROWS_FEED_MOST / 2 + 2) * sizeof *rows->grains);
        if (!rows->times || !rows->grains)
            return fault_no_memory(fault);
    }
    rows->row = rows->values;
    for (size_t c = 0; c < layout->width; c++)
        rows->slot_of[c] = SLOT_NONE;
    if (layout->has_time)
        rows->slot_of[layout->time_column] = SLOT_TIME;
    for (size_t s = 0; s < count; s++)
        rows->slot_of[columns[s]] = (int)s;
    if (csv_init(&rows->parser, CSV_REPALL_NL) != 0)
        return fault_no_memory(fault);
    rows->parser_ready = true;
    csv_set_delim(&rows->parser, (unsigned char)layout->separator);
    csv_set_realloc_func(&rows->parser, bounded_realloc);
    return STATUS_DONE;
}

/* Room for the next rows: the one that had begun moves to the front. */
static void hand_over(struct csv_rows *rows)
{
    memmove(rows->values, rows->row, rows->slots * sizeof *rows->values);
    if (rows->times) {
        rows->times[0] = rows->times[rows->count];
        rows->grains[0] = rows->grains[rows->count];
    }
    rows->row = rows->values;
    rows->count = 0;
}

void csv_rows_skip(struct csv_rows *rows, long lines)
{
    rows->line += lines;
}

bool csv_rows_clean(const struct csv_rows *rows)
{
    return rows->fault->status == STATUS_DONE && !rows->empty_line;
}

int csv_rows_feed(struct csv_rows *rows, const char *bytes, size_t length)
{
    hand_over(rows);
    if (csv_parse(&rows->parser, bytes, length, on_cell, on_end, rows) != length)
        return fault_set(rows->fault, STATUS_RECORDING,
                         "a cell is longer than 1 MiB, a quote may be open: '%s' (line %ld)",
                         rows->path, rows->line);
    return rows->fault->status;
}

int csv_rows_finish(struct csv_rows *rows)
{
    hand_over(rows);
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
    free(rows->grains);
    free(rows->times);
    free(rows->values);
    free(rows->slot_of);
    rows->grains = NULL;
    rows->times = NULL;
    rows->values = NULL;
    rows->slot_of = NULL;
}
