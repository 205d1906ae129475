/* [aim] and [limits]. */
#include <math.h>
#include <stdio.h>
#include <stdlib.h>
#include <string.h>

#include "sheet/sheet_fields.h"

/* ---- [aim] ---- */

static bool read_target(struct sheet_parse *p, const struct sheet_entry *e,
                        struct job_target *target)
{
    struct show show = {0};
    double shown = NAN;
    const char *at = e->value;
    const char *fault = sheet_values_amplitude(&at, &shown, &show);
    if (!fault && !sheet_values_end(at))
        fault = "text behind the value";
    if (!fault && !(shown > 0 && shown <= 1e6))
        fault = "out of range (more than 0, at most 1e6)";
    if (fault) {
        sheet_fields_wrong(p, e, fault);
        return false;
    }
    target->amplitude = units_from_shown(shown, &show);
    target->quantity = show.quantity;
    return true;
}

static void read_targets(struct sheet_parse *p, size_t section)
{
    struct job *job = &p->sheet->job;
    const struct sheet_entry *all = sheet_fields_find(p, section, "target");
    struct job_target common = {.amplitude = NAN, .in_aim = true};
    if (all)
        read_target(p, all, &common);
    for (size_t i = 0; i < p->lines.entry_count; i++) {
        const struct sheet_entry *e = &p->lines.entries[i];
        if (!all && sheet_fields_is(e, section, "target") && e->subject[0])
            job->aim.named = true;
    }
    for (size_t i = 0; i < job->sensor_count; i++) {
        job->aim.targets[i] = common;
        if (!all)
            job->aim.targets[i].quantity = job->sensors[i].quantity;
        job->aim.targets[i].in_aim = !job->aim.named;
    }
    for (size_t i = 0; i < p->lines.entry_count; i++) {
        const struct sheet_entry *e = &p->lines.entries[i];
        if (!sheet_fields_is(e, section, "target") || !e->subject[0])
            continue;
        int sensor = sheet_fields_sensor(p, e, e->subject);
        if (sensor >= 0 && read_target(p, e, &job->aim.targets[sensor]))
            job->aim.targets[sensor].in_aim = true;
    }
}

static void read_repeatability(struct sheet_parse *p, size_t section)
{
    static const struct sheet_range SHARE = {0, 100, false, "0 to 100 %"};
    struct job_aim *aim = &p->sheet->job.aim;
    double percent = sheet_fields_measure(p, section, "repeatability", DIMENSION_PERCENT, &SHARE);
    aim->repeatability_given = !isnan(percent);
    if (aim->repeatability_given)
        aim->repeatability = percent / 100;
}

static void read_tolerance(struct sheet_parse *p, size_t section)
{
    static const char *const TOLERANCES[] = {"API 4W/N", NULL};
    struct job *job = &p->sheet->job;
    const struct sheet_entry *e = sheet_fields_find(p, section, "tolerance");
    job->aim.tolerance = isnan(job->grade) ? TOLERANCE_NONE : TOLERANCE_GRADE;
    if (sheet_fields_choice(p, section, "tolerance", TOLERANCES, -1) < 0)
        return;
    job->aim.tolerance = TOLERANCE_API_4WN;
    size_t rotor = sheet_fields_section(p, SHEET_ROTOR, "");
    if (!sheet_fields_find(p, rotor, "mass"))
        sheet_fields_wrong(p, e, "needs the key 'mass' in [rotor]");
    if (!sheet_fields_find(p, rotor, "service speed"))
        sheet_fields_wrong(p, e, "needs the key 'service speed' in [rotor]");
}

/* The condition of a run, or of a coast-down of it: "hot @ 900 rpm". */
static bool is_condition(const struct job *job, const char *name)
{
    for (size_t i = 0; i < job->run_count; i++) {
        size_t length = strlen(job->runs[i].condition);
        if (!strncmp(job->runs[i].condition, name, length) &&
            (!name[length] || !strncmp(name + length, " @ ", 3)))
            return true;
    }
    return false;
}

