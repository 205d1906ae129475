/* [plane NAME]. */
#include <math.h>
#include <stdio.h>
#include <stdlib.h>
#include <string.h>

#include "base/angle.h"
#include "sheet/sheet_fields.h"

#define POSITIONS_MOST 1000
#define STOCK_MOST 200
#define PIECE_COUNT_MOST 1000
#define PIECES_DEFAULT 4 /* at most, on one plane: the sheet's contract */
#define PIECES_LIMIT 64  /* what a placement record holds (PIECES_MOST) */
#define SAME_ANGLE 1e-6  /* deg: two positions nearer than this are one */

static const struct sheet_range RADIUS = {0, 100, true, "more than 0, at most 100 m"};
static const struct sheet_range DRILL = {0, 1, true, "more than 0, at most 1 m"};
/* Above aerogels, below the densest metal (osmium, 22590 kg/m3: CRC Handbook). */
static const struct sheet_range DENSITY = {1, 23000, false, "1 to 23000 kg/m3"};
static const struct sheet_range PIECE = {0, 1e5, true, "more than 0, at most 100 t"};

/* Items of the longest list; NULL with no_memory set. */
static struct sheet_item *new_items(struct sheet_parse *p, size_t most)
{
    struct sheet_item *items = calloc(most, sizeof *items);
    if (!items)
        p->errors.no_memory = true;
    return items;
}

static bool add_position(struct job_plane *plane, double against)
{
    for (size_t i = 0; i < plane->position_count; i++)
        if (fabs(angle_wrap_180(plane->positions[i].angle_deg - against)) < SAME_ANGLE)
            return false;
    plane->positions[plane->position_count] =
        (struct job_position){(int)plane->position_count + 1, against, false};
    plane->position_count++;
    return true;
}

/* ", numbered with rotation" behind "12 from 0 deg": +1 where numbers grow as the sheet's angles
 * do. */
static const char *take_numbering(const struct sheet_parse *p, const char **at, int *direction)
{
    bool counted_with = p->sheet->job.angles == SENSE_WITH, with;
    *direction = 1;
    if (sheet_values_end(*at))
        return NULL;
    if (!sheet_values_word(at, ",") || !sheet_values_word(at, "numbered"))
        return "text behind the positions, ', numbered with rotation' may follow";
    with = sheet_values_word(at, "with");
    if (!with && !sheet_values_word(at, "against"))
        return "numbered how? wanted 'with rotation' or 'against rotation'";
    if (!sheet_values_word(at, "rotation") || !sheet_values_end(*at))
        return "numbered how? wanted 'with rotation' or 'against rotation'";
    *direction = with == counted_with ? 1 : -1;
    return NULL;
}

/* "12 from 0 deg": evenly spaced. */
static const char *spread_positions(const struct sheet_parse *p, const char *at,
                                    struct job_plane *plane)
{
    double count, from = NAN;
    int direction;
    const char *fault = sheet_values_number(&at, &count);
    if (!fault && !(count >= 1 && count <= POSITIONS_MOST && count == floor(count)))
        fault = "number of positions out of range (1 to 1000)";
    if (!fault && !sheet_values_word(&at, "from"))
        fault = "wanted 'N from ANGLE deg'";
    if (!fault)
        fault = sheet_values_measure(&at, DIMENSION_ANGLE, &from);
    if (!fault && fabs(from) > 360)
        fault = "out of range (-360 to 360 deg)";
    if (!fault)
        fault = take_numbering(p, &at, &direction);
    for (int i = 0; !fault && i < (int)count; i++)
        if (!add_position(plane, sheet_fields_against(p, from + direction * 360.0 * i / count)))
            fault = "position given twice";
    return fault;
}

/* "0 120 240 deg": numbered as listed. */
static const char *list_positions(struct sheet_parse *p, const char *at, struct job_plane *plane)
{
    struct sheet_item *items = new_items(p, POSITIONS_MOST);
    size_t count = 0;
    if (!items)
        return NULL;
    const char *fault =
        sheet_values_list(at, DIMENSION_ANGLE, false, items, POSITIONS_MOST, &count);
    for (size_t i = 0; !fault && i < count; i++) {
        if (fabs(items[i].value) > 360)
            fault = "out of range (-360 to 360 deg)";
        else if (!add_position(plane, sheet_fields_against(p, items[i].value)))
            fault = "position given twice";
    }
    free(items);
    return fault;
}

static void read_positions(struct sheet_parse *p, size_t section, struct job_plane *plane)
{
    const struct sheet_entry *e = sheet_fields_find(p, section, "positions");
    plane->any_position = true;
    if (!e || !strcmp(e->value, "any"))
        return;
    plane->positions = calloc(POSITIONS_MOST, sizeof *plane->positions);
    if (!plane->positions) {
        p->errors.no_memory = true;
        return;
    }
    plane->any_position = false;
    const char *at = e->value;
    char number[16], word[16];
    bool spread = sheet_values_take(&at, number, sizeof number) &&
                  sheet_values_take(&at, word, sizeof word) && !strcmp(word, "from");
    const char *fault = spread                         ? spread_positions(p, e->value, plane)
                        : strstr(e->value, "numbered") ? "a list is numbered as listed"
                                                       : list_positions(p, e->value, plane);
    if (fault)
        sheet_fields_wrong(p, e, fault);
}

