/* table.h - columns of text that never pass the paper's width.
 *
 * Cells are given row by row. Each column is as wide as its widest cell; where all of them are too
 * wide, the columns marked `shrink` give way and their long cells get an ellipsis in the middle.
 * Where even that is not enough a row is carried on in the next line at a column's border: a number
 * is never cut.
 */
#ifndef LOPSIDE_REPORT_TABLE_H
#define LOPSIDE_REPORT_TABLE_H

#include <stdbool.h>
#include <stddef.h>

#include "base/buffer.h"

#define TABLE_COLUMNS_MOST 12

struct table_column {
    const char *head; /* borrowed */
    bool right;       /* aligned right */
    bool shrink;      /* may be shortened, down to TABLE_SHRINK_LEAST */
};
#define TABLE_SHRINK_LEAST 6

struct table {
    const struct table_column *columns; /* borrowed */
    size_t column_count;                /* 1..TABLE_COLUMNS_MOST */
    char **cells;                       /* owned, row after row */
    size_t cell_count, room;
    size_t gap;  /* blanks between columns; 2 after table_init */
    bool failed; /* memory ran out */
};

void table_init(struct table *table, const struct table_column *columns, size_t column_count);
void table_cell(struct table *table, const char *format, ...) __attribute__((format(printf, 2, 3)));
/* Appends the head and all rows, each indented by `indent` columns. Nothing without rows. */
void table_print(const struct table *table, size_t indent, struct buffer *out);
void table_release(struct table *table);

#endif
