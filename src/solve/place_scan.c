/* place_scan.c - see place_scan.h. */
#include "solve/place_scan.h"

#include <math.h>
#include <stdlib.h>
#include <string.h>

#include "solve/place_kept.h"

struct scan {
    struct place_hunt *hunt;
    const struct place_site *site;
    const struct place_aim *aim;
    const struct place_sums *sums[PLACE_PIECES_MOST];
    size_t parts;
    struct place_candidates *list; /* NULL: the last plane */
    size_t depth;
    const struct place_form *form;
    const struct place_sum *at[PLACE_PIECES_MOST];
    double complex rest_low[PLACE_PIECES_MOST], rest_high[PLACE_PIECES_MOST]; /* of later parts' leaves */
    double limit;
    int failed;
};

/* Least 2 g x + s x^2 over [low, high]. */
static double valley(double g, double s, double low, double high)
{
    double x = g > 0 ? low : high;
    if (s > 0) {
        x = fmin(fmax(-g / s, low), high);
    }
    return x * (2 * g + s * x);
}

static double bound_of(const struct place_aim *aim, double complex low, double complex high)
{
    double complex from = low - aim->center, to = high - aim->center;
    return aim->base + valley(creal(aim->slope), aim->stiffness, creal(from), creal(to)) +
           valley(cimag(aim->slope), aim->stiffness, cimag(from), cimag(to));
}

static int by_bound(const void *a, const void *b)
{
    const struct place_candidate *x = a, *y = b;
    if (x->bound != y->bound) {
        return x->bound < y->bound ? -1 : 1;
    }
    for (size_t i = 0; i < PLACE_PIECES_MOST; i++) {
        if (x->load.item[i] != y->load.item[i]) {
            return x->load.item[i] < y->load.item[i] ? -1 : 1;
        }
    }
    return 0;
}

/* Keeps the nearer half; those at the border go together, or stay together if all are equal. */
static int thin_out(struct scan *scan)
{
    struct place_candidates *list = scan->list;
    qsort(list->candidate, list->count, sizeof *list->candidate, by_bound);
    size_t keep = list->count / 2;
    double border = list->candidate[keep].bound;
    while (keep > 0 && list->candidate[keep - 1].bound >= border) {
        keep--;
    }
    if (keep > 0) {
        list->count = keep;
        list->limit = border;
        scan->limit = border;
        return 0;
    }
    size_t room = 2 * list->room;
    struct place_candidate *more = realloc(list->candidate, room * sizeof *more);
    if (more == NULL) {
        return -1;
    }
    list->candidate = more;
    list->room = room;
    return 0;
}

/* The items of all parts, rising; false where the same set comes from another split of its items, too. */
static bool gather(const struct scan *scan, struct place_load *load)
{
    size_t n = 0;
    bool ended = false;
    memset(load->item, 0xff, sizeof load->item);
    for (size_t p = 0; p < scan->parts; p++) {
        const uint32_t *items = scan->sums[p]->items + scan->at[p]->first;
        for (size_t i = 0; i < scan->sums[p]->depth; i++) {
            if (items[i] == PLACE_NO_ITEM) {
                ended = true;
            } else if (ended || (n > 0 && items[i] < load->item[n - 1])) {
                return false;
            } else {
                load->item[n++] = items[i];
            }
        }
    }
    return scan->parts == 1 || place_sums_allowed(&scan->site->stock, load->item, n);
}

static void accept(struct scan *scan, double complex w, double bound)
{
    struct place_load load = {.w = w};
    if (!gather(scan, &load)) {
        return;
    }
    for (size_t i = 0; i < PLACE_PIECES_MOST && load.item[i] != PLACE_NO_ITEM; i++) {
        load.mass[i] = scan->site->stock.masses[load.item[i] % scan->site->stock.stock];
    }
    if (scan->list == NULL) {
        double value = place_form_worst(scan->form, &w, NULL);
        scan->hunt->load[scan->depth] = load;
        place_kept_offer(scan->hunt, value);
        scan->limit = place_kept_cutoff(scan->hunt);
        return;
    }
    scan->list->candidate[scan->list->count++] = (struct place_candidate){bound, load};
    if (scan->list->count == scan->list->room && thin_out(scan) != 0) {
        scan->failed = 1;
    }
}

