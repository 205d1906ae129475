/* remedy.h - after refusals: which runs are lost, why, and what mends it. */
#ifndef LOPSIDE_SOLVE_REMEDY_H
#define LOPSIDE_SOLVE_REMEDY_H

#include <stdbool.h>
#include <stddef.h>

#include "solve/advice.h"
#include "solve/model.h"
#include "stream/records.h"

struct remedy_cause { /* a finding above a limit, of any stage */
    char check[NAME_ROOM];
    int run, sensor; /* -1: none */
    bool refused;
    double value, limit;
    char text[400];
};

/* True where a finding can be a cause: refused, or one that says what is wrong with the sheet or
 * the set-up (`lag-follows-weight`, `sensor-swapped`, `tape-moved`) at caution. Fills `cause`. */
bool remedy_take(const struct job *job, const struct finding_record *finding,
                 struct remedy_cause *cause);

/* Puts the text of the step `repeat` by the causes: first what is wrong with sheet or set-up, then
 * what was refused, by check, with all runs (two by name and how many more). Leaves `next` as it is
 * where no cause is about a run. */
void remedy_step(const struct model *model, const struct remedy_cause *causes, size_t count,
                 struct advice_next *next);

#endif
