#include "solve/posterior.h"

#include <math.h>
#include <stdlib.h>
#include <string.h>

int posterior_init(struct posterior *p, size_t unknowns)
{
    memset(p, 0, sizeof *p);
    p->unknowns = unknowns;
    p->dof = INFINITY;
    p->mean = calloc(unknowns, sizeof *p->mean);
    p->cov = calloc(4 * unknowns * unknowns, sizeof *p->cov);
    p->known = calloc(unknowns, sizeof *p->known);
    if (!p->mean || !p->cov || !p->known) {
        posterior_release(p);
        return -1;
    }
    return 0;
}

void posterior_release(struct posterior *p)
{
    free(p->mean);
    free(p->cov);
    free(p->known);
    memset(p, 0, sizeof *p);
}

/* Rows 0 and 1 of the real map that makes b^T x out of the stacked unknowns. */
static void stack_row(double complex x, double re[2], double im[2])
{
    re[0] = creal(x);
    re[1] = -cimag(x);
    im[0] = cimag(x);
    im[1] = creal(x);
}

static double complex factor_of(const double complex *weights, size_t k)
{
    return k == 0 ? 1 : weights[k - 1];
}

double complex posterior_predict(const struct posterior *p, const double complex *weights,
                                 double cov[3])
{
    double complex mean = 0;
    size_t width = 2 * p->unknowns;
    cov[0] = cov[1] = cov[2] = 0;
    for (size_t i = 0; i < p->unknowns; i++) {
        double re[2], im[2];
        mean += p->mean[i] * factor_of(weights, i);
        stack_row(factor_of(weights, i), re, im);
        for (size_t j = 0; j < p->unknowns; j++) {
            double re2[2], im2[2];
            stack_row(factor_of(weights, j), re2, im2);
            for (int a = 0; a < 2; a++)
                for (int b = 0; b < 2; b++) {
                    double c = p->cov[(2 * i + (size_t)a) * width + 2 * j + (size_t)b];
                    cov[0] += re[a] * re2[b] * c;
                    cov[1] += re[a] * im2[b] * c;
                    cov[2] += im[a] * im2[b] * c;
                }
        }
    }
    return mean;
}

int posterior_rebase(struct posterior *p, const double complex *weights)
{
    size_t width = 2 * p->unknowns;
    double *cross = calloc(2 * width, sizeof *cross);
    if (!cross)
        return -1;
    double own[3];
    double complex moved = posterior_predict(p, weights, own);
    for (size_t j = 0; j < width; j++)
        for (size_t i = 0; i < p->unknowns; i++) {
            double re[2], im[2];
            stack_row(factor_of(weights, i), re, im);
            for (int a = 0; a < 2; a++) {
                cross[j] += re[a] * p->cov[(2 * i + (size_t)a) * width + j];
                cross[width + j] += im[a] * p->cov[(2 * i + (size_t)a) * width + j];
            }
        }
    for (size_t j = 2; j < width; j++) {
        p->cov[j] = p->cov[j * width] = cross[j];
        p->cov[width + j] = p->cov[j * width + 1] = cross[width + j];
    }
    p->cov[0] = own[0];
    p->cov[1] = p->cov[width] = own[1];
    p->cov[width + 1] = own[2];
    p->mean[0] = moved;
    for (size_t k = 1; k < p->unknowns; k++)
        p->known[0] = p->known[0] && (p->known[k] || weights[k - 1] == 0);
    free(cross);
    return 0;
}

void posterior_marginal(const struct posterior *p, size_t k, double cov[3])
{
    size_t width = 2 * p->unknowns, at = 2 * k * width + 2 * k;
    cov[0] = p->cov[at];
    cov[1] = p->cov[at + 1];
    cov[2] = p->cov[at + width + 1];
}

double posterior_inflation(const struct posterior *p)
{
    return isinf(p->dof) ? 1 : p->dof / (p->dof - 2);
}

void posterior_forms(const struct posterior *p, double scale, double complex *form,
                     double complex *certain)
{
    size_t n = p->unknowns, width = 2 * n;
    double inflation = posterior_inflation(p);
    for (size_t i = 0; i < n; i++)
        for (size_t j = 0; j < n; j++) {
            const double *re = p->cov + 2 * i * width + 2 * j, *im = re + width;
            double complex mean = conj(p->mean[i]) * p->mean[j];
            double complex unknown = CMPLX(re[0] + im[1], re[1] - im[0]);
            form[i * n + j] = scale * scale * (mean + inflation * unknown);
            if (certain)
                certain[i * n + j] = scale * scale * mean;
        }
}
