/* [run NAME]. */
#include <math.h>
#include <stdio.h>
#include <stdlib.h>
#include <string.h>

#include "base/angle.h"
#include "sheet/sheet_fields.h"

static const struct sheet_range SPEED = {0, 1e6, true, "more than 0, at most 1e6 rpm"};
static const struct sheet_range RADIUS = {0, 100, true, "more than 0, at most 100 m"};
#define WEIGHT_MOST 1e5 /* kg, either sign: more than any balance weight */

struct run_parts {
    size_t section, index;
    struct job_run *job;
    struct sheet_run *sheet;
};

/* ---- weights ---- */

static const char NO_FORM[] = "wanted 'MASS at ANGLE deg' or 'MASS at position N'";
static const char NO_POSITION[] = "the plane has no such position";

/* "at 30 deg" or "at position 2". */
static const char *take_place(const struct sheet_parse *p, const char **at,
                              const struct job_plane *plane, struct job_weight *weight)
{
    double number = NAN;
    if (!sheet_values_word(at, "at"))
        return NO_FORM;
    if (!sheet_values_word(at, "position")) {
        const char *next = *at + strspn(*at, " \t");
        if (!*next || !strchr("+-.0123456789", *next))
            return NO_FORM;
        const char *fault = sheet_values_measure(at, DIMENSION_ANGLE, &number);
        if (!fault && fabs(number) > 360)
            fault = "angle out of range (-360 to 360 deg)";
        weight->angle_deg = sheet_fields_against(p, number);
        return fault;
    }
    const char *fault = sheet_values_number(at, &number);
    if (fault)
        return fault;
    if (plane->any_position)
        return "the plane has no numbered positions";
    for (size_t i = 0; i < plane->position_count; i++)
        if (plane->positions[i].number == number) {
            weight->angle_deg = plane->positions[i].angle_deg;
            weight->position = plane->positions[i].number;
            return NULL;
        }
    return NO_POSITION;
}

/* A fault of a weight; where the position is none of the plane's, which it has. */
static void tell_weight(struct sheet_parse *p, const struct sheet_entry *e,
                        const struct job_plane *plane, const char *fault)
{
    char cause[80];
    if (fault == NO_POSITION && plane->position_count > 0) {
        snprintf(cause, sizeof cause, "%s (1 to %zu)", fault, plane->position_count);
        fault = cause;
    }
    sheet_fields_wrong(p, e, fault);
}

static const char *take_radius(const char **at, const struct job_plane *plane,
                               struct job_weight *weight)
{
    weight->radius_m = plane->radius_m;
    weight->mass = weight->mounted_mass;
    if (!sheet_values_word(at, "radius"))
        return NULL;
    const char *fault = sheet_values_measure(at, DIMENSION_LENGTH, &weight->radius_m);
    if (fault)
        return fault;
    if (!(weight->radius_m > RADIUS.min && weight->radius_m <= RADIUS.max))
        return "radius out of range (more than 0, at most 100 m)";
    weight->mass = weight->mounted_mass * weight->radius_m / plane->radius_m;
    return NULL;
}

static void read_weight(struct sheet_parse *p, const struct run_parts *run,
                        const struct sheet_entry *e)
{
    int index = sheet_fields_plane(p, e, e->subject);
    if (index < 0)
        return;
    const struct job_plane *plane = &p->sheet->job.planes[index];
    struct job_weight *weight = &run->job->weights[run->job->weight_count];
    *weight = (struct job_weight){.plane = (size_t)index};
    const char *at = e->value;
    const char *fault = sheet_values_measure(&at, DIMENSION_MASS, &weight->mounted_mass);
    if (!fault && fabs(weight->mounted_mass) > WEIGHT_MOST)
        fault = "mass out of range (at most 100 t)";
    if (!fault)
        fault = take_place(p, &at, plane, weight);
    if (!fault)
        fault = take_radius(&at, plane, weight);
    if (!fault && !sheet_values_end(at))
        fault = "text behind the weight, only 'radius R mm' may follow";
    if (fault)
        tell_weight(p, e, plane, fault);
    else
        run->job->weight_count++;
}

/* ---- readings by hand ---- */

static const char *take_lag(const struct sheet_parse *p, const char **at, struct job_hand *hand,
                            double *lag)
{
    *lag = 0;
    hand->has_phase = sheet_values_word(at, "at");
    if (!hand->has_phase)
        return sheet_values_end(*at) ? NULL
                                     : "text behind the amplitude, only 'at ANGLE deg' may follow";
    const char *fault = sheet_values_measure(at, DIMENSION_ANGLE, lag);
    if (fault)
        return fault;
    if (fabs(*lag) > 360)
        return "phase out of range (-360 to 360 deg)";
    if (p->sheet->job.phase == PHASE_LEAD)
        *lag = -*lag;
    return sheet_values_end(*at) ? NULL : "text behind the phase";
}

