#include "read/audio.h"

#include <fcntl.h>
#include <math.h>
#include <sndfile.h>
#include <stdint.h>
#include <string.h>
#include <sys/stat.h>
#include <unistd.h>

#include "read/columns.h"
#include "read/promise.h"

/* Bits of a coding without loss; 0: floating point; -1: a coding that loses something. */
static int bits_of(int format)
{
    switch (format & SF_FORMAT_SUBMASK) {
    case SF_FORMAT_PCM_S8:
    case SF_FORMAT_PCM_U8:
        return 8;
    case SF_FORMAT_PCM_16:
    case SF_FORMAT_ALAC_16:
        return 16;
    case SF_FORMAT_ALAC_20:
        return 20;
    case SF_FORMAT_PCM_24:
    case SF_FORMAT_ALAC_24:
        return 24;
    case SF_FORMAT_PCM_32:
    case SF_FORMAT_ALAC_32:
        return 32;
    case SF_FORMAT_FLOAT:
    case SF_FORMAT_DOUBLE:
        return 0;
    default:
        return -1;
    }
}

/* Bytes of a sample where the container stores it plainly; 0: packed. */
static int bytes_of(int format)
{
    switch (format & SF_FORMAT_SUBMASK) {
    case SF_FORMAT_PCM_S8:
    case SF_FORMAT_PCM_U8:
        return 1;
    case SF_FORMAT_PCM_16:
        return 2;
    case SF_FORMAT_PCM_24:
        return 3;
    case SF_FORMAT_PCM_32:
    case SF_FORMAT_FLOAT:
        return 4;
    case SF_FORMAT_DOUBLE:
        return 8;
    default:
        return 0;
    }
}

/* Compares what the header promises with what is there. */
static int check_length(int fd, const char *path, struct promise *promise, struct fault *fault)
{
    struct stat s;
    if (fstat(fd, &s) != 0 || promise_read(fd, (long long)s.st_size, promise) != 0)
        return fault_set(fault, STATUS_RECORDING, "cannot read the recording: '%s'", path);
    if (!promise->known)
        return STATUS_DONE;
    if (!promise->found)
        return fault_set(fault, STATUS_RECORDING,
                         "the header is damaged or cut short, it leads to no samples: '%s'", path);
    if (promise->open)
        return fault_set(fault, STATUS_RECORDING,
                         "the header gives no length, but %lld bytes of samples follow (a recorder "
                         "that lost power?): '%s'",
                         promise->there, path);
    if (promise->promised > promise->there)
        return fault_set(fault, STATUS_RECORDING,
                         "the recording is cut short, its header promises %lld bytes of samples "
                         "and %lld are there: '%s'",
                         promise->promised, promise->there, path);
    if (promise->promised == 0)
        return fault_set(fault, STATUS_RECORDING, "the recording holds no samples: '%s'", path);
    return STATUS_DONE;
}

static int check_format(const SF_INFO *info, const struct promise *promise, const char *path,
                        struct fault *fault)
{
    const int container = info->format & SF_FORMAT_TYPEMASK;
    if (container == SF_FORMAT_RAW || container == SF_FORMAT_SD2)
        return fault_set(fault, STATUS_RECORDING, "the recording has no header: '%s'", path);
    if (bits_of(info->format) < 0)
        return fault_set(fault, STATUS_RECORDING,
                         "the recording's coding loses part of the signal, only PCM, float and "
                         "lossless ones are read: '%s'",
                         path);
    if (info->samplerate <= 0 || info->channels <= 0)
        return fault_set(fault, STATUS_RECORDING, "the header gives no rate or channels: '%s'",
                         path);
    if (info->frames <= 0 || info->frames == INT64_MAX)
        return fault_set(fault, STATUS_RECORDING, "the header gives no length: '%s'", path);
    const int bytes = bytes_of(info->format);
    if (promise->known && bytes > 0 &&
        info->frames != promise->promised / ((long long)bytes * info->channels))
        return fault_set(
            fault, STATUS_RECORDING,
            "the header contradicts itself, %lld frames and %lld bytes of samples: '%s'",
            (long long)info->frames, promise->promised, path);
    return STATUS_DONE;
}

/* UTF-16 text starts with the same bits as MPEG audio, which libsndfile's decoder reports on
 * standard error. */
static bool is_lossy_stream(int fd)
{
    unsigned char head[3];
    if (pread(fd, head, sizeof head, 0) != (ssize_t)sizeof head)
        return false;
    return (head[0] == 0xFF && head[1] >= 0xE0) || (head[0] == 0xFE && head[1] == 0xFF) ||
           memcmp(head, "ID3", 3) == 0;
}

int audio_open(struct audio *audio, const char *path, struct fault *fault)
{
    *audio = (struct audio){.path = path};
    int fd = open(path, O_RDONLY | O_CLOEXEC | O_NONBLOCK);
    if (fd < 0)
        return fault_set(fault, STATUS_RECORDING, "cannot open the recording: '%s'", path);
    struct promise promise;
    if (check_length(fd, path, &promise, fault) != STATUS_DONE) {
        close(fd);
        return fault->status;
    }
    if (is_lossy_stream(fd)) {
        close(fd);
        return fault_set(fault, STATUS_RECORDING,
                         "the recording is UTF-16 text or in a coding that loses part of the "
                         "signal: '%s'",
                         path);
    }
    SF_INFO info = {0};
    SNDFILE *file = sf_open_fd(fd, SFM_READ, &info, 1);
    if (!file)
        return fault_set(fault, STATUS_RECORDING, "neither a sound file nor text: '%s'", path);
    if (check_format(&info, &promise, path, fault) != STATUS_DONE) {
        sf_close(file);
        return fault->status;
    }
    audio->file = file;
    audio->channels = info.channels;
    audio->rate_hz = info.samplerate;
    audio->frames = (long long)info.frames;
    audio->bits = bits_of(info.format);
    audio->largest = audio->bits > 0 ? 1.0 - ldexp(1.0, 1 - audio->bits) : 1.0;
    return STATUS_DONE;
}

int audio_read(struct audio *audio, float *samples, size_t frames, size_t *got, struct fault *fault)
{
    *got = 0;
    const long long left = audio->frames - audio->done;
    if ((long long)frames > left)
        frames = (size_t)left;
    if (frames == 0)
        return STATUS_DONE;
    const sf_count_t read = sf_readf_float(audio->file, samples, (sf_count_t)frames);
    if (read != (sf_count_t)frames)
        return fault_set(fault, STATUS_RECORDING,
                         "the recording is cut short, its header promises %lld frames and %lld are "
                         "there: '%s'",
                         audio->frames, audio->done + (read > 0 ? (long long)read : 0),
                         audio->path);
    const size_t count = frames * (size_t)audio->channels;
    const size_t bad = audio->bits == 0 ? columns_first_bad(samples, count) : count;
    if (bad < count) {
        const size_t channels = (size_t)audio->channels;
        return fault_set(fault, STATUS_RECORDING,
                         "a sample is no number: '%s' (frame %lld, channel %zu)", audio->path,
                         audio->done + (long long)(bad / channels), bad % channels + 1);
    }
    audio->done += (long long)frames;
    *got = frames;
    return STATUS_DONE;
}

void audio_close(struct audio *audio)
{
    if (audio->file)
        sf_close(audio->file);
    audio->file = NULL;
}
