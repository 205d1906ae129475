/* sheet_fields.h - one key of one section as a checked value.
 *
 * An absent key gives the stated value for absence; a wrong one is noted as an error with its line and
 * then counts as absent. `section` may be SHEET_NO_SECTION: every key is absent.
 */
#ifndef LOPSIDE_SHEET_SHEET_FIELDS_H
#define LOPSIDE_SHEET_SHEET_FIELDS_H

#include "sheet/sheet_keys.h"
#include "sheet/sheet_parse.h"
#include "sheet/sheet_values.h"

struct sheet_range {
    double min, max;
    bool above;       /* min itself is out */
    const char *text; /* "more than 0, at most 1000 t" */
};

/* The index of the section of that kind and name, or SHEET_NO_SECTION. */
size_t sheet_fields_section(const struct sheet_parse *p, enum sheet_kind kind, const char *name);

/* The entry of a key without a subject, or NULL. */
const struct sheet_entry *sheet_fields_find(const struct sheet_parse *p, size_t section,
                                            const char *key);

/* The entry of that key with that subject, or NULL. */
const struct sheet_entry *sheet_fields_about(const struct sheet_parse *p, size_t section,
                                             const char *key, const char *subject);

/* True where the entry stands in `section` and is `key` (with a subject or without). */
bool sheet_fields_is(const struct sheet_entry *entry, size_t section, const char *key);

void sheet_fields_wrong(struct sheet_parse *p, const struct sheet_entry *entry, const char *cause);
void sheet_fields_missing(struct sheet_parse *p, size_t section, const char *key);

bool sheet_fields_in(struct sheet_parse *p, const struct sheet_entry *entry, double value,
                     const struct sheet_range *range);

/* A value with its unit, SI; NaN where absent. */
double sheet_fields_measure(struct sheet_parse *p, size_t section, const char *key,
                            enum dimension dimension, const struct sheet_range *range);

/* A whole number, with `unit` behind it unless NULL (its last letter "s" may be missing). */
int sheet_fields_integer(struct sheet_parse *p, size_t section, const char *key, const char *unit,
                         int min, int max, int absent);

/* Index into the NULL-terminated choices. */
int sheet_fields_choice(struct sheet_parse *p, size_t section, const char *key,
                        const char *const *choices, int absent);

/* Up to room-1 bytes of text; "" where absent. */
void sheet_fields_text(struct sheet_parse *p, size_t section, const char *key, char *out,
                       size_t room);

/* The index of a sensor, plane or run of that name, or -1 with the error noted. */
int sheet_fields_sensor(struct sheet_parse *p, const struct sheet_entry *entry, const char *name);
int sheet_fields_plane(struct sheet_parse *p, const struct sheet_entry *entry, const char *name);
int sheet_fields_run(struct sheet_parse *p, const struct sheet_entry *entry, const char *name);

/* An angle as people count it, as the angle against rotation in [0, 360). */
double sheet_fields_against(const struct sheet_parse *p, double deg);

#endif