static void read_hand(struct sheet_parse *p, const struct run_parts *run,
                      const struct sheet_entry *e)
{
    int index = sheet_fields_sensor(p, e, e->subject);
    if (index < 0)
        return;
    enum quantity quantity = p->sheet->job.sensors[index].quantity;
    struct job_hand *hand = &run->job->hand[run->job->hand_count];
    struct show show = {0};
    double shown = NAN, lag = 0;
    const char *at = e->value;
    *hand = (struct job_hand){.sensor = (size_t)index};
    const char *fault = sheet_values_amplitude(&at, &shown, &show);
    if (!fault && !(shown >= 0 && shown <= 1e6))
        fault = "amplitude out of range (0 to 1e6)";
    if (!fault)
        fault = take_lag(p, &at, hand, &lag);
    if (!fault && run->job->without[index])
        fault = "a reading of a sensor that the run is without";
    if (fault) {
        sheet_fields_wrong(p, e, fault);
        return;
    }
    if (show.quantity != quantity && !(run->job->speed_rpm > 0))
        return; /* the missing or wrong speed is an error already */
    double w = run->job->speed_rpm * 2 * PI / 60;
    double complex peak = angle_vector(units_from_shown(shown, &show), lag);
    hand->vector = units_convert(peak, show.quantity, quantity, w);
    hand->amplitude = cabs(hand->vector);
    run->job->hand_count++;
}

static void read_hands(struct sheet_parse *p, const struct run_parts *run)
{
    size_t entries = p->lines.entry_count, given = 0;
    for (size_t i = 0; i < entries; i++)
        given += sheet_fields_is(&p->lines.entries[i], run->section, "reading");
    run->job->speed_rpm = sheet_fields_measure(p, run->section, "speed", DIMENSION_SPEED, &SPEED);
    const struct sheet_entry *speed = sheet_fields_find(p, run->section, "speed");
    if (given > 0 && !speed)
        sheet_fields_missing(p, run->section, "speed");
    if (given == 0 && speed && run->sheet->file_count > 0) {
        sheet_fields_wrong(p, speed, "for readings by hand; a recording brings its own speed");
        run->job->speed_rpm = NAN;
    }
    run->job->hand = calloc(given + 1, sizeof *run->job->hand);
    if (!run->job->hand)
        p->errors.no_memory = true;
    for (size_t i = 0; run->job->hand && i < entries; i++)
        if (sheet_fields_is(&p->lines.entries[i], run->section, "reading"))
            read_hand(p, run, &p->lines.entries[i]);
}

/* ---- recordings ---- */

static void read_file(struct sheet_parse *p, const struct run_parts *run,
                      const struct sheet_entry *e)
{
    struct sheet_run *sheet = run->sheet;
    for (size_t i = 0; i < sheet->file_count; i++)
        if (!strcmp(sheet->files[i], e->value)) {
            sheet_fields_wrong(p, e, "file given twice in one run");
            return;
        }
    sheet->files[sheet->file_count] = strdup(e->value);
    if (!sheet->files[sheet->file_count]) {
        p->errors.no_memory = true;
        return;
    }
    sheet->file_lines[sheet->file_count++] = e->line;
}

static void read_without(struct sheet_parse *p, const struct run_parts *run,
                         const struct sheet_entry *e)
{
    int sensor = sheet_fields_sensor(p, e, e->subject);
    if (strcmp(e->value, "yes") && strcmp(e->value, "no"))
        sheet_fields_wrong(p, e, "not one of 'yes', 'no'");
    else if (sensor >= 0)
        run->job->without[sensor] = !strcmp(e->value, "yes");
}

static void read_override(struct sheet_parse *p, const struct run_parts *run,
                          const struct sheet_entry *e)
{
    int sensor = sheet_fields_sensor(p, e, e->subject);
    if (sensor < 0)
        return;
    if (!strcmp(e->key->name, "channel"))
        sheet_sensors_channel(p, e, run->sheet->channels[sensor]);
    else
        sheet_sensors_scale(p, e, p->sheet->job.sensors[sensor].quantity,
                            &run->sheet->scales[sensor]);
}

/* The arrays of a run, as long as the run can need; false where memory is out. */
static bool make_room(struct sheet_parse *p, const struct run_parts *run)
{
    const struct job *job = &p->sheet->job;
    size_t entries = p->lines.sections[run->section].entries, sensors = job->sensor_count;
    for (size_t i = 0; i < p->lines.entry_count; i++) /* those of a doubled section, too */
        entries += p->lines.entries[i].section == run->section;
    run->job->weights = calloc(entries + 1, sizeof *run->job->weights);
    run->job->without = calloc(sensors + 1, sizeof *run->job->without);
    run->sheet->files = calloc(entries + 1, sizeof *run->sheet->files);
    run->sheet->file_lines = calloc(entries + 1, sizeof *run->sheet->file_lines);
    run->sheet->channels = calloc(sensors + 1, sizeof *run->sheet->channels);
    run->sheet->scales = calloc(sensors + 1, sizeof *run->sheet->scales);
    if (run->job->weights && run->job->without && run->sheet->files && run->sheet->file_lines &&
        run->sheet->channels && run->sheet->scales)
        return true;
    p->errors.no_memory = true;
    return false;
}

