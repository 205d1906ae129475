/* csv_rows.h - the data rows of a text of separated columns, from bytes to numbers.
 *
 * libcsv cuts the text into cells; the wanted ones become doubles, the others are passed over. */
#ifndef LOPSIDE_READ_CSV_ROWS_H
#define LOPSIDE_READ_CSV_ROWS_H

#include <csv.h>
#include <stdbool.h>
#include <stddef.h>

#include "read/csv_layout.h"
#include "read/even.h"
#include "read/fault.h"

#define CSV_ROWS_FEED_MOST 65536u /* bytes at a time, which bounds the memory */

struct csv_rows {
    double *values; /* owned: rows that are ready, interleaved by slot */
    double *times;  /* owned: their times as printed, where nobody judges them; or NULL */
    struct decimal_grain *grains; /* owned: of those times */
    size_t count;                 /* of those rows */
    size_t slots;                 /* wanted columns */
    /* all that follows is private */
    struct csv_parser parser;
    bool parser_ready;
    int *slot_of;         /* per column: slot, or what else it is */
    double *row;          /* of the values: the row at hand */
    size_t width, column; /* of the layout; of the cell at hand */
    size_t filled;        /* columns of the row at hand up to the last that is not empty */
    size_t empty;         /* first wanted cell of the row that is empty, from 1; 0: none */
    double time_si;
    struct even *even; /* borrowed; NULL: no time column, or nobody judges it */
    char decimal;
    long line, first_line; /* of the row at hand; of the first */
    long empty_line;       /* of the first empty row since the last one with data; 0: none */
    bool row_open;         /* cells came since the last end of line */
    bool fresh;            /* no row ended since the last newline */
    const char *path;      /* borrowed */
    struct fault *fault;   /* borrowed */
};

/* `columns` (from 0, each once, none of them the time's) get the slots in that order. `even` judges
 * the time column, if the layout has one; NULL: the times are handed out beside the values. `path`,
 * `even` and `fault` are borrowed until the release. */
int csv_rows_init(struct csv_rows *rows, const struct csv_layout *layout, const size_t *columns,
                  size_t count, struct even *even, const char *path, struct fault *fault)
    __attribute__((warn_unused_result));

/* Takes the next bytes, at most CSV_ROWS_FEED_MOST, from the start of the data on. Rows that became
 * complete stand in values[0..count*slots) until the next call. Faults, each with its line: a row
 * with too few or too many cells, a cell that is no number, an empty line within the data, a time
 * that is uneven, a cell of more than 1 MiB. */
int csv_rows_feed(struct csv_rows *rows, const char *bytes, size_t length)
    __attribute__((warn_unused_result));

/* Takes whole lines that somebody else read, and that were clean, for read. Only between two rows,
 * while none was empty. */
void csv_rows_skip(struct csv_rows *rows, long lines);

/* Whether what came so far, whole lines without quotes, had no fault and no empty line. */
bool csv_rows_clean(const struct csv_rows *rows);

/* No more bytes: the last row may lack its newline. */
int csv_rows_finish(struct csv_rows *rows) __attribute__((warn_unused_result));

void csv_rows_release(struct csv_rows *rows);

#endif
