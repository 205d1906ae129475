#include "read/promise.h"

#include <errno.h>
#include <stdint.h>
#include <string.h>
#include <unistd.h>

/* Sources: RIFF: IBM & Microsoft 1991, "Multimedia Programming Interface and Data Specifications
 * 1.0"; RF64: EBU Tech 3306 (2009); AIFF: Apple 1989, "Audio Interchange File Format"; CAF: Apple,
 * "Core Audio Format Specification 1.0"; W64: Sonic Foundry's GUID chunks of 24 bytes; AU: the
 * NeXT/Sun header of six 32-bit words. */

#define CHUNKS_MOST 4096 /* more chunk headers than this before the samples are no recording */
#define UNKNOWN_32 0xFFFFFFFFu

static uint64_t little(const unsigned char *p, int bytes)
{
    uint64_t value = 0;
    while (bytes-- > 0)
        value = value << 8 | p[bytes];
    return value;
}

static uint64_t big(const unsigned char *p, int bytes)
{
    uint64_t value = 0;
    for (int i = 0; i < bytes; i++)
        value = value << 8 | p[i];
    return value;
}

/* 1: all of it; 0: the file ends before; -1: a read error. */
static int fetch(int fd, long long offset, unsigned char *bytes, size_t length)
{
    size_t have = 0;
    while (have < length) {
        ssize_t got = pread(fd, bytes + have, length - have, (off_t)(offset + (long long)have));
        if (got < 0 && errno == EINTR)
            continue;
        if (got <= 0)
            return got < 0 ? -1 : 0;
        have += (size_t)got;
    }
    return 1;
}

/* How a family of containers writes its chunks. */
struct chunks {
    int id, length; /* bytes of a chunk's name and of its size */
    bool is_big;    /* byte order of the size */
    bool inclusive; /* the size counts the chunk's header */
    int align;
    int before;          /* bytes of the samples' chunk before the samples */
    const char *samples; /* name of the samples' chunk */
    long long first;     /* offset of the first chunk */
};

static void settle(struct promise *promise, uint64_t promised, long long start, long long size)
{
    promise->found = true;
    promise->there = size > start ? size - start : 0;
    promise->open = promised == 0 && promise->there > 0;
    promise->promised = promised > INT64_MAX ? INT64_MAX : (long long)promised;
}

/* Walks the chunks to the samples. `wide`: RF64's 64-bit size of the samples is in its first chunk.
 */
static int walk(int fd, long long size, const struct chunks *how, bool wide,
                struct promise *promise)
{
    unsigned char head[32];
    long long at = how->first;
    uint64_t wide_size = 0;
    const int head_size = how->id + how->length;
    for (int i = 0; i < CHUNKS_MOST; i++) {
        int got = fetch(fd, at, head, (size_t)head_size);
        if (got <= 0)
            return got;
        uint64_t length =
            how->is_big ? big(head + how->id, how->length) : little(head + how->id, how->length);
        const bool unknown = how->length == 4 ? length == UNKNOWN_32 : length > INT64_MAX;
        if (how->inclusive && !unknown)
            length = length < (uint64_t)head_size ? 0 : length - (uint64_t)head_size;
        if (wide && memcmp(head, "ds64", 4) == 0) {
            unsigned char sizes[16];
            got = fetch(fd, at + head_size, sizes, sizeof sizes);
            if (got <= 0)
                return got;
            wide_size = little(sizes + 8, 8);
        }
        if (memcmp(head, how->samples, 4) == 0) {
            uint64_t promised = length;
            if (wide && unknown)
                promised = wide_size;
            else if (unknown)
                promised = 0;
            if (promised >= (uint64_t)how->before)
                promised -= (uint64_t)how->before;
            settle(promise, promised, at + head_size + how->before, size);
            return 0;
        }
        if (length > (uint64_t)size)
            return 0;
        uint64_t step = length + (uint64_t)head_size;
        step += (uint64_t)((how->align - (int)(step % (uint64_t)how->align)) % how->align);
        at += (long long)step;
    }
    return 0;
}

int promise_read(int fd, long long size, struct promise *promise)
{
    static const struct chunks riff = {4, 4, false, false, 2, 0, "data", 12};
    static const struct chunks rifx = {4, 4, true, false, 2, 0, "data", 12};
    static const struct chunks form = {4, 4, true, false, 2, 8, "SSND", 12};
    static const struct chunks core = {4, 8, true, false, 1, 4, "data", 8};
    static const struct chunks wave64 = {16, 8, false, true, 8, 0, "data", 40};
    unsigned char head[24];
    *promise = (struct promise){0};
    int got = fetch(fd, 0, head, sizeof head);
    if (got < 0)
        return -1;
    if (got == 0 && (fetch(fd, 0, head, 4) <= 0 || size < 4))
        return 0;
    promise->known = true;
    if (memcmp(head, "RIFF", 4) == 0)
        return walk(fd, size, &riff, false, promise);
    if (memcmp(head, "RIFX", 4) == 0)
        return walk(fd, size, &rifx, false, promise);
    if (memcmp(head, "RF64", 4) == 0 || memcmp(head, "BW64", 4) == 0)
        return walk(fd, size, &riff, true, promise);
    if (memcmp(head, "FORM", 4) == 0)
        return walk(fd, size, &form, false, promise);
    if (memcmp(head, "caff", 4) == 0)
        return walk(fd, size, &core, false, promise);
    if (memcmp(head, "riff", 4) == 0)
        return walk(fd, size, &wave64, false, promise);
    if (memcmp(head, ".snd", 4) == 0 && got > 0) {
        uint64_t promised = big(head + 8, 4);
        settle(promise, promised == UNKNOWN_32 ? 0 : promised, (long long)big(head + 4, 4), size);
        return 0;
    }
    promise->known = false;
    return 0;
}
