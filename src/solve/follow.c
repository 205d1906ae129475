#include "solve/follow.h"

#include <math.h>
#include <stdio.h>

#include "base/angle.h"
#include "solve/turn.h"

/* deg: within so much of the opposite it is one, common practice for a position that is off. */
#define TURN_OPPOSITE 15
/* Refused from so many standard errors on, twice the caution, where the sheet does not say, and
 * from so many deg on: less cannot turn the sign of the answer, and `linearity` sees it. */
#define TURN_REFUSED 6
#define TURN_SENSE 20

/* What a turn of the effect that differs so from the weight's looks like. */
static const char *turn_looks(const struct turn_figure *t)
{
    double apart = fabs(angle_wrap_180(t->effect_deg - t->weight_deg));
    double mirror = fabs(angle_wrap_180(t->effect_deg + t->weight_deg));
    if (apart > 180 - TURN_OPPOSITE && (mirror > TURN_OPPOSITE || !(mirror < 0.5 * apart)))
        return ", as if one of them had been removed instead of added (or the reverse), or mounted "
               "opposite: check how and where each was mounted";
    if (mirror < 0.5 * apart)
        return ", as if angles or phase were counted the other way: check the sheet's `angles` and "
               "`phase`";
    return ": check the angles of the weights";
}

/* No trials of a plane tell a mirror: said, not called in order. */
static void turn_untold(const struct model *m, size_t plane, const struct turn_figure *t,
                        struct advice_finding *f)
{
    f->verdict = ADVICE_OK;
    f->value = f->limit = NAN;
    f->unit = "";
    snprintf(f->text, sizeof f->text,
             "not checkable with these runs: the weights on '%s' stand %.0f deg apart; a run with "
             "one that is 30 to 150 deg from them would show a wrong counting sense",
             m->job->planes[plane].name, fabs(t->weight_deg));
}

bool follow_row(const struct model *m, const struct model_row *row, size_t plane,
                struct advice_finding *f)
{
    struct judge_limits l = judge_limits_of(m->job, "lag-follows-weight", 3, INFINITY);
    struct turn_figure t;
    if (m->amplitudes || l.off ||
        !turn_worst(row->count, m->job->plane_count, row->y, row->x, (const double(*)[3])row->total,
                    plane, &t))
        return false;
    *f = (struct advice_finding){.check = "lag-follows-weight",
                                 .unit = "s.e.",
                                 .basis = "common practice",
                                 .run = (int)row->runs[t.to],
                                 .sensor = (int)row->sensor};
    if (isinf(l.refuse) && fabs(angle_wrap_180(t.effect_deg - t.weight_deg)) >= TURN_SENSE)
        l.refuse = fmax(TURN_REFUSED, l.caution);
    f->value = t.se;
    f->verdict = judge_value(&l, t.se, &f->limit);
    if (f->verdict == ADVICE_OK && !t.told) {
        turn_untold(m, plane, &t, f);
        return true;
    }
    snprintf(f->text, sizeof f->text,
             "from run '%s' the weight on '%s' turned by %.0f deg %s rotation and the lag of its "
             "effect %s by %.0f deg%s",
             m->job->runs[row->runs[t.from]].name, m->job->planes[plane].name, fabs(t.weight_deg),
             t.weight_deg < 0 ? "with" : "against", t.effect_deg < 0 ? "fell" : "grew",
             fabs(t.effect_deg), f->verdict == ADVICE_OK ? "" : turn_looks(&t));
    return true;
}

bool follow_worst(const struct model *m, size_t plane, struct advice_finding *worst)
{
    struct advice_finding f;
    bool any = false;
    for (size_t r = 0; r < m->row_count; r++) {
        if (!follow_row(m, &m->rows[r], plane, &f))
            continue;
        if (!any || isnan(worst->value) || f.value > worst->value)
            *worst = f;
        any = true;
    }
    return any;
}