static void read_condition(struct sheet_parse *p, const struct run_parts *run)
{
    const struct sheet_entry *e = sheet_fields_find(p, run->section, "condition");
    const char *fault = e ? sheet_keys_name_fault(e->value) : NULL;
    strcpy(run->job->condition, "service");
    if (fault)
        sheet_fields_wrong(p, e, fault);
    else if (e)
        strcpy(run->job->condition, e->value);
}

/* ---- role ---- */

#define SPEEDS_MOST 32 /* of a coast-down: each is a condition of its own */

static int by_value(const void *a, const void *b)
{
    double x = ((const struct sheet_item *)a)->value, y = ((const struct sheet_item *)b)->value;
    return (x > y) - (x < y);
}

/* The speeds of a coast-down, sorted; all of them must give a condition's name that fits. */
static const char *take_speeds(struct job_run *job, const char *text)
{
    struct sheet_item items[SPEEDS_MOST];
    char name[NAME_ROOM];
    size_t count = 0;
    const char *fault = sheet_values_list(text, DIMENSION_SPEED, false, items, SPEEDS_MOST, &count);
    if (fault)
        return fault;
    qsort(items, count, sizeof *items, by_value);
    for (size_t i = 0; i < count; i++) {
        if (!(items[i].value > SPEED.min && items[i].value <= SPEED.max))
            return "speed out of range (more than 0, at most 1e6 rpm)";
        if (i > 0 && items[i].value - items[i - 1].value < 1e-3)
            return "speed given twice";
        if (!job_speed_condition(job->condition, items[i].value, name))
            return "condition too long with a speed behind it (40 bytes in all)";
        job->speeds_rpm[i] = items[i].value;
    }
    job->speed_count = count;
    return NULL;
}

static void read_role(struct sheet_parse *p, const struct run_parts *run)
{
    static const char *const ROLES[] = {"runout", "coast-down", NULL};
    const struct sheet_entry *speeds = sheet_fields_find(p, run->section, "speeds");
    const struct sheet_entry *role = sheet_fields_find(p, run->section, "role");
    int which = sheet_fields_choice(p, run->section, "role", ROLES, -1);
    const char *fault = NULL;
    if (which >= 0)
        strcpy(run->job->role, ROLES[which]);
    if (which != 1) {
        if (speeds && (!role || which >= 0))
            sheet_fields_wrong(p, speeds, "only with 'role = coast-down'");
        return;
    }
    if (!speeds) {
        sheet_fields_missing(p, run->section, "speeds");
        return;
    }
    run->job->speeds_rpm = calloc(SPEEDS_MOST, sizeof *run->job->speeds_rpm);
    if (!run->job->speeds_rpm) {
        p->errors.no_memory = true;
        return;
    }
    fault = take_speeds(run->job, speeds->value);
    if (fault)
        sheet_fields_wrong(p, speeds, fault);
    else if (run->job->hand_count > 0)
        sheet_fields_wrong(p, role, "needs a recording, readings by hand have no sweep");
}

static void read_entries(struct sheet_parse *p, const struct run_parts *run)
{
    for (size_t i = 0; i < p->lines.entry_count; i++) {
        const struct sheet_entry *e = &p->lines.entries[i];
        if (sheet_fields_is(e, run->section, "file"))
            read_file(p, run, e);
        else if (sheet_fields_is(e, run->section, "weight"))
            read_weight(p, run, e);
        else if (sheet_fields_is(e, run->section, "without"))
            read_without(p, run, e);
        else if (sheet_fields_is(e, run->section, "channel") ||
                 sheet_fields_is(e, run->section, "scale"))
            read_override(p, run, e);
    }
}

static void read_run(struct sheet_parse *p, const struct run_parts *run)
{
    const struct job *job = &p->sheet->job;
    run->sheet->line = p->lines.sections[run->section].line;
    run->sheet->layout = p->sheet->layout;
    run->job->speed_rpm = NAN;
    if (!make_room(p, run))
        return;
    for (size_t i = 0; i < job->sensor_count; i++) {
        strcpy(run->sheet->channels[i], job->sensors[i].channel);
        run->sheet->scales[i] = p->sheet->scales[i];
    }
    read_condition(p, run);
    sheet_fields_text(p, run->section, "when", run->job->when, sizeof run->job->when);
    sheet_machine_layout(p, run->section, &run->sheet->layout);
    read_entries(p, run);
    read_hands(p, run);
    read_role(p, run);
}

void sheet_runs_read(struct sheet_parse *p)
{
    struct job *job = &p->sheet->job;
    for (size_t i = 0; i < job->run_count; i++) {
        struct run_parts run = {p->run_sections[i], i, &job->runs[i], &p->sheet->runs[i]};
        read_run(p, &run);
    }
    if (job->run_count == 0 && !p->audit)
        sheet_errors_add(&p->errors, 1, "missing section: '[run NAME]' (without one, name recordings: 'lopside read "
                         "SHEET RECORDING...')");
}
