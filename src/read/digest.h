/* digest.h - SHA-256 (FIPS 180-4) of files, taken in a thread that runs ahead of their decoding. */
#ifndef LOPSIDE_READ_DIGEST_H
#define LOPSIDE_READ_DIGEST_H

#include <stdbool.h>
#include <stddef.h>

#include "read/fault.h"
#include "read/lines.h"

/* Which state of which file: differs once a file was changed or replaced. */
struct digest_mark {
    unsigned long long device, node;
    long long size;                 /* bytes */
    long long seconds, nanoseconds; /* of its last change */
};

struct digest {
    char sha256[65]; /* hexadecimal */
    struct digest_mark mark;
    bool text;          /* no NUL byte in its first 4 KiB */
    struct lines lines; /* of a text */
    struct fault fault; /* unreadable, a directory, empty, changed: status not STATUS_DONE */
};

/* The mark of a file. Status; STATUS_RECORDING for what is no regular file. */
int digest_mark(const char *path, struct digest_mark *mark, struct fault *fault)
    __attribute__((warn_unused_result));
bool digest_mark_equal(const struct digest_mark *a, const struct digest_mark *b);

/* A queue of files and the thread that works on it, in their order. */
struct digest_queue;

/* `paths` and the strings are borrowed until the free. NULL: no memory, or no thread. */
struct digest_queue *digest_queue_new(char *const *paths, size_t count);

/* Waits until file `index` was looked over: mark, text and lines stand, the hash does not yet. The
 * result is borrowed until the free; its fault may still come with the hash. */
const struct digest *digest_queue_scanned(struct digest_queue *queue, size_t index);

/* Whether file `index` is hashed by now, too. */
bool digest_queue_ready(struct digest_queue *queue, size_t index);

/* Waits until file `index` is hashed. The result is borrowed until the free. */
const struct digest *digest_queue_wait(struct digest_queue *queue, size_t index);

/* Ends the thread, if need be in the middle of a file. NULL is fine. */
void digest_queue_free(struct digest_queue *queue);

#endif
