#include "solve/culprit.h"

#include <math.h>
#include <stdlib.h>
#include <string.h>

/* Room for all readings but one. */
struct rest {
    double complex *y, *x;
    double (*cov)[3];
};

static void without(const struct regress_data *data, size_t out, struct rest *rest)
{
    size_t n = 0;
    for (size_t i = 0; i < data->count; i++) {
        if (i == out)
            continue;
        rest->y[n] = data->y[i];
        memcpy(rest->cov[n], data->cov[i], sizeof rest->cov[n]);
        for (size_t p = 0; p < data->planes; p++)
            rest->x[n * data->planes + p] = data->x[i * data->planes + p];
        n++;
    }
}

/* *misfit of the readings but one; INFINITY where they do not determine everything. */
static int misfit_of(const struct regress_data *data, const struct rest *rest, double *misfit)
{
    struct regress_data some = {.count = data->count - 1,
                                .planes = data->planes,
                                .y = rest->y,
                                .x = rest->x,
                                .cov = (const double(*)[3])rest->cov,
                                .scale = data->scale};
    struct posterior p;
    size_t at;
    int result = regress_fit(&some, &p);
    if (result != REGRESS_OK)
        return result;
    *misfit = p.rank == data->planes + 1 ? regress_misfit(&some, &p, &at) : INFINITY;
    posterior_release(&p);
    return REGRESS_OK;
}

int culprit_find(const struct regress_data *data, double fits, bool *possible, int *which)
{
    struct rest rest = {calloc(data->count + 1, sizeof *rest.y),
                        calloc(data->count * data->planes + 1, sizeof *rest.x),
                        calloc(data->count + 1, sizeof *rest.cov)};
    int result = rest.y && rest.x && rest.cov ? REGRESS_OK : REGRESS_NO_MEMORY;
    size_t count = 0;
    *which = -1;
    for (size_t i = 0; i < data->count && result == REGRESS_OK; i++) {
        double misfit = INFINITY;
        without(data, i, &rest);
        result = misfit_of(data, &rest, &misfit);
        possible[i] = isnan(misfit) || misfit < fits;
        if (!possible[i])
            continue;
        *which = count++ == 0 && !isnan(misfit) ? (int)i : -1;
    }
    free(rest.cov);
    free(rest.x);
    free(rest.y);
    return result;
}

int culprit_mirrored(const struct regress_data *data, double fits, bool *fits_mirrored)
{
    size_t count = data->count * data->planes, at;
    double complex *x = calloc(count + 1, sizeof *x);
    struct regress_data mirrored = *data;
    struct posterior p;
    *fits_mirrored = false;
    if (!x)
        return REGRESS_NO_MEMORY;
    for (size_t i = 0; i < count; i++)
        x[i] = conj(data->x[i]);
    mirrored.x = x;
    int result = regress_fit(&mirrored, &p);
    if (result == REGRESS_OK) {
        *fits_mirrored = p.rank == data->planes + 1 && regress_misfit(&mirrored, &p, &at) < fits;
        posterior_release(&p);
    }
    free(x);
    return result;
}

static bool bare(const struct regress_data *data, size_t i)
{
    for (size_t p = 0; p < data->planes; p++)
        if (data->x[i * data->planes + p] != 0)
            return false;
    return true;
}

int culprit_left_on(const struct regress_data *data, double fits, int *on, int *in)
{
    size_t planes = data->planes, count = data->count, at;
    double complex *x = calloc(count * planes + 1, sizeof *x);
    struct regress_data changed = *data;
    int result = x ? REGRESS_OK : REGRESS_NO_MEMORY;
    *on = *in = -1;
    changed.x = x;
    for (size_t i = 0; i < count && result == REGRESS_OK; i++)
        for (size_t j = i + 1; j < count && result == REGRESS_OK && !bare(data, i); j++) {
            struct posterior p;
            memcpy(x, data->x, count * planes * sizeof *x);
            for (size_t k = 0; k < planes; k++)
                x[j * planes + k] += data->x[i * planes + k];
            result = regress_fit(&changed, &p);
            if (result != REGRESS_OK)
                continue;
            double misfit =
                p.rank == planes + 1 ? regress_misfit(&changed, &p, &at) : (double)INFINITY;
            posterior_release(&p);
            if (!(misfit < fits))
                continue;
            fits = misfit;
            *on = (int)i;
            *in = (int)j;
        }
    free(x);
    return result;
}
