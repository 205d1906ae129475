/* What concerns several sections at once. */
#include <stdio.h>
#include <stdlib.h>
#include <string.h>

#include "sheet/sheet_fields.h"

/* The first entry of that key anywhere that `counts` (NULL: any), or NULL. */
static const struct sheet_entry *first_entry(const struct sheet_parse *p, const char *key,
                                             bool (*counts)(const struct sheet_entry *))
{
    for (size_t i = 0; i < p->lines.entry_count; i++) {
        const struct sheet_entry *e = &p->lines.entries[i];
        if (sheet_fields_is(e, e->section, key) && (!counts || counts(e)))
            return e;
    }
    return NULL;
}

static bool has_numbers(const struct sheet_entry *e)
{
    return strcmp(e->value, "any") != 0;
}

static bool has_phase(const struct sheet_entry *e)
{
    return strstr(e->value, " at ") != NULL || strstr(e->value, "\tat ") != NULL;
}

/* `key` must stand in [job] because of `reason`. */
static void need_in_job(struct sheet_parse *p, const char *key, const struct sheet_entry *reason)
{
    size_t job = sheet_fields_section(p, SHEET_JOB, "");
    if (!reason || sheet_fields_find(p, job, key))
        return;
    if (job == SHEET_NO_SECTION)
        sheet_errors_add(&p->errors, reason->line,
                         "missing section '[job]', which must say '%s' for: '%.100s = %.100s'", key,
                         reason->text, reason->value);
    else
        sheet_errors_add(&p->errors, p->lines.sections[job].line,
                         "missing key in [job]: '%s' (needed for '%.60s' in line %d)", key,
                         reason->text, reason->line);
}

static void check_job(struct sheet_parse *p)
{
    if (p->audit)
        return; /* neither runs nor planes count there */
    const struct sheet_entry *weight = first_entry(p, "weight", NULL);
    need_in_job(p, "angles", weight ? weight : first_entry(p, "positions", has_numbers));
    need_in_job(p, "phase", first_entry(p, "reading", has_phase));
}

/* How many entries of that key stand in the section. */
static size_t count_entries(const struct sheet_parse *p, size_t section, const char *key)
{
    size_t count = 0;
    for (size_t i = 0; i < p->lines.entry_count; i++)
        count += sheet_fields_is(&p->lines.entries[i], section, key);
    return count;
}

static bool is_recorded(const struct sheet_parse *p, size_t run)
{
    return count_entries(p, p->run_sections[run], "file") > 0;
}

static void check_run(struct sheet_parse *p, size_t run)
{
    const struct job *job = &p->sheet->job;
    const struct sheet_section *s = &p->lines.sections[p->run_sections[run]];
    bool files = is_recorded(p, run);
    bool hand = count_entries(p, p->run_sections[run], "reading") > 0;
    if (files && hand)
        sheet_errors_add(&p->errors, s->line,
                         "a run has either recordings or readings by hand, not both: '[%.60s]'",
                         s->text);
    if (!files && !hand && !p->audit && s->entries > 0)
        sheet_errors_add(&p->errors, s->line, "neither a 'file' nor a 'reading' in: '[%.60s]'",
                         s->text);
    size_t on = 0;
    for (size_t i = 0; i < job->sensor_count; i++)
        on += !job->runs[run].without || !job->runs[run].without[i];
    if (files && job->sensor_count > 0 && on == 0)
        sheet_errors_add(&p->errors, s->line, "a run without any sensor: '[%.60s]'", s->text);
}

/* ---- channels ---- */

/* The line to blame for a sensor's channel in a run: its own there, or the sensor's. */
static int channel_line(const struct sheet_parse *p, size_t run, size_t sensor)
{
    const char *name = p->sheet->job.sensors[sensor].name;
    const struct sheet_entry *e = NULL;
    if (run < p->sheet->job.run_count)
        e = sheet_fields_about(p, p->run_sections[run], "channel", name);
    if (!e)
        e = sheet_fields_find(p, p->sensor_sections[sensor], "channel");
    return e ? e->line : p->lines.sections[p->sensor_sections[sensor]].line;
}

/* A sensor's channel in a run; in the sensor's section where `run` is none. "": it has none. */
static const char *channel_of(const struct sheet_parse *p, size_t run, size_t sensor)
{
    const struct job *job = &p->sheet->job;
    if (run >= job->run_count)
        return job->sensors[sensor].channel;
    if (job->runs[run].without && job->runs[run].without[sensor])
        return "";
    return p->sheet->runs[run].channels ? p->sheet->runs[run].channels[sensor] : "";
}

/* Two sensors on one channel: the one further down in the sheet is told. */
static void tell_same(struct sheet_parse *p, size_t run, size_t sensor, size_t other)
{
    int line = channel_line(p, run, sensor), earlier = channel_line(p, run, other);
    if (earlier < line || (earlier == line && other < sensor))
        sheet_errors_add(&p->errors, line, "same channel as sensor '%.60s': '%.60s'",
                         p->sheet->job.sensors[other].name, channel_of(p, run, sensor));
}

static void check_channel(struct sheet_parse *p, size_t run, size_t sensor)
{
    const struct job *job = &p->sheet->job;
    const char *channel = channel_of(p, run, sensor);
    if (run < job->run_count && job->runs[run].without && job->runs[run].without[sensor])
        return;
    if (!channel[0]) {
        if (!sheet_fields_find(p, p->sensor_sections[sensor], "channel"))
            sheet_fields_missing(p, p->sensor_sections[sensor], "channel");
        return;
    }
    if (job->has_tacho && !strcmp(channel, job->tacho_channel))
        sheet_errors_add(&p->errors, channel_line(p, run, sensor),
                         "same channel as the tacho: '%.60s'", channel);
    for (size_t i = 0; i < job->sensor_count; i++)
        if (i != sensor && !strcmp(channel, channel_of(p, run, i)))
            tell_same(p, run, sensor, i);
}

static void check_channels(struct sheet_parse *p)
{
    const struct job *job = &p->sheet->job;
    for (size_t run = 0; run < job->run_count; run++) {
        if (p->audit || !is_recorded(p, run))
            continue;
        for (size_t sensor = 0; sensor < job->sensor_count; sensor++)
            check_channel(p, run, sensor);
    }
    for (size_t sensor = 0; p->audit && sensor < job->sensor_count; sensor++)
        check_channel(p, job->run_count, sensor);
}

/* Records say "as found" for the rotor without weights: that cannot be a run whose weights stay on.
 */
static void check_mounted(struct sheet_parse *p)
{
    const struct job *job = &p->sheet->job;
    const int run = job->aim.mounted;
    if (run < 0 || strcmp(job->runs[run].name, "as found") || job_run_is_bare(job, (size_t)run))
        return;
    sheet_errors_add(&p->errors, p->lines.sections[p->run_sections[run]].line,
                     "the rotor without weights is called 'as found': give this run, whose weights "
                     "stay on, another name: '[%.60s]'",
                     p->lines.sections[p->run_sections[run]].text);
}

void sheet_checks_cross(struct sheet_parse *p)
{
    check_job(p);
    for (size_t run = 0; run < p->sheet->job.run_count; run++)
        check_run(p, run);
    check_channels(p);
    check_mounted(p);
}
