/* culprit.h - which reading of a row does not fit the others. */
#ifndef LOPSIDE_SOLVE_CULPRIT_H
#define LOPSIDE_SOLVE_CULPRIT_H

#include <stdbool.h>
#include <stddef.h>

#include "solve/regress.h"

/* Each reading is left out in turn. possible[i] (count entries) becomes true where the others then
 * determine everything and fit each other: no misfit of `fits` standard errors or more is left, or
 * none is spare among them to show one. *which: the only possible one, where the others were spare
 * enough to agree; -1: none alone explains it, or several would. With one spare run every reading
 * that is bound by others is possible, whichever it was. Stored responses of `data` are not looked
 * at. Gives an enum regress_error. */
int culprit_find(const struct regress_data *data, double fits, bool *possible, int *which)
    __attribute__((warn_unused_result));

/* *fits_mirrored: with all angles of the weights counted the other way the readings determine
 * everything and fit each other likewise. No single reading is then to blame: without one the
 * answer would be as wrong. */
int culprit_mirrored(const struct regress_data *data, double fits, bool *fits_mirrored)
    __attribute__((warn_unused_result));

/* Readings `*on` and `*in` (a later one): had the weights of the first been on in the second as
 * well, as a trial weight that nobody took off, all would fit, misfit below `fits`; the pair that
 * fits best. -1: there is none. Readings stand in the order of the runs. */
int culprit_left_on(const struct regress_data *data, double fits, int *on, int *in)
    __attribute__((warn_unused_result));

#endif
