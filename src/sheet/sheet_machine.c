/* [job], [rotor], [recording], [tacho]. */
#include <math.h>
#include <string.h>

#include "sheet/sheet_fields.h"
#include "sheet/sheet_utf8.h"

static const struct sheet_range MASS = {0, 1e6, true, "more than 0, at most 1000 t"};
static const struct sheet_range SPEED = {0, 1e6, true, "more than 0, at most 1e6 rpm"};
static const struct sheet_range SPAN = {0, 1000, true, "more than 0, at most 1000 m"};
static const struct sheet_range CENTRE = {-1000, 1000, false, "-1000 to 1000 m"};
static const struct sheet_range RATE = {0, 1e8, true, "more than 0, at most 1e8 Hz"};
static const struct sheet_range FULL_SCALE = {0, 1e6, true, "more than 0, at most 1e6 V"};
#define GRADE_MOST 4000 /* ISO 21940-11:2016 table 1 ends there */

/* The sheet's file name without folder and ending; what is no text in it as '?'. */
static void default_title(struct sheet_parse *p)
{
    struct job *job = &p->sheet->job;
    const char *slash = strrchr(p->sheet->path, '/');
    const char *stem = slash ? slash + 1 : p->sheet->path;
    const char *dot = strrchr(stem, '.');
    size_t length = dot && dot > stem ? (size_t)(dot - stem) : strlen(stem);
    size_t made = 0;
    for (size_t at = 0; at < length;) {
        size_t size = sheet_utf8_length(stem + at, length - at);
        bool good = size > 0 && !sheet_utf8_fault(stem + at, size);
        if (made + (good ? size : 1) >= sizeof job->title)
            break;
        memcpy(job->title + made, good ? stem + at : "?", good ? size : 1);
        made += good ? size : 1;
        at += size > 0 ? size : 1;
    }
    job->title[made] = '\0';
}

static void read_job(struct sheet_parse *p)
{
    static const char *const ANGLES[] = {"against rotation", "with rotation", NULL};
    static const char *const PHASES[] = {"lag", "lead", NULL};
    static const char *const SYSTEMS[] = {"metric", "US", NULL};
    struct job *job = &p->sheet->job;
    size_t s = sheet_fields_section(p, SHEET_JOB, "");
    sheet_fields_text(p, s, "title", job->title, sizeof job->title);
    if (!job->title[0])
        default_title(p);
    int angles = sheet_fields_choice(p, s, "angles", ANGLES, -1);
    int phase = sheet_fields_choice(p, s, "phase", PHASES, -1);
    job->angles = angles < 0 ? SENSE_NONE : angles == 0 ? SENSE_AGAINST : SENSE_WITH;
    job->phase = phase < 0 ? PHASE_NONE : phase == 0 ? PHASE_LAG : PHASE_LEAD;
    job->units = sheet_fields_choice(p, s, "units", SYSTEMS, 0) == 1 ? UNITS_US : UNITS_METRIC;
}

/* "G6.3" */
static double read_grade(struct sheet_parse *p, size_t section)
{
    const struct sheet_entry *e = sheet_fields_find(p, section, "grade");
    if (!e)
        return NAN;
    const char *at = e->value + 1;
    double grade = NAN;
    const char *fault = e->value[0] == 'G' ? sheet_values_number(&at, &grade)
                                           : "not a grade, wanted G and a number";
    if (!fault && !sheet_values_end(at))
        fault = "text behind the value";
    if (!fault && !(grade > 0 && grade <= GRADE_MOST))
        fault = "out of range (more than G0, at most G4000)";
    if (!fault)
        return grade;
    sheet_fields_wrong(p, e, fault);
    return NAN;
}

static void read_support(struct sheet_parse *p, size_t s)
{
    static const char *const SUPPORTS[] = {"between bearings", "overhung", NULL};
    struct job *job = &p->sheet->job;
    const struct sheet_entry *span = sheet_fields_find(p, s, "bearing span");
    const struct sheet_entry *centre = sheet_fields_find(p, s, "mass centre");
    int support = sheet_fields_choice(p, s, "support", SUPPORTS, -1);
    job->support = support < 0    ? SUPPORT_NONE
                   : support == 0 ? SUPPORT_BETWEEN_BEARINGS
                                  : SUPPORT_OVERHUNG;
    job->span_m = sheet_fields_measure(p, s, "bearing span", DIMENSION_LENGTH, &SPAN);
    job->centre_m = sheet_fields_measure(p, s, "mass centre", DIMENSION_LENGTH, &CENTRE);
    if (span && !centre)
        sheet_fields_wrong(p, span, "needs the key 'mass centre' beside it");
    if (centre && !span)
        sheet_fields_wrong(p, centre, "needs the key 'bearing span' beside it");
    if ((span || centre) && !sheet_fields_find(p, s, "support"))
        sheet_fields_wrong(p, span ? span : centre, "needs the key 'support' beside it");
    if (job->support == SUPPORT_BETWEEN_BEARINGS && job->span_m > 0 &&
        !(job->centre_m > 0 && job->centre_m < job->span_m) && !isnan(job->centre_m))
        sheet_fields_wrong(p, centre, "not between the bearings");
}

