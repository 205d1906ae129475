/* tolerance.h - permissible residual unbalance and its share per plane or bearing.
 *
 * The limits of the allocation and the API rule are given as they are commonly quoted; whoever
 * accepts a machine by them checks the current edition of the standard.
 */
#ifndef LOPSIDE_SOLVE_TOLERANCE_H
#define LOPSIDE_SOLVE_TOLERANCE_H

#include <stdbool.h>

/* ISO 21940-11:2016 (before: ISO 1940-1): U_per = G m / Omega, kg m. grade in mm/s (6.3), mass kg,
 * rpm > 0. */
double tolerance_grade(double grade_mm_s, double mass, double rpm);

/* API 610/611/612/617/684: 4 W/N oz in with W lb, which is 6350 W/N g mm with W kg: kg m for one
 * plane whose journal carries `journal_load` kg. */
double tolerance_api_4wn(double journal_load, double rpm);

/* Static load of bearings A and B as fractions of the weight, by the lever rule: span > 0, centre
 * of mass at `centre` from A towards B (both m). An overhung mass gives one above 1 and one below
 * 0. */
void tolerance_loads(double span, double centre, double share[2]);

/* ISO 21940-11 allocation to bearings A and B as fractions of U_per: lever rule on absolute
 * distances, held within 0.3..0.7 between bearings and 0.3..1.3 overhung (limits from memory). */
void tolerance_shares(double span, double centre, bool overhung, double share[2]);

#endif
