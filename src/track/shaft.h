/* shaft.h - mark times to shaft angle: a smooth, monotone curve between the marks.
 *
 * Mark m passes at angle 2*pi*m. Time as a function of angle is fitted around every mark by a
 * polynomial over its neighbours (interpolation through seven marks; least squares over more, after
 * Savitzky & Golay, Anal. Chem. 36 (1964) 1627, where the marks scatter); value, slope and
 * curvature at the ends of a turn give the quintic that is the angle in between. With marks once a
 * turn a wander with a period of ten turns is followed to 1e-4 of itself.
 *
 * Marks go in one by one; turns come out when the marks behind them are known. At most
 * SHAFT_ROOM marks are remembered. */
#ifndef LOPSIDE_TRACK_SHAFT_H
#define LOPSIDE_TRACK_SHAFT_H

#include <stdbool.h>
#include <stddef.h>

#define SHAFT_ROOM 64
#define SHAFT_AHEAD 8 /* marks that must be known behind a turn before it comes out, */
#define SHAFT_HURRIED 3
#define SHAFT_START 20 /* and behind the first one, so that their scatter is known */

#define SHAFT_RIPPLE_ORDERS 12

/* What is added to the angle within a turn, in turns: mean + sum of cosine[k]*cos((k+1)*2*pi*s) +
 * sine[k]*sin((k+1)*2*pi*s). */
struct shaft_ripple {
    size_t orders;
    double mean, cosine[SHAFT_RIPPLE_ORDERS], sine[SHAFT_RIPPLE_ORDERS];
};

/* One turn: time from t0 to t1 (samples), angle in turns c[1]*s + ... + c[5]*s^5, s =
 * (t-t0)/(t1-t0). */
struct shaft_turn {
    double t0, t1;
    double c[6];
    bool first, last;                  /* of an unbroken stretch of turns */
    const struct shaft_ripple *ripple; /* borrowed; NULL: none. shaft.c knows of none */
};

struct shaft_knot { /* time of a mark, and its derivatives by turns */
    double at, slope, bend;
};

#define SHAFT_FIT 11 /* marks of one fit, at most */

/* What a fit over evenly numbered marks m-half .. m+half comes to: three fixed sums over them. */
struct shaft_filter {
    double value[SHAFT_FIT], slope[SHAFT_FIT], bend[SHAFT_FIT], leverage;
    long half;
};

struct shaft {
    struct shaft_filter exact, smooth;
    double at[SHAFT_ROOM];
    bool real[SHAFT_ROOM];
    long first, next; /* numbers of the oldest mark remembered and of the one to come */
    long turn;        /* number of the turn to come out, relative to the stretch */
    bool ended, hurried;
    struct shaft_knot knot; /* at the start of that turn */
    double squares;         /* of the scatter of marks about the smooth curve, turns^2 */
    long scattered;         /* how many marks that sum rests on */
};

void shaft_init(struct shaft *shaft);

/* The next mark, later than the one before. `real` false: put in where a pulse was missing; its
 * time is only a first guess. Take all turns out before the next push. */
void shaft_push(struct shaft *shaft, double at, bool real);

/* For when little can be held: from now on turns come out SHAFT_HURRIED marks behind. */
void shaft_hurry(struct shaft *shaft);

/* No more marks in this stretch: the rest of the turns may come out. */
void shaft_end(struct shaft *shaft);

/* Begins the next stretch; the scatter is kept. */
void shaft_restart(struct shaft *shaft);

/* The next turn, if it is ready. */
bool shaft_next(struct shaft *shaft, struct shaft_turn *turn);

/* Time before which no sample is needed any more: the start of the turn to come out next, less the
 * largest step by which smoothing may move it. Needs a mark. */
double shaft_begin(const struct shaft *shaft);

/* Standard deviation of the marks about the smooth curve, deg of shaft angle; NaN where fewer than
 * eight marks could be judged. */
double shaft_jitter(const struct shaft *shaft);

#endif
