#include "solve/stored.h"

#include <math.h>
#include <stdlib.h>
#include <string.h>

#include "solve/regress.h"

void stored_match(const struct model *m, struct model_row *row)
{
    const struct job *job = m->job;
    for (size_t i = 0; i < job->response_count && !m->amplitudes; i++) {
        const struct job_response *r = &job->responses[i];
        if (r->sensor != row->sensor || strcmp(r->condition, m->conditions[row->condition]) != 0)
            continue;
        double away = fabs(r->speed_rpm - row->speed_rpm) / row->speed_rpm;
        if (away > STORED_SPEED_APART) /* never with a speed that is not known */
            row->apart = r;
        else
            row->stored[r->plane] = r;
    }
}

int stored_rank(const struct model_row *row, size_t planes, size_t count, const double complex *x)
{
    bool *held = calloc(planes + 1, sizeof *held);
    if (!held)
        return REGRESS_NO_MEMORY;
    for (size_t p = 0; p < planes; p++)
        held[p] = row->stored[p] != NULL;
    int rank = regress_rank(count, planes, x, held);
    free(held);
    return rank;
}

struct priors {
    size_t count;
    size_t *plane;
    double complex *vector;
    double (*cov)[3];
};

static void priors_release(struct priors *q)
{
    free(q->plane);
    free(q->vector);
    free(q->cov);
}

/* The stored responses of the row as arrays. */
static int priors_init(struct priors *q, const struct model_row *row, size_t planes)
{
    *q = (struct priors){0, calloc(planes + 1, sizeof *q->plane),
                         calloc(planes + 1, sizeof *q->vector), calloc(planes + 1, sizeof *q->cov)};
    if (!q->plane || !q->vector || !q->cov) {
        priors_release(q);
        return REGRESS_NO_MEMORY;
    }
    for (size_t p = 0; p < planes; p++) {
        if (!row->stored[p])
            continue;
        q->plane[q->count] = p;
        q->vector[q->count] = row->stored[p]->vector;
        memcpy(q->cov[q->count++], row->stored[p]->cov, sizeof q->cov[0]);
    }
    return REGRESS_OK;
}

/* The furthest that a response of the runs alone lies from its stored one, in s.e. of both. */
static void compare(struct model_row *row, const struct posterior *own, size_t planes)
{
    for (size_t p = 0; p < planes; p++) {
        const struct job_response *r = row->stored[p];
        double cov[3];
        if (!r || !own->known[p + 1])
            continue;
        posterior_marginal(own, p + 1, cov);
        double away = cabs(own->mean[p + 1] - r->vector);
        double least =
            1e-9 * cabs(r->vector); /* exact ones are known to nine digits, as readings are */
        double se = sqrt(fmax(cov[0] + cov[2] + r->cov[0] + r->cov[2], least * least));
        if (se > 0 && !(away / se <= row->changed)) {
            row->changed = away / se;
            row->changed_plane = (int)p;
        }
    }
}

/* The readings with the prior; where they contradict each other, again with a prior widened. */
static int fit_both(struct model_row *row, struct regress_data *data, struct priors *q)
{
    size_t at = 0;
    data->prior_count = q->count;
    data->prior_plane = q->plane;
    data->prior = q->vector;
    data->prior_cov = (const double(*)[3])q->cov;
    int result = regress_fit(data, &row->posterior);
    if (result != REGRESS_OK)
        return result;
    double misfit = regress_misfit(data, &row->posterior, &at);
    if (isnan(row->changed) && isnan(row->misfit)) { /* only stored and new together are spare */
        row->changed = misfit;
        row->misfit_run = row->count > 0 ? row->runs[at] : 0;
    }
    row->kept = MODEL_STORED_HELD;
    if (!(row->changed >= STORED_CHANGED))
        return REGRESS_OK;
    row->kept = MODEL_STORED_WIDENED;
    for (size_t j = 0; j < q->count; j++)
        for (int k = 0; k < 3; k++)
            q->cov[j][k] *= row->changed * row->changed;
    posterior_release(&row->posterior);
    return regress_fit(data, &row->posterior);
}

int stored_fit(struct model_row *row, size_t planes)
{
    struct regress_data data = {.count = row->count,
                                .planes = planes,
                                .y = row->y,
                                .x = row->x,
                                .cov = (const double(*)[3])row->total,
                                .scale = row->as_found};
    struct priors q;
    size_t at = 0;
    int result = priors_init(&q, row, planes);
    if (result != REGRESS_OK)
        return result;
    result = regress_fit(&data, &row->posterior);
    if (result == REGRESS_OK) {
        row->misfit = regress_misfit(&data, &row->posterior, &at);
        row->misfit_run = row->count > 0 ? row->runs[at] : 0;
        compare(row, &row->posterior, planes);
    }
    bool whole = row->posterior.rank == planes + 1;
    if (result == REGRESS_OK && q.count > 0 && whole && row->changed >= STORED_CHANGED) {
        row->kept = MODEL_STORED_LEFT;
        memset(row->stored, 0, planes * sizeof(const struct job_response *));
    } else if (result == REGRESS_OK && q.count > 0) {
        posterior_release(&row->posterior);
        result = fit_both(row, &data, &q);
    }
    priors_release(&q);
    return result;
}
