#include "report/report.h"

#include <errno.h>
#include <stdio.h>
#include <string.h>

#include "base/message.h"
#include "base/options.h"
#include "base/status.h"
#include "report/dossier.h"
#include "report/draw.h"
#include "report/html.h"
#include "report/text.h"
#include "report/tidy.h"
#include "report/whole.h"
#include "stream/stream.h"

enum form { FORM_TEXT, FORM_CSV, FORM_JSON, FORM_HTML, FORM_SVG };
static const char *const forms[] = {"text", "csv", "json", "html", "svg", NULL};

#define WHAT_NOT_GIVEN (-1)

/* The whole input into the dossier; nothing is printed before its end was seen. */
static int collect(struct stream *stream, struct dossier *dossier)
{
    struct record record;
    while (stream_next_tracked(stream, &record)) {
        const char *why = "";
        int result = dossier_add(dossier, record.json, record.bytes, record.length, &why);
        if (result == -2)
            return message_no_memory();
        if (result != 0)
            return record_malformed(&record, why);
    }
    dossier_close(dossier);
    return stream->status;
}

/* Writes and empties. */
static int write_out(struct buffer *out)
{
    if (out->failed)
        return message_no_memory();
    size_t length = out->length;
    size_t written = length ? fwrite(out->bytes, 1, length, stdout) : 0;
    buffer_clear(out);
    if (written == length && fflush(stdout) == 0)
        return STATUS_DONE;
    message("cannot write: %s", strerror(errno));
    return STATUS_SYSTEM;
}

static int write_whole(const struct stream *stream, struct dossier *dossier)
{
    struct buffer head = BUFFER_INIT, tail = BUFFER_INIT;
    size_t length = 0;
    const char *job = stream_job_line(stream, &length);
    whole_head(job, length, &head);
    whole_tail(dossier, &tail);
    int status = write_out(&head);
    if (status == STATUS_DONE)
        status = write_out(&dossier->text);
    if (status == STATUS_DONE)
        status = write_out(&tail);
    buffer_release(&head);
    buffer_release(&tail);
    return status;
}

static int render(const struct stream *stream, struct dossier *dossier, int form, int what)
{
    struct buffer out = BUFFER_INIT;
    if (form == FORM_JSON)
        return write_whole(stream, dossier);
    size_t length = 0;
    const char *job = stream_job_line(stream, &length);
    int status = STATUS_DONE;
    if (form == FORM_HTML)
        status = html_write(dossier, job, length, &out, write_out);
    else if (form == FORM_SVG)
        draw_file(dossier, (enum draw_what)what, &out);
    else if (form == FORM_CSV)
        tidy_write(dossier, what == WHAT_NOT_GIVEN ? TIDY_READINGS : (enum tidy_what)what, &out);
    else
        text_write(dossier, &out);
    if (status == STATUS_DONE)
        status = write_out(&out);
    buffer_release(&out);
    return status;
}

static int find(const char *const *names, const char *name)
{
    for (int i = 0; names[i]; i++) {
        if (strcmp(names[i], name) == 0)
            return i;
    }
    return WHAT_NOT_GIVEN;
}

static int tell_names(int form, const char *name)
{
    const char *const *names = form == FORM_CSV ? tidy_names : draw_names;
    struct buffer list = BUFFER_INIT;
    for (int i = 0; names[i]; i++)
        buffer_format(&list, "%s%s", i ? ", " : "", names[i]);
    message("no such %s: '%s' (one of %s)", form == FORM_CSV ? "table" : "picture", name,
            list.failed ? "" : list.bytes);
    buffer_release(&list);
    return STATUS_USAGE;
}

/* Turns --what into the index of the form's own list. */
static int validate(int form, const char *name, int *what)
{
    if (form != FORM_CSV && form != FORM_SVG) {
        if (!name)
            return STATUS_DONE;
        message("--what chooses a table or a picture, so it needs --as csv or svg: '%s'", name);
        return STATUS_USAGE;
    }
    if (!name && form == FORM_SVG) {
        message("a picture must be named: --what polar, plane, time, spectrum or speed");
        return STATUS_USAGE;
    }
    *what = name ? find(form == FORM_CSV ? tidy_names : draw_names, name) : WHAT_NOT_GIVEN;
    if (!name || *what != WHAT_NOT_GIVEN)
        return STATUS_DONE;
    return tell_names(form, name);
}

int stage_report(int argc, char **argv)
{
    int form = FORM_TEXT, what = WHAT_NOT_GIVEN;
    const char *name = NULL;
    const struct option options[] = {
        {"as", 0, OPTION_CHOICE, "FORM", "text", 0, 0, forms, "what to make", &form},
        {"what", 0, OPTION_TEXT, "NAME", NULL, 0, 0, NULL,
         "the table of csv or the picture of svg: readings, responses, correction, placement, "
         "forecast, findings, spectrum; polar, plane, time, spectrum, speed",
         &name},
        {0},
    };
    const struct usage usage = {
        "report",
        "[FILE...]",
        "turn a solved stream into a report",
        options,
        0,
        1000000,
        "Reads whole streams from FILEs or standard input. Exit code: 0 done, 3 a recording "
        "could not be read,\n4 the readings were refused, 5 there is no correction; 1 and 2 as "
        "everywhere."};
    message_stage("report");
    struct option_list files = {0};
    struct stream stream = {0};
    struct dossier dossier;
    int status = STATUS_DONE;
    switch (options_parse(&usage, argc, argv, &files)) {
    case OPTIONS_STOP:
        return STATUS_DONE;
    case OPTIONS_MISUSE:
        option_list_release(&files);
        return STATUS_USAGE;
    case OPTIONS_GO:
        break;
    }
    status = validate(form, name, &what);
    if (status != STATUS_DONE) {
        option_list_release(&files);
        return status;
    }
    dossier_init(&dossier, &stream.job);
    dossier.keep_lines = form == FORM_JSON;
    dossier.keep_traces =
        form == FORM_HTML || form == FORM_SVG || (form == FORM_CSV && what == TIDY_SPECTRUM);
    dossier.sparse = form == FORM_TEXT || form == FORM_HTML ||
                     (form == FORM_CSV && (what == WHAT_NOT_GIVEN || what == TIDY_READINGS));
    status = stream_open(&stream, files.items, files.count, false);
    if (status == STATUS_DONE)
        status = collect(&stream, &dossier);
    if (status == STATUS_DONE)
        status = render(&stream, &dossier, form, what);
    if (status == STATUS_DONE)
        status = dossier_status(&dossier);
    dossier_release(&dossier);
    stream_close(&stream);
    option_list_release(&files);
    return status;
}
