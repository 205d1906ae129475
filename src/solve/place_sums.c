/* place_sums.c - see place_sums.h. */
#include "solve/place_sums.h"

#include <math.h>
#include <stdlib.h>

#define LEAF_SUMS 8 /* a leaf's sums are looked at one by one; 4 to 16 were equally fast */

size_t place_sums_size(size_t items, size_t depth)
{
    /* C(items + depth, depth), "nothing" being one more item. */
    double size = 1;
    for (size_t i = 1; i <= depth; i++) {
        size = size * (double)(items + i) / (double)i;
    }
    return size > 0x1p40 ? SIZE_MAX : (size_t)(size + 0.5);
}

bool place_sums_allowed(const struct place_stock *stock, const uint32_t *items, size_t count)
{
    double all = 0;
    for (size_t i = 0; i < count; i++) {
        if (items[i] == PLACE_NO_ITEM) {
            continue;
        }
        size_t position = items[i] / stock->stock, piece = items[i] % stock->stock;
        double here = stock->held != NULL ? stock->held[position] : 0;
        int same = 0;
        for (size_t j = 0; j < count; j++) {
            if (items[j] == PLACE_NO_ITEM) {
                continue;
            }
            here += items[j] / stock->stock == position ? stock->masses[items[j] % stock->stock] : 0;
            same += items[j] % stock->stock == piece;
        }
        if (here > stock->most * (1 + 1e-12) ||
            (stock->counts[piece] >= 0 && same > stock->counts[piece])) {
            return false;
        }
        all += stock->masses[piece];
    }
    return all <= stock->most_in_all * (1 + 1e-12);
}

/* Items in rising order, so that each set comes once. */
static void list_sums(struct place_sums *sums, const struct place_stock *stock, uint32_t *chosen,
                      size_t used, uint32_t from)
{
    struct place_sum *sum = &sums->sum[sums->count];
    *sum = (struct place_sum){.first = (uint32_t)(sums->count * sums->depth)};
    for (size_t i = 0; i < sums->depth; i++) {
        sums->items[sum->first + i] = i < used ? chosen[i] : PLACE_NO_ITEM;
        if (i < used) {
            double mass = stock->masses[chosen[i] % stock->stock];
            sum->mass += mass;
            sum->w += mass * stock->e[chosen[i] / stock->stock];
        }
    }
    sums->count++;
    if (used == sums->depth) {
        return;
    }
    uint32_t all = (uint32_t)(stock->positions * stock->stock);
    for (uint32_t item = from; item < all; item++) {
        chosen[used] = item;
        if (place_sums_allowed(stock, chosen, used + 1)) {
            list_sums(sums, stock, chosen, used + 1, item);
        }
    }
}

static int by_real(const void *a, const void *b)
{
    const struct place_sum *x = a, *y = b;
    if (creal(x->w) != creal(y->w)) {
        return creal(x->w) < creal(y->w) ? -1 : 1;
    }
    return (x->first > y->first) - (x->first < y->first);
}

static int by_imaginary(const void *a, const void *b)
{
    const struct place_sum *x = a, *y = b;
    if (cimag(x->w) != cimag(y->w)) {
        return cimag(x->w) < cimag(y->w) ? -1 : 1;
    }
    return (x->first > y->first) - (x->first < y->first);
}

static uint32_t grow(struct place_sums *sums, uint32_t begin, uint32_t end)
{
    uint32_t me = (uint32_t)sums->nodes++;
    double low_x = INFINITY, low_y = INFINITY, high_x = -INFINITY, high_y = -INFINITY;
    double mass = INFINITY;
    for (uint32_t i = begin; i < end; i++) {
        const struct place_sum *sum = &sums->sum[i];
        low_x = fmin(low_x, creal(sum->w));
        low_y = fmin(low_y, cimag(sum->w));
        high_x = fmax(high_x, creal(sum->w));
        high_y = fmax(high_y, cimag(sum->w));
        mass = fmin(mass, sum->mass);
    }
    struct place_node node = {CMPLX(low_x, low_y), CMPLX(high_x, high_y), mass, begin, end, 0, 0};
    if (end - begin > LEAF_SUMS) {
        qsort(sums->sum + begin, end - begin, sizeof *sums->sum,
              high_x - low_x >= high_y - low_y ? by_real : by_imaginary);
        uint32_t half = begin + (end - begin) / 2;
        node.left = grow(sums, begin, half);
        node.right = grow(sums, half, end);
    }
    sums->node[me] = node;
    return me;
}

int place_sums_init(struct place_sums *sums, const struct place_stock *stock, size_t depth)
{
    size_t size = place_sums_size(stock->positions * stock->stock, depth);
    uint32_t chosen[16];
    *sums = (struct place_sums){.depth = depth};
    sums->sum = malloc(size * sizeof *sums->sum);
    sums->items = malloc(size * depth * sizeof *sums->items);
    sums->node = malloc((size / 2 + 8) * sizeof *sums->node);
    if (sums->sum == NULL || sums->items == NULL || sums->node == NULL) {
        return -1;
    }
    list_sums(sums, stock, chosen, 0, 0);
    grow(sums, 0, (uint32_t)sums->count);
    return 0;
}

void place_sums_release(struct place_sums *sums)
{
    free(sums->sum);
    free(sums->items);
    free(sums->node);
    *sums = (struct place_sums){0};
}
