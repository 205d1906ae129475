/* csv_words.h - what the words in a header say: is this the time, and in which unit? */
#ifndef LOPSIDE_READ_CSV_WORDS_H
#define LOPSIDE_READ_CSV_WORDS_H

#include <stdbool.h>
#include <stddef.h>

/* True for "Time", "t", "time_ms", "Zeit [s]", ... */
bool csv_words_is_time(const char *header);

/* Seconds per unit, out of "ms", "[ms]", "(s)", ...; 0 where the text is empty, -1 for a unit that
 * is no time. */
double csv_words_time_unit(const char *text);

/* The same out of a whole header, "Time (ms)" or "time_ms": 0 where it names no unit, -1 where it
 * names in brackets one that is no time. */
double csv_words_header_unit(const char *header);

/* True where `header` is `name`, perhaps with a unit in brackets behind it. `exact`: without. */
bool csv_words_match(const char *header, const char *name, bool exact);

/* True for the spellings of what is no number but stands where one should: nan, inf, infinity. */
bool csv_words_is_not_finite(const char *text, size_t length);

#endif
