/* repeats.h - what runs with equal weights tell besides how well they repeat. */
#ifndef LOPSIDE_VET_REPEATS_H
#define LOPSIDE_VET_REPEATS_H

#include "vet/facts.h"
#include "vet/findings.h"

/* Three or more usable runs with equal weights that tell `when`: where their vectors lie on a line
 * over time that scatter alone makes once in 100 (when.h), a further finding of the check `repeat`,
 * its figure the move from the first to the last in % of the larger of reading and as-found
 * amplitude. */
void repeats_trend(struct vet_runs *runs, const size_t *order, const struct job *job,
                   struct findings *findings);

/* near-resonance from the two usable runs with equal weights whose speeds are furthest apart, where
 * they are far enough apart to tell it: the turn's standard error (readings and repeatability) at
 * most a third of the caution limit. */
void repeats_resonance(struct vet_runs *runs, const size_t *order, const struct job *job,
                       struct findings *findings);

#endif
