/* remedy.h - after refusals: which runs are lost, why, and what mends it. */
#ifndef LOPSIDE_SOLVE_REMEDY_H
#define LOPSIDE_SOLVE_REMEDY_H

#include <stdbool.h>
#include <stddef.h>

#include "solve/advice.h"
#include "solve/model.h"
#include "stream/job.h"

struct remedy_cause { /* a finding above a limit, of any stage */
    char check[NAME_ROOM];
    int run, sensor; /* -1: none */
    bool refused;
    double value, limit;
    char text[400];
};

/* True for the checks that say what is wrong with the sheet or the set-up (`lag-follows-weight`,
 * `sensor-swapped`, `tape-moved` ...): they are causes from a caution on, the others once refused.
 */
bool remedy_is_diagnosis(const char *check);

/* 2x so far above 1x (%) that the tacho is asked first: one that counts a shaft of half the speed
 * shows 1x as 2x. Common practice, and vet's own advice. */
#define REMEDY_SHAFT_PCT 500

/* Puts what is told to be wrong with the sheet or the set-up in front of the step's text. */
void remedy_lead(const struct model *model, const struct remedy_cause *causes, size_t count,
                 struct advice_next *next);

/* Puts the text of the step `repeat` by the causes: first what is wrong with sheet or set-up, then
 * what was refused, by check, with all runs (two by name and how many more). Leaves `next` as it is
 * where no cause is about a run. */
void remedy_step(const struct model *model, const struct remedy_cause *causes, size_t count,
                 struct advice_next *next);

#endif
