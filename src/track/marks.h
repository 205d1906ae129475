/* marks.h - pulses to marks: which pulses are the shaft's mark, which are missing, which are extra.
 *
 * The first pulses vote for a period and a start; from then on every mark is expected one period
 * after the one before, the pulse nearest to that is taken, others are set aside as extra, and
 * marks that did not come are put in. After a gap of more than MARKS_GAP turns the vote is taken
 * anew. */
#ifndef LOPSIDE_TRACK_MARKS_H
#define LOPSIDE_TRACK_MARKS_H

#include <stdbool.h>
#include <stddef.h>

#include "track/pulse.h"
#include "track/sieve.h"

#define MARKS_VOTERS 48       /* pulses that vote; more where there are several a turn, */
#define MARKS_VOTERS_MOST 512 /* but never more than this */
#define MARKS_GAP 6           /* turns that may be bridged */
#define MARKS_ROOM                                                                                 \
    ((MARKS_VOTERS_MOST + 2) * (MARKS_GAP + 1)) /* marks that one push can release                 \
                                                 */

struct mark {
    double at;   /* samples */
    bool real;   /* false: put in */
    bool breaks; /* a new stretch begins with it: turns before it were lost */
};

struct marks {
    int per_turn;
    bool reference; /* the marks given out are one place on the shaft */
    bool sifted;    /* it was tried to tell the pulses apart */
    struct sieve sieve;
    struct pulse voters[MARKS_VOTERS_MOST];
    size_t voter_count, quorum;
    long slot; /* of the next mark among those of a turn */
    bool locked;
    double period, last; /* samples; time of the last mark given out */
    double spread;       /* mean square of how far periods were off, as a share */
    double absent;       /* running share of the marks that did not come */
    bool has_candidate;
    double candidate;          /* the pulse that may become the next mark */
    long candidate_turns;      /* how many periods it lies behind `last` */
    long strays;               /* pulses set aside since the last mark */
    bool breaks;               /* the next mark begins a new stretch */
    long count, missed, extra; /* of the recording so far, within stretches */
    long between;              /* missing between them, where nothing was put in */
    int scratches;             /* pulses a turn that are told apart from the single mark, and */
    long beside;               /* pulses that the sieve left out */
};

/* `per_turn`: pulses a turn, as the user states. With more than one, the one that can be told apart
 * is the mark; where none can, every per_turn-th one is given out and `reference` is false. */
void marks_init(struct marks *marks, int per_turn);

/* Takes the next pulse; fills `out` (room for MARKS_ROOM) and returns how many marks came out. */
size_t marks_push(struct marks *marks, const struct pulse *pulse, struct mark *out);

/* Makes the vote now, with what has come so far (the caller cannot wait any longer). */
size_t marks_hurry(struct marks *marks, struct mark *out);

/* Forgets the rhythm: the next pulses vote anew, and the next mark begins a new stretch. */
void marks_unlock(struct marks *marks);

/* Pulses that were set aside, without those of scratches that come every turn beside a single mark
 * and are told apart from it: these are as good as marks of their own. */
long marks_extra(const struct marks *marks);

/* No more pulses: the marks that were held back. */
size_t marks_finish(struct marks *marks, struct mark *out);

#endif
