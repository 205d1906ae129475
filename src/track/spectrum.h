/* spectrum.h - the order spectrum of every sensor, averaged over stretches of whole turns.
 *
 * Samples are averaged into equal steps of shaft angle, weighted by a triangle of two steps' width;
 * what would alias onto a low order is weakened by the square of that order over the steps of a
 * turn. A rectangular window over whole turns leaves every order that is a multiple of the
 * resolution in its own line, and the lines' powers add up to the signal's (Parseval). At most
 * SPECTRUM_MOST stretches, spread over the recording, are transformed.
 *
 * What does not turn with the shaft is looked for in a second, finer spectrum: stretches that
 * follow each other are joined to some SPECTRUM_FINE_S seconds and seen through a Hann window. */
#ifndef LOPSIDE_TRACK_SPECTRUM_H
#define LOPSIDE_TRACK_SPECTRUM_H

#include <stdbool.h>
#include <stddef.h>

#include "track/stray.h"
#include "track/vector.h"

#define SPECTRUM_TURNS 16 /* of one stretch: the resolution is 1/16 order */
#define SPECTRUM_MOST 48  /* stretches */
#define SPECTRUM_FINE                                                                              \
    12                     /* orders up to this come line by line, those above one order at a time \
                            */
#define SPECTRUM_LINES 400 /* room for the lines of one spectrum */
#define SPECTRUM_FINE_S 5  /* a line and a neighbour half a hertz off are two, */
#define SPECTRUM_FINE_TURNS 256 /* but no longer than this; the speed wanders */
#define SPECTRUM_FINE_LEAST 2   /* joined stretches in a recording, at least */

struct spectrum {
    size_t sensors, bins; /* bins: steps of angle per turn */
    size_t turns;         /* of a stretch; 0: not set up */
    size_t joined;        /* stretches of the finer spectrum; they are transformed or left out */
    double top;           /* highest order that is given */
    long every;           /* together: one group of that many is transformed */
    long stretch;         /* counts them */
    size_t turn;          /* within the stretch */
    double *grid;         /* owned: sensors * (turns * bins + 2), sums of weighted samples */
    double *share;        /* owned: turns * bins + 1, the weights */
    double *power;        /* owned: sensors * (turns*bins/2 + 1), sum of squared amplitudes */
    double *in, *out;     /* owned, for the transforms */
    void *plan;           /* owned */
    long count;           /* stretches transformed */
    size_t held;          /* stretches in `fine` */
    float *fine;          /* owned: sensors * joined * turns * bins, means by angle */
    double *fine_power;   /* owned: sensors * fine_count, as in stray.h */
    double *locked;       /* owned: sensors * halves, as in stray.h */
    size_t halves;        /* multiples of half an order among the powers */
    void *fine_plan;      /* owned */
    size_t fine_count;    /* powers, up to order SPECTRUM_FINE */
    long fine_sum;        /* how many transforms were added */
    double samples;       /* of the present turn, */
    double weighed, used; /* their sums through the window: of the joined turns, of all of them */
    size_t step[VECTOR_PIECE];  /* of the present piece's samples, and */
    float beyond[VECTOR_PIECE]; /* how far beyond it they lie, steps */
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

/* The largest lines of a sensor that do not turn with the shaft, as stray_find says, their places
 * in cycles per sample instead of orders. `out` has room for STRAY_MOST. Returns how many. */
size_t spectrum_strays(const struct spectrum *spectrum, size_t sensor, struct stray *out);

#endif
