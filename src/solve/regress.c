#include "solve/regress.h"

#include <lapacke.h>
#include <math.h>
#include <stdbool.h>
#include <stdlib.h>
#include <string.h>

/* A variance below (FLOOR*scale)^2 is no statement: nobody reads nine digits off an instrument. */
#define FLOOR 1e-9
/* Two weight patterns closer than this are one: weights are known to a few digits at best. */
#define RANK_TOLERANCE 1e-6

/* The design with its leading one and a line for each prior, count x (planes + 1), row-major. New;
 * NULL: no memory. */
static double complex *design_new(const struct regress_data *d)
{
    size_t width = d->planes + 1;
    double complex *f = calloc((d->count + d->prior_count + 1) * width, sizeof *f);
    for (size_t i = 0; f && i < d->count; i++) {
        f[i * width] = 1;
        for (size_t p = 0; p < d->planes; p++)
            f[i * width + p + 1] = d->x[i * d->planes + p];
    }
    for (size_t j = 0; f && j < d->prior_count; j++) {
        size_t plane = d->prior_plane[j];
        double reach = 0, size = cabs(d->prior[j]);
        for (size_t i = 0; i < d->count; i++)
            reach = fmax(reach, cabs(d->x[i * d->planes + plane]));
        f[(d->count + j) * width + plane + 1] = reach > 0 ? reach : size > 0 ? d->scale / size : 1;
    }
    return f;
}

/* Length of each column of the design; 1 for an empty one. */
static void column_lengths(size_t rows, size_t width, const double complex *f, double *length)
{
    for (size_t k = 0; k < width; k++) {
        double sum = 0;
        for (size_t i = 0; i < rows; i++)
            sum = hypot(sum, cabs(f[i * width + k]));
        length[k] = sum > 0 ? sum : 1;
    }
}

/* The inverse of the lower Cholesky factor of a reading's covariance, with the floor. */
static void whitener(const double cov[3], double scale, double w[3])
{
    double least = FLOOR * FLOOR * scale * scale;
    double a = fmax(cov[0], 0) + least, c = fmax(cov[2], 0) + least;
    double l11 = sqrt(a), l21 = cov[1] / l11;
    double rest = c - l21 * l21;
    double l22 = sqrt(fmax(rest, least));
    w[0] = 1 / l11;
    w[1] = -l21 / (l11 * l22);
    w[2] = 1 / l22;
}

/* Reading or prior i of the data as a value with its covariance. */
static double complex value_of(const struct regress_data *d, const double complex *f, size_t i,
                               double cov[3])
{
    if (i < d->count) {
        memcpy(cov, d->cov[i], 3 * sizeof *cov);
        return d->y[i];
    }
    size_t j = i - d->count;
    double mass = creal(f[i * (d->planes + 1) + d->prior_plane[j] + 1]);
    for (int k = 0; k < 3; k++)
        cov[k] = mass * mass * d->prior_cov[j][k];
    return mass * d->prior[j];
}

/* The stacked real design, 2 rows x 2 width; whitened where data is not NULL, then with `b`. */
static void stack(size_t rows, size_t width, const double complex *f, const double *length,
                  const struct regress_data *data, double *m, double *b)
{
    for (size_t i = 0; i < rows; i++) {
        double w[3] = {1, 0, 1}, cov[3];
        double complex y = data ? value_of(data, f, i, cov) : 0;
        if (data)
            whitener(cov, data->scale, w);
        double *re = m + 4 * i * width, *im = re + 2 * width;
        for (size_t k = 0; k < width; k++) {
            double complex g = f[i * width + k] / length[k];
            double top[2] = {creal(g), -cimag(g)}, bottom[2] = {cimag(g), creal(g)};
            for (size_t c = 0; c < 2; c++) {
                re[2 * k + c] = w[0] * top[c];
                im[2 * k + c] = w[1] * top[c] + w[2] * bottom[c];
            }
        }
        if (data && b) {
            b[2 * i] = w[0] * creal(y);
            b[2 * i + 1] = w[1] * creal(y) + w[2] * cimag(y);
        }
    }
}

struct factors {
    double *m, *b, *s, *u, *vt, *work; /* one allocation, in m */
    size_t rows, width, least;
};

static int factors_init(struct factors *f, size_t rows, size_t width)
{
    f->rows = 2 * rows;
    f->width = 2 * width;
    f->least = f->rows < f->width ? f->rows : f->width;
    size_t total =
        f->rows * f->width + f->rows + 2 * f->least + f->rows * f->least + f->width * f->width;
    f->m = calloc(total, sizeof *f->m);
    if (!f->m)
        return -1;
    f->b = f->m + f->rows * f->width;
    f->s = f->b + f->rows;
    f->work = f->s + f->least;
    f->u = f->work + f->least;
    f->vt = f->u + f->rows * f->least;
    return 0;
}

static int factorise(struct factors *f)
{
    lapack_int info = LAPACKE_dgesvd(LAPACK_ROW_MAJOR, 'S', 'A', (lapack_int)f->rows,
                                     (lapack_int)f->width, f->m, (lapack_int)f->width, f->s, f->u,
                                     (lapack_int)f->least, f->vt, (lapack_int)f->width, f->work);
    if (info == LAPACK_WORK_MEMORY_ERROR || info == LAPACK_TRANSPOSE_MEMORY_ERROR)
        return REGRESS_NO_MEMORY;
    return info == 0 ? REGRESS_OK : REGRESS_FAILED;
}

