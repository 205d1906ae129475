/* spectrum.h - the order spectrum of every sensor, averaged over stretches of whole turns.
 *
 * Samples are averaged into equal steps of shaft angle; a rectangular window over whole turns
 * leaves every order that is a multiple of the resolution in its own line, and the lines' powers
 * add up to the signal's (Parseval). At most SPECTRUM_MOST stretches, spread over the recording,
 * are transformed. */
#ifndef LOPSIDE_TRACK_SPECTRUM_H
#define LOPSIDE_TRACK_SPECTRUM_H

#include <stdbool.h>
#include <stddef.h>

#include "track/vector.h"

#define SPECTRUM_TURNS 16 /* of one stretch: the resolution is 1/16 order */
#define SPECTRUM_MOST 48  /* stretches */
#define SPECTRUM_FINE                                                                              \
    12                     /* orders up to this come line by line, those above one order at a time \
                            */
#define SPECTRUM_LINES 400 /* room for the lines of one spectrum */

struct spectrum {
    size_t sensors, bins; /* bins: steps of angle per turn */
    size_t turns;         /* of a stretch; 0: not set up */
    double top;           /* highest order that is given */
    long every;           /* one stretch of that many is transformed */
    long stretch;         /* counts them */
    size_t turn;          /* within the stretch */
    double *grid;         /* owned: sensors * turns * bins, sums of weighted samples */
    double *share;        /* owned: turns * bins, the weights */
    double *power;        /* owned: sensors * (turns*bins/2 + 1), sum of squared amplitudes */
    double *complex_out;  /* owned, for the transform */
    void *plan;           /* owned */
    long count;           /* stretches transformed */
};

/* `period` (samples per turn) and `frames` (0: unknown) in samples. 0, or -1 when memory is out. */
int spectrum_init(struct spectrum *spectrum, size_t sensors, double rate_hz, double period,
                  double frames) __attribute__((warn_unused_result));
void spectrum_end(struct spectrum *spectrum);

/* True where the turn that comes now is to be added. */
bool spectrum_wants(const struct spectrum *spectrum);

/* Adds a piece of the present turn: the weights before any ramp, and a sensor's samples. The
 * sensor 0 must come first. */
void spectrum_add(struct spectrum *spectrum, const struct vector_weights *weights, size_t sensor,
                  const float *x, float offset);

/* The present turn is over. */
void spectrum_turn(struct spectrum *spectrum);

/* Turns were lost: begin the stretch anew. */
void spectrum_break(struct spectrum *spectrum);

/* The lines of a sensor: orders, and amplitudes (peak) whose squares over two add up to the power.
 * Both have room for SPECTRUM_LINES. Returns how many; 0: no whole stretch was seen. */
size_t spectrum_lines(const struct spectrum *spectrum, size_t sensor, double *orders,
                      double *amplitude);

#endif
