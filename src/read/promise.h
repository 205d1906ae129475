/* promise.h - how much sound the header of an audio file promises, and how much is there.
 *
 * libsndfile reads a file that was cut short without an error, as a shorter one. The sizes in the
 * containers' chunk headers tell. */
#ifndef LOPSIDE_READ_PROMISE_H
#define LOPSIDE_READ_PROMISE_H

#include <stdbool.h>

struct promise {
    bool known;         /* a container whose sizes are understood: WAV, RF64, W64, AIFF, CAF, AU */
    bool found;         /* the samples' chunk; false: damaged, or cut within the headers */
    bool open;          /* the header gives no length: 0, or "unknown", as after a loss of power */
    long long promised; /* bytes of samples */
    long long there;    /* bytes behind the start of the samples, up to the end of the file */
};

/* Reads the chunk headers of the file descriptor (seekable) of `size` bytes. Returns 0, or -1 for a
 * read error. */
int promise_read(int fd, long long size, struct promise *promise)
    __attribute__((warn_unused_result));

#endif
