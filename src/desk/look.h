/* look.h - a short look at a recording before the long work: what is on each of its columns? */
#ifndef LOPSIDE_DESK_LOOK_H
#define LOPSIDE_DESK_LOOK_H

#include <stdbool.h>
#include <stddef.h>

#include "read/fault.h"
#include "read/recording.h"
#include "track/tracker.h"

#define LOOK_SECONDS 20.0 /* of each recording: two hundred turns at 600 rpm */

struct look_column {
    double min, max;   /* SI of the column */
    double rail;       /* |value| at full scale; NaN: not known */
    double resolution; /* smallest step between two values; 0: constant */
    long long railed;  /* samples at full scale or held at an extreme */
    int same_as;       /* column with the same signal; -1: none */
    bool pulses;       /* looked at as a tacho: pulses that come regularly */
    bool reference;    /* and that are one place on the shaft */
    bool two_levels;   /* looked at as a tacho: nearly always at one of two levels */
    double speed_rpm;  /* NaN: unknown */
    double once;       /* 1x amplitude (peak), SI of the column; NaN: not known, no tacho that tells */
};

struct look {
    double rate_hz;
    long long frames;            /* of the recording */
    long long seen;              /* of them looked at */
    struct look_column *columns; /* owned, as wished */
    size_t count;
    char (*sha256)[65]; /* owned, one a file */
    size_t file_count;
};

struct look_tacho {
    int column;      /* the one that is the tacho; -1: none; LOOK_EACH: try each */
    int edge, marks; /* as in tracker_set_up */
    double level, service_rpm;
};

#define LOOK_EACH (-2)

/* Reads the first LOOK_SECONDS. `wish` as for recording_open, but for its digests, which are taken
 * here: `paths` count. Returns a status; not STATUS_DONE: its line is in `fault` and nothing is
 * kept. */
int look_at(struct look *look, const struct recording_wish *wish, const struct look_tacho *tacho,
            struct fault *fault) __attribute__((warn_unused_result));
void look_release(struct look *look); /* also when all zero */

/* Share of values near the two extremes, over n values (which are sorted in place): of a pulse
 * train nearly 1, of a sine 0.59, of noise less. NaN for n = 0 or a constant.
 * Near: within a fifth of the range of the inner 99.8 %. */
double look_extremes(float *values, size_t n);

#endif
