/* place_form.c - see place_form.h. */
#include "solve/place_form.h"

#include <math.h>
#include <stdlib.h>
#include <string.h>

#include <lapacke.h>

int place_form_init(struct place_form *form, size_t planes, size_t rows)
{
    form->planes = planes;
    form->rows = rows;
    form->f = calloc(rows * (planes + 1) * (planes + 1), sizeof *form->f);
    return form->f == NULL ? -1 : 0;
}

void place_form_release(struct place_form *form)
{
    free(form->f);
    form->f = NULL;
}

double place_form_row(const struct place_form *form, size_t row, const double complex *w)
{
    size_t n = form->planes + 1;
    const double complex *f = form->f + row * n * n;
    double value = creal(f[0]);
    for (size_t q = 1; q < n; q++) {
        double complex half = f[q * n];
        for (size_t p = 1; p < q; p++) {
            half += f[q * n + p] * w[p - 1];
        }
        double complex x = w[q - 1];
        value += 2 * (creal(x) * creal(half) + cimag(x) * cimag(half));
        value += creal(f[q * n + q]) * (creal(x) * creal(x) + cimag(x) * cimag(x));
    }
    return value;
}

double place_form_worst(const struct place_form *form, const double complex *w, size_t *which)
{
    double worst = -INFINITY;
    for (size_t r = 0; r < form->rows; r++) {
        double value = place_form_row(form, r, w);
        if (value > worst) {
            worst = value;
            if (which != NULL) {
                *which = r;
            }
        }
    }
    return worst;
}

void place_form_settle(const struct place_form *form, double complex w, struct place_form *to)
{
    size_t n = form->planes + 1, m = to->planes + 1;
    for (size_t r = 0; r < form->rows; r++) {
        const double complex *f = form->f + r * n * n;
        double complex *t = to->f + r * m * m;
        for (size_t i = 0; i < m; i++) {
            for (size_t j = 0; j < m; j++) {
                t[i * m + j] = f[(i ? i + 1 : 0) * n + (j ? j + 1 : 0)];
            }
        }
        for (size_t i = 1; i < m; i++) {
            t[i * m] += f[(i + 1) * n + 1] * w;
            t[i] = conj(t[i * m]);
        }
        double complex half = f[n];
        t[0] = creal(f[0]) + 2 * (creal(w) * creal(half) + cimag(w) * cimag(half)) +
               creal(f[n + 1]) * (creal(w) * creal(w) + cimag(w) * cimag(w));
    }
}

void place_form_blend(const struct place_form *form, const double *lambda, struct place_form *to)
{
    size_t size = (form->planes + 1) * (form->planes + 1);
    memset(to->f, 0, size * sizeof *to->f);
    for (size_t r = 0; r < form->rows; r++) {
        for (size_t i = 0; i < size; i++) {
            to->f[i] += lambda[r] * form->f[r * size + i];
        }
    }
}

double complex place_form_slope(const struct place_form *form, const double complex *w, size_t q)
{
    size_t n = form->planes + 1;
    double complex slope = form->f[(q + 1) * n];
    for (size_t p = 0; p < form->planes; p++) {
        slope += form->f[(q + 1) * n + p + 1] * w[p];
    }
    return slope;
}

double place_form_stiffness(const struct place_form *form)
{
    size_t n = form->planes + 1, m = form->planes - 1;
    double own = creal(form->f[n + 1]);
    if (m == 0) {
        return own;
    }
    double complex *a = malloc((m * m + m) * sizeof *a);
    if (a == NULL) {
        return -1;
    }
    double complex *b = a + m * m;
    for (size_t i = 0; i < m; i++) {
        b[i] = form->f[(i + 2) * n + 1];
        for (size_t j = 0; j < m; j++) {
            a[i * m + j] = form->f[(i + 2) * n + j + 2];
        }
    }
    double stiff = 0;
    if (LAPACKE_zpotrf(LAPACK_ROW_MAJOR, 'L', (int)m, a, (int)m) == 0) {
        /* |L^-1 b|^2 by forward substitution. */
        double taken = 0;
        for (size_t i = 0; i < m; i++) {
            for (size_t j = 0; j < i; j++) {
                b[i] -= a[i * m + j] * b[j];
            }
            b[i] /= a[i * m + i];
            taken += creal(b[i]) * creal(b[i]) + cimag(b[i]) * cimag(b[i]);
        }
        stiff = fmax(0, own - taken - 1e-13 * own);
    }
    free(a);
    return stiff;
}
