/* csv_file.h - a recording as a text of separated columns, read a few rows at a time. */
#ifndef LOPSIDE_READ_CSV_FILE_H
#define LOPSIDE_READ_CSV_FILE_H

#include <stddef.h>

#include "read/csv_lanes.h"
#include "read/csv_layout.h"
#include "read/csv_rows.h"
#include "read/digest.h"
#include "read/fault.h"

struct csv_file {
    const char *path; /* borrowed, for messages */
    int fd;           /* private */
    long long size;   /* private: bytes of the file */
    struct csv_layout layout;
    struct csv_rows rows;         /* private: reads in one go what the lanes do not */
    struct csv_lanes *lanes;      /* private; NULL: none, or no more */
    const struct csv_rows *ready; /* private: the rows that are handed out */
    struct even even;             /* private */
    char *chunk;                  /* private */
    long long offset;             /* private: of the text that comes behind the ready rows */
    long long fetched;            /* private: of the text that the lanes do not have yet */
    size_t taken;                 /* private: rows handed out of those that are ready */
    bool ended;                   /* private */
    double uncertainty;           /* of that rate, relative: how coarsely the times are printed */
    double rate_hz;               /* from the time column; NaN: there is none */
    long long frames;             /* rows of data */
    long long done;               /* rows handed out so far */
};

/* Opens the text and finds its layout. `path` and `digest` (of the whole file) are borrowed. */
int csv_file_open(struct csv_file *file, const char *path, const struct csv_wish *wish,
                  const struct digest *digest, struct fault *fault)
    __attribute__((warn_unused_result));

/* Says which columns are wanted, from 0, each once; then the rows can be read. */
int csv_file_start(struct csv_file *file, const size_t *columns, size_t count, struct fault *fault)
    __attribute__((warn_unused_result));

/* Up to `frames` rows of the wanted columns, interleaved: a pointer that is valid until the next
 * call. *got is 0 at the end only. Faults: see csv_rows.h; also fewer or more rows than were
 * counted. */
int csv_file_read(struct csv_file *file, size_t frames, const double **rows, size_t *got,
                  struct fault *fault) __attribute__((warn_unused_result));

void csv_file_close(struct csv_file *file); /* once opened, even in vain, or all zero with fd -1 */

#endif
