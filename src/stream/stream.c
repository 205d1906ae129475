#include "stream/stream.h"

#include <errno.h>
#include <fcntl.h>
#include <stdalign.h>
#include <stdint.h>
#include <stdio.h>
#include <stdlib.h>
#include <string.h>
#include <unistd.h>

#include "base/message.h"
#include "stream/fields.h"

#define CHUNK (256 * 1024)               /* one read: the width of the pipes between the stages */
#define JOB_MOST (16u * 1024 * 1024) /* a job names every recording of an audit */
#define LINE_MOST (256u * 1024)      /* any other record; parsed it stays far below 32 MiB */

struct stream_state {
    const char *const *paths;
    size_t path_count, path;   /* path: index of the open file + 1 */
    int fd;
    bool open, eof;
    char *bytes;               /* owned, malloc-aligned */
    size_t room, start, fill;  /* unread bytes are [start, fill) */
    long long line_number;     /* of the current file */
    bool inside;               /* between job and end */
    bool any;                  /* a job record was seen */
    long long records;         /* since the job record, it included */
    struct buffer job_line;    /* original bytes of the first job record */
    char (*runs)[NAME_ROOM];   /* names seen so far */
    size_t run_count;
    size_t pending;            /* bytes of samples that follow */
    size_t columns;            /* of the last wave record */
    json_t *json;              /* of the current record */
    json_t *seen;              /* keys of the records that may stand once only */
    const char *const *makes;  /* kinds that the input must not hold; NULL: any may */
    struct sink *sink;         /* NULL: nothing is written */
};

/* ---- bytes ---- */

static const char *input_name(const struct stream_state *s)
{
    return s->path_count ? s->paths[s->path - 1] : "standard input";
}

static int open_next(struct stream *stream)
{
    struct stream_state *s = stream->state;
    s->line_number = 0;
    s->eof = false;
    if (s->path_count == 0) {
        s->fd = STDIN_FILENO;
    } else {
        s->path++;
        s->fd = open(input_name(s), O_RDONLY | O_CLOEXEC);
        if (s->fd < 0) {
            message("cannot read: '%s' (%s)", input_name(s), strerror(errno));
            return STATUS_USAGE;
        }
    }
    s->open = true;
    return STATUS_DONE;
}

static void close_input(struct stream_state *s)
{
    if (s->open && s->fd != STDIN_FILENO)
        close(s->fd);
    s->open = false;
}

static int make_room(struct stream_state *s, size_t need)
{
    if (s->start > 0) {
        memmove(s->bytes, s->bytes + s->start, s->fill - s->start);
        s->fill -= s->start;
        s->start = 0;
    }
    if (s->fill + need <= s->room)
        return STATUS_DONE;
    size_t room = s->room ? s->room * 2 : 2 * CHUNK;
    char *bytes = realloc(s->bytes, room);
    if (!bytes)
        return message_no_memory();
    s->bytes = bytes;
    s->room = room;
    return STATUS_DONE;
}

/* Reads once more into the buffer; sets eof when there is nothing left. */
static int refill(struct stream_state *s)
{
    int status = make_room(s, CHUNK);
    if (status != STATUS_DONE)
        return status;
    ssize_t got;
    do {
        got = read(s->fd, s->bytes + s->fill, CHUNK);
    } while (got < 0 && errno == EINTR);
    if (got < 0) {
        message("cannot read: '%s' (%s)", input_name(s), strerror(errno));
        return STATUS_SYSTEM;
    }
    s->eof = got == 0;
    s->fill += (size_t)got;
    return STATUS_DONE;
}

static int ended_early(const struct stream_state *s)
{
    message("ended early: '%s' (after line %lld)", input_name(s), s->line_number);
    return STATUS_SYSTEM;
}

static size_t line_most(const char *line, size_t have)
{
    static const char job[] = "{\"kind\":\"job\"";
    return have >= sizeof job && !memcmp(line, job, sizeof job - 1) ? JOB_MOST : LINE_MOST;
}

