#include "solve/chebyshev.h"

#include <lapacke.h>
#include <math.h>
#include <stdlib.h>
#include <string.h>

#define GAP 1e-12      /* of the value at the start */
#define NEWTON_MOST 60 /* steps for one tau; ten are usual */

/* The problem in scaled real unknowns v = [re, im] of each plane's weight, then t. */
struct barrier {
    size_t rows, n;         /* n = 2 planes */
    double *h, *g, *c;      /* J_r = v'H_r v + 2 g_r'v + c_r */
    double *value;          /* rows */
    double *slope;          /* n: gradient of one row */
    double *hessian, *step; /* (n+1)^2, n+1 */
    double *trial;          /* n+1 */
    double tau;
};

static double row_value(const struct barrier *b, size_t r, const double *v, double *slope)
{
    const double *h = b->h + r * b->n * b->n, *g = b->g + r * b->n;
    double sum = b->c[r];
    for (size_t i = 0; i < b->n; i++) {
        double hv = 0;
        for (size_t j = 0; j < b->n; j++)
            hv += h[i * b->n + j] * v[j];
        if (slope)
            slope[i] = 2 * (hv + g[i]);
        sum += v[i] * (hv + 2 * g[i]);
    }
    return sum;
}

/* tau*t - sum log(t - J_r); INFINITY outside. v[n] is t. */
static double barrier_value(const struct barrier *b, const double *v)
{
    double sum = b->tau * v[b->n];
    for (size_t r = 0; r < b->rows; r++) {
        double room = v[b->n] - row_value(b, r, v, NULL);
        if (!(room > 0))
            return INFINITY;
        sum -= log(room);
    }
    return sum;
}

/* Fills hessian and step (the gradient, negated). */
static void derivatives(struct barrier *b, const double *v)
{
    size_t n = b->n, m = n + 1;
    memset(b->hessian, 0, m * m * sizeof *b->hessian);
    memset(b->step, 0, m * sizeof *b->step);
    b->step[n] = -b->tau;
    for (size_t r = 0; r < b->rows; r++) {
        double d = 1 / (v[n] - row_value(b, r, v, b->slope));
        const double *h = b->h + r * n * n;
        for (size_t i = 0; i < n; i++) {
            b->step[i] -= d * b->slope[i];
            for (size_t j = 0; j < n; j++)
                b->hessian[i * m + j] += d * d * b->slope[i] * b->slope[j] + 2 * d * h[i * n + j];
            b->hessian[i * m + n] -= d * d * b->slope[i];
            b->hessian[n * m + i] -= d * d * b->slope[i];
        }
        b->step[n] += d;
        b->hessian[n * m + n] += d * d;
    }
}

/* Newton's method for the present tau. */
static int centre(struct barrier *b, double *v)
{
    size_t m = b->n + 1;
    for (int k = 0; k < NEWTON_MOST; k++) {
        derivatives(b, v);
        double slope = 0, now = barrier_value(b, v), length = 1;
        for (size_t i = 0; i < m; i++)
            b->trial[i] = b->step[i];
        lapack_int info = LAPACKE_dposv(LAPACK_ROW_MAJOR, 'U', (lapack_int)m, 1, b->hessian,
                                        (lapack_int)m, b->step, 1);
        if (info < 0)
            return CHEBYSHEV_NO_MEMORY;
        if (info > 0) /* flat to the last digit: as good as it gets */
            return CHEBYSHEV_OK;
        for (size_t i = 0; i < m; i++)
            slope += b->trial[i] * b->step[i];
        if (!(slope > 1e-10))
            return CHEBYSHEV_OK;
        for (; length > 1e-12; length /= 2) {
            for (size_t i = 0; i < m; i++)
                b->trial[i] = v[i] + length * b->step[i];
            if (barrier_value(b, b->trial) <= now - 0.1 * length * slope)
                break;
        }
        if (length <= 1e-12)
            return CHEBYSHEV_OK;
        memcpy(v, b->trial, m * sizeof *v);
    }
    return CHEBYSHEV_OK;
}

/* Real forms of one row, columns divided by length, values by unit. */
static void fill_row(struct barrier *b, size_t r, const double complex *f, size_t planes,
                     const double *length, double unit)
{
    size_t n = b->n, q = planes + 1;
    b->c[r] = creal(f[0]) / unit;
    for (size_t i = 0; i < planes; i++) {
        double complex g = f[(i + 1) * q] / (unit * length[i]);
        b->g[r * n + 2 * i] = creal(g);
        b->g[r * n + 2 * i + 1] = cimag(g);
        for (size_t j = 0; j < planes; j++) {
            double complex e = f[(i + 1) * q + j + 1] / (unit * length[i] * length[j]);
            double *h = b->h + r * n * n + 2 * i * n + 2 * j;
            h[0] = h[n + 1] = creal(e);
            h[1] = -cimag(e);
            h[n] = cimag(e);
        }
    }
}

static double largest_row(struct barrier *b, const double *v)
{
    double most = 0;
    for (size_t r = 0; r < b->rows; r++)
        most = fmax(most, row_value(b, r, v, NULL));
    return most;
}

int chebyshev_solve(const double complex *forms, size_t rows, size_t planes, double complex *w,
                    double *largest)
{
    size_t n = 2 * planes, m = n + 1, q = planes + 1;
    double *room = calloc(rows * (n * n + n + 1) + n + m * m + 3 * m + planes + 1, sizeof *room);
    if (!room)
        return CHEBYSHEV_NO_MEMORY;
    struct barrier b = {.rows = rows, .n = n, .h = room};
    b.g = b.h + rows * n * n;
    b.c = b.g + rows * n;
    b.slope = b.c + rows;
    b.hessian = b.slope + n;
    b.step = b.hessian + m * m;
    b.trial = b.step + m;
    double *v = b.trial + m, *length = v + m, unit = 0;
    for (size_t r = 0; r < rows; r++) {
        unit = fmax(unit, creal(forms[r * q * q]));
        for (size_t i = 0; i < planes; i++)
            length[i] += creal(forms[r * q * q + (i + 1) * q + i + 1]);
    }
    unit = unit > 0 ? unit : 1;
    for (size_t i = 0; i < planes; i++) {
        length[i] = length[i] > 0 ? sqrt(length[i] / unit) : 1;
        v[2 * i] = creal(w[i]) * length[i];
        v[2 * i + 1] = cimag(w[i]) * length[i];
    }
    for (size_t r = 0; r < rows; r++)
        fill_row(&b, r, forms + r * q * q, planes, length, unit);
    double start = largest_row(&b, v);
    int result = CHEBYSHEV_OK;
    if (start > 1e-20) {
        v[n] = 1.1 * start;
        for (b.tau = (double)rows / start; (double)rows / b.tau > GAP && result == CHEBYSHEV_OK;
             b.tau *= 8)
            result = centre(&b, v);
    }
    for (size_t i = 0; i < planes; i++)
        w[i] = CMPLX(v[2 * i], v[2 * i + 1]) / length[i];
    *largest = largest_row(&b, v) * unit;
    free(room);
    return result;
}