static size_t count_rank(const struct factors *f)
{
    size_t rank = 0;
    while (rank < f->least && f->s[rank] > RANK_TOLERANCE * f->s[0])
        rank++;
    return rank / 2; /* real and imaginary part of each unknown share a value */
}

/* Rank of the bare design, rows x width; with `known`, which unknowns it determines. */
static int judge(size_t rows, size_t width, const double complex *design, const double *length,
                 bool *known)
{
    struct factors f;
    if (rows == 0)
        return 0;
    if (factors_init(&f, rows, width) != 0)
        return REGRESS_NO_MEMORY;
    stack(rows, width, design, length, NULL, f.m, NULL);
    int result = factorise(&f);
    if (result == REGRESS_OK) {
        size_t rank = count_rank(&f);
        for (size_t k = 0; known && k < width; k++) {
            double free_part = 0;
            for (size_t j = 2 * rank; j < f.width; j++)
                free_part = hypot(free_part, f.vt[j * f.width + 2 * k]);
            known[k] = free_part < RANK_TOLERANCE;
        }
        result = (int)rank;
    }
    free(f.m);
    return result;
}

int regress_rank(size_t count, size_t planes, const double complex *x, const bool *held)
{
    size_t kept = 0;
    double *length = calloc(planes + 1, sizeof *length);
    double complex *f = calloc((count + 1) * (planes + 1), sizeof *f);
    int rank = REGRESS_NO_MEMORY;
    for (size_t p = 0; p < planes; p++)
        kept += !(held && held[p]);
    if (f && length) {
        for (size_t i = 0; i < count; i++) {
            double complex *to = f + i * (kept + 1);
            *to++ = 1;
            for (size_t p = 0; p < planes; p++)
                if (!(held && held[p]))
                    *to++ = x[i * planes + p];
        }
        column_lengths(count, kept + 1, f, length);
        rank = judge(count, kept + 1, f, length, NULL);
    }
    free(f);
    free(length);
    return rank < 0 ? rank : rank + (int)(planes - kept);
}

/* Solution and covariance from the `rank` largest singular values. */
static void solve_factors(const struct factors *f, const double *length, struct posterior *p)
{
    for (size_t j = 0; j < 2 * p->rank; j++) {
        double along = 0;
        for (size_t i = 0; i < f->rows; i++)
            along += f->u[i * f->least + j] * f->b[i];
        along /= f->s[j];
        const double *v = f->vt + j * f->width;
        for (size_t k = 0; k < p->unknowns; k++)
            p->mean[k] += along * CMPLX(v[2 * k], v[2 * k + 1]) / length[k];
        for (size_t a = 0; a < f->width; a++)
            for (size_t c = 0; c < f->width; c++)
                p->cov[a * f->width + c] +=
                    v[a] / length[a / 2] * v[c] / length[c / 2] / (f->s[j] * f->s[j]);
    }
}

static bool has_nan(const struct regress_data *d)
{
    double sum = d->scale;
    for (size_t i = 0; i < d->count; i++)
        sum += creal(d->y[i]) + cimag(d->y[i]) + d->cov[i][0] + d->cov[i][1] + d->cov[i][2];
    for (size_t i = 0; i < d->count * d->planes; i++)
        sum += creal(d->x[i]) + cimag(d->x[i]);
    for (size_t j = 0; j < d->prior_count; j++)
        sum += creal(d->prior[j]) + cimag(d->prior[j]) + d->prior_cov[j][0] + d->prior_cov[j][1] +
               d->prior_cov[j][2];
    return !isfinite(sum) || !(d->scale > 0);
}

int regress_fit(const struct regress_data *d, struct posterior *p)
{
    struct factors f = {0};
    size_t rows = d->count + d->prior_count, width = d->planes + 1;
    memset(p, 0, sizeof *p);
    if (has_nan(d))
        return REGRESS_NAN;
    double *length = calloc(width, sizeof *length);
    double complex *design = design_new(d);
    int result = REGRESS_NO_MEMORY;
    if (!length || !design || posterior_init(p, width) != 0)
        goto done;
    column_lengths(rows, width, design, length);
    int rank = judge(rows, width, design, length, p->known);
    if (rank < 0) {
        result = rank;
        goto done;
    }
    p->rank = (size_t)rank;
    if (rows > 0) {
        if (factors_init(&f, rows, width) != 0)
            goto done;
        stack(rows, width, design, length, d, f.m, f.b);
        result = factorise(&f);
        if (result != REGRESS_OK)
            goto done;
        solve_factors(&f, length, p);
    }
    result = REGRESS_OK;
done:
    free(f.m);
    free(design);
    free(length);
    if (result != REGRESS_OK)
        posterior_release(p);
    return result;
}

double regress_misfit(const struct regress_data *d, const struct posterior *p, size_t *which)
{
    double worst = NAN;
    for (size_t i = 0; i < d->count; i++) {
        double explained[3];
        double complex fit = posterior_predict(p, d->x + i * d->planes, explained);
        double total = d->cov[i][0] + d->cov[i][2];
        double spare = total - explained[0] - explained[2];
        if (!(spare > 1e-6 * total) || !(total > 0)) /* this reading alone fixes its own fit */
            continue;
        double misfit = cabs(d->y[i] - fit) / sqrt(spare);
        if (!(misfit <= worst)) {
            worst = misfit;
            *which = i;
        }
    }
    return worst;
}
