#include "sheet/sheet_fields.h"

#include <math.h>
#include <stdio.h>
#include <stdlib.h>
#include <string.h>

#include "base/angle.h"
#include "base/nearest.h"

size_t sheet_fields_section(const struct sheet_parse *p, enum sheet_kind kind, const char *name)
{
    for (size_t i = 0; i < p->lines.section_count; i++)
        if (p->lines.sections[i].kind == (int)kind && !strcmp(p->lines.sections[i].name, name))
            return i;
    return SHEET_NO_SECTION;
}

bool sheet_fields_is(const struct sheet_entry *entry, size_t section, const char *key)
{
    return entry->key && entry->section == section && !strcmp(entry->key->name, key);
}

const struct sheet_entry *sheet_fields_about(const struct sheet_parse *p, size_t section,
                                             const char *key, const char *subject)
{
    for (size_t i = 0; i < p->lines.entry_count; i++) {
        const struct sheet_entry *e = &p->lines.entries[i];
        if (sheet_fields_is(e, section, key) && !strcmp(e->subject, subject))
            return e;
    }
    return NULL;
}

const struct sheet_entry *sheet_fields_find(const struct sheet_parse *p, size_t section,
                                            const char *key)
{
    return sheet_fields_about(p, section, key, "");
}

void sheet_fields_wrong(struct sheet_parse *p, const struct sheet_entry *entry, const char *cause)
{
    sheet_errors_add(&p->errors, entry->line, "%s: '%.100s = %.100s'", cause, entry->text,
                     entry->value);
}

void sheet_fields_missing(struct sheet_parse *p, size_t section, const char *key)
{
    const struct sheet_section *s = &p->lines.sections[section];
    if (s->entries > 0) /* an empty section is an error already */
        sheet_errors_add(&p->errors, s->line, "missing key in [%.60s]: '%s'", s->text, key);
}

bool sheet_fields_in(struct sheet_parse *p, const struct sheet_entry *entry, double value,
                     const struct sheet_range *range)
{
    if (value <= range->max && (range->above ? value > range->min : value >= range->min))
        return true;
    char cause[120];
    snprintf(cause, sizeof cause, "out of range (%s)", range->text);
    sheet_fields_wrong(p, entry, cause);
    return false;
}

double sheet_fields_measure(struct sheet_parse *p, size_t section, const char *key,
                            enum dimension dimension, const struct sheet_range *range)
{
    const struct sheet_entry *e = sheet_fields_find(p, section, key);
    if (!e)
        return NAN;
    const char *at = e->value;
    double value = NAN;
    const char *fault = sheet_values_measure(&at, dimension, &value);
    if (!fault && !sheet_values_end(at))
        fault = "text behind the value";
    if (fault) {
        sheet_fields_wrong(p, e, fault);
        return NAN;
    }
    return sheet_fields_in(p, e, value, range) ? value : NAN;
}

/* Takes the unit of a count: "lines", and "line" as well. */
static bool take_count_unit(const char **at, const char *unit)
{
    char single[24];
    snprintf(single, sizeof single, "%.*s", (int)strlen(unit) - 1, unit);
    return sheet_values_word(at, unit) || sheet_values_word(at, single);
}

int sheet_fields_integer(struct sheet_parse *p, size_t section, const char *key, const char *unit,
                         int min, int max, int absent)
{
    const struct sheet_entry *e = sheet_fields_find(p, section, key);
    if (!e)
        return absent;
    const char *at = e->value;
    char cause[80];
    double value = NAN;
    const char *fault = sheet_values_number(&at, &value);
    if (!fault && value != floor(value))
        fault = "not a whole number";
    if (!fault && unit && !take_count_unit(&at, unit)) {
        snprintf(cause, sizeof cause, "unit does not fit, wanted %s", unit);
        fault = cause;
    }
    if (!fault && !sheet_values_end(at))
        fault = "text behind the value";
    if (!fault && !(value >= min && value <= max)) {
        snprintf(cause, sizeof cause, "out of range (%d to %d)", min, max);
        fault = cause;
    }
    if (!fault)
        return (int)value;
    sheet_fields_wrong(p, e, fault);
    return absent;
}

int sheet_fields_choice(struct sheet_parse *p, size_t section, const char *key,
                        const char *const *choices, int absent)
{
    const struct sheet_entry *e = sheet_fields_find(p, section, key);
    if (!e)
        return absent;
    char cause[160] = "not one of";
    for (int i = 0; choices[i]; i++) {
        if (!strcmp(choices[i], e->value))
            return i;
        size_t length = strlen(cause);
        snprintf(cause + length, sizeof cause - length, "%s '%s'", i ? "," : "", choices[i]);
    }
    sheet_fields_wrong(p, e, cause);
    return absent;
}

void sheet_fields_text(struct sheet_parse *p, size_t section, const char *key, char *out,
                       size_t room)
{
    const struct sheet_entry *e = sheet_fields_find(p, section, key);
    char cause[60];
    out[0] = '\0';
    if (!e)
        return;
    if (strlen(e->value) < room) {
        strcpy(out, e->value);
        return;
    }
    snprintf(cause, sizeof cause, "longer than %zu bytes", room - 1);
    sheet_fields_wrong(p, e, cause);
}

/* ---- names ---- */

static void tell_unknown(struct sheet_parse *p, const struct sheet_entry *entry, const char *what,
                         const char *name, const char *const *names, size_t count)
{
    char hint[NEAREST_ROOM];
    sheet_errors_add(&p->errors, entry->line, "no such %s: '%.100s'%s", what, name,
                     nearest_hint(name, names, count, hint));
}

#define FIND(things, count, what)                                                                  \
    const char *names[16];                                                                         \
    size_t known = 0;                                                                              \
    for (size_t i = 0; i < (count); i++) {                                                         \
        if (!strcmp((things)[i].name, name))                                                       \
            return (int)i;                                                                         \
        if (known < 16)                                                                            \
            names[known++] = (things)[i].name;                                                     \
    }                                                                                              \
    tell_unknown(p, entry, what, name, names, known);                                              \
    return -1

int sheet_fields_sensor(struct sheet_parse *p, const struct sheet_entry *entry, const char *name)
{
    const struct job *job = &p->sheet->job;
    FIND(job->sensors, job->sensor_count, "sensor");
}

int sheet_fields_plane(struct sheet_parse *p, const struct sheet_entry *entry, const char *name)
{
    const struct job *job = &p->sheet->job;
    FIND(job->planes, job->plane_count, "plane");
}

int sheet_fields_run(struct sheet_parse *p, const struct sheet_entry *entry, const char *name)
{
    const struct job *job = &p->sheet->job;
    FIND(job->runs, job->run_count, "run");
}

double sheet_fields_against(const struct sheet_parse *p, double deg)
{
    return angle_wrap_360(p->sheet->job.angles == SENSE_WITH ? 0 - deg : deg + 0);
}
