#include "solve/ruling.h"

bool ruling_counts(const struct model_row *row)
{
    return row->in_aim && row->state == MODEL_GOOD;
}

/* As found alone: a named sensor, or every sensor, without a usable reading is lost. */
static struct ruling rule_bare(const struct model *m)
{
    struct ruling ruling = {RULING_TRIAL, NULL, false};
    size_t usable = 0;
    for (size_t r = 0; r < m->row_count; r++) {
        const struct model_row *row = &m->rows[r];
        if (row->in_aim && row->count > 0)
            usable++;
        else if (row->in_aim && m->job->aim.named)
            return (struct ruling){RULING_REPEAT, row, true};
    }
    if (usable == 0)
        ruling.kind = m->row_count > 0 ? RULING_REPEAT : RULING_MISSING;
    return ruling;
}

/* True where stored responses carry a correction before any weight was tried. */
static bool any_good(const struct model *m)
{
    for (size_t r = 0; r < m->row_count && m->job->plane_count > 0; r++)
        if (ruling_counts(&m->rows[r]))
            return true;
    return false;
}

/* A probe of the aim whose slow-roll vector is missing: the run of runout is one that is needed. */
static const struct model_row *unrolled(const struct model *m)
{
    for (size_t r = 0; r < m->row_count; r++)
        if (m->rows[r].in_aim && m->rows[r].unrolled)
            return &m->rows[r];
    return NULL;
}

struct ruling ruling_of(const struct model *m)
{
    const struct model_row *slow = unrolled(m);
    if (slow)
        return (struct ruling){RULING_REPEAT, slow, m->job->aim.named};
    if (model_is_bare(m) && !any_good(m))
        return rule_bare(m);
    struct ruling solve = {RULING_SOLVE, NULL, false};
    const struct model_row *missing = NULL;
    size_t good = 0;
    for (size_t c = 0; c < m->condition_count; c++) {
        size_t good_here = 0, short_here = 0;
        const struct model_row *lost = NULL;
        for (size_t r = 0; r < m->row_count; r++) {
            const struct model_row *row = &m->rows[r];
            if (row->condition != c || !row->in_aim)
                continue;
            if (row->state == MODEL_GOOD)
                good_here++;
            else if (row->state == MODEL_SHORT && !row->lacks) {
                missing = missing ? missing : row;
                short_here++;
            } else if (m->job->aim.named)
                return (struct ruling){RULING_REPEAT, row, true};
            else if (!lost || (lost->state != MODEL_LOST && row->state == MODEL_LOST))
                lost = row;
        }
        if (good_here == 0 && lost && (lost->state == MODEL_LOST || short_here == 0))
            return (struct ruling){RULING_REPEAT, lost, false};
        good += good_here;
    }
    if (good == 0) {
        solve.kind = RULING_MISSING;
        solve.row = missing;
    }
    return solve;
}
