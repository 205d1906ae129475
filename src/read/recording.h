/* recording.h - the files of one run as one stream of calibrated frames.
 *
 * Channels count on from file to file: with four in the first, the second file's first one is 5. */
#ifndef LOPSIDE_READ_RECORDING_H
#define LOPSIDE_READ_RECORDING_H

#include <stdbool.h>
#include <stddef.h>

#include "read/csv_layout.h"
#include "read/digest.h"
#include "read/fault.h"

struct recording_column {
    const char *name;    /* for messages. Borrowed */
    const char *channel; /* number from 1, or a CSV column's name. Borrowed */
    bool volts;          /* the column is a voltage */
    bool plain;          /* the unit does not matter: whole numbers need no calibration (a tacho) */
    double si;           /* SI per volt, or per unit of the column */
};

struct recording_wish {
    char *const *paths;                  /* at least one. Borrowed */
    const struct digest *const *digests; /* one a path, without faults. Borrowed */
    size_t path_count;
    const struct recording_column *columns; /* at least one. Borrowed during the call */
    size_t column_count;
    double full_scale; /* V at digital full scale; NaN: not known */
    double rate_hz;    /* for a text without a time column; NaN: not known */
    struct csv_wish csv;
};

struct recording_source; /* private: one file */

struct recording {
    double rate_hz;
    long long frames;
    double *rails; /* owned: one a column, |SI| at full scale; NaN: not known */
    size_t column_count;
    struct recording_source *sources;  /* private */
    size_t source_count;               /* private */
    bool whole_numbers;                /* private: nothing in it can be out of range */
    const struct recording_wish *wish; /* borrowed */
};

/* Opens all files and finds all columns. STATUS_RECORDING: unreadable, cut short, a missing
 * channel, different rates or lengths; STATUS_USAGE: a calibration that the sheet lacks. `wish` is
 * borrowed until the close. */
int recording_open(struct recording *recording, const struct recording_wish *wish,
                   struct fault *fault) __attribute__((warn_unused_result));

/* Exactly min(frames, what is left) frames into samples[frames*column_count], interleaved. *got is
 * 0 at the end, after which the files were found complete and unchanged. */
int recording_read(struct recording *recording, float *samples, size_t frames, size_t *got,
                   struct fault *fault) __attribute__((warn_unused_result));

void recording_close(struct recording *recording); /* opened, even in vain, or all zero */

#endif
