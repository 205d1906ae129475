#include "solve/correct.h"

#include <lapacke.h>
#include <math.h>
#include <stdlib.h>
#include <string.h>

static int lapack_error(lapack_int info)
{
    if (info == LAPACK_WORK_MEMORY_ERROR || info == LAPACK_TRANSPOSE_MEMORY_ERROR)
        return CORRECT_NO_MEMORY;
    return info == 0 ? CORRECT_OK : CORRECT_FAILED;
}

/* Least squares of a (rows x n, row-major, overwritten) w = b, columns brought to unit length
 * first; b has max(rows, n) places, its first n receive w. */
static int solve_scaled(size_t rows, size_t n, double complex *a, double complex *b)
{
    double *work = calloc(2 * n, sizeof *work);
    if (!work)
        return CORRECT_NO_MEMORY;
    double *length = work, *s = work + n;
    for (size_t k = 0; k < n; k++) {
        for (size_t i = 0; i < rows; i++)
            length[k] = hypot(length[k], cabs(a[i * n + k]));
        if (!(length[k] > 0))
            length[k] = 1;
        for (size_t i = 0; i < rows; i++)
            a[i * n + k] /= length[k];
    }
    lapack_int rank;
    lapack_int info = LAPACKE_zgelss(LAPACK_ROW_MAJOR, (lapack_int)rows, (lapack_int)n, 1, a,
                                     (lapack_int)n, b, 1, s, 1e-13, &rank);
    for (size_t k = 0; k < n; k++)
        b[k] /= length[k];
    free(work);
    return lapack_error(info);
}

int correct_least_squares(const struct posterior *rows, const double *scale, size_t count,
                          size_t planes, double complex *w)
{
    size_t tall = count > planes ? count : planes;
    double complex *a = calloc(count * planes + tall + 1, sizeof *a);
    if (!a)
        return CORRECT_NO_MEMORY;
    double complex *b = a + count * planes;
    for (size_t r = 0; r < count; r++) {
        b[r] = -scale[r] * rows[r].mean[0];
        for (size_t k = 0; k < planes; k++)
            a[r * planes + k] = scale[r] * rows[r].mean[k + 1];
    }
    int result = solve_scaled(count, planes, a, b);
    if (result == CORRECT_OK)
        memcpy(w, b, planes * sizeof *w);
    free(a);
    return result;
}

int correct_quadratic(const double complex *form, size_t planes, double complex *w)
{
    size_t n = planes + 1;
    double complex *a = calloc(planes * planes + planes + 1, sizeof *a);
    if (!a)
        return CORRECT_NO_MEMORY;
    double complex *b = a + planes * planes;
    double *length = calloc(planes + 1, sizeof *length);
    int result = CORRECT_NO_MEMORY;
    if (!length)
        goto done;
    for (size_t i = 0; i < planes; i++) {
        double d = creal(form[(i + 1) * n + i + 1]);
        length[i] = d > 0 ? sqrt(d) : 1;
    }
    for (size_t i = 0; i < planes; i++) {
        b[i] = -form[(i + 1) * n] / length[i];
        for (size_t j = 0; j < planes; j++)
            a[i * planes + j] = form[(i + 1) * n + j + 1] / (length[i] * length[j]);
    }
    result = solve_scaled(planes, planes, a, b);
    for (size_t i = 0; i < planes && result == CORRECT_OK; i++)
        w[i] = b[i] / length[i];
done:
    free(length);
    free(a);
    return result;
}

double correct_value(const double complex *form, size_t planes, const double complex *w)
{
    double complex sum = 0;
    size_t n = planes + 1;
    for (size_t i = 0; i < n; i++)
        for (size_t j = 0; j < n; j++)
            sum += conj(i ? w[i - 1] : 1) * form[i * n + j] * (j ? w[j - 1] : 1);
    return creal(sum);
}

