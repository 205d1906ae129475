/* oppose.h - placed weights that work against each other. */
#ifndef LOPSIDE_SOLVE_OPPOSE_H
#define LOPSIDE_SOLVE_OPPOSE_H

#include <stdbool.h>

#include "solve/place.h"

/* Two equal weights further apart than that (degrees) together do less than one of them: 2
 * cos(120/2 deg) = 1. */
#define OPPOSE_APART_DEG 120.0

/* True where two items of the choice on that plane stand further apart than OPPOSE_APART_DEG. */
bool oppose_on(const struct place_choice *choice, size_t plane);

/* True where both choices have the same masses at the same places. */
bool oppose_same(const struct place_choice *a, const struct place_choice *b);

/* kg, all that the choice has on that plane, whatever its direction. */
double oppose_mass(const struct place_choice *choice, size_t plane);

#endif