/* "importance hot = 2": once a condition. */
static void read_importances(struct sheet_parse *p, size_t section)
{
    static const struct sheet_range FACTOR = {0, 1000, true, "more than 0, at most 1000"};
    struct job *job = &p->sheet->job;
    job->aim.importances = calloc(p->lines.entry_count + 1, sizeof *job->aim.importances);
    if (!job->aim.importances) {
        p->errors.no_memory = true;
        return;
    }
    for (size_t i = 0; i < p->lines.entry_count; i++) {
        const struct sheet_entry *e = &p->lines.entries[i];
        if (!sheet_fields_is(e, section, "importance"))
            continue;
        double factor = NAN;
        const char *at = e->value, *fault = sheet_values_number(&at, &factor);
        if (!fault && !sheet_values_end(at))
            fault = "text behind the value";
        if (!fault && !p->audit && !is_condition(job, e->subject))
            fault = "no run has that condition";
        if (fault) {
            sheet_fields_wrong(p, e, fault);
            continue;
        }
        if (!sheet_fields_in(p, e, factor, &FACTOR) || strlen(e->subject) >= NAME_ROOM)
            continue;
        struct job_importance *own = &job->aim.importances[job->aim.importance_count++];
        strcpy(own->condition, e->subject);
        own->factor = factor;
    }
}

/* "group 2 rigid": of ISO 20816-3. */
static void read_zones(struct sheet_parse *p, size_t section)
{
    static const char *const ZONES[] = {"group 1 rigid", "group 1 flexible", "group 2 rigid",
                                        "group 2 flexible", NULL};
    int zone = sheet_fields_choice(p, section, "zones", ZONES, -1);
    p->sheet->job.aim.zone_group = zone < 0 ? 0 : 1 + zone / 2;
    p->sheet->job.aim.zone_flexible = zone >= 0 && zone % 2 == 1;
}

static void read_minimise(struct sheet_parse *p, size_t section)
{
    static const char *const MINIMISES[] = {"total", "worst", "static first", NULL};
    struct job *job = &p->sheet->job;
    job->aim.minimise =
        (enum minimise)sheet_fields_choice(p, section, "minimise", MINIMISES, MINIMISE_TOTAL);
    if (job->aim.minimise == MINIMISE_STATIC_FIRST && job->plane_count != 2 && !p->audit)
        sheet_fields_wrong(p, sheet_fields_find(p, section, "minimise"),
                           "static and couple parts need two planes");
}

static void read_aim(struct sheet_parse *p)
{
    struct job *job = &p->sheet->job;
    size_t s = sheet_fields_section(p, SHEET_AIM, "");
    const struct sheet_entry *mounted = sheet_fields_find(p, s, "mounted");
    job->aim.targets = calloc(job->sensor_count + 1, sizeof *job->aim.targets);
    if (!job->aim.targets) {
        p->errors.no_memory = true;
        return;
    }
    read_targets(p, s);
    read_minimise(p, s);
    job->aim.mounted = -1;
    if (mounted && !p->audit)
        job->aim.mounted = sheet_fields_run(p, mounted, mounted->value);
    read_repeatability(p, s);
    read_tolerance(p, s);
    read_zones(p, s);
    read_importances(p, s);
}

/* ---- [limits] ---- */

/* Checks whose figure is the worse the lower it is. */
static bool is_low_worse(const char *check)
{
    return !strcmp(check, "length") || !strcmp(check, "one-x-share");
}

static bool is_trial_effect(const char *check)
{
    return !strcmp(check, "trial-effect");
}

/* The unit behind a figure; *errors_unit: it was s.e., the second unit of trial-effect. */
static const char *take_limit_unit(const struct sheet_key *key, const char **at, bool *errors_unit)
{
    *errors_unit = false;
    if (is_trial_effect(key->name) && sheet_values_word(at, "s.e.")) {
        *errors_unit = true;
        return NULL;
    }
    if (!key->unit[0] || sheet_values_word(at, key->unit))
        return NULL;
    if (!strcmp(key->unit, "%")) {
        const char *text = *at + strspn(*at, " \t");
        if (*text == '%') {
            *at = text + 1;
            return NULL;
        }
    }
    return sheet_values_end(*at) ? "no unit" : "unit does not fit";
}