int correct_condition(const struct posterior *rows, const double *se, size_t count, size_t planes,
                      double *condition, double complex *weak)
{
    double complex *a = calloc(count * planes + planes * planes + 1, sizeof *a);
    double *real = calloc(4 * planes + count + 1, sizeof *real);
    int result = CORRECT_NO_MEMORY;
    if (!a || !real)
        goto done;
    double complex *vt = a + count * planes;
    double *length = real, *s = real + planes, *super = s + planes;
    for (size_t r = 0; r < count; r++)
        for (size_t k = 0; k < planes; k++) {
            a[r * planes + k] = rows[r].mean[k + 1] / se[r];
            length[k] = hypot(length[k], cabs(a[r * planes + k]));
        }
    for (size_t k = 0; k < planes; k++)
        length[k] = length[k] > 0 ? length[k] : 1;
    for (size_t i = 0; i < count * planes; i++)
        a[i] /= length[i % planes];
    result = CORRECT_OK;
    *condition = INFINITY;
    for (size_t k = 0; k < planes; k++)
        weak[k] = 1;
    if (count == 0)
        goto done;
    result = lapack_error(LAPACKE_zgesvd(LAPACK_ROW_MAJOR, 'N', 'A', (lapack_int)count,
                                         (lapack_int)planes, a, (lapack_int)planes, s, NULL, 1, vt,
                                         (lapack_int)planes, super));
    if (result != CORRECT_OK)
        goto done;
    if (count >= planes && s[planes - 1] > 0)
        *condition = s[0] / s[planes - 1];
    double most = 0;
    for (size_t k = 0; k < planes; k++) {
        weak[k] = conj(vt[(planes - 1) * planes + k]) / length[k];
        most = fmax(most, cabs(weak[k]));
    }
    for (size_t k = 0; k < planes && most > 0; k++)
        weak[k] /= most;
done:
    free(real);
    free(a);
    return result;
}

/* Column of the map from a row's unknown (its real part with unit 1, imaginary with unit I) to the
 * right-hand side of the normal equations: conj(A) times the change of the vibration, and the
 * change of conj(A) times the residual e. */
static void row_column(const struct posterior *row, const double complex *w, size_t planes,
                       size_t j, double complex unit, double complex e, double complex *column)
{
    double complex change = (j ? w[j - 1] : 1) * unit;
    for (size_t k = 0; k < planes; k++)
        column[k] = conj(row->mean[k + 1]) * change + (j == k + 1 ? conj(unit) * e : 0);
}

/* total += inflated T C T' for one row, T its map (stacked real), s its scale squared. */
static void add_row(const struct posterior *row, const double complex *w, size_t planes, double s,
                    double *map, double complex *column, double *total)
{
    size_t width = 2 * row->unknowns, n = 2 * planes;
    double known[3], factor = posterior_inflation(row) * s * s;
    double complex e = posterior_predict(row, w, known);
    for (size_t c = 0; c < width; c++) {
        row_column(row, w, planes, c / 2, c % 2 ? I : 1, e, column);
        for (size_t k = 0; k < planes; k++) {
            map[2 * k * width + c] = creal(column[k]);
            map[(2 * k + 1) * width + c] = cimag(column[k]);
        }
    }
    for (size_t a = 0; a < n; a++)
        for (size_t b = 0; b < n; b++)
            for (size_t i = 0; i < width; i++)
                for (size_t j = 0; j < width; j++)
                    total[a * n + b] +=
                        factor * map[a * width + i] * row->cov[i * width + j] * map[b * width + j];
}

