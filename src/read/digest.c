#include "read/digest.h"

#include <errno.h>
#include <fcntl.h>
#include <openssl/evp.h>
#include <pthread.h>
#include <stdatomic.h>
#include <stdlib.h>
#include <string.h>
#include <sys/stat.h>
#include <unistd.h>

#define CHUNK (256u * 1024u) /* stays in the second-level cache */
#define TEXT_PROBE 4096u     /* binary headers have a NUL within their first bytes */

static void to_hex(const unsigned char *bytes, size_t length, char *hex)
{
    static const char digits[] = "0123456789abcdef";
    for (size_t i = 0; i < length; i++) {
        hex[2 * i] = digits[bytes[i] >> 4];
        hex[2 * i + 1] = digits[bytes[i] & 15];
    }
    hex[2 * length] = '\0';
}

int digest_bytes(const void *bytes, size_t length, char sha256[65])
{
    unsigned char sum[EVP_MAX_MD_SIZE];
    unsigned int size = 0;
    if (!EVP_Digest(bytes, length, sum, &size, EVP_sha256(), NULL) || size != 32)
        return -1;
    to_hex(sum, 32, sha256);
    return 0;
}

static struct digest_mark mark_of(const struct stat *s)
{
    return (struct digest_mark){.device = (unsigned long long)s->st_dev,
                                .node = (unsigned long long)s->st_ino,
                                .size = (long long)s->st_size,
                                .seconds = (long long)s->st_mtim.tv_sec,
                                .nanoseconds = (long long)s->st_mtim.tv_nsec};
}

int digest_mark(const char *path, struct digest_mark *mark, struct fault *fault)
{
    struct stat s;
    if (stat(path, &s) != 0) {
        char why[128] = "";
        if (strerror_r(errno, why, sizeof why) != 0)
            why[0] = '\0';
        return fault_set(fault, STATUS_RECORDING, "cannot open the recording, %s: '%s'", why, path);
    }
    if (!S_ISREG(s.st_mode))
        return fault_set(fault, STATUS_RECORDING, "%s: '%s'",
                         S_ISDIR(s.st_mode) ? "the recording is a folder"
                                            : "the recording is no regular file",
                         path);
    *mark = mark_of(&s);
    return STATUS_DONE;
}

bool digest_mark_equal(const struct digest_mark *a, const struct digest_mark *b)
{
    return a->device == b->device && a->node == b->node && a->size == b->size &&
           a->seconds == b->seconds && a->nanoseconds == b->nanoseconds;
}

static int system_fault(struct fault *fault, const char *what, const char *path)
{
    char why[128] = "";
    if (strerror_r(errno, why, sizeof why) != 0)
        why[0] = '\0';
    return fault_set(fault, STATUS_RECORDING, "%s, %s: '%s'", what, why, path);
}

/* Everything of the open file through the hash and the line count. */
static int pour(int fd, const char *path, EVP_MD_CTX *context, struct digest *digest,
                const atomic_bool *stop)
{
    char *chunk = malloc(CHUNK);
    if (!chunk)
        return fault_no_memory(&digest->fault);
    int status = STATUS_DONE;
    long long total = 0;
    digest->text = true;
    while (status == STATUS_DONE && !atomic_load(stop)) {
        ssize_t got = read(fd, chunk, CHUNK);
        if (got < 0 && errno == EINTR)
            continue;
        if (got < 0)
            status = system_fault(&digest->fault, "cannot read the recording", path);
        if (got <= 0)
            break;
        if (total == 0) {
            size_t probe = (size_t)got < TEXT_PROBE ? (size_t)got : TEXT_PROBE;
            digest->text = memchr(chunk, '\0', probe) == NULL;
        }
        if (digest->text)
            lines_feed(&digest->lines, chunk, (size_t)got);
        if (!EVP_DigestUpdate(context, chunk, (size_t)got))
            status = fault_set(&digest->fault, STATUS_SYSTEM, "cannot hash: '%s'", path);
        total += got;
    }
    lines_finish(&digest->lines);
    free(chunk);
    if (status == STATUS_DONE && total != digest->mark.size && !atomic_load(stop))
        status = fault_set(&digest->fault, STATUS_RECORDING,
                           "the recording changed while it was read: '%s'", path);
    return status;
}

