/* lighter.h - the placement that a practitioner would rather fit: with less mass.
 *
 * The best placement may hold pieces that cancel each other in part, since that is how coarse
 * pieces reach a fine sum. What comes near it with pieces that all pull one way stands beside it.
 */
#ifndef LOPSIDE_SOLVE_LIGHTER_H
#define LOPSIDE_SOLVE_LIGHTER_H

#include "solve/answer.h"

/* From so many times the ideal mass on a plane on, what is placed there counts as cancelling itself
 * in part: our choice. */
#define LIGHTER_MASS 1.5

/* True where pieces of the choice cancel each other on that plane: they stand more than
 * OPPOSE_APART_DEG apart, or several have LIGHTER_MASS times the ideal mass and more. */
bool lighter_wanted(const struct answer *answer, const struct place_choice *choice, size_t plane);

/* Searches again, on the planes where pieces cancel each other, within 60, 45 and 30 deg of the
 * ideal weight: of what lies within the noise of the placement the one with the least mass, else
 * the one of the widest. Sets opposed, has_unopposed and unopposed. Nothing is searched where none
 * do, or where the static part alone is placed. Needs answer_place. Gives an enum answer_error. */
int lighter_find(struct answer *answer) __attribute__((warn_unused_result));

#endif