/* The second-order part: what the scatter `cov` of W adds through the variance of the responses. */
static void add_second(const struct posterior *row, size_t planes, double s, const double *cov,
                       double *total)
{
    size_t width = 2 * row->unknowns, n = 2 * planes;
    double variance = 0;
    for (size_t k = 0; k < planes; k++)
        for (size_t l = 0; l < planes; l++) {
            const double *a = row->cov + 2 * (k + 1) * width + 2 * (l + 1), *b = a + width;
            const double *c = cov + 2 * k * n + 2 * l, *d = c + n;
            variance += creal(CMPLX(a[0] + b[1], a[1] - b[0]) * CMPLX(c[0] + d[1], c[1] - d[0]));
        }
    double factor = posterior_inflation(row) * s * s * fmax(variance, 0) / 2;
    for (size_t k = 0; k < planes; k++)
        for (size_t l = 0; l < planes; l++) {
            double complex g = conj(row->mean[k + 1]) * row->mean[l + 1] * factor;
            total[2 * k * n + 2 * l] += creal(g);
            total[2 * k * n + 2 * l + 1] -= cimag(g);
            total[(2 * k + 1) * n + 2 * l] += cimag(g);
            total[(2 * k + 1) * n + 2 * l + 1] += creal(g);
        }
}

/* The inverse of the normal matrix, as a stacked real (2 planes)^2 matrix. */
static int normal_inverse(const struct posterior *rows, const double *scale, size_t count,
                          size_t planes, double *inverse, lapack_int *pivots)
{
    size_t n = 2 * planes;
    for (size_t k = 0; k < planes; k++)
        for (size_t l = 0; l < planes; l++) {
            double complex g = 0;
            for (size_t r = 0; r < count; r++)
                g += scale[r] * scale[r] * conj(rows[r].mean[k + 1]) * rows[r].mean[l + 1];
            inverse[2 * k * n + 2 * l] = inverse[(2 * k + 1) * n + 2 * l + 1] = creal(g);
            inverse[2 * k * n + 2 * l + 1] = -cimag(g);
            inverse[(2 * k + 1) * n + 2 * l] = cimag(g);
        }
    lapack_int info = LAPACKE_dgetrf(LAPACK_ROW_MAJOR, (lapack_int)n, (lapack_int)n, inverse,
                                     (lapack_int)n, pivots);
    if (info == 0)
        info = LAPACKE_dgetri(LAPACK_ROW_MAJOR, (lapack_int)n, inverse, (lapack_int)n, pivots);
    return lapack_error(info);
}

/* cov = inverse total inverse' (n x n each). */
static void sandwich(const double *inverse, const double *total, size_t n, double *half,
                     double *cov)
{
    memset(half, 0, n * n * sizeof *half);
    memset(cov, 0, n * n * sizeof *cov);
    for (size_t i = 0; i < n; i++)
        for (size_t j = 0; j < n; j++)
            for (size_t k = 0; k < n; k++)
                half[i * n + j] += inverse[i * n + k] * total[k * n + j];
    for (size_t i = 0; i < n; i++)
        for (size_t j = 0; j < n; j++)
            for (size_t k = 0; k < n; k++)
                cov[i * n + j] += half[i * n + k] * inverse[j * n + k];
}

int correct_covariance(const struct posterior *rows, const double *scale, size_t count,
                       size_t planes, const double complex *w, double *cov)
{
    size_t n = 2 * planes, width = 2 * (planes + 1);
    double *real = calloc(4 * n * n + n * width + 1, sizeof *real);
    double complex *column = calloc(planes + 1, sizeof *column);
    lapack_int *pivots = calloc(n + 1, sizeof *pivots);
    int result = CORRECT_NO_MEMORY;
    if (!real || !column || !pivots)
        goto done;
    double *inverse = real, *first = inverse + n * n, *total = first + n * n, *half = total + n * n;
    double *map = half + n * n;
    result = normal_inverse(rows, scale, count, planes, inverse, pivots);
    if (result != CORRECT_OK)
        goto done;
    for (size_t r = 0; r < count; r++)
        add_row(&rows[r], w, planes, scale[r] * scale[r], map, column, first);
    sandwich(inverse, first, n, half, cov);
    for (int pass = 0; pass < 2; pass++) { /* a fixed point is close after two */
        memcpy(total, first, n * n * sizeof *total);
        for (size_t r = 0; r < count; r++)
            add_second(&rows[r], planes, scale[r] * scale[r], cov, total);
        sandwich(inverse, total, n, half, cov);
    }
done:
    free(pivots);
    free(column);
    free(real);
    return result;
}
