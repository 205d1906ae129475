/* when.h - when a run was recorded, and what changed with that. */
#ifndef LOPSIDE_VET_WHEN_H
#define LOPSIDE_VET_WHEN_H

#include <complex.h>
#include <stddef.h>

/* Hours since the first of January 2000 of "2025-03-14 10:40" (also with T, seconds, or without a
 * time of day: its noon); NaN where it is written otherwise. The day's number after Fliegel & Van
 * Flandern, Comm. ACM 11 (1968) 657. */
double when_hours(const char *text);

struct when_trend {
    double complex move; /* from the first to the last time, along the straight line */
    double chance;       /* of a line as good as that in mere scatter; NaN: it cannot be told */
};

/* The straight line through `count` (3 or more) vectors over `hours` (not all alike). With both
 * components scattered alike the F test of the line has 2 and 2 (n-2) degrees of freedom, and its
 * chance is (rest / all)^(n-2), the sums of squares about the line and about the mean. */
struct when_trend when_trend_of(const double *hours, const double complex *vectors, size_t count);

#endif
