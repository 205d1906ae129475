/* notes.h - findings beside the answer: stored responses, runout, a prediction that came true or
 * not, vibration zones. Each gives false where there is nothing to say. */
#ifndef LOPSIDE_SOLVE_NOTES_H
#define LOPSIDE_SOLVE_NOTES_H

#include <stdbool.h>
#include <stddef.h>

#include "solve/advice.h"
#include "solve/answer.h"
#include "solve/slope.h"

/* `response-changed`: the stored responses of a row against its runs. */
bool notes_stored(const struct model *model, const struct model_row *row,
                  struct advice_finding *finding);

/* `removed-stays`: a run drilled or ground material off that `mounted` does not list; the answer
 * takes it as put back. */
bool notes_removed(const struct job *job, struct advice_finding *finding);

/* `runout`: the slow-roll vector that is taken off the readings of a sensor; a refusal (a caution
 * outside of the aim) where it is missing. */
bool notes_runout(const struct model *model, size_t sensor, struct advice_finding *finding);

/* The next step where the slow-roll vector of `row` is missing (row->unrolled). */
void notes_runout_step(const struct model *model, const struct model_row *row,
                       struct advice_next *next);

/* `target-missed`: the worst forecast of the aim whose expected amplitude is above its target.
 * False: none is. Needs outlook_fill. */
bool notes_target(const struct answer *answer, struct advice_finding *finding);

/* `prediction`: a row's reading of run `run` lies `se` standard errors from what was predicted. */
void notes_prediction(const struct model *model, const struct model_row *row, size_t run, double se,
                      struct advice_finding *finding);

/* `speed-corrected`: readings brought to one speed by the slope within the runs. */
void notes_speed(const struct job *job, const struct slope_match *match,
                 struct advice_finding *finding);

/* `zone`: where the sensor's vibration lies, and where it is expected after. */
bool notes_zone(const struct answer *answer, const struct answer_forecast *forecast,
                struct advice_finding *finding);

/* The caution `response-turned`: from one condition to another, at speeds that are equal within 2
 * %, the response of a plane turns by more than 90 deg at two sensors and more, at all of them that
 * tell, alike within 30 deg. The first such pair. */
bool notes_turned(const struct model *model, size_t plane, struct advice_finding *finding);

#endif
