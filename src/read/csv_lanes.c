#include "read/csv_lanes.h"

#include <pthread.h>
#include <stdlib.h>
#include <string.h>

#include "read/fault.h"

#define PARTS 8u /* 0.5 MiB of text: what one thread may run ahead while the other writes */
#define PART_BYTES CSV_ROWS_FEED_MOST

enum state { EMPTY, FULL, TAKEN, CUT };

struct part {
    enum state state;
    char *text; /* owned: PART_BYTES */
    size_t length;
    struct csv_rows rows;
    struct fault fault;
    long lines;
    bool clean;
};

struct csv_lanes {
    struct part parts[PARTS];
    size_t first, end; /* parts handed out, parts filled; both count on and on */
    char *rest;        /* owned: PART_BYTES: the beginning of a line */
    size_t rest_length;
    bool stop;
    pthread_t thread;
    pthread_mutex_t
        lock; /* of states, first, end and stop; who took a part has the rest of it alone */
    pthread_cond_t full, cut;
};

static void cut(struct part *part)
{
    const long before = part->rows.line;
    part->clean = !memchr(part->text, '"', part->length) &&
                  csv_rows_feed(&part->rows, part->text, part->length) == STATUS_DONE &&
                  csv_rows_clean(&part->rows);
    part->lines = part->rows.line - before;
}

/* The first part that nobody works on; NULL: none. Under the lock. */
static struct part *find_full(struct csv_lanes *lanes)
{
    for (size_t i = lanes->first; i < lanes->end; i++)
        if (lanes->parts[i % PARTS].state == FULL)
            return &lanes->parts[i % PARTS];
    return NULL;
}

/* Under the lock, which is given up meanwhile. */
static void take(struct csv_lanes *lanes, struct part *part)
{
    part->state = TAKEN;
    pthread_mutex_unlock(&lanes->lock);
    cut(part);
    pthread_mutex_lock(&lanes->lock);
    part->state = CUT;
}

static void *work(void *argument)
{
    struct csv_lanes *lanes = argument;
    pthread_mutex_lock(&lanes->lock);
    while (!lanes->stop) {
        struct part *part = find_full(lanes);
        if (part) {
            take(lanes, part);
            pthread_cond_signal(&lanes->cut);
        } else {
            pthread_cond_wait(&lanes->full, &lanes->lock);
        }
    }
    pthread_mutex_unlock(&lanes->lock);
    return NULL;
}

static bool init_parts(struct csv_lanes *lanes, const struct csv_layout *layout,
                       const size_t *columns, size_t count)
{
    lanes->rest = malloc(PART_BYTES);
    bool fine = lanes->rest != NULL;
    for (size_t i = 0; i < PARTS && fine; i++) {
        struct part *part = &lanes->parts[i];
        part->text = malloc(PART_BYTES);
        fine = part->text && csv_rows_init(&part->rows, layout, columns, count, NULL, "",
                                           &part->fault) == STATUS_DONE;
    }
    return fine;
}

static void release_parts(struct csv_lanes *lanes)
{
    for (size_t i = PARTS; i-- > 0;) {
        csv_rows_release(&lanes->parts[i].rows);
        free(lanes->parts[i].text);
    }
    free(lanes->rest);
}

struct csv_lanes *csv_lanes_new(const struct csv_layout *layout, const size_t *columns,
                                size_t count)
{
    struct csv_lanes *lanes = calloc(1, sizeof *lanes);
    if (!lanes)
        return NULL;
    if (!init_parts(lanes, layout, columns, count) || pthread_mutex_init(&lanes->lock, NULL) != 0)
        goto no_lock;
    if (pthread_cond_init(&lanes->full, NULL) != 0)
        goto no_full;
    if (pthread_cond_init(&lanes->cut, NULL) != 0)
        goto no_cut;
    if (pthread_create(&lanes->thread, NULL, work, lanes) != 0)
        goto no_thread;
    return lanes;

no_thread:
    pthread_cond_destroy(&lanes->cut);
no_cut:
    pthread_cond_destroy(&lanes->full);
no_full:
    pthread_mutex_destroy(&lanes->lock);
no_lock:
    release_parts(lanes);
    free(lanes);
    return NULL;
}

char *csv_lanes_room(struct csv_lanes *lanes, size_t *room)
{
    *room = 0;
    if (lanes->end - lanes->first == PARTS) /* only this side changes either */
        return NULL;
    *room = PART_BYTES - lanes->rest_length;
    return lanes->parts[lanes->end % PARTS].text + lanes->rest_length;
}

/* Bytes up to the last newline, that one included. */
static size_t whole_lines(const char *text, size_t length)
{
    while (length > 0 && text[length - 1] != '\n')
        length--;
    return length;
}

bool csv_lanes_fill(struct csv_lanes *lanes, size_t length)
{
    struct part *part = &lanes->parts[lanes->end % PARTS];
    memcpy(part->text, lanes->rest, lanes->rest_length);
    const size_t all = lanes->rest_length + length;
    part->length = whole_lines(part->text, all);
    lanes->rest_length = all - part->length;
    memcpy(lanes->rest, part->text + part->length, lanes->rest_length);
    if (part->length == 0)
        return all < PART_BYTES;
    pthread_mutex_lock(&lanes->lock);
    part->state = FULL;
    lanes->end++;
    pthread_cond_signal(&lanes->full);
    pthread_mutex_unlock(&lanes->lock);
    return true;
}

bool csv_lanes_next(struct csv_lanes *lanes, struct csv_lanes_part *next)
{
    struct part *part = &lanes->parts[lanes->first % PARTS];
    if (lanes->first == lanes->end)
        return false;
    pthread_mutex_lock(&lanes->lock);
    while (part->state != CUT) {
        struct part *other = find_full(lanes);
        if (other)
            take(lanes, other);
        else
            pthread_cond_wait(&lanes->cut, &lanes->lock);
    }
    pthread_mutex_unlock(&lanes->lock);
    *next = (struct csv_lanes_part){&part->rows, part->length, part->lines, part->clean};
    return true;
}

void csv_lanes_drop(struct csv_lanes *lanes)
{
    pthread_mutex_lock(&lanes->lock);
    lanes->parts[lanes->first % PARTS].state = EMPTY;
    lanes->first++;
    pthread_mutex_unlock(&lanes->lock);
}

void csv_lanes_free(struct csv_lanes *lanes)
{
    if (!lanes)
        return;
    pthread_mutex_lock(&lanes->lock);
    lanes->stop = true;
    pthread_cond_signal(&lanes->full);
    pthread_mutex_unlock(&lanes->lock);
    pthread_join(lanes->thread, NULL);
    pthread_cond_destroy(&lanes->cut);
    pthread_cond_destroy(&lanes->full);
    pthread_mutex_destroy(&lanes->lock);
    release_parts(lanes);
    free(lanes);
}
