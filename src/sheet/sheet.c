#include "sheet/sheet.h"

#include <errno.h>
#include <stdio.h>
#include <stdlib.h>
#include <string.h>

#include "base/nearest.h"
#include "sheet/sheet_fields.h"

/* What sound files begin with: WAV, 64-bit WAV, AIFF, FLAC, Ogg, CAF, AU. */
static bool is_sound(const char *text, size_t length)
{
    static const char *const HEADS[] = {"RIFF", "RF64", "FORM", "fLaC", "OggS", "caff", ".snd"};
    for (size_t i = 0; length > 4 && i < sizeof HEADS / sizeof *HEADS; i++)
        if (!memcmp(text, HEADS[i], 4))
            return memchr(text, '\0', length) != NULL;
    return false;
}

/* Columns of figures in a file that is named as such: no section stands in it. */
static bool is_table(const char *path, const char *text)
{
    const char *point = strrchr(path, '.');
    return point && !strcmp(point, ".csv") && text[0] != '[' && !strstr(text, "\n[");
}

/* The whole file, NUL-terminated, new; NULL with the error noted. */
static char *load(const char *path, size_t *length, struct sheet_errors *errors)
{
    FILE *file = fopen(path, "rb");
    if (!file) {
        const int why = errno;
        char hint[NEAREST_ROOM] = "";
        sheet_errors_add(errors, 0, "cannot be opened: %s%s", strerror(why),
                         why == ENOENT ? nearest_file(path, hint) : hint);
        return NULL;
    }
    char *text = malloc(SHEET_BYTES_MOST + 2);
    if (!text) {
        errors->no_memory = true;
        goto close;
    }
    *length = fread(text, 1, SHEET_BYTES_MOST + 1, file);
    text[*length] = '\0';
    if (ferror(file))
        sheet_errors_add(errors, 0, "cannot be read: %s", strerror(errno));
    else if (is_sound(text, *length) || is_table(path, text))
        sheet_errors_add(errors, 0, "this is a recording: 'lopside new' makes a sheet");
    else if (*length > SHEET_BYTES_MOST)
        sheet_errors_add(errors, 0, "not a job sheet: longer than 1 MiB");
    else
        goto close;
    free(text);
    text = NULL;
close:
    fclose(file);
    return text;
}

/* "." or what stands before the last stroke. */
static char *folder_of(const char *path)
{
    const char *slash = strrchr(path, '/');
    if (!slash)
        return strdup(".");
    size_t length = slash == path ? 1 : (size_t)(slash - path);
    return strndup(path, length);
}

static size_t count_sections(const struct sheet_parse *p, enum sheet_kind kind)
{
    size_t count = 0;
    for (size_t i = 0; i < p->lines.section_count; i++)
        count += p->lines.sections[i].kind == (int)kind;
    return count;
}

/* The sections of that kind, in the order of the sheet; new, NULL: no memory. */
static size_t *list_sections(const struct sheet_parse *p, enum sheet_kind kind)
{
    size_t *list = calloc(p->lines.section_count + 1, sizeof *list);
    for (size_t i = 0, made = 0; list && i < p->lines.section_count; i++)
        if (p->lines.sections[i].kind == (int)kind)
            list[made++] = i;
    return list;
}

/* The job's sensors, planes and runs with their names, so that any section may name any other. */
static bool make_room(struct sheet_parse *p)
{
    struct sheet *sheet = p->sheet;
    struct job *job = &sheet->job;
    size_t sensors = count_sections(p, SHEET_SENSOR), planes = count_sections(p, SHEET_PLANE),
           runs = count_sections(p, SHEET_RUN);
    p->sensor_sections = list_sections(p, SHEET_SENSOR);
    p->plane_sections = list_sections(p, SHEET_PLANE);
    p->run_sections = list_sections(p, SHEET_RUN);
    job->sensors = calloc(sensors + 1, sizeof *job->sensors);
    job->planes = calloc(planes + 1, sizeof *job->planes);
    job->runs = calloc(runs + 1, sizeof *job->runs);
    sheet->scales = calloc(sensors + 1, sizeof *sheet->scales);
    sheet->runs = calloc(runs + 1, sizeof *sheet->runs);
    if (!p->sensor_sections || !p->plane_sections || !p->run_sections || !job->sensors ||
        !job->planes || !job->runs || !sheet->scales || !sheet->runs)
        return false;
    job->sensor_count = sensors;
    job->plane_count = planes;
    job->run_count = runs;
    for (size_t i = 0; i < sensors; i++)
        strcpy(job->sensors[i].name, p->lines.sections[p->sensor_sections[i]].name);
    for (size_t i = 0; i < planes; i++)
        strcpy(job->planes[i].name, p->lines.sections[p->plane_sections[i]].name);
    for (size_t i = 0; i < runs; i++)
        strcpy(job->runs[i].name, p->lines.sections[p->run_sections[i]].name);
    return true;
}

static void parse(struct sheet_parse *p, char *text, size_t length)
{
    sheet_lines_split(&p->lines, text, length, &p->errors);
    if (p->lines.section_count == 0 && p->errors.count > 0)
        return; /* not a sheet: nothing more to say */
    sheet_keys_check(&p->lines, &p->errors);
    if (!make_room(p)) {
        p->errors.no_memory = true;
        return;
    }
    sheet_machine_read(p);
    sheet_sensors_read(p);
    sheet_planes_read(p);
    sheet_runs_read(p);
    sheet_aim_read(p);
    sheet_responses_read(p);
    sheet_checks_cross(p);
}

/* With `text`, which is changed, that; else the file. */
static int read_either(struct sheet *sheet, const char *path, char *text, size_t length, bool audit,
                       struct buffer *errors)
{
    struct sheet_parse p = {.sheet = sheet, .audit = audit};
    *sheet = (struct sheet){.path = strdup(path), .folder = folder_of(path)};
    job_init(&sheet->job);
    if (!sheet->path || !sheet->folder)
        p.errors.no_memory = true;
    char *loaded = text || p.errors.no_memory ? NULL : load(path, &length, &p.errors);
    if (!p.errors.no_memory && (text || loaded))
        parse(&p, text ? text : loaded, length);
    free(loaded);
    sheet_errors_print(&p.errors, path, errors);
    int result = p.errors.no_memory || errors->failed ? -1 : (int)p.errors.count;
    if (result != 0)
        sheet_release(sheet);
    sheet_errors_release(&p.errors);
    sheet_lines_release(&p.lines);
    free(p.sensor_sections);
    free(p.plane_sections);
    free(p.run_sections);
    return result;
}

int sheet_read(struct sheet *sheet, const char *path, bool audit, struct buffer *errors)
{
    return read_either(sheet, path, NULL, 0, audit, errors);
}

int sheet_read_text(struct sheet *sheet, const char *path, char *text, size_t length, bool audit,
                    struct buffer *errors)
{
    return read_either(sheet, path, text, length, audit, errors);
}

static void release_run(struct sheet_run *run)
{
    for (size_t i = 0; i < run->file_count; i++)
        free(run->files[i]);
    free(run->files);
    free(run->file_lines);
    free(run->channels);
    free(run->scales);
}

void sheet_release(struct sheet *sheet)
{
    for (size_t i = 0; sheet->runs && i < sheet->job.run_count; i++)
        release_run(&sheet->runs[i]);
    free(sheet->runs);
    free(sheet->scales);
    free(sheet->path);
    free(sheet->folder);
    job_release(&sheet->job);
    *sheet = (struct sheet){.job = sheet->job};
}
