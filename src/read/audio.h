/* audio.h - recordings in the containers that libsndfile opens. */
#ifndef LOPSIDE_READ_AUDIO_H
#define LOPSIDE_READ_AUDIO_H

#include <stdbool.h>
#include <stddef.h>

#include "read/fault.h"

struct audio {
    void *file;       /* private */
    const char *path; /* borrowed, for messages */
    int channels;
    double rate_hz;
    long long frames; /* as promised by the header */
    long long done;   /* frames read so far */
    int bits;         /* of whole-number samples; 0: floating point */
    double
        largest; /* largest sample of a whole-number coding: (2^(bits-1) - 1)/2^(bits-1); else 1 */
};

/* Opens the file. Refused (status, with its line in `fault`): what libsndfile does not know,
 * codings that lose something, a file shorter than its header promises, a header that gives no
 * length, no frames. */
int audio_open(struct audio *audio, const char *path, struct fault *fault)
    __attribute__((warn_unused_result));

/* Reads exactly min(frames, what is left) frames, interleaved, whole-number codings scaled to [-1,
 * 1), which is exact up to 24 bits. *got is their number, 0 at the end. A file that ends early is a
 * fault, and so is a sample that is no finite number, named by frame (from 0) and channel (from 1).
 */
int audio_read(struct audio *audio, float *samples, size_t frames, size_t *got, struct fault *fault)
    __attribute__((warn_unused_result));

void audio_close(struct audio *audio); /* once opened, or all zero */

#endif