/* The next line, newline included; *length 0 at a clean end of the current input. */
static int next_line(struct stream_state *s, const char **line, size_t *length)
{
    size_t looked = 0;
    for (;;) {
        const char *from = s->bytes + s->start;
        size_t have = s->fill - s->start;
        const char *newline = have > looked ? memchr(from + looked, '\n', have - looked) : NULL;
        size_t whole = newline ? (size_t)(newline - from) + 1 : have;
        if (whole > line_most(from, whole)) {
            message("not a lopside stream: '%s' (line %lld is too long)", input_name(s),
                    s->line_number + 1);
            return STATUS_USAGE;
        }
        if (newline) {
            *line = from;
            *length = (size_t)(newline - from) + 1;
            s->start += *length;
            s->line_number++;
            return STATUS_DONE;
        }
        if (s->eof) {
            *length = 0;
            return have ? ended_early(s) : STATUS_DONE;
        }
        looked = have;
        int status = refill(s);
        if (status != STATUS_DONE)
            return status;
    }
}

/* ---- records ---- */

int record_malformed(const struct record *record, const char *why)
{
    if (why == fields_no_memory)
        return message_no_memory();
    message("malformed record: '%s' (%s; '%s', line %lld)", record->kind, why, record->input,
            record->line);
    return STATUS_USAGE;
}

int record_outside(const struct record *record, const char *run)
{
    message("record outside its run: '%s' (run '%s'; '%s', line %lld)", record->kind, run,
            record->input, record->line);
    return STATUS_USAGE;
}

static int malformed(const struct stream_state *s, const char *why)
{
    const struct record record = {.kind = json_string_value(json_object_get(s->json, "kind")),
                                  .input = input_name(s),
                                  .line = s->line_number};
    return record_malformed(&record, why);
}

static int parse_line(struct stream_state *s, const char *line, size_t length, const char **kind)
{
    json_error_t error;
    json_decref(s->json);
    s->json = json_loadb(line, length, JSON_REJECT_DUPLICATES, &error);
    /* somebody's own record may count beyond 64 bits; where we need a whole number, a real is malformed */
    if (!s->json && json_error_code(&error) == json_error_numeric_overflow)
        s->json = json_loadb(line, length, JSON_REJECT_DUPLICATES | JSON_DECODE_INT_AS_REAL, &error);
    /* jansson does not always say that memory is out; it says nothing then */
    if (!s->json && (json_error_code(&error) == json_error_out_of_memory || !error.text[0]))
        return message_no_memory();
    *kind = json_string_value(json_object_get(s->json, "kind"));
    if (!*kind) {
        message("not a lopside stream: '%s' (line %lld%s%s)", input_name(s), s->line_number,
                s->json ? "" : ": ", s->json ? "" : error.text);
        return STATUS_USAGE;
    }
    return STATUS_DONE;
}

static int first_job(struct stream *stream, const char *line, size_t length)
{
    struct stream_state *s = stream->state;
    const char *why;
    buffer_add(&s->job_line, line, length);
    if (s->job_line.failed)
        return message_no_memory();
    int result = job_parse(&stream->job, s->json, &why);
    if (result == -2)
        return message_no_memory();
    if (result < 0)
        return malformed(s, why);
    s->any = true;
    return s->sink ? sink_record(s->sink, line, length) : STATUS_DONE;
}

static int take_job(struct stream *stream, const char *line, size_t length)
{
    struct stream_state *s = stream->state;
    if (s->inside)
        return ended_early(s); /* the stream before this one has no end */
    s->inside = true;
    s->records = 1;
    if (!s->any)
        return first_job(stream, line, length);
    if (length != s->job_line.length || memcmp(line, s->job_line.bytes, length) != 0) {
        message("streams of different jobs: '%s' (line %lld)", input_name(s), s->line_number);
        return STATUS_USAGE;
    }
    return STATUS_DONE;
}

static int take_end(struct stream_state *s)
{
    const json_t *records = json_object_get(s->json, "records");
    if (!json_is_integer(records))
        return malformed(s, "the number of records is missing");
    if (json_integer_value(records) != s->records) {
        message("records are missing or too many: '%s' (line %lld: %lld counted, %lld promised)",
                input_name(s), s->line_number, s->records, (long long)json_integer_value(records));
        return STATUS_SYSTEM;
    }
    s->inside = false;
    return STATUS_DONE;
}

