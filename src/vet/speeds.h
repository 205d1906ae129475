/* speeds.h - what readings at slightly different speeds may be off by. */
#ifndef LOPSIDE_VET_SPEEDS_H
#define LOPSIDE_VET_SPEEDS_H

#include "vet/facts.h"
#include "vet/findings.h"

/* Variance per component (of amplitude^2) that a reading of this amplitude gets where it was taken
 * `percent` off the speed it is used for. `found`: the turn of its lag with the speed as its own
 * run tells it, `limit` (deg per %, > 0): from where on a turn counts as near a resonance. Where
 * the run does not tell the turn to half of that limit, the vector may have gone that far in any
 * direction: evenly over a disc of radius limit x percent x amplitude, r^2/4 a component. Where it
 * does, the turn it tells and its error count, s^2/2 a component; never less than what the
 * vibration grows by with speed far from any resonance, 4 % for each % (acceleration below the
 * first one: force and two derivatives each as the speed squared). Our choice of rule. NaN for a
 * percentage, amplitude or limit that is NaN; an error that is NaN tells no turn. */
double speeds_variance(double percent, double amplitude, const struct resonance *found,
                       double limit);

/* Widens the readings in use of every condition whose runs' speeds are a caution of `speed-match`,
 * by how far each stands from the speed of the first run in use without weights (else of the first
 * run). Nothing where that check is off. Readings of coast-downs stand at the speed asked for, and
 * are left alone. */
void speeds_widen(struct vet_runs *runs, const size_t *order, const struct job *job,
                  const struct findings *findings);

#endif
