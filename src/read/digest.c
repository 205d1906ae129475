#include "read/digest.h"

#include <errno.h>
#include <fcntl.h>
#include <openssl/crypto.h>
#include <openssl/evp.h>
#include <pthread.h>
#include <stdatomic.h>
#include <stdlib.h>
#include <string.h>
#include <sys/stat.h>
#include <unistd.h>

#include "base/nearest.h"

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

/* The library's SHA-256 in a context of its own: one that could not be made is NULL here, whereas
 * the library's default one is then used all the same, and reads through a null pointer
 * (OpenSSL 3.0). */
struct method {
    OSSL_LIB_CTX *library;
    EVP_MD *sha256;
};

static bool method_open(struct method *method)
{
    method->library = OSSL_LIB_CTX_new();
    method->sha256 = method->library ? EVP_MD_fetch(method->library, "SHA256", NULL) : NULL;
    return method->sha256 != NULL;
}

static void method_close(struct method *method)
{
    EVP_MD_free(method->sha256);
    OSSL_LIB_CTX_free(method->library);
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
        const int cause = errno;
        char why[128] = "", hint[NEAREST_ROOM] = "";
        if (strerror_r(cause, why, sizeof why) != 0)
            why[0] = '\0';
        return fault_set(fault, STATUS_RECORDING, "cannot open the recording, %s: '%s'%s", why,
                         path, cause == ENOENT ? nearest_file(path, hint) : hint);
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

/* Everything of the open file, or its first chunk alone, through `feed`, from the start. */
static int pour(int fd, const char *path, struct digest *digest, bool whole,
                bool (*feed)(struct digest *, void *, const char *, size_t), void *context,
                const atomic_bool *stop)
{
    char *chunk = malloc(CHUNK);
    if (!chunk)
        return fault_no_memory(&digest->fault);
    int status = STATUS_DONE;
    off_t total = 0;
    while (status == STATUS_DONE && !atomic_load(stop)) {
        ssize_t got = pread(fd, chunk, CHUNK, total);
        if (got < 0 && errno == EINTR)
            continue;
        if (got < 0)
            status = system_fault(&digest->fault, "cannot read the recording", path);
        if (got <= 0)
            break;
        if (!feed(digest, context, chunk, (size_t)got))
            status = fault_set(&digest->fault, STATUS_SYSTEM, "cannot hash: '%s'", path);
        total += got;
        if (!whole)
            break;
    }
    free(chunk);
    if (status == STATUS_DONE && whole && total != digest->mark.size && !atomic_load(stop))
        status = fault_set(&digest->fault, STATUS_RECORDING,
                           "the recording changed while it was read: '%s'", path);
    return status;
}

static bool feed_probe(struct digest *digest, void *context, const char *bytes, size_t length)
{
    (void)context;
    digest->text = memchr(bytes, '\0', length < TEXT_PROBE ? length : TEXT_PROBE) == NULL;
    return true;
}

static bool feed_lines(struct digest *digest, void *context, const char *bytes, size_t length)
{
    (void)context;
    lines_feed(&digest->lines, bytes, length);
    return true;
}

static bool feed_hash(struct digest *digest, void *context, const char *bytes, size_t length)
{
    (void)digest;
    return EVP_DigestUpdate(context, bytes, length) == 1;
}

/* What decoding wants to know before it starts; a text is counted, which is quick. The open file,
 * or -1. */
static int scan(const char *path, struct digest *digest, const atomic_bool *stop)
{
    if (digest_mark(path, &digest->mark, &digest->fault) != STATUS_DONE)
        return -1;
    if (digest->mark.size == 0) {
        fault_set(&digest->fault, STATUS_RECORDING, "the recording is empty: '%s'", path);
        return -1;
    }
    int fd = open(path, O_RDONLY | O_CLOEXEC | O_NONBLOCK);
    if (fd < 0) {
        system_fault(&digest->fault, "cannot open the recording", path);
        return -1;
    }
    int status = pour(fd, path, digest, false, feed_probe, NULL, stop);
    if (status == STATUS_DONE && digest->text)
        status = pour(fd, path, digest, true, feed_lines, NULL, stop);
    lines_finish(&digest->lines);
    if (status == STATUS_DONE)
        return fd;
    close(fd);
    return -1;
}

/* The hash of the open file; what goes wrong is in `fault`, which becomes the digest's with it. */
static void hash(int fd, const char *path, const struct method *method, struct digest *digest,
                 const atomic_bool *stop)
{
    unsigned char sum[EVP_MAX_MD_SIZE];
    unsigned int size = 0;
    EVP_MD_CTX *context = method->sha256 ? EVP_MD_CTX_new() : NULL;
    if (!context || !EVP_DigestInit_ex(context, method->sha256, NULL))
        fault_no_memory(&digest->fault);
    else if (pour(fd, path, digest, true, feed_hash, context, stop) == STATUS_DONE) {
        if (EVP_DigestFinal_ex(context, sum, &size) && size == 32)
            to_hex(sum, size, digest->sha256);
        else
            fault_set(&digest->fault, STATUS_SYSTEM, "cannot hash: '%s'", path);
    }
    EVP_MD_CTX_free(context);
}

struct digest_queue {
    char *const *paths;
    struct digest *scanned; /* as they are handed out before the hash */
    struct digest *digests;
    size_t count, looked_over, done;
    pthread_t thread;
    pthread_mutex_t lock;
    pthread_cond_t progress;
    atomic_bool stop;
};

static void advance(struct digest_queue *queue, size_t *counter, size_t value)
{
    pthread_mutex_lock(&queue->lock);
    *counter = value;
    pthread_cond_signal(&queue->progress);
    pthread_mutex_unlock(&queue->lock);
}

static void *work(void *argument)
{
    struct digest_queue *queue = argument;
    struct method method = {0};
    for (size_t i = 0; i < queue->count && !atomic_load(&queue->stop); i++) {
        struct digest *digest = &queue->digests[i];
        const int fd = scan(queue->paths[i], digest, &queue->stop);
        queue->scanned[i] = *digest;
        advance(queue, &queue->looked_over, i + 1);
        if (fd >= 0) {
            if (!method.library)
                (void)method_open(&method); /* hash() says that there is none */
            hash(fd, queue->paths[i], &method, digest, &queue->stop);
            close(fd);
        }
        advance(queue, &queue->done, i + 1);
    }
    method_close(&method);
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
    queue->scanned = calloc(count ? count : 1, sizeof *queue->scanned);
    if (!queue->digests || !queue->scanned)
        goto no_digests;
    if (pthread_mutex_init(&queue->lock, NULL) != 0)
        goto no_digests;
    if (pthread_cond_init(&queue->progress, NULL) != 0)
        goto no_progress;
    if (pthread_create(&queue->thread, NULL, work, queue) != 0)
        goto no_thread;
    return queue;

no_thread:
    pthread_cond_destroy(&queue->progress);
no_progress:
    pthread_mutex_destroy(&queue->lock);
no_digests:
    free(queue->scanned);
    free(queue->digests);
    free(queue);
    return NULL;
}

static void wait_for(struct digest_queue *queue, const size_t *counter, size_t index)
{
    pthread_mutex_lock(&queue->lock);
    while (*counter <= index)
        pthread_cond_wait(&queue->progress, &queue->lock);
    pthread_mutex_unlock(&queue->lock);
}

const struct digest *digest_queue_scanned(struct digest_queue *queue, size_t index)
{
    wait_for(queue, &queue->looked_over, index);
    return &queue->scanned[index];
}

bool digest_queue_ready(struct digest_queue *queue, size_t index)
{
    pthread_mutex_lock(&queue->lock);
    const bool ready = queue->done > index;
    pthread_mutex_unlock(&queue->lock);
    return ready;
}

const struct digest *digest_queue_wait(struct digest_queue *queue, size_t index)
{
    wait_for(queue, &queue->done, index);
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
    free(queue->scanned);
    free(queue->digests);
    free(queue);
}
