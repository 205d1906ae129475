/* trials.h - did each trial weight do enough to learn from? */
#ifndef LOPSIDE_VET_TRIALS_H
#define LOPSIDE_VET_TRIALS_H

#include "vet/facts.h"
#include "vet/findings.h"

/* A trial is a run whose weights tell something new: they raise the rank of [1, weights] over the
 * usable runs before it in its condition (`order` is the sheet's, runs without weights come first).
 * Its effect is taken against the earlier run whose weights differ on the fewest planes, the first
 * of such, so that a second trial with the first one left on is judged by itself. The finding names
 * the sensor with the largest effect over its standard error (effect.h; cov + widen +
 * repeatability). Refused under 5 of those, with all readings of the run; a caution where on every
 * sensor amplitude and lag change less than the caution limit, read as % and as deg. Readings
 * without phase are not judged. */
void trials_effect(struct vet_runs *runs, const size_t *order, const struct job *job,
                   struct findings *findings);

/* By the sheet alone: true where run `run` of the job raises the rank over the ordinary runs before
 * it and those without weights; false for one that can only confirm, as a correction run does after
 * its trials. True, too, where memory is out. */
bool trials_is_trial(const struct job *job, size_t run);

#endif
