/* across.h - the checks that need several runs. */
#ifndef LOPSIDE_VET_ACROSS_H
#define LOPSIDE_VET_ACROSS_H

#include "vet/facts.h"
#include "vet/findings.h"

/* All of them work on the runs that the job's sheet names (`index` >= 0); `order` (count of runs)
 * holds their positions in the sheet's order, recordings of an audit last. Each adds findings and
 * takes `use` off what it refuses; readings that are refused already are not compared. */

/* True where the run's vectors need no other run to be judged: a recording of an audit, or the run
 * whose amplitude is the as-found amplitude of its condition, the first in the sheet without
 * weights. */
bool across_stands_alone(const struct vet_run *run, const struct job *job);

/* Positions of the runs in the sheet's order, recordings of an audit behind; new, NULL: no memory.
 */
size_t *across_order(const struct vet_runs *runs, const struct job *job);

/* The as-found amplitude of a sensor in a condition: of the first run in `order` without weights
 * whose reading of it is in use (what is clipped or dead is no measure for others), else of the
 * first that has one; SI peak; NaN for none. */
double across_as_found(const struct vet_runs *runs, const size_t *order, const struct job *job,
                       const char *condition, size_t sensor);

/* The sensor's target as an amplitude of its own quantity at the reading's speed, SI peak; NaN for
 * none, or without a speed. */
double across_target(const struct job *job, const struct vet_reading *reading, size_t sensor);

/* True where the k-th run in `order` is an ordinary one and the first of its condition. */
bool across_first_of_condition(const struct vet_runs *runs, const size_t *order,
                               const struct job *job, size_t k);

/* Positions (in `members`, room for all runs) of the usable runs that repeat the k-th of `order`,
 * itself first; 0 where an earlier run of the order does so already. */
size_t across_repeats_of(const struct vet_runs *runs, const size_t *order, const struct job *job,
                         size_t k, size_t sensor, size_t *members);

/* Runs of runout: refused (check `service-speed`) at a quarter of the service speed and more, or of
 * the first ordinary run's where the sheet names none. */
void across_runout(struct vet_runs *runs, const size_t *order, const struct job *job,
                   struct findings *findings);

/* Two runs with one SHA-256: with equal weights the later one is refused, else both. Of
 * an audit the later one gets a caution. */
void across_same_recording(struct vet_runs *runs, const size_t *order, const struct job *job,
                           struct findings *findings);

/* Runs without phase are refused; where no run of a job with one plane has phase, a caution: the
 * amplitudes alone may serve. A recording of an audit stands alone. */
void across_phase_reference(struct vet_runs *runs, const size_t *order, const struct job *job,
                            struct findings *findings);

/* Per condition the spread of speed, (largest - smallest)/mean; as long as it refuses, the run
 * furthest from the median is refused (of two alike the later). */
void across_speed_match(struct vet_runs *runs, const size_t *order, const struct job *job,
                        struct findings *findings);

/* Runs of equal weights: the difference in % of the largest of both readings and the as-found
 * amplitude, judged where it exceeds its own uncertainty (cov of both, 99 % point of chi-squared).
 * Two that differ too much are both refused; of more, those too far from their median. How long
 * lies between two is said where both tell it. */
void across_repeat(struct vet_runs *runs, const size_t *order, const struct job *job,
                   struct findings *findings);

/* As found already below the target. */
void across_low_level(struct vet_runs *runs, const size_t *order, const struct job *job,
                      struct findings *findings);

/* All of the above in the order in which later ones build on earlier ones. 0; -1: no memory. */
int across_runs(struct vet_runs *runs, const size_t *order, const struct job *job,
                struct findings *findings) __attribute__((warn_unused_result));

#endif