/* All sums of the leaves' points, part by part. */
static void look_at_points(struct scan *scan, const uint32_t *node, size_t part, double complex w)
{
    scan->hunt->nodes -= part > 1;
    const struct place_sums *sums = scan->sums[part];
    const struct place_node *leaf = &sums->node[node[part]];
    for (uint32_t i = leaf->begin; i < leaf->end && !scan->failed; i++) {
        scan->at[part] = &sums->sum[i];
        double complex sum = w + sums->sum[i].w;
        if (part + 1 < scan->parts) {
            double complex low = sum + scan->rest_low[part], high = sum + scan->rest_high[part];
            if (bound_of(scan->aim, low, high) < scan->limit) {
                look_at_points(scan, node, part + 1, sum);
            }
            continue;
        }
        double bound = bound_of(scan->aim, sum, sum);
        if (bound < scan->limit && (scan->list == NULL || bound >= scan->list->from)) {
            accept(scan, sum, bound);
        }
    }
}

static double bound_of_nodes(const struct scan *scan, const uint32_t *node)
{
    double complex low = 0, high = 0;
    double mass = 0;
    for (size_t p = 0; p < scan->parts; p++) {
        const struct place_node *box = &scan->sums[p]->node[node[p]];
        low += box->low;
        high += box->high;
        mass += box->mass;
    }
    if (mass > scan->site->stock.most_in_all * (1 + 1e-12)) {
        return INFINITY;
    }
    return bound_of(scan->aim, low, high);
}

static void look(struct scan *scan, const uint32_t *node, double bound)
{
    if (bound >= scan->limit || scan->failed) {
        return;
    }
    if (--scan->hunt->nodes <= 0) {
        scan->hunt->lost = fmin(scan->hunt->lost, bound);
        return;
    }
    size_t split = scan->parts;
    double complex low = 0, high = 0;
    double widest = -1;
    for (size_t p = 0; p < scan->parts; p++) {
        const struct place_node *box = &scan->sums[p]->node[node[p]];
        double complex side = box->high - box->low;
        double width = fmax(creal(side), cimag(side));
        if (box->left != 0 && width > widest) {
            widest = width;
            split = p;
        }
    }
    if (split == scan->parts) {
        for (size_t p = scan->parts; p-- > 0;) {
            const struct place_node *box = &scan->sums[p]->node[node[p]];
            low += box->low;
            high += box->high;
            if (p > 0) {
                scan->rest_low[p - 1] = low;
                scan->rest_high[p - 1] = high;
            }
        }
        look_at_points(scan, node, 0, 0);
        return;
    }
    uint32_t left[PLACE_PIECES_MOST], right[PLACE_PIECES_MOST];
    memcpy(left, node, scan->parts * sizeof *left);
    memcpy(right, node, scan->parts * sizeof *right);
    left[split] = scan->sums[split]->node[node[split]].left;
    right[split] = scan->sums[split]->node[node[split]].right;
    double at_left = bound_of_nodes(scan, left), at_right = bound_of_nodes(scan, right);
    if (at_left <= at_right) {
        look(scan, left, at_left);
        look(scan, right, at_right);
    } else {
        look(scan, right, at_right);
        look(scan, left, at_left);
    }
}

static void run(struct scan *scan)
{
    uint32_t root[PLACE_PIECES_MOST] = {0};
    scan->parts = scan->site->part_count;
    for (size_t p = 0; p < scan->parts; p++) {
        scan->sums[p] = &scan->site->parts[scan->site->part[p]];
    }
    look(scan, root, bound_of_nodes(scan, root));
}

int place_scan_list(struct place_hunt *hunt, const struct place_site *site,
                    const struct place_aim *aim, struct place_candidates *list)
{
    struct place_candidate *room = realloc(list->candidate, list->room * sizeof *room);
    if (room == NULL) {
        return -1;
    }
    list->candidate = room;
    list->count = 0;
    struct scan scan = {.hunt = hunt, .site = site, .aim = aim, .list = list};
    scan.limit = fmin(list->limit, place_kept_cutoff(hunt));
    list->limit = scan.limit;
    run(&scan);
    qsort(list->candidate, list->count, sizeof *list->candidate, by_bound);
    return scan.failed ? -1 : 0;
}

void place_scan_last(struct place_hunt *hunt, size_t depth, const struct place_aim *aim,
                     const struct place_form *form)
{
    struct scan scan = {.hunt = hunt, .site = &hunt->site[depth], .aim = aim, .depth = depth,
                        .form = form};
    scan.limit = place_kept_cutoff(hunt);
    run(&scan);
}