static const char *check_piece(const struct job_plane *plane, const struct sheet_item *item)
{
    if (!(item->value > PIECE.min && item->value <= PIECE.max))
        return "out of range (a piece is more than 0, at most 100 t)";
    if (item->count > PIECE_COUNT_MOST)
        return "out of range (at most 1000 pieces of a kind)";
    for (size_t i = 0; i < plane->stock_count; i++)
        if (plane->stock[i].mass == item->value)
            return "piece listed twice";
    return NULL;
}

static void read_stock(struct sheet_parse *p, size_t section, struct job_plane *plane)
{
    const struct sheet_entry *e = sheet_fields_find(p, section, "stock");
    struct sheet_item *items = e ? new_items(p, STOCK_MOST) : NULL;
    size_t count = 0;
    if (!items)
        return;
    const char *fault =
        sheet_values_list(e->value, DIMENSION_MASS, true, items, STOCK_MOST, &count);
    plane->stock = calloc(STOCK_MOST, sizeof *plane->stock);
    if (!plane->stock)
        p->errors.no_memory = true;
    for (size_t i = 0; plane->stock && !fault && i < count; i++) {
        fault = check_piece(plane, &items[i]);
        if (!fault)
            plane->stock[plane->stock_count++] = (struct job_piece){items[i].value, items[i].count};
    }
    if (fault)
        sheet_fields_wrong(p, e, fault);
    free(items);
}

static const char *take_position(struct job_plane *plane, double number)
{
    for (size_t i = 0; i < plane->position_count; i++) {
        if (plane->positions[i].number != number)
            continue;
        if (plane->positions[i].taken)
            return "position given twice";
        plane->positions[i].taken = true;
        return NULL;
    }
    return "no such position";
}

/* "3 7": numbers of positions. */
static void read_taken(struct sheet_parse *p, size_t section, struct job_plane *plane)
{
    const struct sheet_entry *e = sheet_fields_find(p, section, "taken");
    const struct sheet_entry *positions = sheet_fields_find(p, section, "positions");
    const char *fault = NULL;
    if (!e)
        return;
    if (!positions || !strcmp(positions->value, "any"))
        fault = "the plane has no numbered positions";
    else if (plane->position_count == 0)
        return; /* the positions are an error already */
    for (const char *at = e->value; !fault && !sheet_values_end(at);) {
        double number = NAN;
        fault = sheet_values_number(&at, &number);
        if (!fault)
            fault = take_position(plane, number);
        if (!fault && sheet_values_word(&at, ",") && sheet_values_end(at))
            fault = "list ends with a comma";
    }
    if (fault)
        sheet_fields_wrong(p, e, fault);
}

/* The keys of a drill: `hole` with `density`, and `depth` for the deepest hole. */
static void read_drill(struct sheet_parse *p, size_t section, struct job_plane *plane)
{
    static const char *const KEYS[] = {"hole", "density", "depth"};
    for (size_t i = 0; i < 3; i++) {
        const struct sheet_entry *e = sheet_fields_find(p, section, KEYS[i]);
        if (e && plane->work != WORK_REMOVE)
            sheet_fields_wrong(p, e, "only with 'work = remove'");
    }
    const struct sheet_entry *hole = sheet_fields_find(p, section, "hole");
    const struct sheet_entry *density = sheet_fields_find(p, section, "density");
    const struct sheet_entry *depth = sheet_fields_find(p, section, "depth");
    plane->hole_m = sheet_fields_measure(p, section, "hole", DIMENSION_LENGTH, &DRILL);
    plane->density = sheet_fields_measure(p, section, "density", DIMENSION_DENSITY, &DENSITY);
    plane->depth_m = sheet_fields_measure(p, section, "depth", DIMENSION_LENGTH, &DRILL);
    if (hole && !density)
        sheet_fields_wrong(p, hole, "needs the key 'density', too");
    if (!hole && density)
        sheet_fields_wrong(p, density, "needs the key 'hole', too");
    if (!hole && depth)
        sheet_fields_wrong(p, depth, "needs the keys 'hole' and 'density', too");
}

static void read_work(struct sheet_parse *p, size_t section, struct job_plane *plane)
{
    static const char *const WORKS[] = {"add", "remove", NULL};
    plane->work = sheet_fields_choice(p, section, "work", WORKS, 0) == 1 ? WORK_REMOVE : WORK_ADD;
    read_drill(p, section, plane);
}

static void read_plane(struct sheet_parse *p, size_t section, struct job_plane *plane)
{
    if (!sheet_fields_find(p, section, "radius"))
        sheet_fields_missing(p, section, "radius");
    plane->radius_m = sheet_fields_measure(p, section, "radius", DIMENSION_LENGTH, &RADIUS);
    read_positions(p, section, plane);
    read_stock(p, section, plane);
    plane->pieces =
        sheet_fields_integer(p, section, "pieces", NULL, 1, PIECES_LIMIT, PIECES_DEFAULT);
    plane->most = sheet_fields_measure(p, section, "most", DIMENSION_MASS, &PIECE);
    plane->most_in_all = sheet_fields_measure(p, section, "most in all", DIMENSION_MASS, &PIECE);
    if (isnan(plane->most))
        plane->most = INFINITY;
    if (isnan(plane->most_in_all))
        plane->most_in_all = INFINITY;
    read_taken(p, section, plane);
    read_work(p, section, plane);
}

void sheet_planes_read(struct sheet_parse *p)
{
    struct job *job = &p->sheet->job;
    for (size_t i = 0; i < job->plane_count; i++)
        read_plane(p, p->plane_sections[i], &job->planes[i]);
    if (job->plane_count == 0 && !p->audit)
        sheet_errors_add(&p->errors, 1, "missing section: '[plane NAME]'");
}
