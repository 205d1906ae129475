/* place_branch.c - see place_branch.h. */
#include "solve/place_branch.h"

#include <math.h>
#include <stdlib.h>
#include <string.h>

#include "solve/place_kept.h"
#include "solve/place_relax.h"
#include "solve/place_scan.h"
#include "solve/place_spread.h"

#define AIM_ACCURACY 1e-3 /* of the optimum: the bound holds whatever it is; sharper was slower */

static int settle(struct place_hunt *hunt, size_t depth, const struct place_form *form);

/* One row, one plane: J itself is the bound, wherever its centre. */
static void aim_exactly(const struct place_form *form, struct place_aim *aim)
{
    aim->center = 0;
    aim->base = creal(form->f[0]);
    aim->slope = form->f[2];
    aim->stiffness = creal(form->f[3]);
}

/* The lower bound on what is left as a function of this site's weight; see the header. */
static int aim_at(struct place_hunt *hunt, size_t depth, const struct place_form *form,
                  struct place_aim *aim, double *bound)
{
    struct place_form blend = {0};
    double complex *w = malloc(form->planes * sizeof *w);
    double *lambda = malloc(form->rows * sizeof *lambda);
    struct place_region *region = malloc(form->planes * sizeof *region);
    int result = -1;
    if (w == NULL || lambda == NULL || region == NULL ||
        place_form_init(&blend, form->planes, 1) != 0) {
        goto done;
    }
    for (size_t q = 0; q < form->planes; q++) {
        region[q] = hunt->site[depth + q].region;
    }
    if (place_relax(form, region, hunt->norm, AIM_ACCURACY, place_kept_cutoff(hunt), w, lambda, bound) !=
        0) {
        goto done;
    }
    place_form_blend(form, lambda, &blend);
    aim->center = w[0];
    aim->slope = place_form_slope(&blend, w, 0);
    aim->stiffness = place_form_stiffness(&blend);
    aim->base = place_form_row(&blend, 0, w);
    for (size_t q = 1; q < form->planes; q++) {
        double complex g = place_form_slope(&blend, w, q);
        aim->base += 2 * (place_region_least(&region[q], g) - creal(conj(g) * w[q]));
    }
    result = aim->stiffness < 0 ? -1 : 0;
done:
    place_form_release(&blend);
    free(region);
    free(lambda);
    free(w);
    return result;
}

static int settle_candidates(struct place_hunt *hunt, size_t depth, const struct place_form *form,
                             const struct place_candidates *list)
{
    struct place_form rest = {0};
    int result = place_form_init(&rest, form->planes - 1, form->rows);
    for (size_t i = 0; result == 0 && i < list->count; i++) {
        const struct place_candidate *candidate = &list->candidate[i];
        if (candidate->bound >= place_kept_cutoff(hunt)) {
            break;
        }
        if (hunt->nodes <= 0) {
            hunt->lost = fmin(hunt->lost, candidate->bound);
            break;
        }
        hunt->load[depth] = candidate->load;
        place_form_settle(form, candidate->load.w, &rest);
        double lost = hunt->lost;
        hunt->lost = INFINITY;
        result = settle(hunt, depth + 1, &rest);
        hunt->lost = fmin(lost, fmax(hunt->lost, candidate->bound));
    }
    place_form_release(&rest);
    return result;
}

/* Sums in rising order of their bound, a batch at a time, so that memory stays small. */
static int settle_in_batches(struct place_hunt *hunt, size_t depth, const struct place_form *form,
                             const struct place_aim *aim)
{
    struct place_candidates list = {.room = 256, .from = -INFINITY};
    int result = 0;
    do {
        list.limit = INFINITY;
        result = place_scan_list(hunt, &hunt->site[depth], aim, &list);
        if (result == 0) {
            result = settle_candidates(hunt, depth, form, &list);
        }
        list.from = list.limit;
        list.room = list.room < 16384 ? 2 * list.room : list.room;
    } while (result == 0 && hunt->nodes > 0 && list.from < place_kept_cutoff(hunt));
    if (hunt->nodes <= 0 && list.from < place_kept_cutoff(hunt)) {
        hunt->lost = fmin(hunt->lost, list.from);
    }
    free(list.candidate);
    return result;
}

/* Sites from `depth` on are open; form is what is left for them. */
static int settle(struct place_hunt *hunt, size_t depth, const struct place_form *form)
{
    if (depth == hunt->sites) {
        place_kept_offer(hunt, place_form_worst(form, NULL, NULL));
        return 0;
    }
    if (hunt->site[depth].kind != PLACE_PIECES) {
        return place_spread(hunt, depth, form);
    }
    struct place_aim aim;
    double bound;
    if (depth + 1 == hunt->sites && form->rows == 1) {
        aim_exactly(form, &aim);
        place_scan_last(hunt, depth, &aim, form);
        return 0;
    }
    hunt->nodes -= place_relax_nodes(form);
    if (aim_at(hunt, depth, form, &aim, &bound) != 0) {
        return -1;
    }
    if (bound >= place_kept_cutoff(hunt)) {
        return 0;
    }
    double lost = hunt->lost;
    int result = 0;
    hunt->lost = INFINITY;
    if (depth + 1 == hunt->sites) {
        place_scan_last(hunt, depth, &aim, form);
    } else {
        result = settle_in_batches(hunt, depth, form, &aim);
    }
    hunt->lost = fmin(lost, fmax(hunt->lost, bound));
    return result;
}

int place_branch(struct place_hunt *hunt)
{
    hunt->lost = INFINITY;
    return settle(hunt, 0, &hunt->form);
}
