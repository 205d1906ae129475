#include "solve/witness.h"

#include <math.h>
#include <stdio.h>
#include <string.h>

#include "solve/lookback.h"

#define REFUSED 6.0      /* s.e.: twice the caution, as `lag-follows-weight` */
#define LEAST_OFF 0.1    /* of as found: a smaller difference turns no answer; common practice */
#define LEAST_NOISE 5e-3 /* of as found: readings noted by hand carry three digits at best */
#define WORSE 2.0        /* s.e.: about the 95 % point, common practice */

/* Limits of lag-follows-weight, since the same hangs on it. */
static struct judge_limits limits_of(const struct job *job)
{
    struct judge_limits l = judge_limits_of(job, "lag-follows-weight", 3, INFINITY);
    if (isinf(l.refuse))
        l.refuse = fmax(REFUSED, l.caution);
    return l;
}

static struct advice_finding begin(const struct model_row *row, size_t run, const char *check)
{
    return (struct advice_finding){.check = check,
                                   .unit = "s.e.",
                                   .basis = "common practice",
                                   .run = (int)run,
                                   .sensor = (int)row->sensor};
}

int witness_contrary(const struct model *m, const struct model_row *row, size_t run,
                     struct advice_finding *f)
{
    struct judge_limits l = limits_of(m->job);
    struct lookback look;
    if (m->amplitudes || l.off)
        return 0;
    int found = lookback_row(row, m->job->plane_count, run, &look);
    if (found <= 0)
        return found;
    double complex wanted = look.predicted - look.bare, got = look.measured - look.bare;
    if (!(look.se >= l.refuse) || !(creal(conj(wanted) * got) < 0) ||
        !(cabs(got - wanted) >= LEAST_OFF * row->as_found))
        return 0;
    *f = begin(row, run, "prediction");
    f->value = look.se;
    f->verdict = judge_value(&l, look.se, &f->limit);
    snprintf(f->text, sizeof f->text,
             "run '%s' changed sensor '%s' contrary to what the runs before it predict: check how "
             "and where its weights and the trials' were mounted, the sheet's `angles` and "
             "`phase`, and whether the tape or the machine changed",
             m->job->runs[run].name, m->job->sensors[row->sensor].name);
    return 1;
}

bool witness_refused(const struct model *m, const struct model_row *row,
                     const struct model_reading *r, struct advice_finding *f)
{
    struct judge_limits l = limits_of(m->job);
    size_t planes = m->job->plane_count;
    double complex x[16];
    double cov[3];
    if (m->amplitudes || l.off || planes > 16 || !r->phase || r->sensor != row->sensor ||
        row->posterior.rank != planes + 1 ||
        strcmp(r->condition, m->conditions[row->condition]) != 0)
        return false;
    for (size_t p = 0; p < planes; p++)
        x[p] = job_run_weight(m->job, r->run, p);
    double complex off = r->vector - (row->runout ? m->runout[row->sensor].vector : 0) -
                         posterior_predict(&row->posterior, x, cov);
    double noise = fmax(row->sigma, LEAST_NOISE * row->as_found);
    double variance = cov[0] + cov[2] + r->cov[0] + r->cov[2] + 2 * noise * noise;
    *f = begin(row, r->run, "prediction");
    f->value = cabs(off) / sqrt(variance);
    f->verdict = judge_value(&l, f->value, &f->limit);
    if (f->verdict == ADVICE_OK || isnan(f->value))
        return false;
    snprintf(f->text, sizeof f->text,
             "run '%s', whose effect is too small to solve with, still contradicts the other runs "
             "at sensor '%s', %s standard errors off: check how and where the weights were "
             "mounted, the sheet's `angles` and `phase`, and repeat it with a larger weight",
             m->job->runs[r->run].name, m->job->sensors[row->sensor].name,
             judge_figure(f->value, 2).text);
    return true;
}

/* Standard error of an amplitude difference: that along the vector is at most the whole. */
static double worse_by(const struct model_row *row, size_t run)
{
    for (size_t i = 0; i < row->count; i++) {
        double noise = fmax(row->sigma, LEAST_NOISE * row->as_found);
        if (row->runs[i] == run)
            return (cabs(row->y[i]) - row->as_found) /
                   sqrt(row->cov[i][0] + row->cov[i][2] + 2 * noise * noise);
    }
    return NAN;
}

int witness_worse(const struct model *m, size_t run, struct advice_finding *f)
{
    bool any = false;
    for (size_t i = 0; i < m->row_count; i++) {
        const struct model_row *row = &m->rows[i];
        struct lookback look;
        double se = worse_by(row, run);
        if (!row->in_aim || row->state != MODEL_GOOD || !(se >= WORSE) || (any && se <= f->value))
            continue;
        int found = m->amplitudes ? 0 : lookback_row(row, m->job->plane_count, run, &look);
        if (found < 0)
            return found;
        if (found && cabs(look.predicted) > row->as_found)
            continue;
        *f = begin(row, run, "correction-worse");
        f->value = se;
        f->limit = WORSE;
        f->verdict = ADVICE_CAUTION;
        bool alone = !found && row->count <= m->job->plane_count + 1;
        snprintf(f->text, sizeof f->text,
                 "run '%s' is worse than as found at sensor '%s'%s: before anything is fitted, "
                 "check how and where its weights were mounted and the sheet's `angles` and "
                 "`phase`",
                 m->job->runs[run].name, m->job->sensors[row->sensor].name,
                 alone ? ", and the answer rests on that run alone" : "");
        any = true;
    }
    return any;
}

static bool misfits(const struct model_row *row)
{
    return row->misfit >= MODEL_MISFIT;
}

bool witness_moved(const struct model *m, const struct model_row *row,
                   const struct remedy_cause *cause)
{
    bool swapped = !strcmp(cause->check, "sensor-swapped");
    size_t shown = 0, alike = 0;
    if (cause->run < 0 ||
        strcmp(m->job->runs[cause->run].condition, m->conditions[row->condition]) != 0)
        return false;
    if (!strcmp(cause->check, "sensor-turned"))
        return (int)row->sensor == cause->sensor && misfits(row);
    if (!swapped && strcmp(cause->check, "tape-moved") != 0)
        return false;
    for (size_t i = 0; i < m->row_count; i++) {
        const struct model_row *other = &m->rows[i];
        if (other->condition != row->condition || !misfits(other))
            continue;
        shown++;
        alike += m->job->sensors[other->sensor].quantity == m->job->sensors[row->sensor].quantity;
    }
    if (swapped)
        return shown > 1 ? misfits(row) : alike > 0;
    return shown > 1; /* at one sensor a weight that is not as listed explains as much */
}
