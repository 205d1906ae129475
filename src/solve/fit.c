#include "solve/fit.h"

#include <math.h>
#include <stdarg.h>
#include <stdio.h>
#include <string.h>

#include "solve/advice.h"
#include "solve/lighter.h"
#include "solve/misfit.h"
#include "solve/oppose.h"
#include "solve/sits.h"

#define GAP_SHOWN 0.01 /* %, our choice: less than any reading tells */

/* Whether any hole is to be drilled; its depth stands beside its placement. */
static bool has_holes(const struct answer *a)
{
    for (size_t i = 0; i < a->placement.best.count; i++) {
        const struct job_plane *plane = &a->model->job->planes[a->placement.best.items[i].plane];
        if (plane->work == WORK_REMOVE && plane->hole_m > 0)
            return true;
    }
    return false;
}

static bool only_removal(const struct answer *a)
{
    for (size_t i = 0; i < a->placement.best.count; i++)
        if (a->model->job->planes[a->placement.best.items[i].plane].work != WORK_REMOVE)
            return false;
    return a->placement.best.count > 0;
}

/* Aimed sensors that take no part: two by name and how many more. */
static void list_lost(const struct answer *a, char *text, size_t size)
{
    const struct model *m = a->model;
    size_t length = strlen(text), named = 0, more = 0;
    for (size_t r = 0; r < m->row_count; r++) {
        const struct model_row *row = &m->rows[r];
        if (!row->in_aim || row->state == MODEL_GOOD)
            continue;
        char one[120];
        int wanted = snprintf(
            one, sizeof one, named ? ", '%s' (%s)" : "; this answer does not know sensor '%s' (%s)",
            m->job->sensors[row->sensor].name, m->conditions[row->condition]);
        if (named == 2 || length + (size_t)wanted + 20 > size) {
            more++;
            continue;
        }
        named++;
        length += (size_t)snprintf(text + length, size - length, "%s", one);
    }
    if (more > 0)
        snprintf(text + length, size - length, "; and %zu more", more);
}

/* Adds a clause, whole or not at all. */
__attribute__((format(printf, 2, 3))) static void clause(struct advice_next *next,
                                                         const char *format, ...)
{
    char more[300];
    size_t length = strlen(next->text);
    va_list arguments;
    va_start(arguments, format);
    size_t wanted = (size_t)vsnprintf(more, sizeof more, format, arguments);
    va_end(arguments);
    if (wanted < sizeof more && length + wanted + 2 < sizeof next->text)
        snprintf(next->text + length, sizeof next->text - length, "%s%s", length ? "; " : "", more);
}

/* What is not proven about the placement. */
static void say_unproven(const struct answer *a, struct advice_next *next)
{
    double gap = a->placement.gap, from = a->placement.nothing;
    double better =
        100 * (sqrt(a->placement.of_all / from) - sqrt(fmax(0, a->placement.bound) / from));
    if (gap > 0 && from > 0)
        clause(next, "a better placement is not ruled out, by %s %% of the vibration at most",
               better < GAP_SHOWN ? "0.01" : judge_figure(better, 2).text);
    else if (a->placement.cut)
        clause(next, "that fewer pieces would not do as well is not proven");
}

/* Root of expected squared vibration with that choice, in % of what it is now, no finer than 0.1 %.
 */
static struct judge_figure left_of(const struct answer *a, const struct place_choice *choice)
{
    double share = 100 * sqrt(fmax(0, choice->objective) / a->placement.nothing);
    /* rounded once, as the report does */
    return share >= 9.95 ? judge_figure(share, 2) : judge_figure(round(10 * share) / 10, 2);
}

static double mass_of(const struct answer *a, const struct place_choice *choice)
{
    double mass = 0;
    for (size_t p = 0; p < a->planes; p++)
        mass += oppose_mass(choice, p);
    return mass;
}