static void take(const char *path, struct digest *digest, const atomic_bool *stop)
{
    if (digest_mark(path, &digest->mark, &digest->fault) != STATUS_DONE)
        return;
    if (digest->mark.size == 0) {
        fault_set(&digest->fault, STATUS_RECORDING, "the recording is empty: '%s'", path);
        return;
    }
    int fd = open(path, O_RDONLY | O_CLOEXEC | O_NONBLOCK);
    if (fd < 0) {
        system_fault(&digest->fault, "cannot open the recording", path);
        return;
    }
    unsigned char sum[EVP_MAX_MD_SIZE];
    unsigned int size = 0;
    EVP_MD_CTX *context = EVP_MD_CTX_new();
    if (!context || !EVP_DigestInit_ex(context, EVP_sha256(), NULL))
        fault_no_memory(&digest->fault);
    else if (pour(fd, path, context, digest, stop) == STATUS_DONE) {
        if (EVP_DigestFinal_ex(context, sum, &size) && size == 32)
            to_hex(sum, size, digest->sha256);
        else
            fault_set(&digest->fault, STATUS_SYSTEM, "cannot hash: '%s'", path);
    }
    EVP_MD_CTX_free(context);
    close(fd);
}

struct digest_queue {
    char *const *paths;
    struct digest *digests;
    size_t count, done;
    pthread_t thread;
    pthread_mutex_t lock;
    pthread_cond_t progress;
    atomic_bool stop;
};

static void *work(void *argument)
{
    struct digest_queue *queue = argument;
    for (size_t i = 0; i < queue->count && !atomic_load(&queue->stop); i++) {
        take(queue->paths[i], &queue->digests[i], &queue->stop);
        pthread_mutex_lock(&queue->lock);
        queue->done = i + 1;
        pthread_cond_signal(&queue->progress);
        pthread_mutex_unlock(&queue->lock);
    }
    return NULL;
}

struct digest_queue *digest_queue_new(char *const *paths, size_t count)
{
    struct digest_queue *queue = calloc(1, sizeof *queue);
    if (!queue)
        return NULL;
    queue->paths = paths;
    queue->count = count;
    atomic_init(&queue->stop, false);
    queue->digests = calloc(count ? count : 1, sizeof *queue->digests);
    if (!queue->digests)
        goto no_digests;
    if (pthread_mutex_init(&queue->lock, NULL) != 0)
        goto no_lock;
    if (pthread_cond_init(&queue->progress, NULL) != 0)
        goto no_progress;
    if (pthread_create(&queue->thread, NULL, work, queue) != 0)
        goto no_thread;
    return queue;

no_thread:
    pthread_cond_destroy(&queue->progress);
no_progress:
    pthread_mutex_destroy(&queue->lock);
no_lock:
    free(queue->digests);
no_digests:
    free(queue);
    return NULL;
}

const struct digest *digest_queue_wait(struct digest_queue *queue, size_t index)
{
    pthread_mutex_lock(&queue->lock);
    while (queue->done <= index)
        pthread_cond_wait(&queue->progress, &queue->lock);
    pthread_mutex_unlock(&queue->lock);
    return &queue->digests[index];
}

void digest_queue_free(struct digest_queue *queue)
{
    if (!queue)
        return;
    atomic_store(&queue->stop, true);
    pthread_join(queue->thread, NULL);
    pthread_cond_destroy(&queue->progress);
    pthread_mutex_destroy(&queue->lock);
    free(queue->digests);
    free(queue);
}
