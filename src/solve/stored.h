/* stored.h - responses known from earlier jobs on the machine, as prior knowledge of a row. */
#ifndef LOPSIDE_SOLVE_STORED_H
#define LOPSIDE_SOLVE_STORED_H

#include "solve/model.h"

/* A response of a speed further away than this share is of another machine: what `speed-match`
 * refuses across the runs of a condition. */
#define STORED_SPEED_APART 0.03

/* Stored and new differ by more than both allow from so many standard errors on (design: checks).
 */
#define STORED_CHANGED 3.0

/* Finds the job's responses of the row's condition and sensor; row->speed_rpm is set. Fills
 * row->stored and row->apart. With amplitudes alone none can be used. */
void stored_match(const struct model *model, struct model_row *row);

/* Rank of [1, x] with the row's stored responses taken as found (regress_rank). */
int stored_rank(const struct model_row *row, size_t planes, size_t count, const double complex *x)
    __attribute__((warn_unused_result));

/* Fits the row's readings with the stored responses as prior; fills posterior, misfit (of the
 * readings among themselves), changed, kept. Where the runs alone determine a response that differs
 * from the stored one by STORED_CHANGED standard errors or more, the row's stored responses are set
 * aside if the runs alone determine everything; else their covariances grow by the square of the
 * misfit, so that they bind no more than they deserve. Gives an enum regress_error. */
int stored_fit(struct model_row *row, size_t planes) __attribute__((warn_unused_result));

#endif
