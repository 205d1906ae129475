/* csv_lanes.h - the rows of a clean text, cut by several threads at once.
 *
 * The text goes in parts of whole lines round a ring. Each part is cut into cells and numbers by a
 * csv_rows of its own, as if it were the start of the data, in a thread that runs ahead or in the
 * caller's, whichever comes to it first; the results do not depend on which. That is right only
 * where no line hangs on the one before it. Of a part with a quote, an empty line or any fault
 * nothing is said but that it is not clean: its text must be read again in one go, from the part's
 * first byte on, by a csv_rows that has skipped the lines before. */
#ifndef LOPSIDE_READ_CSV_LANES_H
#define LOPSIDE_READ_CSV_LANES_H

#include <stdbool.h>
#include <stddef.h>

#include "read/csv_layout.h"
#include "read/csv_rows.h"

struct csv_lanes;

struct csv_lanes_part {
    const struct csv_rows *rows; /* values, times, count. Borrowed */
    size_t length;               /* of its text, in bytes */
    long lines;
    bool clean; /* false: nothing else holds but the length */
};

/* `columns` as in csv_rows_init; `layout` is borrowed during the call. New; NULL: no memory, or no
 * thread. */
struct csv_lanes *csv_lanes_new(const struct csv_layout *layout, const size_t *columns,
                                size_t count);

/* Where the next bytes of the text may be put, and how many; NULL: all parts are full. */
char *csv_lanes_room(struct csv_lanes *lanes, size_t *room);

/* So many bytes were put there, at least one. What follows the last newline waits for the next.
 * False: no line ended in all of the room; no more can be taken. */
bool csv_lanes_fill(struct csv_lanes *lanes, size_t length) __attribute__((warn_unused_result));

/* The next part in the text's order, once it is cut. False: none is full. It stays valid until
 * csv_lanes_drop, which makes room. */
bool csv_lanes_next(struct csv_lanes *lanes, struct csv_lanes_part *part)
    __attribute__((warn_unused_result));
void csv_lanes_drop(struct csv_lanes *lanes);

void csv_lanes_free(struct csv_lanes *lanes); /* NULL is fine */

#endif
