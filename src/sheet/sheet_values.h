/* sheet_values.h - numbers, units and lists of the sheet's values.
 *
 * Each function reads at *at and moves it behind what it took. Numbers are decimal with a point, in any
 * locale; no NaN, infinity or hexadecimal. All causes are static text, NULL where nothing is wrong.
 */
#ifndef LOPSIDE_SHEET_SHEET_VALUES_H
#define LOPSIDE_SHEET_SHEET_VALUES_H

#include <stdbool.h>
#include <stddef.h>

#include "sheet/units.h"

/* "-12.5e3". */
const char *sheet_values_number(const char **at, double *value);

/* Number and unit, "340 kg" or "340kg", in SI (percent as written). For vibrations without detection. */
const char *sheet_values_measure(const char **at, enum dimension dimension, double *value);

/* "1.8 mm/s rms": amplitude as written and how it is shown. */
const char *sheet_values_amplitude(const char **at, double *value, struct show *show);

/* Takes `word` if it stands there as a whole (blanks around); a comma stands alone. */
bool sheet_values_word(const char **at, const char *word);

/* Takes the next word, up to a blank or a comma; false where there is none or it has no room. */
bool sheet_values_take(const char **at, char *word, size_t room);

bool sheet_values_end(const char *at); /* nothing but blanks is left */

struct sheet_item {
    double value; /* SI */
    int count;    /* of `4x10`; -1: no count was given */
};

/* "0 120 240 deg", "4x10 2x50 g", "1 2 oz 10 g": one unit for all numbers before it. Commas between
 * are welcome. Up to `most` items (an error beyond); counts only with `counts`. */
const char *sheet_values_list(const char *at, enum dimension dimension, bool counts,
                              struct sheet_item *items, size_t most, size_t *count);

#endif