static int take_run(struct stream_state *s)
{
    const char *name = json_string_value(json_object_get(s->json, "run"));
    if (!name || !*name || strlen(name) >= NAME_ROOM)
        return malformed(s, "a run without a name");
    for (size_t i = 0; i < s->run_count; i++)
        if (!strcmp(s->runs[i], name)) {
            message("run appears twice: '%s' ('%s', line %lld)", name, input_name(s),
                    s->line_number);
            return STATUS_USAGE;
        }
    char(*runs)[NAME_ROOM] = s->runs;
    if ((s->run_count & (s->run_count + 1)) == 0) /* grow at 0, 1, 3, 7 ... */
        runs = realloc(s->runs, (2 * s->run_count + 1) * sizeof *s->runs);
    if (!runs)
        return message_no_memory();
    s->runs = runs;
    memcpy(s->runs[s->run_count++], name, strlen(name) + 1);
    return STATUS_DONE;
}

/* What tells two records of a kind apart, where a second one would have to be believed or not. */
static const struct {
    const char *kind, *fields[3];
} once[] = {
    {"reading", {"run", "sensor", "condition"}},
    {"vetted", {"run", "sensor", "condition"}},
    {"tacho", {"run"}},
    {"channel", {"run", "sensor"}},
    {"spectrum", {"run", "sensor"}},
    {"response", {"condition", "sensor", "plane"}},
    {"correction", {"plane"}},
    {"forecast", {"sensor", "condition"}},
    {"next", {NULL}},
};

static int take_once(struct stream_state *s, size_t which)
{
    char key[256];
    size_t used = (size_t)snprintf(key, sizeof key, "%s", once[which].kind);
    for (size_t i = 0; i < 3 && once[which].fields[i]; i++) {
        const char *text = json_string_value(json_object_get(s->json, once[which].fields[i]));
        used += (size_t)snprintf(key + used, sizeof key - used, "\t%.50s", text ? text : "");
    }
    if (!s->seen)
        s->seen = json_object();
    if (!s->seen)
        return message_no_memory();
    if (json_object_get(s->seen, key))
        return malformed(s, "the same thing is said twice");
    return json_object_set_new_nocheck(s->seen, key, json_true()) < 0 ? message_no_memory()
                                                                      : STATUS_DONE;
}

static int take_block(struct stream_state *s)
{
    const json_t *frames = json_object_get(s->json, "frames");
    long long count = json_is_integer(frames) ? json_integer_value(frames) : -1;
    if (!s->columns)
        return malformed(s, "a block without a wave record before it");
    if (count < 0 || (unsigned long long)count > SIZE_MAX / 4 / s->columns)
        return malformed(s, "the number of frames is out of range");
    s->pending = (size_t)count * s->columns * 4;
    return STATUS_DONE;
}

/* What every record owes to the rules of the stream, apart from job and end. */
static int take_other(struct stream_state *s, const char *kind)
{
    if (!s->inside) {
        message("not a lopside stream: '%s' (line %lld: no job record before it)", input_name(s),
                s->line_number);
        return STATUS_USAGE;
    }
    s->records++;
    for (size_t i = 0; s->makes && s->makes[i]; i++)
        if (!strcmp(kind, s->makes[i])) {
            message("the input already holds what this stage makes: '%s' ('%s', line %lld)", kind,
                    input_name(s), s->line_number);
            return STATUS_USAGE;
        }
    for (size_t i = 0; i < sizeof once / sizeof *once; i++)
        if (!strcmp(kind, once[i].kind))
            return take_once(s, i);
    if (!strcmp(kind, "run"))
        return take_run(s);
    if (!strcmp(kind, "wave")) {
        s->columns = json_array_size(json_object_get(s->json, "columns"));
        return STATUS_DONE;
    }
    if (!strcmp(kind, "block"))
        return take_block(s);
    return STATUS_DONE;
}

/* The current input is used up: the next one, or the end of all. *more is false at the end. */
static int next_input(struct stream *stream, bool *more)
{
    struct stream_state *s = stream->state;
    if (s->inside || !s->any)
        return ended_early(s);
    close_input(s);
    *more = s->path < s->path_count;
    return *more ? open_next(stream) : STATUS_DONE;
}

