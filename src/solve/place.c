/* place.c - see place.h. */
#include "solve/place.h"

#include <math.h>
#include <stdlib.h>
#include <string.h>

#include "base/angle.h"
#include "solve/place_branch.h"
#include "solve/place_setup.h"

#define NODES 4000000L /* at most 3 s of one core of 2020 (bench_place), 10 s where it is shared by four */
#define PROVEN 1e-9     /* of `nothing`: place.h */

/* What was best with at most so many pieces a plane. */
struct level {
    struct place_found kept[PLACE_KEPT];
    size_t count;
};

static void level_release(struct level *level)
{
    for (size_t i = 0; i < PLACE_KEPT; i++) {
        free(level->kept[i].load);
    }
}

static int level_copy(struct level *level, const struct place_hunt *hunt)
{
    level->count = hunt->count;
    for (size_t i = 0; i < hunt->count; i++) {
        level->kept[i] = hunt->kept[i];
        level->kept[i].load = malloc((hunt->sites + 1) * sizeof(struct place_load));
        if (level->kept[i].load == NULL) {
            return -1;
        }
        memcpy(level->kept[i].load, hunt->kept[i].load, hunt->sites * sizeof(struct place_load));
    }
    return 0;
}

/* x^H F x for one row of the problem at a placement. */
static double row_value(const struct place_problem *problem, const double complex *forms, size_t r,
                        const double complex *x)
{
    size_t n = problem->planes + 1;
    double value = 0;
    for (size_t i = 0; i < n; i++) {
        double complex pull = 0;
        for (size_t j = 0; j < n; j++) {
            pull += forms[(r * n + i) * n + j] * x[j];
        }
        value += creal(conj(x[i]) * pull);
    }
    return value;
}

/* The uncertain part of J there: of all rows, or of the worst one. */
static int uncertain_part(const struct place_problem *problem, const struct place_hunt *hunt,
                          const struct place_found *found, double *part)
{
    double complex *x = calloc(problem->planes + 1, sizeof *x);
    if (x == NULL) {
        return -1;
    }
    x[0] = 1;
    for (size_t s = 0; s < hunt->sites; s++) {
        x[hunt->site[s].plane + 1] = found->load[s].w;
    }
    double worst = -INFINITY, sum = 0, of_worst = 0;
    for (size_t r = 0; r < problem->rows; r++) {
        double all = row_value(problem, problem->forms, r, x);
        double rest = all - row_value(problem, problem->certain, r, x);
        sum += rest;
        of_worst = all > worst ? rest : of_worst;
        worst = fmax(worst, all);
    }
    *part = fmax(0, problem->worst ? of_worst : sum);
    free(x);
    return 0;
}

static double angle_at(const struct place_problem *problem, const struct place_site *site,
                       const struct place_load *load, size_t i)
{
    const struct place_plane *plane = &problem->plane[site->plane];
    if (site->kind == PLACE_ANYWHERE) {
        return angle_of(plane->sign * load->w);
    }
    size_t position = load->item[i] / (site->kind == PLACE_PIECES ? plane->stock : 1);
    return plane->positions > 0 ? plane->angles_deg[position] : (double)position;
}

/* Pieces at one position make one item. */
static void add_items(const struct place_problem *problem, const struct place_site *site,
                      const struct place_load *load, struct place_choice *choice)
{
    const struct place_plane *plane = &problem->plane[site->plane];
    size_t stock = site->kind == PLACE_PIECES ? plane->stock : 1, last = SIZE_MAX;
    for (size_t i = 0; i < PLACE_PIECES_MOST && load->item[i] != PLACE_NO_ITEM; i++) {
        size_t position = load->item[i] / stock;
        if (position != last) {
            choice->items[choice->count++] =
                (struct place_item){.plane = site->plane,
                                    .position = plane->positions > 0 ? (int)position : -1,
                                    .angle_deg = angle_at(problem, site, load, i)};
        }
        struct place_item *item = &choice->items[choice->count - 1];
        item->mass += load->mass[i];
        item->pieces[item->piece_count++] = load->mass[i];
        last = position;
    }
}

