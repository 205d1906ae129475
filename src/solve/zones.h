/* zones.h - the zones of broad-band vibration of non-rotating parts after ISO 20816-3:2022 (before:
 * ISO 10816-3:2009).
 *
 * The boundaries B/C and C/D are as fan makers print them after DIN ISO 10816-3; A/B and all of
 * displacement are from memory. Whoever accepts a machine by them checks the current edition.
 */
#ifndef LOPSIDE_SOLVE_ZONES_H
#define LOPSIDE_SOLVE_ZONES_H

#include <stdbool.h>

#define ZONES_BASIS                                                                                \
    "ISO 20816-3; boundary A/B and displacements from memory: check the current edition"

/* Boundaries A/B, B/C, C/D, rms, SI (m/s, or m with `displacement`): group 1 (above 300 kW) or 2
 * (15 to 300 kW). */
void zones_limits(int group, bool flexible, bool displacement, double limits[3]);

/* 'A' to 'D'; a value on a boundary lies in the better zone. '?' for NaN. */
char zones_of(double rms, const double limits[3]);

#endif