/* Pieces that work against each other, and what doing without them costs. */
static void say_opposed(const struct answer *a, struct advice_next *next)
{
    char planes[120] = "";
    size_t length = 0;
    bool apart = false, us = a->model->job->units == UNITS_US;
    double ideal = 0, unit = us ? 0.45359237 / 16 : 1e-3;
    for (size_t p = 0; p < a->planes; p++) {
        ideal += cabs(a->weights[p]);
        if (!lighter_wanted(a, &a->placement.best, p) || length + 50 >= sizeof planes)
            continue;
        apart = apart || oppose_on(&a->placement.best, p);
        length += (size_t)snprintf(planes + length, sizeof planes - length, "%s'%s'",
                                   length ? " and " : "", a->model->job->planes[p].name);
    }
    if (!a->opposed || (!a->has_unopposed && !apart))
        return;
    if (!a->has_unopposed) {
        clause(next, "pieces on %s work partly against each other, but without that nothing helps",
               planes);
        return;
    }
    struct judge_figure without = left_of(a, &a->unopposed.best);
    struct judge_figure with = left_of(a, &a->placement.best);
    double now = mass_of(a, &a->placement.best), then = mass_of(a, &a->unopposed.best);
    const char *name = us ? "oz" : "g";
    clause(next, "pieces on %s work partly against each other (%.4g %s for an ideal of %s %s)",
           planes, now / unit, name, judge_figure(ideal / unit, 2).text, name);
    if (then < now * (1 - 1e-9))
        clause(next, "the first alternative does with %.4g %s", then / unit, name);
    else
        clause(next, "the first alternative does without");
    if (strcmp(without.text, with.text) == 0)
        clause(next, "what it leaves is the same to two digits");
    else
        clause(next, "it leaves an expected %s %% instead of %s %%", without.text, with.text);
}

/* The row of the answer that fits worst, from a caution of `linearity` on; NULL: none. */
static const struct model_row *worst_misfit(const struct answer *a, struct advice_finding *f)
{
    const struct model_row *worst = NULL;
    for (size_t r = 0; r < a->rows; r++)
        if (misfit_judge(a->model, a->row[r], f) && f->verdict != ADVICE_OK &&
            (!worst || a->row[r]->misfit > worst->misfit))
            worst = a->row[r];
    return worst && misfit_judge(a->model, worst, f) ? worst : NULL;
}

/* Runs that do not fit one set of responses: the reader is to look there before anything is fitted.
 */
static void say_misfit(const struct answer *a, struct advice_next *next)
{
    const struct model *m = a->model;
    struct advice_finding f;
    const struct model_row *worst = worst_misfit(a, &f);
    if (!worst)
        return;
    const char *run = f.run >= 0 ? m->job->runs[f.run].name : "";
    clause(next,
           "first see why the runs do not fit one set of responses (linearity, %s s.e. at "
           "sensor '%s'%s%s%s): a weight from them may be far off",
           judge_figure(worst->misfit, 2).text, m->job->sensors[worst->sensor].name,
           run[0] ? ", run '" : "", run, run[0] ? "'" : "");
}

void fit_doubt(const struct answer *a, struct advice_next *next)
{
    struct advice_finding f;
    const struct model_row *worst = worst_misfit(a, &f);
    if (worst)
        clause(next,
               "but the runs do not fit one set of responses (linearity, %s s.e. at sensor '%s'): "
               "check that what is on is what the sheet lists, before responses are kept from "
               "them",
               judge_figure(worst->misfit, 2).text, a->model->job->sensors[worst->sensor].name);
}

static bool lists_weights(const struct job *job)
{
    for (size_t r = 0; r < job->run_count; r++)
        if (job->runs[r].weight_count > 0)
            return true;
    return false;
}

void fit_step(const struct answer *a, bool trim, struct advice_next *next)
{
    const struct job *job = a->model->job;
    int mounted = job->aim.mounted;
    *next = (struct advice_next){.step = trim ? "trim" : "correct"};
    say_misfit(a, next);
    const char *drill = has_holes(a) ? "drill as placed, depths beside each placement" : NULL;
    const char *work = only_removal(a) ? drill ? drill : "remove material as placed"
                       : mounted >= 0  ? "add what is placed"
                                       : "fit what is placed";
    if (mounted >= 0 && sits_only_removed(job, (size_t)mounted))
        clause(next, "%s, then run again", work);
    else if (mounted >= 0)
        clause(next, "leave the weights of run '%s' on, %s, then run again",
               job->runs[mounted].name, work);
    else
        clause(next,
               job_removed_run(job) >= 0
                   ? "put back what runs removed, take off what was mounted, %s, then run again"
               : lists_weights(job)
                   ? "take all off that the runs list, %s, then run again"
                   : "leave all weights on that were on as found, %s, then run again",
               work);
    say_unproven(a, next);
    if (drill && !only_removal(a))
        clause(next, "%s", drill);
    if (a->static_only)
        clause(next, "the static part comes first, the couple after that run");
    if (a->model->amplitudes)
        clause(next, "found from amplitudes alone, no lag is meant");
    say_opposed(a, next);
    list_lost(a, next->text, sizeof next->text);
}

void fit_heed(const struct advice_finding *f, struct advice_next *next)
{
    struct advice_next own = *next;
    snprintf(own.text, sizeof own.text, "%s", f->text);
    clause(&own, "%.299s", next->text);
    memcpy(next->text, own.text, sizeof next->text);
}
