/* sits.h - what already sits on the rotor where something is to be placed: the weights of the run
 * that the aim leaves mounted. */
#ifndef LOPSIDE_SOLVE_SITS_H
#define LOPSIDE_SOLVE_SITS_H

#include <stdbool.h>
#include <stddef.h>

#include "stream/job.h"

/* Two angles within so many degrees are one place: half the step of whole degrees. */
#define SITS_NEAR_DEG 0.5

/* Mass (kg, as bolted on; negative: taken off) that the mounted run has on plane `plane` at
 * `angle_deg` (against rotation), to SITS_NEAR_DEG; 0 where nothing stays mounted. */
double sits_mass(const struct job *job, size_t plane, double angle_deg);

/* The same at the plane's radius (kg), which the force follows. */
double sits_equivalent(const struct job *job, size_t plane, double angle_deg);

/* Of what sits there, what the limits of the plane count, kg >= 0: added weights on a plane that is
 * added to, removed ones on a plane that is drilled or ground. */
double sits_at(const struct job *job, size_t plane, double angle_deg);
double sits_in_all(const struct job *job, size_t plane);

/* True where the sheet's limits let nothing at all stand on a plane: `text` says why. */
bool sits_nowhere(const struct job *job, size_t plane, char *text, size_t size);

/* True where that run lists something, and all of it is removed material: nothing that could be left
 * on or taken off. */
bool sits_only_removed(const struct job *job, size_t run);

#endif
