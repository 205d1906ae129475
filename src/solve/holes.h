/* holes.h - holes that would run into each other. */
#ifndef LOPSIDE_SOLVE_HOLES_H
#define LOPSIDE_SOLVE_HOLES_H

#include <stdbool.h>

#include "solve/advice.h"
#include "solve/answer.h"

/* Distance (m) between the centres of two holes at that radius (m), `apart_deg` from each other:
 * the chord 2 r sin(apart/2). */
double holes_distance(double radius, double apart_deg);

/* `hole-spacing`: on a plane that is drilled, the placed hole that comes closest to another placed
 * one, to a hole that stays, or to a taken position, where that is less than the hole's diameter. A
 * place that is drilled deeper is no other hole. False: none does, or the sheet gives no hole. */
bool holes_overlap(const struct answer *answer, struct advice_finding *finding);

#endif
