#define _GNU_SOURCE /* F_SETPIPE_SZ, where the system has it */
#include "stream/stream.h"

#include <errno.h>
#include <fcntl.h>
#include <stdlib.h>
#include <string.h>
#include <unistd.h>

#include "base/message.h"

/* Linux takes 64 KiB by default; one of 512 KiB lets both ends of it work. */
#define PIPE_BYTES (512 * 1024)
#define SINK_ROOM (64 * 1024)

struct sink {
    int fd;
    long long records;
    size_t used;
    char bytes[SINK_ROOM];
};

struct sink *sink_new(int fd)
{
    struct sink *sink = malloc(sizeof *sink);
    if (!sink)
        return NULL;
    sink->fd = fd;
    sink->records = 0;
    sink->used = 0;
#ifdef F_SETPIPE_SZ
    (void)fcntl(fd, F_SETPIPE_SZ, PIPE_BYTES); /* no pipe, or not allowed: slower, not wrong */
#endif
    return sink;
}

static int write_all(int fd, const char *bytes, size_t length)
{
    while (length > 0) {
        ssize_t written = write(fd, bytes, length);
        if (written < 0 && errno == EINTR)
            continue;
        if (written < 0) {
            message("cannot write: %s", strerror(errno));
            return STATUS_SYSTEM;
        }
        bytes += written;
        length -= (size_t)written;
    }
    return STATUS_DONE;
}

static int flush(struct sink *sink)
{
    size_t used = sink->used;
    sink->used = 0;
    return write_all(sink->fd, sink->bytes, used);
}

int sink_bytes(struct sink *sink, const void *bytes, size_t length)
{
    if (length > SINK_ROOM - sink->used) {
        int status = flush(sink);
        if (status != STATUS_DONE)
            return status;
        if (length >= SINK_ROOM)
            return write_all(sink->fd, bytes, length);
    }
    memcpy(sink->bytes + sink->used, bytes, length);
    sink->used += length;
    return STATUS_DONE;
}

int sink_record(struct sink *sink, const char *bytes, size_t length)
{
    sink->records++;
    return sink_bytes(sink, bytes, length);
}

int sink_line(struct sink *sink, struct line *line)
{
    if (line->text.failed) {
        message("cannot build a record: no memory left, or a text that is not UTF-8");
        return STATUS_SYSTEM;
    }
    return sink_record(sink, line->text.bytes, line->text.length);
}

int sink_finish(struct sink *sink)
{
    struct line line = LINE_INIT;
    line_begin(&line, "end");
    line_integer(&line, "records", sink->records);
    line_end(&line);
    int status = line.text.failed ? message_no_memory()
                                  : sink_bytes(sink, line.text.bytes, line.text.length);
    line_release(&line);
    if (status == STATUS_DONE)
        status = flush(sink);
    return status;
}

void sink_free(struct sink *sink)
{
    free(sink);
}
