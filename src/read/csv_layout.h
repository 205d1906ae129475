/* csv_layout.h - finds out how a text of numbers is laid out, from its first lines. */
#ifndef LOPSIDE_READ_CSV_LAYOUT_H
#define LOPSIDE_READ_CSV_LAYOUT_H

#include <stdbool.h>
#include <stddef.h>

#include "read/fault.h"

/* What is known beforehand. */
struct csv_wish {
    char separator;          /* ',', ';', '\t'; 0: to be found */
    char decimal;            /* '.', ','; 0: to be found */
    int skip;                /* lines before the header or the data; -1: to be found */
    const char *time_column; /* name or number from 1; "none"; "": to be found. Borrowed */
    bool first_is_channel;   /* the first column is a channel, never the time */
};

#define CSV_NAME_ROWS 2 /* rows of text right before the data that may hold names and units */

struct csv_layout {
    char separator, decimal;
    size_t data_offset; /* of the first row of data, in bytes */
    long data_line;     /* its line, from 1 */
    size_t width;       /* columns, empty ones at the end of a row left out */
    char **names;       /* owned: name_rows rows of `width` texts, outer blanks taken off */
    size_t name_rows;
    bool has_time;
    size_t time_column; /* from 0 */
    double time_si;     /* seconds per unit of the time column */
};

/* Finds the layout from the first bytes of a text; `whole` where they are all of it. `path` is for
 * messages. Two readings of the separators that are both possible are a fault, not a guess. */
int csv_layout_find(struct csv_layout *layout, const char *head, size_t length, bool whole,
                    const struct csv_wish *wish, const char *path, struct fault *fault)
    __attribute__((warn_unused_result));

/* Index of the column with that name (with or without a unit in brackets behind it); -1: none, -2:
 * several. */
int csv_layout_column(const struct csv_layout *layout, const char *name);

void csv_layout_release(struct csv_layout *layout);

#endif
