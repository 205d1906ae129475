/* `responses = FILE` of [aim]: stored `response` records, as they stand in a stream. */
#include <errno.h>
#include <jansson.h>
#include <math.h>
#include <stdio.h>
#include <stdlib.h>
#include <string.h>

#include "base/buffer.h"
#include "sheet/sheet_fields.h"
#include "stream/fields.h"
#include "stream/records.h"

#define RESPONSES_MOST 100000 /* lines; 1000 sensors and planes at 100 speeds are 20 MB */
#define SAME 1e-6             /* relative: two radii nearer than this are one */

struct stored {
    struct sheet_parse *parse;
    const struct sheet_entry *entry;
    int *lines; /* of each response taken */
    size_t room;
};

/* "cause: 'responses = FILE' (its line N)". */
static void wrong(const struct stored *s, int line, const char *cause)
{
    sheet_errors_add(&s->parse->errors, s->entry->line, "%s: '%.200s' (its line %d)", cause,
                     s->entry->value, line);
}

static bool same_text(const char *a, const char *b)
{
    return !strcmp(a ? a : "", b ? b : "");
}

/* What the response was measured with against the sheet; NULL: it fits. A speed is compared where
 * the readings' own is known: by `solve`. */
static const char *setup_fault(const struct job *job, const struct response_record *r,
                               const json_t *json)
{
    struct fields f = fields_of(json);
    const char *quantity = fields_text(&f, "quantity");
    double radius = fields_real(&f, "radius_m");
    const char *channel = fields_text(&f, "tacho_channel");
    const char *edge = fields_text(&f, "tacho_edge");
    if (f.why)
        return f.why;
    if (strcmp(quantity, quantity_text(job->sensors[r->sensor].quantity)) != 0)
        return "the stored response was measured in another quantity";
    if (!(fabs(radius - job->planes[r->plane].radius_m) <= SAME * job->planes[r->plane].radius_m))
        return "the stored response is of another radius of the plane";
    if (!same_text(channel, job->has_tacho ? job->tacho_channel : NULL))
        return "the stored response was measured with another tacho channel";
    if (job->has_tacho && strcmp(edge, job->tacho_edge < 0 ? "falling" : "rising") != 0)
        return "the stored response was measured with the other edge of the mark";
    if (!isfinite(creal(r->vector)) || !isfinite(cimag(r->vector)))
        return "the stored response has no vector";
    if (!(r->cov[0] >= 0 && r->cov[2] >= 0 && r->cov[0] * r->cov[2] >= r->cov[1] * r->cov[1]))
        return "the stored response has a covariance that is none";
    return NULL;
}

static void keep(struct stored *s, const struct response_record *r, int line)
{
    struct job *job = &s->parse->sheet->job;
    char cause[100];
    for (size_t i = 0; i < job->response_count; i++) {
        const struct job_response *old = &job->responses[i];
        if (old->sensor == (size_t)r->sensor && old->plane == (size_t)r->plane &&
            !strcmp(old->condition, r->condition)) {
            snprintf(cause, sizeof cause, "response stored twice, first in line %d", s->lines[i]);
            wrong(s, line, cause);
            return;
        }
    }
    if (job->response_count == s->room) {
        size_t room = s->room ? 2 * s->room : 64;
        struct job_response *more = realloc(job->responses, room * sizeof *more);
        job->responses = more ? more : job->responses;
        int *lines = more ? realloc(s->lines, room * sizeof *lines) : NULL;
        s->lines = lines ? lines : s->lines;
        if (!more || !lines) {
            s->parse->errors.no_memory = true;
            return;
        }
        s->room = room;
    }
    s->lines[job->response_count] = line;
    struct job_response *own = &job->responses[job->response_count++];
    *own = (struct job_response){.sensor = (size_t)r->sensor,
                                 .plane = (size_t)r->plane,
                                 .vector = r->vector,
                                 .speed_rpm = r->speed_rpm};
    memcpy(own->condition, r->condition, sizeof own->condition);
    memcpy(own->cov, r->cov, sizeof own->cov);
}

static void take_line(struct stored *s, const char *text, size_t length, int line)
{
    struct response_record r;
    const char *why = NULL;
    json_t *json = json_loadb(text, length, JSON_REJECT_DUPLICATES, NULL);
    const char *kind = json_string_value(json_object_get(json, "kind"));
    if (!json)
        why = "not a line of JSON";
    else if (!kind || strcmp(kind, "response") != 0)
        why = "not a `response` record";
    else if (response_parse(&r, &s->parse->sheet->job, json, &why) == 0)
        why = setup_fault(&s->parse->sheet->job, &r, json);
    if (why)
        wrong(s, line, why);
    else
        keep(s, &r, line);
    json_decref(json);
}

/* The sheet's folder and the path of the key. New; NULL: no memory. */
static char *path_of(const struct stored *s)
{
    struct buffer path = BUFFER_INIT;
    if (s->entry->value[0] != '/')
        buffer_format(&path, "%s/", s->parse->sheet->folder);
    buffer_format(&path, "%s", s->entry->value);
    char *copy = path.failed ? NULL : strdup(path.bytes);
    buffer_release(&path);
    return copy;
}

static void read_file(struct stored *s, FILE *file)
{
    char *text = NULL;
    size_t room = 0, errors = s->parse->errors.count;
    ssize_t length;
    int line = 0;
    while (s->parse->errors.count < errors + 8 && line < RESPONSES_MOST &&
           (length = getline(&text, &room, file)) >= 0)
        if (line++, strspn(text, " \t\r\n") < (size_t)length)
            take_line(s, text, (size_t)length, line);
    if (ferror(file))
        sheet_fields_wrong(s->parse, s->entry, "cannot be read");
    else if (s->parse->sheet->job.response_count == 0 && s->parse->errors.count == errors)
        sheet_fields_wrong(s->parse, s->entry, "no `response` record in the file");
    free(text);
}

void sheet_responses_read(struct sheet_parse *p)
{
    size_t section = sheet_fields_section(p, SHEET_AIM, "");
    struct stored s = {.parse = p, .entry = sheet_fields_find(p, section, "responses")};
    if (!s.entry || p->audit)
        return;
    char *path = path_of(&s);
    FILE *file = path ? fopen(path, "rb") : NULL;
    char cause[120];
    if (!path)
        p->errors.no_memory = true;
    else if (!file) {
        snprintf(cause, sizeof cause, "cannot be opened, %s", strerror(errno));
        sheet_fields_wrong(p, s.entry, cause);
    } else {
        read_file(&s, file);
        fclose(file);
    }
    free(path);
    free(s.lines);
}
