/* within.h - the checks that one run answers for itself. */
#ifndef LOPSIDE_VET_WITHIN_H
#define LOPSIDE_VET_WITHIN_H

#include "vet/facts.h"
#include "vet/findings.h"

/* Percentages of a vector refer to the larger of the reading and the sensor's as-found amplitude in
 * its condition. Lag is judged only where the reading is at least this share of that (contract). */
#define WITHIN_LAG_SHARE 0.2

/* 2x of so many % of 1x and more is first of all a question to the tacho: one that counts a shaft
 * of half the speed shows this shaft's 1x as 2x. Common practice; coupling trouble rarely does so.
 */
#define WITHIN_SHAFT_PCT 500

/* Checks of the recording itself: readable, length, service-speed, speed-steady, clipping,
 * sensor-dead, tacho, phase-reference (where all readings have phase, or in an audit),
 * weight-force. Adds findings about run `position` and takes `use` off the readings they refuse
 * (all of them, and `refused`, where the run is judged). */
void within_run(struct vet_run *run, int position, const struct job *job,
                struct findings *findings);

/* Checks of its vectors: amplitude-steady, phase-steady, drift, beat, near-resonance, on ordinary
 * and audited runs two-x, half-order, neighbour, and on those without weights one-x-share.
 * as_found: SI peak amplitude per sensor, NaN where there is none. Also adds to `widen` what a
 * drift that tripped leaves open: d^2/12 on each component, the variance along a straight path of
 * length d; and what a beat that tripped does (beat.h). */
void within_vectors(struct vet_run *run, int position, const double *as_found,
                    const struct job *job, struct findings *findings);

/* Where the tacho's speed is a whole multiple of the service speed, or one of it: the next finding
 * advises the number of marks that would explain it, written to `to`. */
void within_hint_marks(const struct vet_run *run, const struct job *job, char *to, size_t room,
                       struct findings *findings);

/* Takes `use` off all readings of the run. */
void within_refuse(struct vet_run *run, const struct job *job);

/* What a run's mounted weights pull with: the largest over the planes, N, at `rpm`. */
double within_force(const struct job_run *run, const struct job *job, double rpm);

/* The static journal load, N: half of the rotor's weight; with both distances the smaller of the
 * two loads, or the larger where the centre of mass overhangs. NaN without a rotor mass. */
double within_journal_load(const struct job *job);

#endif
