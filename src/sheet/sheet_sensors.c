/* [sensor NAME], and the channels and scales that a run may override. */
#include <math.h>
#include <stdio.h>
#include <stdlib.h>
#include <string.h>

#include "sheet/sheet_fields.h"

#define CHANNEL_MOST 4096 /* more than any recorder has */

void sheet_sensors_channel(struct sheet_parse *p, const struct sheet_entry *entry, char *channel)
{
    size_t length = strlen(entry->value);
    if (length >= NAME_ROOM) {
        sheet_fields_wrong(p, entry, "longer than 40 bytes; a column may be named by its number");
        return;
    }
    if (strspn(entry->value, "0123456789") == length) {
        long number = length < 8 ? strtol(entry->value, NULL, 10) : CHANNEL_MOST + 1L;
        if (number < 1 || number > CHANNEL_MOST) {
            sheet_fields_wrong(p, entry, "out of range (1 to 4096)");
            return;
        }
        snprintf(channel, NAME_ROOM, "%ld", number);
        return;
    }
    strcpy(channel, entry->value);
}

/* "mV/(mm/s)" or "mV/g": volts in one of the first, and the unit behind the stroke. */
static const char *split_scale_unit(const char *text, double *volts, struct show *unit)
{
    char name[16];
    *volts = !strncmp(text, "mV/", 3) ? 1e-3 : !strncmp(text, "V/", 2) ? 1 : 0;
    if (*volts == 0)
        return "unit does not fit, wanted mV/g, mV/(mm/s), V/(m/s2), mV/um or the like";
    text = strchr(text, '/') + 1;
    size_t length = strlen(text);
    if (text[0] == '(' && text[length - 1] == ')') {
        text++;
        length -= 2;
    }
    snprintf(name, sizeof name, "%.*s", length < 16 ? (int)length : 15, text);
    if (length >= sizeof name || !units_vibration(name, unit))
        return "unit does not fit, wanted mV/g, mV/(mm/s), V/(m/s2), mV/um or the like";
    return NULL;
}

void sheet_sensors_scale(struct sheet_parse *p, const struct sheet_entry *entry,
                         enum quantity quantity, struct sheet_scale *scale)
{
    const char *at = entry->value;
    char word[24];
    struct show unit;
    double number = NAN, volts;
    const char *fault = sheet_values_number(&at, &number);
    if (!fault && sheet_values_end(at))
        fault = "no unit, wanted mV/g, mV/(mm/s), V/(m/s2), mV/um or the like";
    if (!fault && (!sheet_values_take(&at, word, sizeof word) || !sheet_values_end(at)))
        fault = "unit does not fit, wanted mV/g, mV/(mm/s), V/(m/s2), mV/um or the like";
    if (!fault)
        fault = split_scale_unit(word, &volts, &unit);
    if (!fault && unit.quantity != quantity)
        fault = "scale and unit of the sensor are not the same quantity";
    if (!fault && number == 0)
        fault = "a scale of zero";
    if (!fault && !isnormal(unit.si / (number * volts)))
        fault = "scale out of range";
    if (fault) {
        sheet_fields_wrong(p, entry, fault);
        return;
    }
    scale->given = true;
    scale->si_per_volt = unit.si / (number * volts);
}

/* What is shown where the sheet does not say: velocity for casing sensors, displacement for shaft
 * probes, in the units of the country's habit. */
static void default_show(const struct job *job, struct job_sensor *sensor)
{
    bool probe = sensor->quantity == QUANTITY_DISPLACEMENT;
    const char *text = job->units == UNITS_US ? (probe ? "mil pk-pk" : "in/s pk")
                                              : (probe ? "um pk-pk" : "mm/s rms");
    if (!units_show_parse(text, &sensor->show))
        abort(); /* our own constants */
}

static void read_show(struct sheet_parse *p, size_t section, struct job_sensor *sensor)
{
    const struct sheet_entry *e = sheet_fields_find(p, section, "show");
    default_show(&p->sheet->job, sensor);
    if (e && !units_show_parse(e->value, &sensor->show))
        sheet_fields_wrong(p, e, "not a unit with pk, pk-pk or rms behind it");
}

static double read_at(struct sheet_parse *p, size_t section)
{
    static const struct sheet_range TURN = {-360, 360, false, "-360 to 360 deg"};
    return sheet_fields_measure(p, section, "at", DIMENSION_ANGLE, &TURN);
}

static void read_sensor(struct sheet_parse *p, size_t section, size_t index)
{
    struct job_sensor *sensor = &p->sheet->job.sensors[index];
    struct sheet_scale *scale = &p->sheet->scales[index];
    struct show unit = {.quantity = QUANTITY_VELOCITY, .si = 1};
    const struct sheet_section *s = &p->lines.sections[section];
    const struct sheet_entry *e = sheet_fields_find(p, section, "unit");
    bool known = e && units_vibration(e->value, &unit);
    if (!strcmp(s->name, "tacho"))
        sheet_errors_add(&p->errors, s->line, "name is taken by the tacho: '[%.60s]'", s->text);
    if (!e)
        sheet_fields_missing(p, section, "unit");
    else if (!known)
        sheet_fields_wrong(p, e, "unit does not fit, wanted g, m/s2, mm/s, in/s, um or mil");
    sensor->quantity = unit.quantity;
    scale->si_per_unit = unit.si;
    sensor->at_deg = read_at(p, section);
    read_show(p, section, sensor);
    if ((e = sheet_fields_find(p, section, "channel")))
        sheet_sensors_channel(p, e, sensor->channel);
    if (known && (e = sheet_fields_find(p, section, "scale")))
        sheet_sensors_scale(p, e, sensor->quantity, scale);
}

void sheet_sensors_read(struct sheet_parse *p)
{
    struct job *job = &p->sheet->job;
    for (size_t i = 0; i < job->sensor_count; i++)
        read_sensor(p, p->sensor_sections[i], i);
    if (job->sensor_count == 0)
        sheet_errors_add(&p->errors, 1, "missing section: '[sensor NAME]'");
}
