/* tracker.h - the samples of one recording to blocks of 1x vectors, streaming.
 *
 * Joins pulse, marks, shaft, vector and window: samples are held until the shaft angle over them is
 * known, which takes a few turns, and are then summed and let go. At most TRACKER_HOLD bytes of
 * them are held; a stretch without marks that is longer than this is left out.
 *
 * Samples are worked on in chunks of TRACKER_CHUNK frames counted from the recording's start,
 * whatever sizes they come in: the same samples give the same results. */
#ifndef LOPSIDE_TRACK_TRACKER_H
#define LOPSIDE_TRACK_TRACKER_H

#include <stdbool.h>
#include <stddef.h>

#include "track/channel.h"
#include "track/marks.h"
#include "track/pulse.h"
#include "track/shaft.h"
#include "track/shape.h"
#include "track/spectrum.h"
#include "track/teeth.h"
#include "track/tone.h"
#include "track/window.h"

#define TRACKER_CHUNK 2048
#define TRACKER_HOLD (12L * 1024 * 1024)

struct tracker_set_up {
    double rate_hz;
    double frames; /* of the whole recording; 0: unknown */
    size_t columns;
    int tacho;          /* its column; -1: none */
    const double *rail; /* per column; NaN: unknown */
    int edge;           /* +1, -1 */
    int marks;          /* pulses a turn */
    double level;       /* NaN: to be found */
    double service_rpm; /* NaN: unknown; a hint for how long to look for levels, and without a tacho
                         * for which line is the shaft's */
    const int *derivatives; /* borrowed, per sensor, as in tone.h; NULL: all are velocities. Without
                             * a tacho only */
    bool sweeps;            /* the speed runs through a range: short blocks */
};

struct tracker {
    double rate_hz, frames;
    size_t columns, sensors;
    int tacho;
    float *data;          /* owned: columns planes of `room` frames */
    const float **planes; /* owned scratch: columns pointers, and as many to the sensors' */
    size_t room, most;    /* frames per plane now and at most */
    size_t fill;          /* frames held */
    long long start;      /* number of the first frame held */
    size_t done;          /* of the frames held, those that went through tracker_chunk */
    size_t searched;      /* of the frames held, those searched for pulses */
    double level_frames;  /* frames to look at for the levels */
    double silent;        /* frames searched since the last pulse */
    struct pulse_finder finder;
    struct marks marks;
    struct shaft shaft;
    struct teeth teeth;
    bool skipped; /* the turn before was not usable: the next one begins a stretch */
    struct windows windows;
    struct spectrum spectrum;
    struct channel *channels; /* owned, per column */
    struct channel_pairs pairs;
    struct shape shape; /* of the tacho */
    struct tone tone;   /* without a tacho, or while its channel shows nothing: `listening` */
    bool listening;
    bool sweeps;
    float *offset;            /* owned, per column: a rough mean that is taken off */
    struct vector_sums *sums; /* owned scratch: 2 * sensors */
    struct vector_weights weights;
    double turns, turn_mean, turn_squares; /* of turn speeds, rev/sample (Welford 1962) */
    double time;                           /* that these turns took, samples */
};

/* 0, or -1 when memory is out (nothing is kept). */
int tracker_init(struct tracker *tracker, const struct tracker_set_up *set_up)
    __attribute__((warn_unused_result));
void tracker_release(struct tracker *tracker);

/* Right after tracker_init: amplitudes alone would be of no use, so that a dead tacho gives
 * nothing.
 */
void tracker_phase_only(struct tracker *tracker);

/* n interleaved frames. 0, or -1 when memory is out. */
int tracker_add(struct tracker *tracker, const float *frames, size_t n)
    __attribute__((warn_unused_result));

/* The recording is over: windows, channels and the counts are complete. */
int tracker_finish(struct tracker *tracker) __attribute__((warn_unused_result));

/* True where the marks form a regular sequence, so that there are a speed and turns. */
bool tracker_regular(const struct tracker *tracker);

/* True where speed and amplitudes are those of the line in `tone`: there is no tacho, or its
 * channel is dead or noise, and a line was found. */
bool tracker_toned(const struct tracker *tracker);

/* True where phase may be read, too: a mark is the same place on the shaft every time. */
bool tracker_reference(const struct tracker *tracker);

/* Whether the tacho gives pulses at all, rather than vibration; see shape.h. */
bool tracker_pulsed(const struct tracker *tracker);

double tracker_speed(const struct tracker *tracker);   /* mean, rpm; NaN: unknown */
double tracker_scatter(const struct tracker *tracker); /* standard deviation of turn speeds, rpm */

#endif
