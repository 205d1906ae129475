/* findings.h - a growing list of what the checks found. */
#ifndef LOPSIDE_VET_FINDINGS_H
#define LOPSIDE_VET_FINDINGS_H

#include <stdbool.h>
#include <stddef.h>

#include "vet/limits.h"

struct finding {
    enum check check;
    enum ruling ruling;
    int run;    /* position among the runs seen; -1: not about one run */
    int sensor; /* -1: not about one sensor */
    double value, limit;
    const char *unit; /* static */
    char text[400];
};

struct findings {
    struct finding *items; /* owned */
    size_t count, room;
    bool failed;                 /* memory is out: the list is not whole */
    const struct limits *limits; /* borrowed */
    const char *instead;         /* of the next finding's advice, borrowed; NULL: its check's */
};

void findings_init(struct findings *findings, const struct limits *limits);
void findings_clear(struct findings *findings);   /* keeps the memory */
void findings_release(struct findings *findings); /* frees it */

/* The next finding gives this advice (borrowed until then) instead of its check's; NULL:
 * its check's. */
void findings_instead(struct findings *findings, const char *advice);

/* Judges `value` by its check, adds a finding and returns the ruling. The text is what was seen
 * (`format`, a clause without a stop), the limit, and where it tripped the check's advice. A check
 * that is off adds nothing and is ok. */
enum ruling findings_add(struct findings *findings, enum check check, int run, int sensor,
                         double value, const char *format, ...)
    __attribute__((format(printf, 6, 7)));

/* The same with the ruling, the limit and the unit decided by the caller. */
enum ruling findings_rule(struct findings *findings, enum check check, enum ruling ruling, int run,
                          int sensor, double value, double limit, const char *unit,
                          const char *format, ...) __attribute__((format(printf, 9, 10)));

/* A figure as it is said: to two significant digits and no finer than 0.01, for printing with %g.
 */
double findings_figure(double value);

#endif
