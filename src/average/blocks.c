#include "average/blocks.h"

#include <math.h>
#include <stdlib.h>

static bool has_vector(double complex z)
{
    return !isnan(creal(z)) && !isnan(cimag(z));
}

/* The mean of two blocks. */
static struct block joined(const struct block *a, const struct block *b)
{
    double turns = a->turns + b->turns;
    struct block c = {.turns = turns};

    if (a->turns <= 0)
        return *b;
    c.t = (a->t * a->turns + b->t * b->turns) / turns;
    c.speed_rpm = (a->speed_rpm * a->turns + b->speed_rpm * b->turns) / turns;
    if (has_vector(a->vector) && has_vector(b->vector))
        c.vector = (a->vector * a->turns + b->vector * b->turns) / turns;
    else
        c.vector = has_vector(a->vector) ? a->vector : b->vector;
    return c;
}

static struct block at(const struct blocks *b, size_t i)
{
    return (struct block){b->vectors[i], b->turns[i], b->t[i], b->speed[i]};
}

static void put(struct blocks *b, size_t i, const struct block *block)
{
    b->vectors[i] = block->vector;
    b->turns[i] = block->turns;
    b->t[i] = block->t;
    b->speed[i] = block->speed_rpm;
}

static void halve(struct blocks *b)
{
    for (size_t i = 0; i + 1 < b->count; i += 2) {
        struct block one = at(b, i), two = at(b, i + 1), both = joined(&one, &two);
        put(b, i / 2, &both);
    }
    b->count /= 2;
    b->pack *= 2;
}

static bool grow(double **values, size_t room)
{
    double *more = realloc(*values, room * sizeof **values);

    if (more)
        *values = more;
    return more != NULL;
}

static bool make_room(struct blocks *b)
{
    size_t room = b->room ? 2 * b->room : 64;
    double complex *more;

    if (b->count < b->room)
        return true;
    more = realloc(b->vectors, room * sizeof *more);
    if (!more)
        return false;
    b->vectors = more;
    if (!grow(&b->turns, room) || !grow(&b->t, room) || !grow(&b->speed, room))
        return false;
    b->room = room;
    return true;
}

static int close_open(struct blocks *b)
{
    if (b->count ==
        BLOCKS_MOST) { /* even, so none is left over; the open one waits for its double */
        halve(b);
        return 0;
    }
    if (!make_room(b))
        return -1;
    put(b, b->count++, &b->open);
    b->open = (struct block){0};
    b->packed = 0;
    return 0;
}

int blocks_add(struct blocks *b, const struct block *block)
{
    b->pack = b->pack ? b->pack : 1;
    b->open = b->packed ? joined(&b->open, block) : *block;
    b->packed++;
    return b->packed >= b->pack ? close_open(b) : 0;
}

void blocks_end(struct blocks *b)
{
    if (b->count < b->room && 2 * b->packed >= b->pack && b->packed > 0 && b->pack > 1)
        put(b, b->count++, &b->open);
    b->packed = 0;
}

void blocks_drop_empty(struct blocks *b)
{
    size_t kept = 0;

    for (size_t i = 0; i < b->count; i++) {
        struct block one = at(b, i);
        if (has_vector(one.vector))
            put(b, kept++, &one);
    }
    if (kept)
        b->count = kept;
}

bool blocks_empty(const struct blocks *b)
{
    return b->count == 0 || !has_vector(b->vectors[0]);
}

void blocks_clear(struct blocks *b)
{
    b->count = b->packed = b->pack = 0;
    b->amplitudes = false;
}

void blocks_release(struct blocks *b)
{
    free(b->vectors);
    free(b->turns);
    free(b->t);
    free(b->speed);
    *b = (struct blocks){0};
}
