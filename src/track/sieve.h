/* sieve.h - which pulses are the one mark that can be told apart from the others of a turn.
 *
 * Among several pulses a turn one may be larger or smaller (height times width), or stand after a
 * longer or shorter gap. A sieve is a threshold on such a feature, taken relative to the recent
 * pulses so that growing pulses and changing speed do not matter. */
#ifndef LOPSIDE_TRACK_SIEVE_H
#define LOPSIDE_TRACK_SIEVE_H

#include <stdbool.h>
#include <stddef.h>

#include "track/pulse.h"

enum sieve_feature { SIEVE_OFF, SIEVE_SIZE, SIEVE_GAP };

struct sieve {
    enum sieve_feature feature;
    double sign, threshold; /* kept: sign*value > sign*threshold */
    double size, gap, last; /* running means of the pulses, and the last one's time */
    long seen, settle;      /* pulses since the start, and how many make the means (a turn) */
    bool doubt;             /* none was found, and more pulses might show one */
};

/* Height times width of a pulse, in whichever direction it is the shorter one. */
double sieve_size(const struct pulse *pulse);

/* Looks for a sieve that keeps one of `marks` (2 and more) pulses; the ones kept must come
 * regularly. The size is looked at before the gap, larger before smaller. `ratio` (above 1): how
 * many times larger the one class must be than the other. Up to SIEVE_MOST pulses are looked at.
 * Where two features name different marks and the first only just does, there is none: another
 * recording of the same shaft must not get another zero. Nor does a difference count that the
 * sampling may have made: two samples or less, where the marks keep their places between
 * the samples. False: the pulses cannot be told apart, and of `sieve` nothing was written but
 * `doubt`. */
#define SIEVE_MOST 512
bool sieve_find(struct sieve *sieve, const struct pulse *pulses, size_t count, int marks,
                double ratio);

/* The same, but the kept ones must be the larger ones, and the others must come regularly, too,
 * where marks is 2: what is left out is a scratch that comes every turn, not chance. */
bool sieve_find_large(struct sieve *sieve, const struct pulse *pulses, size_t count, int marks,
                      double ratio);

/* Forgets the running means, not the threshold. */
void sieve_restart(struct sieve *sieve);

/* True where the pulse is one to keep; every pulse has to be shown, in order. */
bool sieve_keeps(struct sieve *sieve, const struct pulse *pulse);

#endif
