/* digits.h - numbers for people: no digit that the uncertainty does not support.
 *
 * The rule: a number stops at the place of the second significant digit of its 95 % half width, and
 * never has more than DIGITS_MOST significant digits, since no channel is calibrated better. A
 * number without a known uncertainty (read by hand, nominal) has at most DIGITS_MOST significant
 * digits and no trailing zeros. Half widths are rounded up, as JCGM 100:2008 (GUM) 7.2.6 allows, so
 * that a range never looks narrower than it is.
 */
#ifndef LOPSIDE_REPORT_DIGITS_H
#define LOPSIDE_REPORT_DIGITS_H

#include <stdbool.h>
#include <stddef.h>

#define DIGITS_MOST 4  /* significant digits; common practice for calibrated vibration channels */
#define DIGITS_ROOM 32 /* bytes that hold every text made here */

/* The decimal exponent of the last digit to show of `value`, known to +/- `half` (same unit; NaN or
 * <= 0: not known). value NaN or infinite: 0. */
int digits_place(double value, double half);

/* The decimal exponent of the second significant digit of `value`; INT_MAX for zero, NaN and
 * infinities, which have none. */
int digits_place_second(double value);

/* Writes `value` into text (DIGITS_ROOM bytes) as above; "-" for NaN and infinities. Returns text.
 */
char *digits_text(char *text, double value, double half);

/* As digits_text, with as many more digits as it takes for what is printed to be on the same side
 * of `limit`, as that is printed, as `value` is: 15753 below 15850 is not "16000". DIGITS_MOST at
 * most. */
char *digits_against(char *text, double value, double half, double limit);

/* `value` rounded to the digit 10^place. */
char *digits_at(char *text, double value, int place);

/* The half width itself, rounded up to 10^place of the number that it stands beside: "0.083". */
char *digits_half(char *text, double half, int place);

/* A half width beside a number shown to 10^place: as digits_half; "<0.1", less than one of the last
 * digit, where it is below half of that; "-" where it is not known (NaN, <= 0). */
char *digits_beside(char *text, double half, int place);

/* False where a half width is below a hundredth of the last place shown: it says nothing (NaN:
 * false). */
bool digits_half_counts(double half, int place);

/* An angle in [0, 360): tenths of a degree where it is known to less than a degree, or not at all
 * known how well (then without a trailing ".0"); whole degrees otherwise. */
char *digits_angle(char *text, double deg, double half_deg);

/* The decimal exponent of the last digit that digits_angle shows where the half width is known. */
int digits_angle_place(double half_deg);

/* Half width of an angle, rounded up to the same place as digits_angle shows. */
char *digits_angle_half(char *text, double half_deg);

/* A probability as percent: "under 1 %", "42 %", "over 99 %". "-" for NaN. */
char *digits_chance(char *text, double probability);

#endif
