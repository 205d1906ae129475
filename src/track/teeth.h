/* teeth.h - the speed ripple within the turn, from all the marks of a toothed wheel of which one
 * can be told apart. The mark that comes once a turn cannot show it.
 *
 * Where each mark stands is read from the first turns (medians of at least TEETH_TURNS, against a
 * cubic through the marks that are told apart, so that wandering speed does not count). The
 * recording alone cannot tell a ripple that is locked to the shaft from marks at unequal angles, so
 * a choice is made, by what each of them looks like: a ripple is smooth, so a few harmonics explain
 * how far the marks are from even, and unequal marks are off at random.
 *
 * (a) TEETH_WHEEL marks or more, their spacings within TEETH_TOLERANCE of even, and either smooth
 * (the harmonics explain TEETH_SMOOTH times as much a term as is left a degree of freedom: Fisher's
 * ratio) or within TEETH_EVEN of even: a toothed wheel, taken for exactly even. One or two teeth
 * may be missing, and where the reference stands among them makes no difference.
 *
 * (b) Fewer, but TEETH_LEAST or more: tapes or bolts. They are taken for even only with the
 * reference among them, within TEETH_SWING of even (which is what a swing of speed by 2 % within
 * the turn makes of even marks, and hand-laid tapes seldom keep), and smooth by TEETH_SMOOTH_FEW,
 * or within TEETH_EVEN_FEW of even. One may be missing.
 *
 * (c) Any others are left where they are: the curve is the one through the reference marks. Learnt
 * angles would come to the same, since a ripple that is locked to the shaft is learnt along with
 * them, and one that is not averages out of 1x.
 *
 * Taken wrongly, even marks leave the unevenness in the angle, the same in each run: a lag that is
 * off by no more than the marks are, which does not turn a correction.
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
#define TEETH_LEAST 4        /* marks that show a ripple once a turn */
#define TEETH_TOLERANCE 0.08 /* of a spacing: half of what tells a mark apart by it (15 %) */
#define TEETH_SWING 0.025    /* of a spacing */
#define TEETH_EVEN 0.01      /* of a spacing: as teeth are cut, */
#define TEETH_EVEN_FEW 0.002 /* and as no hand lays tapes */
#define TEETH_SMOOTH 8       /* by chance 6 % of 8 marks, 2 % of 12, 1 % of 16 */
#define TEETH_SMOOTH_FEW 50  /* by chance 10 % of 4 marks, 2 % of 5, under 1 % of 6 and 7 */
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
    int odd;                   /* mark that is none of the wheel's; -1: all are */
    bool decided;              /* the places are settled */
    double place[TEETH_MOST];  /* of each mark, turns from the reference */
    double ripple[TEETH_MOST]; /* mean of place less curve, turns */
    long seen[TEETH_MOST];     /* turns that it rests on */
    struct shaft_ripple fitted;
};

/* `per_turn` marks a turn; out of use below TEETH_LEAST and above TEETH_MOST. 0, or -1 when
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
