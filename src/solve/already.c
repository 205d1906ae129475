#include "solve/already.h"

#include <math.h>
#include <stdio.h>

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
