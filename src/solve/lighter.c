#include "solve/lighter.h"

#include <math.h>
#include <stdlib.h>

#include "base/angle.h"
#include "solve/oppose.h"

/* Of the nodes of the search proper: what is found only stands beside it. */
#define NODES 400000L
#define NODES_NARROW 100000L

bool lighter_wanted(const struct answer *a, const struct place_choice *choice, size_t plane)
{
    size_t pieces = 0;
    for (size_t i = 0; i < choice->count; i++)
        pieces += choice->items[i].plane == plane ? choice->items[i].piece_count : 0;
    return oppose_on(choice, plane) ||
           (pieces > 1 && oppose_mass(choice, plane) > LIGHTER_MASS * cabs(a->weights[plane]));
}

static double mass_of(const struct answer *a, const struct place_choice *choice)
{
    double mass = 0;
    for (size_t p = 0; p < a->planes; p++)
        mass += oppose_mass(choice, p);
    return mass;
}

/* Narrows the planes where pieces still stand too far apart; false: none. */
static bool narrow(const struct answer *a, const struct place_choice *choice, bool first,
                   struct menu_arc *arc)
{
    bool more = false;
    for (size_t p = 0; p < a->planes; p++) {
        double sign = a->model->job->planes[p].work == WORK_REMOVE ? -1 : 1;
        if (arc[p].half_deg < 180 || !(first ? lighter_wanted(a, choice, p) : oppose_on(choice, p)))
            continue;
        arc[p] = (struct menu_arc){angle_of(sign * a->weights[p]), OPPOSE_APART_DEG / 2};
        more = true;
    }
    return more;
}

/* Whether `other` is to be preferred to what is held: see lighter_find. */
static bool better(const struct answer *a, const struct place_choice *other)
{
    const struct place_choice *held = &a->unopposed.best;
    double most = a->placement.best.objective + answer_noise(a, a->placed_weights);
    if (other->count == 0 || !(other->objective <= most))
        return false;
    return !(held->objective <= most) || mass_of(a, other) < mass_of(a, held) * (1 - 1e-9);
}

static int try_narrower(struct answer *a, struct menu_arc *arc, double half_deg)
{
    struct place_result found;
    bool done = false;
    for (size_t p = 0; p < a->planes; p++)
        arc[p].half_deg = arc[p].half_deg < 180 ? half_deg : 180;
    int result = answer_search(a, arc, NODES_NARROW, &found, &done);
    if (result != ANSWER_OK || !done)
        return result;
    if (better(a, &found.best)) {
        place_release(&a->unopposed);
        a->unopposed = found;
    } else {
        place_release(&found);
    }
    return result;
}

int lighter_find(struct answer *a)
{
    struct menu_arc *arc = calloc(a->planes + 1, sizeof *arc);
    const struct place_choice *best = &a->placement.best;
    bool done = false;
    int result = arc ? ANSWER_OK : ANSWER_NO_MEMORY;
    for (size_t p = 0; p < a->planes && result == ANSWER_OK; p++)
        arc[p].half_deg = 180;
    while (answer_helps(a) && !a->static_only && result == ANSWER_OK &&
           narrow(a, done ? &a->unopposed.best : best, !done, arc)) {
        a->opposed = true;
        if (done)
            place_release(&a->unopposed);
        result = answer_search(a, arc, NODES, &a->unopposed, &done);
    }
    for (double half = 45; half >= 30 && done && result == ANSWER_OK; half -= 15)
        result = try_narrower(a, arc, half);
    a->has_unopposed =
        done && a->unopposed.best.count > 0 && !oppose_same(&a->unopposed.best, best);
    free(arc);
    return result;
}
