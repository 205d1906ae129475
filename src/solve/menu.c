#include "solve/menu.h"

#include <math.h>
#include <stdlib.h>

#include "base/angle.h"
#include "solve/drill.h"
#include "solve/sits.h"

#define WHOLE_DEGREES 360
#define PIECES_DEFAULT 4 /* the sheet's */

double menu_most(const struct job_plane *plane)
{
    if (plane->work != WORK_REMOVE)
        return plane->most;
    return fmin(plane->most, drill_mass(plane->hole_m, plane->density, plane->depth_m));
}

int menu_init(struct menu *menu, const struct job_plane *from)
{
    size_t angles = MENU_ANGLES_MOST(from);
    menu->angles = calloc(angles + 1, sizeof *menu->angles);
    menu->masses = calloc(from->stock_count + 1, sizeof *menu->masses);
    menu->counts = calloc(from->stock_count + 1, sizeof *menu->counts);
    menu->held = calloc(angles + 1, sizeof *menu->held);
    menu->index = calloc(angles + 1, sizeof *menu->index);
    return menu->angles && menu->masses && menu->counts && menu->held && menu->index ? 0 : -1;
}

void menu_release(struct menu *menu)
{
    free(menu->angles);
    free(menu->masses);
    free(menu->counts);
    free(menu->held);
    free(menu->index);
    *menu = (struct menu){0};
}

static bool in_arc(const struct menu_arc *arc, double angle_deg)
{
    return !arc || fabs(angle_wrap_180(angle_deg - arc->centre_deg)) <= arc->half_deg + 1e-9;
}

/* The free positions, or every whole degree; how many. */
static size_t list_angles(const struct job_plane *from, const struct menu_arc *arc,
                          struct menu *menu)
{
    size_t count = 0;
    int number = 0;
    for (int i = 0; from->any_position && i < WHOLE_DEGREES; i++)
        if (in_arc(arc, i)) {
            menu->index[count] = -1;
            menu->angles[count++] = i;
        }
    for (size_t i = 0; !from->any_position && i < from->position_count; i++) {
        if (from->positions[i].taken)
            continue;
        if (in_arc(arc, from->positions[i].angle_deg)) {
            menu->index[count] = number;
            menu->angles[count++] = from->positions[i].angle_deg;
        }
        number++;
    }
    return count;
}

/* All positions are taken, or no piece may be used: nothing may be put here. */
static void forbid(struct place_plane *to)
{
    to->positions = 1;
    to->stock = 0;
    to->most = to->most_in_all = 0;
}

/* The pieces that may be used: what is drilled must not be deeper than the hole may be. */
static size_t list_stock(const struct job_plane *from, struct menu *menu)
{
    bool drilled = from->work == WORK_REMOVE && from->hole_m > 0 && from->depth_m > 0;
    double deepest = drilled ? drill_mass(from->hole_m, from->density, from->depth_m) : INFINITY;
    size_t count = 0;
    for (size_t i = 0; i < from->stock_count; i++) {
        if (from->stock[i].mass > deepest)
            continue;
        menu->masses[count] = from->stock[i].mass;
        menu->counts[count++] = from->stock[i].count;
    }
    return count;
}

int menu_fill(const struct job *job, size_t p, const struct menu_arc *arc, struct menu *menu,
              struct place_plane *to)
{
    const struct job_plane *from = &job->planes[p];
    if (menu_init(menu, from) != 0)
        return -1;
    size_t angles = list_angles(from, arc, menu), stock = list_stock(from, menu);
    bool held = false;
    for (size_t i = 0; i < angles; i++) {
        menu->held[i] = sits_at(job, p, menu->angles[i]);
        held = held || menu->held[i] > 0;
    }
    int pieces = from->pieces > 0 ? from->pieces : PIECES_DEFAULT;
    *to = (struct place_plane){.angles_deg = menu->angles,
                               .positions = angles,
                               .masses = menu->masses,
                               .counts = menu->counts,
                               .stock = stock,
                               .held = menu->held,
                               .pieces = pieces > PLACE_PIECES_MOST ? PLACE_PIECES_MOST : pieces,
                               .most = menu_most(from),
                               .most_in_all = fmax(0, from->most_in_all - sits_in_all(job, p)),
                               .sign = from->work == WORK_REMOVE ? -1 : 1};
    if (from->any_position && stock == 0) { /* one weight, anywhere: at whole degrees only where it
                                               must mind what is there */
        to->pieces = 1;
        to->positions = (held && !isinf(to->most)) || arc ? angles : 0;
    } else if (from->any_position && !arc) {
        to->positions = 0; /* the search's own whole degrees */
    }
    if (angles == 0 || (from->stock_count > 0 && stock == 0))
        forbid(to);
    return 0;
}

void menu_number(const struct menu *menu, size_t plane, struct place_choice *choice)
{
    for (size_t i = 0; i < choice->count; i++) {
        struct place_item *item = &choice->items[i];
        if (item->plane == plane && item->position >= 0)
            item->position = menu->index[item->position];
    }
}