/* One record into `record`; record->kind NULL: all read. */
static int advance(struct stream *stream, struct record *record)
{
    struct stream_state *s = stream->state;
    for (;;) {
        const char *line;
        size_t length;
        int status = next_line(s, &line, &length);
        if (status != STATUS_DONE)
            return status;
        if (length == 0) {
            bool more = false;
            status = next_input(stream, &more);
            if (status != STATUS_DONE)
                return status;
            if (more)
                continue;
            record->kind = NULL;
            return STATUS_DONE;
        }
        status = parse_line(s, line, length, &record->kind);
        if (status != STATUS_DONE)
            return status;
        record->json = s->json;
        record->bytes = line;
        record->input = input_name(s);
        record->line = s->line_number;
        record->length = length;
        if (!strcmp(record->kind, "job")) {
            bool first = !s->any;
            status = take_job(stream, line, length);
            if (first && status == STATUS_DONE)
                return STATUS_DONE;
        } else if (!strcmp(record->kind, "end") && s->inside) {
            status = take_end(s);
        } else {
            status = take_other(s, record->kind);
            if (status == STATUS_DONE)
                return STATUS_DONE;
        }
        if (status != STATUS_DONE)
            return status;
    }
}

/* ---- what stages use ---- */

int stream_open(struct stream *stream, const char *const *paths, size_t path_count, bool output)
{
    struct record record;
    *stream = (struct stream){.status = STATUS_SYSTEM};
    job_init(&stream->job);
    struct stream_state *s = calloc(1, sizeof *s);
    stream->state = s;
    if (!s)
        return message_no_memory();
    s->paths = paths;
    s->path_count = path_count;
    if (output) {
        s->sink = sink_new(STDOUT_FILENO);
        if (!s->sink)
            return message_no_memory();
    }
    stream->status = open_next(stream);
    if (stream->status == STATUS_DONE)
        stream->status = make_room(s, CHUNK); /* so that the buffer is never NULL */
    if (stream->status == STATUS_DONE)
        stream->status = advance(stream, &record);
    return stream->status;
}

void stream_makes(struct stream *stream, const char *const *kinds)
{
    stream->state->makes = kinds;
}

bool stream_next(struct stream *stream, struct record *record)
{
    while (stream->status == STATUS_DONE && stream->state->pending) { /* samples nobody fetched */
        const float *samples;
        size_t length;
        stream->status = stream_samples(stream, stream->state->pending, &samples, &length);
    }
    if (stream->status != STATUS_DONE)
        return false;
    stream->status = advance(stream, record);
    return stream->status == STATUS_DONE && record->kind;
}

bool stream_next_tracked(struct stream *stream, struct record *record)
{
    if (!stream_next(stream, record))
        return false;
    if (!strcmp(record->kind, "wave") || !strcmp(record->kind, "block")) {
        message("the input still holds samples: 'lopside track' comes first");
        stream->status = STATUS_USAGE;
        return false;
    }
    return true;
}

int stream_samples(struct stream *stream, size_t most, const float **samples, size_t *length)
{
    struct stream_state *s = stream->state;
    if (most > s->pending)
        most = s->pending;
    if (s->start % alignof(float) != 0) {
        int status = make_room(s, 0); /* moves what is unread to the aligned front */
        if (status != STATUS_DONE)
            return stream->status = status;
    }
    while (s->fill - s->start < 4 && most >= 4) {
        int status = s->eof ? ended_early(s) : refill(s);
        if (status != STATUS_DONE)
            return stream->status = status;
    }
    size_t have = (s->fill - s->start) & ~(size_t)3;
    *length = have < most ? have : most & ~(size_t)3;
    *samples = (const float *)(const void *)(s->bytes + s->start);
    s->start += *length;
    s->pending -= *length;
    return STATUS_DONE;
}

int stream_pass(struct stream *stream, const struct record *record)
{
    return stream->state->sink ? sink_record(stream->state->sink, record->bytes, record->length)
                               : STATUS_DONE;
}

int stream_write(struct stream *stream, struct line *line)
{
    int status = sink_line(stream->state->sink, line);
    buffer_clear(&line->text);
    return status;
}

int stream_finish(struct stream *stream)
{
    return sink_finish(stream->state->sink);
}

void stream_close(struct stream *stream)
{
    struct stream_state *s = stream->state;
    job_release(&stream->job);
    if (!s)
        return;
    close_input(s);
    json_decref(s->json);
    json_decref(s->seen);
    sink_free(s->sink);
    buffer_release(&s->job_line);
    free(s->runs);
    free(s->bytes);
    free(s);
    stream->state = NULL;
}

const char *stream_job_line(const struct stream *stream, size_t *length)
{
    *length = stream->state->job_line.length;
    return stream->state->job_line.bytes;
}
