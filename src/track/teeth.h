/* teeth.h - the speed ripple within the turn, from all the marks of a toothed wheel of which one
 * can be told apart. The mark that comes once a turn cannot show it.
 *
 * Where each mark stands is read from the first turns (medians of at least TEETH_TURNS, against a
 * cubic through the marks that are told apart, so that wandering speed does not count). The
 * recording alone cannot tell a ripple that is locked to the shaft from marks at unequal angles, so
 * a choice is made: where the spacings of the marks but the reference, TEETH_WHEEL of them or more
 * in a turn, lie within TEETH_TOLERANCE of even, they are a toothed wheel and taken for exactly
 * even; one or two teeth may be missing. Where the reference stands among them makes no difference.
 * Fewer marks, or marks that are less even (tapes laid by hand), are left alone: the curve is then
 * the one through the reference marks.
 *
 * The differences between the marks' angles and that curve, means over the latest TEETH_MEMORY
 * turns, are fitted by harmonics of the turn, a quarter as many as marks, and a constant (least
 * squares). The harmonics less their sum at the turn's ends are the ripple: zero stays the
 * reference alone. The means leave what is locked to the shaft and average the scatter of single
 * marks away; a ripple at a broken order is not followed. */
#ifndef LOPSIDE_TRACK_TEETH_H
#define LOPSIDE_TRACK_TEETH_H

#include <stdbool.h>
#include <stddef.h>

#include "track/shaft.h"

#define TEETH_MOST 64        /* more marks a turn: only the one that is told apart counts */
#define TEETH_WHEEL 8        /* so many tapes are not laid by hand */
#define TEETH_TOLERANCE 0.08 /* of a spacing: half of what tells a mark apart by it (15 %) */
#define TEETH_TURNS 6        /* for a median */
#define TEETH_LEARN 16       /* turns of the first reading, at most */
#define TEETH_MEMORY 64      /* turns: 1 degree of scatter becomes 0.1 degrees */

struct teeth {
    int per_turn;              /* 0: out of use, as where the marks are no wheel's */
    double *at;                /* owned: times of the latest pulses, a ring */
    long room, next;           /* its places; pulses so far */
    double mark[4];            /* the latest reference marks of the stretch */
    int marks;                 /* how many of them count */
    double *learnt;            /* owned: per_turn places for each of TEETH_LEARN turns */
    long turns;                /* learnt */
    int odd;                   /* mark that is none of the wheel's */
    bool decided;              /* the places are settled */
    double place[TEETH_MOST];  /* of each mark, turns from the reference */
    double ripple[TEETH_MOST]; /* mean of place less curve, turns */
    long seen[TEETH_MOST];     /* turns that it rests on */
    struct shaft_ripple fitted;
};

/* `per_turn` marks a turn; out of use below TEETH_WHEEL - 2 and above TEETH_MOST. 0, or -1 when
 * memory is out. */
int teeth_init(struct teeth *teeth, int per_turn) __attribute__((warn_unused_result));
void teeth_release(struct teeth *teeth);

/* A pulse came, of whatever mark; time in samples, later than the one before. */
void teeth_pulse(struct teeth *teeth, double at);

/* The next reference mark; not `real`: it was put in. */
void teeth_mark(struct teeth *teeth, double at, bool real);

/* The next mark begins a new stretch. */
void teeth_break(struct teeth *teeth);

/* Gives the turn its ripple (borrowed, until the next call). The turn stays as it is where the
 * marks are no wheel's, or their places are not known yet. */
void teeth_bend(struct teeth *teeth, struct shaft_turn *turn);

#endif