static const char *take_figure(const char **at, double *value)
{
    const char *fault = sheet_values_number(at, value);
    if (fault)
        return fault;
    return *value >= 0 && *value <= 1e6 ? NULL : "out of range (0 to 1e6)";
}

/* "30 % 5 s.e.": each alone or both; percent is the caution's figure, s.e. the refusal's. */
static const char *read_trial_effect(const struct sheet_key *key, const char *at,
                                     struct job_limit *limit)
{
    do {
        double value;
        bool errors_unit;
        const char *fault = take_figure(&at, &value);
        if (!fault)
            fault = take_limit_unit(key, &at, &errors_unit);
        if (fault)
            return fault;
        double *place = errors_unit ? &limit->refuse : &limit->caution;
        if (!isnan(*place))
            return "two figures of the same unit";
        *place = value;
        sheet_values_word(&at, ",");
    } while (!sheet_values_end(at));
    return NULL;
}

/* "2 %", "2 5 %", "2 % 5 %", "2 %, 5 %". */
static const char *read_figures(const struct sheet_key *key, const char *at,
                                struct job_limit *limit)
{
    bool other;
    const char *fault = take_figure(&at, &limit->caution);
    if (fault)
        return fault;
    const char *first = at;
    bool unit_first = take_limit_unit(key, &at, &other) == NULL;
    if (unit_first && sheet_values_end(at))
        return NULL;
    sheet_values_word(&at, ",");
    fault = take_figure(&at, &limit->refuse);
    if (fault) /* no second number: then it is the unit that is wrong */
        return unit_first ? "one or two figures are wanted" : take_limit_unit(key, &first, &other);
    fault = take_limit_unit(key, &at, &other);
    if (fault)
        return fault;
    if (!sheet_values_end(at))
        return "one or two figures are wanted";
    bool low = is_low_worse(key->name);
    if (low ? limit->refuse > limit->caution : limit->refuse < limit->caution)
        return low ? "caution before refusal: the second figure must not be larger"
                   : "caution before refusal: the second figure must not be smaller";
    return NULL;
}

static void read_limit(struct sheet_parse *p, const struct sheet_entry *e)
{
    struct job *job = &p->sheet->job;
    struct job_limit limit = {.caution = NAN, .refuse = NAN};
    const char *fault = NULL;
    char cause[100];
    snprintf(limit.check, sizeof limit.check, "%s", e->key->name);
    if (!strcmp(e->value, "none"))
        limit.off = true;
    else if (!e->key->unit)
        fault = "the check has no figure, only 'none' is possible";
    else if (is_trial_effect(e->key->name))
        fault = read_trial_effect(e->key, e->value, &limit);
    else
        fault = read_figures(e->key, e->value, &limit);
    if (fault && strstr(fault, "unit")) {
        snprintf(cause, sizeof cause, "%s, wanted %s%s", fault,
                 e->key->unit[0] ? e->key->unit : "none",
                 is_trial_effect(e->key->name) ? " or s.e." : "");
        fault = cause;
    }
    if (fault)
        sheet_fields_wrong(p, e, fault);
    else
        job->limits[job->limit_count++] = limit;
}

static void read_limits(struct sheet_parse *p)
{
    struct job *job = &p->sheet->job;
    size_t s = sheet_fields_section(p, SHEET_LIMITS, "");
    job->limits = calloc(p->lines.entry_count + 1, sizeof *job->limits);
    if (!job->limits) {
        p->errors.no_memory = true;
        return;
    }
    for (size_t i = 0; s != SHEET_NO_SECTION && i < p->lines.entry_count; i++) {
        const struct sheet_entry *e = &p->lines.entries[i];
        if (e->section == s && e->key)
            read_limit(p, e);
    }
}

void sheet_aim_read(struct sheet_parse *p)
{
    read_aim(p);
    read_limits(p);
}
