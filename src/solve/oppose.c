#include "solve/oppose.h"

#include <math.h>

#include "base/angle.h"

bool oppose_on(const struct place_choice *choice, size_t plane)
{
    for (size_t i = 0; i < choice->count; i++)
        for (size_t k = 0; k < i; k++) {
            const struct place_item *a = &choice->items[i], *b = &choice->items[k];
            if (a->plane == plane && b->plane == plane &&
                fabs(angle_wrap_180(a->angle_deg - b->angle_deg)) > OPPOSE_APART_DEG + 1e-9)
                return true;
        }
    return false;
}

bool oppose_same(const struct place_choice *a, const struct place_choice *b)
{
    if (a->count != b->count)
        return false;
    for (size_t i = 0; i < a->count; i++) {
        const struct place_item *x = &a->items[i], *y = &b->items[i];
        if (x->plane != y->plane || fabs(angle_wrap_180(x->angle_deg - y->angle_deg)) > 1e-6 ||
            fabs(x->mass - y->mass) > 1e-6 * x->mass)
            return false;
    }
    return true;
}

double oppose_mass(const struct place_choice *choice, size_t plane)
{
    double mass = 0;
    for (size_t i = 0; i < choice->count; i++)
        mass += choice->items[i].plane == plane ? choice->items[i].mass : 0;
    return mass;
}
