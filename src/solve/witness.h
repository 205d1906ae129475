/* witness.h - readings that testify against the answer without having made it, in words. */
#ifndef LOPSIDE_SOLVE_WITNESS_H
#define LOPSIDE_SOLVE_WITNESS_H

#include <stdbool.h>

#include "solve/advice.h"
#include "solve/model.h"
#include "solve/remedy.h"

/* The refusal `prediction`: the reading of corrected run `run` changed against as found by more
 * than a right angle off what the runs before it predict, by the limits of `lag-follows-weight`
 * (twice the caution) and a tenth of as found. 1: so, `finding` is filled; 0: not, or nothing
 * predicts it; else an enum regress_error. */
int witness_contrary(const struct model *model, const struct model_row *row, size_t run,
                     struct advice_finding *finding) __attribute__((warn_unused_result));

/* The finding `prediction` about a reading that the fit does without, since its effect was too
 * small to solve with, against what the fit predicts for it: caution at 3 standard errors, refused
 * at 6; the scatter of a row is at least half a percent of as found. False: in order, of another
 * row, or nothing predicts it. */
bool witness_refused(const struct model *model, const struct model_row *row,
                     const struct model_reading *reading, struct advice_finding *finding);

/* The caution `correction-worse`: the amplitude of corrected run `run` is above as found by more
 * than 2 standard errors, at a sensor of the aim where the runs before it do not say that it would
 * be. The worst such sensor. 1, 0, or an enum regress_error. */
int witness_worse(const struct model *model, size_t run, struct advice_finding *finding)
    __attribute__((warn_unused_result));

/* True where a row is lost to what vet found moved (`tape-moved`, `sensor-swapped`,
 * `sensor-turned` as `cause`), since the runs of its condition visibly do not fit as they are
 * (MODEL_MISFIT) and would if it were so: every sensor for a moved tape that two
 * and more show, the pair for an exchange
 * (all of one quantity, where only one shows it), the sensor itself for a turn. */
bool witness_moved(const struct model *model, const struct model_row *row,
                   const struct remedy_cause *cause);

#endif
