/* answer.h - the runs as the ruling on the whole job sees them (ruling.h). */
#ifndef LOPSIDE_VET_ANSWER_H
#define LOPSIDE_VET_ANSWER_H

#include "vet/facts.h"

/* Can what is left of the runs seen still answer the job? Readings are expected of every sensor
 * that the sheet does not leave out, and a vector of every probe from the slow roll if the sheet
 * has one. 1 yes; 0 no: run_lost (a position) and sensor_lost say what is missing first, in
 * `order`; -1 no memory. An audit has nothing to answer: 1. */
int answer_possible(const struct vet_runs *runs, const size_t *order, const struct job *job,
                    size_t *run_lost, size_t *sensor_lost) __attribute__((warn_unused_result));

#endif