static void read_rotor(struct sheet_parse *p)
{
    static const char *const TURNINGS[] = {"clockwise", "counter-clockwise", NULL};
    struct job *job = &p->sheet->job;
    size_t s = sheet_fields_section(p, SHEET_ROTOR, "");
    job->rotor_mass = sheet_fields_measure(p, s, "mass", DIMENSION_MASS, &MASS);
    job->service_rpm = sheet_fields_measure(p, s, "service speed", DIMENSION_SPEED, &SPEED);
    int turning = sheet_fields_choice(p, s, "rotation", TURNINGS, -1);
    job->turning = turning < 0    ? TURNING_NONE
                   : turning == 0 ? TURNING_CLOCKWISE
                                  : TURNING_COUNTER_CLOCKWISE;
    sheet_fields_text(p, s, "seen from", job->seen_from, sizeof job->seen_from);
    job->grade = read_grade(p, s);
    read_support(p, s);
}

void sheet_machine_layout(struct sheet_parse *p, size_t s, struct sheet_layout *layout)
{
    static const char *const SEPARATORS[] = {"comma", "semicolon", "tab", NULL};
    static const char *const DECIMALS[] = {"point", "comma", NULL};
    double full_scale = sheet_fields_measure(p, s, "full scale", DIMENSION_VOLTAGE, &FULL_SCALE);
    double rate = sheet_fields_measure(p, s, "rate", DIMENSION_RATE, &RATE);
    int separator = sheet_fields_choice(p, s, "separator", SEPARATORS, -1);
    int decimal = sheet_fields_choice(p, s, "decimal", DECIMALS, -1);
    if (!isnan(full_scale))
        layout->full_scale = full_scale;
    if (!isnan(rate))
        layout->rate = rate;
    const struct sheet_entry *time = sheet_fields_find(p, s, "time column");
    if (time)
        sheet_sensors_channel(p, time, layout->time_column);
    if (separator >= 0)
        layout->separator = ",;\t"[separator];
    if (decimal >= 0)
        layout->decimal = ".,"[decimal];
    layout->skip = sheet_fields_integer(p, s, "skip", "lines", 0, 1000000, layout->skip);
    const struct sheet_entry *e = sheet_fields_find(p, s, "decimal");
    e = e ? e : sheet_fields_find(p, s, "separator");
    if (e && layout->separator == ',' && layout->decimal == ',')
        sheet_fields_wrong(p, e, "separator and decimal sign are both a comma");
}

/* "2.5 V", or a plain number for CSV. */
static double read_level(struct sheet_parse *p, size_t section)
{
    const struct sheet_entry *e = sheet_fields_find(p, section, "level");
    if (!e)
        return NAN;
    const char *at = e->value;
    double level = NAN;
    const char *fault = sheet_values_number(&at, &level);
    if (!fault && !sheet_values_end(at)) {
        at = e->value;
        fault = sheet_values_measure(&at, DIMENSION_VOLTAGE, &level);
        if (!fault && !sheet_values_end(at))
            fault = "text behind the value";
    }
    if (!fault)
        return level;
    sheet_fields_wrong(p, e, fault);
    return NAN;
}

static void read_tacho(struct sheet_parse *p)
{
    static const char *const EDGES[] = {"rising", "falling", NULL};
    struct job *job = &p->sheet->job;
    size_t s = sheet_fields_section(p, SHEET_TACHO, "");
    const struct sheet_entry *channel = sheet_fields_find(p, s, "channel");
    job->has_tacho = s != SHEET_NO_SECTION;
    job->tacho_edge = sheet_fields_choice(p, s, "edge", EDGES, 0) == 1 ? -1 : 1;
    job->tacho_marks = sheet_fields_integer(p, s, "marks", NULL, 1, 10000, 1);
    job->tacho_level = read_level(p, s);
    if (channel)
        sheet_sensors_channel(p, channel, job->tacho_channel);
    else if (job->has_tacho)
        sheet_fields_missing(p, s, "channel");
}

void sheet_machine_read(struct sheet_parse *p)
{
    struct sheet_layout *layout = &p->sheet->layout;
    *layout = (struct sheet_layout){.full_scale = NAN, .rate = NAN, .skip = -1};
    read_job(p);
    read_rotor(p);
    sheet_machine_layout(p, sheet_fields_section(p, SHEET_RECORDING, ""), layout);
    read_tacho(p);
}
