#include "solve/already.h"

#include <math.h>
#include <stdio.h>
#include <string.h>

#include "base/angle.h"
#include "sheet/units.h"
#include "solve/forecast.h"

/* Upper end of the 95 % range of the next reading as found, SI peak; NaN: no reading tells. */
static double upper_end(const struct model *m, const struct model_row *row)
{
    double complex sum = 0;
    double cov[3] = {0}, n = 0;
    for (size_t i = 0; i < row->count; i++) {
        if (!job_run_is_bare(m->job, row->runs[i]))
            continue;
        n++;
        sum += row->y[i];
        for (int k = 0; k < 3; k++)
            cov[k] += row->total[i][k];
    }
    if (!(n > 0))
        return NAN;
    for (int k = 0; k < 3; k++) /* of the mean, and of one more reading */
        cov[k] *= (1 / n + 1) / n;
    return forecast_quantile(sum / n, cov, m->dof, 0.975);
}

bool already_meets(const struct model *m)
{
    bool targets = false;
    if (m->job->aim.mounted >= 0)
        return false;
    for (size_t r = 0; r < m->row_count; r++) {
        const struct model_row *row = &m->rows[r];
        if (!row->in_aim || isnan(row->target))
            continue;
        targets = true;
        if (!(upper_end(m, row) <= row->target))
            return false;
    }
    return targets;
}

void already_step(const struct model *m, struct advice_next *next)
{
    *next = (struct advice_next){.step = "done"};
    snprintf(next->text, sizeof next->text,
             "as found meets the aim already: nothing needs to be fitted%s",
             model_is_bare(m) ? "" : "; take off what was mounted since");
}

/* The overall vibration of a row as found over its target, as peaks of a sine of that rms; NaN: not
 * known. */
static double overall_share(const struct model *m, const struct model_row *row)
{
    const struct job_sensor *s = &m->job->sensors[row->sensor];
    double sum = 0, n = 0, w = row->speed_rpm * PI / 30;
    for (size_t i = 0; i < row->count; i++)
        if (job_run_is_bare(m->job, row->runs[i]) && !isnan(row->overall[i])) {
            sum += row->overall[i] * row->overall[i];
            n++;
        }
    double target = cabs(units_convert(row->target, s->quantity, row->overall_quantity, w));
    return n > 0 ? sqrt(2 * sum / n) / target : NAN;
}

static double two_x_of(const struct model *m, size_t sensor, const struct remedy_cause *causes,
                       size_t count)
{
    double most = 0;
    for (size_t i = 0; i < count; i++)
        if (causes[i].sensor == (int)sensor && causes[i].run >= 0 &&
            !strcmp(causes[i].check, "two-x") && job_run_is_bare(m->job, (size_t)causes[i].run))
            most = fmax(most, causes[i].value);
    return most;
}

bool already_elsewhere(const struct model *m, const struct model_row *row,
                       const struct remedy_cause *causes, size_t count, struct advice_finding *f)
{
    double share = row->in_aim && !isnan(row->target) ? overall_share(m, row) : NAN;
    if (!(share >= ALREADY_ABOVE))
        return false;
    double two = two_x_of(m, row->sensor, causes, count);
    const char *sensor = m->job->sensors[row->sensor].name;
    *f = (struct advice_finding){.check = "overall-level",
                                 .unit = "%",
                                 .basis = "common practice",
                                 .verdict = ADVICE_CAUTION,
                                 .run = -1,
                                 .sensor = (int)row->sensor,
                                 .value = 100 * share,
                                 .limit = 100 * ALREADY_ABOVE};
    if (two >= REMEDY_SHAFT_PCT)
        snprintf(f->text, sizeof f->text,
                 "1x meets the target at '%s', but the overall vibration is %s times it, and 2x %s "
                 "times 1x: the tacho may count another shaft, of half the speed",
                 sensor, judge_figure(share, 2).text, judge_figure(two / 100, 2).text);
    else
        snprintf(
            f->text, sizeof f->text,
            "1x meets the target at '%s', but the overall vibration is %s times it: see whether "
            "the tacho counts this shaft; else look for what is not 1x, which no weight lowers",
            sensor, judge_figure(share, 2).text);
    return true;
}

void already_doubt(const struct advice_finding *f, struct advice_next *next)
{
    const char *from = strstr(f->text, "but ");
    size_t length = strlen(next->text);
    if (!from || strstr(next->text, "; but "))
        return;
    snprintf(next->text + length, sizeof next->text - length, "; %s", from);
}