static int choice_from(const struct place_problem *problem, const struct place_hunt *hunt,
                       const struct place_found *found, struct place_choice *choice)
{
    *choice = (struct place_choice){.pieces = found->largest, .objective = found->value};
    if (found->pieces == 0) {
        return 0;
    }
    choice->items = calloc((size_t)found->pieces, sizeof *choice->items);
    if (choice->items == NULL) {
        return -1;
    }
    for (size_t p = 0; p < problem->planes; p++) {
        for (size_t s = 0; s < hunt->sites; s++) {
            if (hunt->site[s].plane == p) {
                add_items(problem, &hunt->site[s], &found->load[s], choice);
            }
        }
    }
    return 0;
}

static int choose(const struct place_problem *problem, const struct place_hunt *hunt,
                  const struct level *levels, int most, struct place_result *result)
{
    const struct place_found *of_all = &levels[most].kept[0];
    double noise;
    if (uncertain_part(problem, hunt, of_all, &noise) != 0) {
        return PLACE_NO_MEMORY;
    }
    /* The design's "within the noise", and never below what counts as equal. */
    noise = fmax(fmax(0.1 * noise, problem->floor), PROVEN * hunt->norm);
    int k = 0;
    while (levels[k].kept[0].value - of_all->value > noise) {
        k++;
    }
    result->of_all = of_all->value;
    if (choice_from(problem, hunt, &levels[k].kept[0], &result->best) != 0) {
        return PLACE_NO_MEMORY;
    }
    for (size_t i = 1; i < levels[k].count; i++) {
        if (choice_from(problem, hunt, &levels[k].kept[i], &result->next[i - 1]) != 0) {
            return PLACE_NO_MEMORY;
        }
    }
    return PLACE_OK;
}

/* Level k may use half of the nodes that are left, the last one all of them. *cut: one ran out. */
static int hunt_levels(const struct place_problem *problem, struct place_hunt *hunt,
                       struct level *levels, int most, bool *cut)
{
    long left = problem->nodes > 0 ? problem->nodes : NODES;
    if (level_copy(&levels[0], hunt) != 0) {
        return -1;
    }
    for (int k = 1; k <= most; k++) {
        long share = k < most ? left / 2 : left;
        hunt->nodes = share;
        if (place_setup_pieces(hunt, problem, k) != 0 ||
            (hunt->sites > 0 && place_branch(hunt) != 0) || level_copy(&levels[k], hunt) != 0) {
            return -1;
        }
        *cut = *cut || hunt->nodes <= 0;
        left -= share - (hunt->nodes > 0 ? hunt->nodes : 0);
    }
    return 0;
}

int place_search(const struct place_problem *problem, struct place_result *result)
{
    *result = (struct place_result){.next = {{.objective = NAN}, {.objective = NAN}}};
    if (!place_setup_legal(problem)) {
        return PLACE_BAD_PROBLEM;
    }
    struct place_hunt hunt;
    struct level levels[PLACE_PIECES_MOST + 1] = {0};
    int most = 0, code = PLACE_NO_MEMORY;
    if (place_setup_init(&hunt, problem) == 0) {
        for (size_t s = 0; s < hunt.sites; s++) {
            int pieces = problem->plane[hunt.site[s].plane].pieces;
            most = pieces > most ? pieces : most;
        }
        hunt.lost = INFINITY;
        if (hunt_levels(problem, &hunt, levels, most, &result->cut) == 0) {
            code = choose(problem, &hunt, levels, most, result);
        }
        result->nothing = hunt.norm;
        result->bound = fmin(result->of_all, fmax(hunt.lost, 0));
        result->gap = result->of_all - result->bound;
        result->gap = result->gap <= PROVEN * hunt.norm ? 0 : result->gap;
    }
    for (int k = 0; k <= most; k++) {
        level_release(&levels[k]);
    }
    place_setup_release(&hunt);
    if (code != PLACE_OK) {
        place_release(result);
    }
    return code;
}

void place_release(struct place_result *result)
{
    free(result->best.items);
    free(result->next[0].items);
    free(result->next[1].items);
    *result = (struct place_result){.next = {{.objective = NAN}, {.objective = NAN}}};
}
