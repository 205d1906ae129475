/* progress.h - how far the reading is, on a terminal, where the work is long. */
#ifndef LOPSIDE_DESK_PROGRESS_H
#define LOPSIDE_DESK_PROGRESS_H

#include <stdbool.h>
#include <stddef.h>

#include "read/read.h"

#define PROGRESS_AFTER 2.0 /* s: what takes less is not long */
#define PROGRESS_EVERY 250 /* ms */

struct progress {
    struct read_progress
        *shared;  /* owned, shared with the children; NULL: nothing is to be shown */
    double began; /* s */
    bool shown;   /* a line stands on the terminal */
};

/* Before the stages are started. Shows nothing unless standard error is a terminal on which this
 * process may write. */
void progress_begin(struct progress *progress);

/* Every PROGRESS_EVERY; writes the line to standard error once PROGRESS_AFTER is over. */
void progress_show(struct progress *progress);

/* Takes the line away; nothing is shown any more. */
void progress_end(struct progress *progress);

/* The line, without control characters: "34 % of 2.1 GB, 180 MB/s, 8 s left". `text` has `room`
 * bytes (64 hold all). done and total in bytes, seconds since the beginning; total 0: "". */
void progress_text(char *text, size_t room, double done, double total, double seconds);

#endif
