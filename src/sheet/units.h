/* units.h - units of the sheet and of what is shown.
 *
 * All functions are pure. Exact by definition: g = 9.80665 m/s2 (CGPM 1901), in = 25.4 mm,
 * lb = 0.45359237 kg (international yard and pound, 1959), oz = lb/16.
 */
#ifndef LOPSIDE_SHEET_UNITS_H
#define LOPSIDE_SHEET_UNITS_H

#include <complex.h>
#include <stdbool.h>

#include "stream/job.h"

enum dimension {
    DIMENSION_MASS,      /* kg: g kg oz lb (and mg) */
    DIMENSION_LENGTH,    /* m: mm cm m in */
    DIMENSION_SPEED,     /* rpm: rpm */
    DIMENSION_RATE,      /* Hz: Hz kHz */
    DIMENSION_VOLTAGE,   /* V: V mV */
    DIMENSION_ANGLE,     /* deg */
    DIMENSION_PERCENT,   /* %, kept as the number before the sign */
    DIMENSION_VIBRATION, /* see units_vibration */
    DIMENSION_DENSITY    /* kg/m3: kg/m3 g/cm3 kg/dm3 lb/in3 */
};

/* SI value (see above) of one `unit` of that dimension, or 0 if there is no such unit. */
double units_factor(enum dimension dimension, const char *unit);

/* A vibration unit: "g", "m/s2", "mm/s", "in/s", "um", "mil" (also "m/s", "m", "mm", "in"). Fills
 * unit, quantity and si of `show`; detection is left alone. Returns false if unknown. */
bool units_vibration(const char *unit, struct show *show);

/* "mm/s rms", "um pk-pk", "in/s pk", ... false if it is not one. */
bool units_show_parse(const char *text, struct show *show);

/* Writes "mm/s rms" into text (at least 24 bytes); returns text. */
char *units_show_text(const struct show *show, char *text);

/* The 1x vector `z` (SI peak, lag) of quantity `from` as a vector of quantity `to` at angular
 * speed w (rad/s, > 0). The time derivative of Z is Z*(-j*w): lag 90 deg smaller. */
double complex units_convert(double complex z, enum quantity from, enum quantity to, double w);

/* Peak SI amplitude in the show's own quantity, as the number shown: units and detection applied.
 * rms = peak/sqrt 2, pk-pk = 2*peak. units_from_shown is its inverse. */
double units_shown(double peak_si, const struct show *show);
double units_from_shown(double shown, const struct show *show);

#endif
