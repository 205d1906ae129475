/* stream.h - JSON Lines in and out, with everything that every stage owes the chain.
 *
 * Input: standard input or files named as arguments, one after another, each holding one or more
 * whole streams (job ... end). Checked here, once for all stages: the first record is a job of this
 * version; every `end` counts right; all job records are byte for byte the same; a run appears once;
 * no key is doubled in an object; nothing stands behind the last `end`. Violations print their one
 * line and give the right status: ended early 1, the others 2 (a read error 1). So do a second ruling or
 * reading on the same thing, a second answer, and an input that holds what the stage itself makes.
 *
 * Output: `stream_pass` copies a record's original bytes, `stream_write` prints an own one,
 * `stream_finish` writes `end` and checks that all of it arrived.
 *
 * A stage's loop:
 *
 *     struct stream stream;
 *     int status = stream_open(&stream, paths, path_count);   // reads the job record and passes it on
 *     struct record record;
 *     while (status == STATUS_DONE && stream_next(&stream, &record)) {   // false: all read, or failed
 *         if (!strcmp(record.kind, "turns")) ...
 *         status = stream_pass(&stream, &record);
 *     }
 *     if (status == STATUS_DONE) status = stream.status;      // what went wrong in stream_next
 *     ... write own closing records with stream_write ...
 *     if (status == STATUS_DONE) status = stream_finish(&stream);
 *     stream_close(&stream);
 *
 * Memory: one input buffer of 512 KiB, or twice the longest line. A record of more than 256 KiB is refused
 * (parsed, a number takes up to twenty times its text), a job record of more than 16 MiB. Also refused, in
 * any record, as RFC 8259 lets a reader: a number beyond a double's range, and the character U+0000.
 */
#ifndef LOPSIDE_STREAM_STREAM_H
#define LOPSIDE_STREAM_STREAM_H

#include <jansson.h>
#include <stdbool.h>
#include <stddef.h>

#include "base/status.h"
#include "stream/job.h"
#include "stream/line.h"

struct record {
    const char *kind;  /* borrowed from json */
    json_t *json;      /* borrowed: valid until the next stream_next */
    const char *bytes; /* the original line with its newline; valid until the next stream_next */
    size_t length;
    const char *input; /* where it stands, for messages: a file's name, borrowed; and its line */
    long long line;
};

struct stream {
    struct job job;       /* from the first job record */
    int status;           /* STATUS_DONE, or what stream_next met */
    struct stream_state *state; /* private */
};

/* Opens the input (path_count 0: standard input), reads the first job record into stream->job.
 * With `output` the job record is passed on and standard output is written to; without (report),
 * nothing is ever written. Returns a status; not STATUS_DONE: its line has been printed. */
int stream_open(struct stream *stream, const char *const *paths, size_t path_count, bool output)
    __attribute__((warn_unused_result));

/* What this stage makes: a NULL-terminated list of kinds (borrowed) that the input must not hold yet,
 * since nobody could tell the two apart. To be called behind stream_open. */
void stream_makes(struct stream *stream, const char *const *kinds);

/* The next record other than job and end. `block` records are followed by samples that must be
 * fetched with stream_samples before the next call. False: the last `end` was read
 * (stream->status is STATUS_DONE) or something is wrong (it is not, and was printed). */
bool stream_next(struct stream *stream, struct record *record) __attribute__((warn_unused_result));

/* For stages behind `track`: same as stream_next, but a wave or block record is misuse (2). */
bool stream_next_tracked(struct stream *stream, struct record *record)
    __attribute__((warn_unused_result));

/* After a block record: up to `most` bytes of its samples; repeat until the block's
 * frames*columns*4 bytes are used. Gives a pointer into the input buffer, aligned for float, valid
 * until the next call; *length is a multiple of 4. Status as above (1 with "ended early"). */
int stream_samples(struct stream *stream, size_t most, const float **samples, size_t *length)
    __attribute__((warn_unused_result));

/* Copies the record's original bytes to the output. */
int stream_pass(struct stream *stream, const struct record *record)
    __attribute__((warn_unused_result));

/* Writes a finished line as an own record and clears it. Fails if memory ran out while building it. */
int stream_write(struct stream *stream, struct line *line) __attribute__((warn_unused_result));

/* Says "malformed record" with its kind, why (from X_parse) and its place; gives 2. Where memory is to
 * blame (fields_no_memory) it says that and gives 1. */
int record_malformed(const struct record *record, const char *why);

/* Says that a record's run is not the one that it stands in, with its place; gives 2. */
int record_outside(const struct record *record, const char *run);

/* Writes `end`, flushes, checks that everything arrived. */
int stream_finish(struct stream *stream) __attribute__((warn_unused_result));
void stream_close(struct stream *stream);

/* The original bytes of the first job record, its newline included; borrowed until stream_close. */
const char *stream_job_line(const struct stream *stream, size_t *length);

/* ---- the writing half alone, for `read`, which has no input stream ---- */

struct sink; /* buffered standard output that counts records */

struct sink *sink_new(int fd);                  /* NULL: no memory. A pipe is made 512 KiB wide */
int sink_line(struct sink *sink, struct line *line) __attribute__((warn_unused_result));
/* A record's original bytes, counted. */
int sink_record(struct sink *sink, const char *bytes, size_t length)
    __attribute__((warn_unused_result));
/* Raw bytes, uncounted (samples behind a block record). */
int sink_bytes(struct sink *sink, const void *bytes, size_t length)
    __attribute__((warn_unused_result));
int sink_finish(struct sink *sink) __attribute__((warn_unused_result)); /* writes end, flushes */
void sink_free(struct sink *sink);

#endif
