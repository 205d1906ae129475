/* drill.h - holes that take mass off: a flat-bottomed cylinder; what the drill's point takes
 * besides is not counted, so depth is that of the full diameter. */
#ifndef LOPSIDE_SOLVE_DRILL_H
#define LOPSIDE_SOLVE_DRILL_H

/* Mass (kg) of a hole of diameter `hole` and depth `depth` (m) in `density` (kg/m3); INFINITY where
 * any of them is not above 0: no limit. */
double drill_mass(double hole, double density, double depth);

/* Depth (m) of the hole that takes `mass` (kg) off; NaN where hole or density is not above 0. */
double drill_depth(double hole, double density, double mass);

#endif
