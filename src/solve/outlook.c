#include "solve/outlook.h"

#include <math.h>
#include <stdio.h>
#include <stdlib.h>
#include <string.h>

#include "base/angle.h"
#include "sheet/units.h"
#include "solve/correct.h"
#include "solve/forecast.h"
#include "solve/tolerance.h"
#include "solve/zones.h"

/* One row: the next reading is the vibration, plus the scatter from run to run, plus what a
 * reading of this row is usually off by. */
static void forecast_row(const struct answer *a, const struct model_row *row,
                         const double complex *total, struct answer_forecast *f)
{
    double cov[3], unused[3], dof = row->posterior.dof;
    f->row = row;
    f->before = posterior_predict(&row->posterior, a->mounted, unused);
    f->after = posterior_predict(&row->posterior, total, cov);
    cov[0] += row->widened * (row->sigma * row->sigma + row->typical[0]);
    cov[1] += row->widened * row->typical[1];
    cov[2] += row->widened * (row->sigma * row->sigma + row->typical[2]);
    f->variance = cov[0] + cov[2];
    f->range[0] = forecast_quantile(f->after, cov, dof, 0.025);
    f->range[1] = forecast_quantile(f->after, cov, dof, 0.975);
    f->chance = isnan(row->target) ? NAN : forecast_within(f->after, cov, dof, row->target);
}

/* Mean overall rms of the row's readings with what is mounted, and nothing else; NaN: none. */
static double overall_now(const struct answer *a, const struct model_row *row)
{
    double sum = 0, n = 0;
    for (size_t i = 0; i < row->count; i++) {
        double off = 0, size = 0;
        for (size_t p = 0; p < a->planes; p++) {
            off = fmax(off, cabs(row->x[i * a->planes + p] - a->mounted[p]));
            size = fmax(size, cabs(a->mounted[p]));
        }
        if (off <= 1e-9 * size && !isnan(row->overall[i])) {
            sum += row->overall[i] * row->overall[i];
            n++;
        }
    }
    return n > 0 ? sqrt(sum / n) : NAN;
}

/* Zones are of parts that do not turn: a probe that measures displacement looks at the shaft. All
 * but 1x stays as it is. */
static void fill_zone(const struct answer *a, struct answer_forecast *f)
{
    const struct job *job = a->model->job;
    const struct model_row *row = f->row;
    const struct job_sensor *s = &job->sensors[row->sensor];
    struct answer_zone *z = &f->zone;
    double w = row->speed_rpm * PI / 30;
    *z = (struct answer_zone){0};
    if (job->aim.zone_group == 0 || s->quantity == QUANTITY_DISPLACEMENT || !(w > 0))
        return;
    double overall = overall_now(a, row);
    z->overall = !isnan(overall) && row->overall_quantity != QUANTITY_ACCELERATION;
    z->quantity = z->overall ? row->overall_quantity : QUANTITY_VELOCITY;
    z->given = true;
    double before = cabs(units_convert(f->before, s->quantity, z->quantity, w)) / sqrt(2);
    double size =
        sqrt(creal(f->after * conj(f->after)) + f->variance); /* expected, not the mean's */
    double after = cabs(units_convert(size, s->quantity, z->quantity, w)) / sqrt(2);
    double rest = z->overall ? fmax(0, overall * overall - before * before) : 0;
    z->before = sqrt(rest + before * before);
    z->after = sqrt(rest + after * after);
    zones_limits(job->aim.zone_group, job->aim.zone_flexible, z->quantity == QUANTITY_DISPLACEMENT,
                 z->limits);
}

/* Permissible residual of each plane, kg m; false where the sheet does not say enough. */
static bool permissible(const struct job *job, size_t planes, double *out, char basis[120])
{
    double loads[2] = {0.5, 0.5}, shares[2] = {0.5, 0.5};
    bool distances = job->span_m > 0 && !isnan(job->centre_m);
    if (!(job->rotor_mass > 0) || !(job->service_rpm > 0) || planes == 0)
        return false;
    if (distances) {
        tolerance_loads(job->span_m, job->centre_m, loads);
        tolerance_shares(job->span_m, job->centre_m, job->support == SUPPORT_OVERHUNG, shares);
    }
    for (size_t p = 0; p < planes; p++) {
        double load = planes == 1 ? 1 : planes == 2 ? fabs(loads[p]) : 1 / (double)planes;
        double share = planes == 1 ? 1 : planes == 2 ? shares[p] : 1 / (double)planes;
        if (job->aim.tolerance == TOLERANCE_API_4WN)
            out[p] = tolerance_api_4wn(load * job->rotor_mass, job->service_rpm);
        else if (job->grade > 0)
            out[p] = share * tolerance_grade(job->grade, job->rotor_mass, job->service_rpm);
        else
            return false;
    }
    if (job->aim.tolerance == TOLERANCE_API_4WN)
        snprintf(basis, 120, "API 4W/N; check the current edition");
    else if (planes == 2)
        snprintf(basis, 120, "ISO 21940-11 G%g, %s", job->grade,
                 distances ? "shared by distances; limits of a share from memory, check the edition"
                           : "in equal halves, for want of distances in [rotor]");
    else
        snprintf(basis, 120, "ISO 21940-11 G%g%s", job->grade, planes > 2 ? ", equal shares" : "");
    return true;
}

static void residual_plane(struct answer *a, size_t p, double limit)
{
    size_t n = 2 * a->planes;
    const double *e = a->ellipse + 2 * p * n + 2 * p;
    double cov[3] = {e[0], e[1], e[n + 1]}, radius = a->model->job->planes[p].radius_m;
    double complex left = a->classical[p] - a->placed_weights[p];
    a->residuals[p] =
        (struct answer_residual){radius * cabs(a->classical[p]), radius * cabs(left),
                                 radius * forecast_quantile(left, cov, INFINITY, 0.975), limit};
}

int outlook_fill(struct answer *a)
{
    double complex *total = calloc(a->planes + 1, sizeof *total);
    double *limits = calloc(a->planes + 1, sizeof *limits);
    if (!total || !limits) {
        free(limits);
        free(total);
        return ANSWER_NO_MEMORY;
    }
    for (size_t p = 0; p < a->planes; p++)
        total[p] = a->mounted[p] + a->placed_weights[p];
    a->forecast_count = 0;
    for (size_t r = 0; r < a->model->row_count; r++)
        if (a->model->rows[r].state == MODEL_GOOD)
            forecast_row(a, &a->model->rows[r], total, &a->forecasts[a->forecast_count++]);
    for (size_t i = 0; i < a->forecast_count; i++)
        fill_zone(a, &a->forecasts[i]);
    a->has_residual = permissible(a->model->job, a->planes, limits, a->basis);
    for (size_t p = 0; p < a->planes && a->has_residual; p++)
        residual_plane(a, p, limits[p]);
    free(limits);
    free(total);
    return ANSWER_OK;
}
