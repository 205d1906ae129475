/* menu.h - what the sheet allows on one plane, as lists for the placement search. */
#ifndef LOPSIDE_SOLVE_MENU_H
#define LOPSIDE_SOLVE_MENU_H

#include "solve/place.h"
#include "stream/job.h"

struct menu { /* all owned */
    double *angles, *masses, *held;
    int *counts;
    int *index; /* of each angle among the plane's free positions; -1: none, it may be any angle */
};

struct menu_arc { /* directions within `half_deg` of `centre_deg`, against rotation */
    double centre_deg, half_deg;
};

/* Room for so many angles (position_count, or the whole degrees) and all pieces of the plane. 0, or
 * -1: no memory; release it in any case. */
int menu_init(struct menu *menu, const struct job_plane *plane) __attribute__((warn_unused_result));
#define MENU_ANGLES_MOST(plane) ((plane)->any_position ? 360 : (plane)->position_count)

/* What may stand at one position of a plane, kg: the deepest hole is a limit, too. INFINITY:
 * anything. */
double menu_most(const struct job_plane *plane);

/* Fills `menu` (new; release it in any case) and `to`, which borrows from it and from the job: free
 * positions, within `arc` only unless that is NULL, pieces in stock, limits, and what the run that
 * stays mounted has there. Where nothing at all may be put the plane has one position that takes no
 * mass. 0, or -1: no memory. */
int menu_fill(const struct job *job, size_t plane, const struct menu_arc *arc, struct menu *menu,
              struct place_plane *to) __attribute__((warn_unused_result));

/* The items of a placement on that plane, found over the menu's angles, get their place among all
 * free positions. */
void menu_number(const struct menu *menu, size_t plane, struct place_choice *choice);

void menu_release(struct menu *menu); /* safe on zeros */

#endif
