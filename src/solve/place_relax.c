/* place_relax.c - see place_relax.h. */
#include "solve/place_relax.h"

#include <math.h>
#include <stdlib.h>
#include <string.h>

#include <lapacke.h>

struct edge {
    size_t plane;
    double complex normal; /* inside: Re(conj(normal) w) < limit */
    double limit, scale;
};

/* Everything in units of `norm` and real coordinates y: w_q = origin_q + sum of basis_i y_i. */
struct barrier {
    size_t n, rows, planes, edges;
    size_t *plane;              /* of coordinate i */
    double complex *basis;      /* of coordinate i */
    double complex *origin;     /* of plane q */
    double *curve, *slope, *flat; /* rows x n x n, rows x n, rows */
    struct edge *edge;
    const struct place_region *region;
    double *y, *trial, *gradient, *hessian, *value, *row_slope;
    double complex *w;
    double t, kappa;
    void *memory;
};

struct goal {
    double accuracy, enough, bound;
    double complex *w; /* borrowed */
    double *lambda;    /* borrowed */
};

static double dot(double complex a, double complex b)
{
    return creal(a) * creal(b) + cimag(a) * cimag(b);
}

static double complex middle(const struct place_region *region)
{
    double complex sum = 0;
    for (size_t i = 0; i < region->count; i++) {
        sum += region->corners[i] / (double)region->count;
    }
    return sum;
}

/* Bytes are handed out of one block, so that there is one allocation to check. */
static void *take(char **at, size_t bytes)
{
    void *here = *at;
    *at += (bytes + 15) / 16 * 16;
    return here;
}

static int barrier_room(struct barrier *b, const struct place_form *form,
                        const struct place_region *region)
{
    size_t edges = 0, n = 2 * form->planes, rows = form->rows;
    for (size_t q = 0; q < form->planes; q++) {
        edges += region[q].count;
    }
    size_t doubles = rows * n * n + 2 * rows * n + 2 * rows + 3 * n + 4 + (n + 1) * (n + 1);
    char *at = malloc(doubles * sizeof(double) + n * sizeof(size_t) + edges * sizeof(struct edge) +
                      (2 * n + 2) * sizeof(double complex) + 16 * 16);
    *b = (struct barrier){.rows = rows, .planes = form->planes, .region = region, .memory = at};
    if (at == NULL) {
        return -1;
    }
    b->plane = take(&at, n * sizeof *b->plane);
    b->basis = take(&at, n * sizeof *b->basis);
    b->origin = take(&at, (n / 2) * sizeof *b->origin);
    b->w = take(&at, (n / 2) * sizeof *b->w);
    b->edge = take(&at, edges * sizeof *b->edge);
    b->curve = take(&at, rows * n * n * sizeof(double));
    b->slope = take(&at, rows * n * sizeof(double));
    b->flat = take(&at, rows * sizeof(double));
    b->value = take(&at, rows * sizeof(double));
    b->row_slope = take(&at, rows * n * sizeof(double));
    b->y = take(&at, n * sizeof(double));
    b->trial = take(&at, n * sizeof(double));
    b->gradient = take(&at, (n + 1) * sizeof(double));
    b->hessian = take(&at, (n + 1) * (n + 1) * sizeof(double));
    return 0;
}

static void add_edges(struct barrier *b, size_t q)
{
    const struct place_region *region = &b->region[q];
    if (region->count == 2) {
        double complex way = region->corners[1] - region->corners[0];
        double length = cabs(way);
        way /= length;
        b->edge[b->edges++] = (struct edge){q, way, dot(way, region->corners[1]), length};
        b->edge[b->edges++] = (struct edge){q, -way, -dot(way, region->corners[0]), length};
        return;
    }
    for (size_t i = 0; i < region->count && region->count > 2; i++) {
        double complex from = region->corners[i], to = region->corners[(i + 1) % region->count];
        double complex out = -I * (to - from) / cabs(to - from);
        b->edge[b->edges++] = (struct edge){q, out, dot(out, from), cabs(to - from)};
    }
}

/* Coordinates: two where the region has an inside, one along a segment, none at a point. */
static void lay_out(struct barrier *b, const struct place_form *form, double norm)
{
    size_t m = form->planes + 1;
    for (size_t q = 0; q < b->planes; q++) {
        double stiff = 0;
        for (size_t r = 0; r < b->rows; r++) {
            stiff = fmax(stiff, creal(form->f[r * m * m + (q + 1) * m + q + 1]));
        }
        double unit = stiff > 0 ? sqrt(norm / stiff) : 1;
        const struct place_region *region = &b->region[q];
        b->origin[q] = region->disc ? 0 : middle(region);
        size_t dimensions = region->disc ? (region->radius > 0 ? 2 : 0)
                            : region->count > 2 ? 2 : region->count - 1;
        double complex way = unit;
        if (dimensions == 1) {
            way = region->corners[1] - region->corners[0];
            way *= unit / cabs(way);
        }
        for (size_t d = 0; d < dimensions; d++) {
            b->plane[b->n] = q;
            b->basis[b->n] = d ? I * way : way;
            b->y[b->n++] = 0;
        }
        add_edges(b, q);
    }
}

static void real_rows(struct barrier *b, const struct place_form *form, double norm)
{
    size_t n = b->n, m = form->planes + 1;
    for (size_t r = 0; r < b->rows; r++) {
        const double complex *f = form->f + r * m * m;
        b->flat[r] = place_form_row(form, r, b->origin) / norm;
        for (size_t i = 0; i < n; i++) {
            size_t q = b->plane[i] + 1;
            double complex slope = f[q * m];
            for (size_t p = 1; p < m; p++) {
                slope += f[q * m + p] * b->origin[p - 1];
            }
            b->slope[r * n + i] = dot(b->basis[i], slope) / norm;
            for (size_t j = 0; j < n; j++) {
                double complex pull = f[q * m + b->plane[j] + 1] * b->basis[j];
                b->curve[(r * n + i) * n + j] = dot(b->basis[i], pull) / norm;
            }
        }
    }
}

static void weights_at(const struct barrier *b, const double *y, double complex *w)
{
    memcpy(w, b->origin, b->planes * sizeof *w);
    for (size_t i = 0; i < b->n; i++) {
        w[b->plane[i]] += b->basis[i] * y[i];
    }
}

/* Row values and half slopes at y, then the barrier; INFINITY outside. */
static double barrier_at(struct barrier *b, const double *y, double t)
{
    size_t n = b->n;
    double total = b->kappa * t;
    for (size_t r = 0; r < b->rows; r++) {
        double value = b->flat[r];
        for (size_t i = 0; i < n; i++) {
            double slope = b->slope[r * n + i];
            for (size_t j = 0; j < n; j++) {
                slope += b->curve[(r * n + i) * n + j] * y[j];
            }
            b->row_slope[r * n + i] = slope;
            value += y[i] * (slope + b->slope[r * n + i]);
        }
        b->value[r] = value;
        if (!(t > value)) {
            return INFINITY;
        }
        total -= log(t - value);
    }
    weights_at(b, y, b->w);
    double rooms = 1; /* logarithms are dear: one for many edges */
    for (size_t e = 0; e < b->edges; e++) {
        double room = b->edge[e].limit - dot(b->edge[e].normal, b->w[b->edge[e].plane]);
        if (!(room > 0)) {
            return INFINITY;
        }
        rooms *= room / b->edge[e].scale;
        if (rooms < 1e-200 || rooms > 1e200) {
            total -= log(rooms);
            rooms = 1;
        }
    }
    total -= log(rooms);
    for (size_t q = 0; q < b->planes; q++) {
        double radius = b->region[q].radius;
        if (b->region[q].disc && radius > 0) {
            double room = 1 - dot(b->w[q], b->w[q]) / (radius * radius);
            if (!(room > 0)) {
                return INFINITY;
            }
            total -= log(room);
        }
    }
    return total;
}

/* Adds s * v v^T and g * v, where v is a constraint's slope in one plane's coordinates. */
static void add_push(struct barrier *b, size_t q, double complex v, double g, double s)
{
    size_t width = b->n + 1;
    for (size_t i = 0; i < b->n; i++) {
        if (b->plane[i] != q) {
            continue;
        }
        double vi = dot(b->basis[i], v);
        b->gradient[i] += g * vi;
        for (size_t j = 0; j < b->n; j++) {
            if (b->plane[j] == q) {
                b->hessian[i * width + j] += s * vi * dot(b->basis[j], v);
            }
        }
    }
}

static void push_regions(struct barrier *b)
{
    size_t width = b->n + 1;
    for (size_t e = 0; e < b->edges; e++) {
        const struct edge *edge = &b->edge[e];
        double room = edge->limit - dot(edge->normal, b->w[edge->plane]);
        add_push(b, edge->plane, edge->normal, 1 / room, 1 / (room * room));
    }
    for (size_t q = 0; q < b->planes; q++) {
        double square = b->region[q].radius * b->region[q].radius;
        if (!b->region[q].disc || square == 0) {
            continue;
        }
        double room = square - dot(b->w[q], b->w[q]);
        add_push(b, q, b->w[q], 2 / room, 4 / (room * room));
        for (size_t i = 0; i < b->n; i++) {
            if (b->plane[i] == q) {
                b->hessian[i * width + i] += 2 * dot(b->basis[i], b->basis[i]) / room;
            }
        }
    }
}

/* Gradient and Hessian in (y, t) at the current point; barrier_at(y, t) was called before. */
static void derive(struct barrier *b)
{
    size_t n = b->n, width = n + 1;
    memset(b->gradient, 0, width * sizeof(double));
    memset(b->hessian, 0, width * width * sizeof(double));
    b->gradient[n] = b->kappa;
    for (size_t r = 0; r < b->rows; r++) {
        double over = 1 / (b->t - b->value[r]);
        b->gradient[n] -= over;
        b->hessian[n * width + n] += over * over;
        for (size_t i = 0; i < n; i++) {
            double vi = 2 * b->row_slope[r * n + i] * over;
            b->gradient[i] += vi;
            b->hessian[i * width + n] -= vi * over;
            b->hessian[n * width + i] -= vi * over;
            for (size_t j = 0; j < n; j++) {
                b->hessian[i * width + j] += 2 * b->curve[(r * n + i) * n + j] * over +
                                             vi * 2 * b->row_slope[r * n + j] * over;
            }
        }
    }
    push_regions(b);
}

/* One Newton step with halving; returns the decrement, 0 when no step is left. */
static double newton_step(struct barrier *b)
{
    size_t n = b->n, width = n + 1;
    double here = barrier_at(b, b->y, b->t);
    derive(b);
    double step[width];
    for (size_t i = 0; i < width; i++) {
        step[i] = -b->gradient[i];
        b->hessian[i * width + i] *= 1 + 1e-14;
    }
    if (LAPACKE_dposv_work(LAPACK_COL_MAJOR, 'L', (int)width, 1, b->hessian, (int)width, step,
                           (int)width) != 0) {
        return 0;
    }
    double decrement = 0;
    for (size_t i = 0; i < width; i++) {
        decrement -= step[i] * b->gradient[i];
    }
    if (!(decrement > 0)) {
        return 0;
    }
    for (double size = 1; size > 1e-9; size /= 2) {
        for (size_t i = 0; i < n; i++) {
            b->trial[i] = b->y[i] + size * step[i];
        }
        double t = b->t + size * step[n];
        if (barrier_at(b, b->trial, t) <= here - 0.1 * size * decrement) {
            memcpy(b->y, b->trial, n * sizeof(double));
            b->t = t;
            return decrement;
        }
    }
    return 0;
}

static void weigh_rows(struct barrier *b, double *lambda)
{
    double sum = 0;
    barrier_at(b, b->y, INFINITY);
    for (size_t r = 0; r < b->rows; r++) {
        lambda[r] = 1 / fmax(b->t - b->value[r], 1e-300);
        sum += lambda[r];
    }
    for (size_t r = 0; r < b->rows; r++) {
        lambda[r] /= sum;
    }
}

/* The minimum of row 0 without any limit: w and its value; false where there is none. */
static bool free_minimum(const struct place_form *form, double complex *w, double *value)
{
    size_t n = form->planes, m = n + 1;
    double complex work[n * n];
    for (size_t q = 0; q < n; q++) {
        w[q] = -form->f[(q + 1) * m];
        for (size_t p = 0; p < n; p++) {
            work[p * n + q] = form->f[(q + 1) * m + p + 1];
        }
    }
    if (LAPACKE_zposv_work(LAPACK_COL_MAJOR, 'L', (int)n, 1, work, (int)n, w, (int)n) != 0) {
        return false;
    }
    *value = place_form_row(form, 0, w);
    return isfinite(*value);
}

/* One row whose free minimum lies inside every region: exact, and the common case. */
static bool minimum_inside(const struct place_form *form, const struct place_region *region,
                           double complex *w, double *bound)
{
    if (form->rows != 1 || !free_minimum(form, w, bound)) {
        return false;
    }
    for (size_t q = 0; q < form->planes; q++) {
        if (!place_region_holds(&region[q], w[q])) {
            return false;
        }
    }
    return true;
}

/* The point reached, its multipliers and what they prove. */
static void conclude(struct barrier *b, const struct place_form *form, struct place_form *blend,
                     struct goal *goal)
{
    weigh_rows(b, goal->lambda);
    weights_at(b, b->y, goal->w);
    place_form_blend(form, goal->lambda, blend);
    goal->bound = place_form_row(blend, 0, goal->w);
    for (size_t q = 0; q < form->planes; q++) {
        double complex slope = place_form_slope(blend, goal->w, q);
        goal->bound += 2 * (place_region_least(&b->region[q], slope) - dot(slope, goal->w[q]));
    }
    double complex anywhere[form->planes];
    double least;
    if (free_minimum(blend, anywhere, &least)) {
        goal->bound = fmax(goal->bound, least);
    }
}

/* The barrier's gap falls twelvefold a round, to 1e-12 norm: three orders below what counts as proven. */
static void descend(struct barrier *b, const struct place_form *form, struct place_form *blend,
                    struct goal *goal)
{
    double count = (double)(b->rows + b->edges + b->planes);
    b->t = INFINITY;
    b->kappa = 0;
    barrier_at(b, b->y, INFINITY);
    double top = 0;
    for (size_t r = 0; r < b->rows; r++) {
        top = fmax(top, b->value[r]);
    }
    b->t = top * 1.1 + 0.1;
    for (double gap = 3 * b->t; gap > 1e-12; gap /= 12) {
        b->kappa = count / gap;
        for (int i = 0; i < 30 && newton_step(b) > 1e-3; i++) {
        }
        if (gap < goal->accuracy * b->t) {
            break;
        }
        if (isfinite(goal->enough)) {
            conclude(b, form, blend, goal);
            if (goal->bound >= goal->enough) {
                return;
            }
        }
    }
    conclude(b, form, blend, goal);
}

int place_relax(const struct place_form *form, const struct place_region *region, double norm,
                double accuracy, double enough, double complex *w, double *lambda, double *bound)
{
    if (minimum_inside(form, region, w, bound)) {
        lambda[0] = 1;
        return 0;
    }
    struct barrier b;
    struct place_form blend = {0};
    int result = -1;
    if (barrier_room(&b, form, region) == 0 && place_form_init(&blend, form->planes, 1) == 0) {
        lay_out(&b, form, norm);
        real_rows(&b, form, norm);
        struct goal goal = {accuracy, enough, -INFINITY, w, lambda};
        descend(&b, form, &blend, &goal);
        *bound = goal.bound;
        result = 0;
    }
    place_form_release(&blend);
    free(b.memory);
    return result;
}

long place_relax_nodes(const struct place_form *form)
{
    /* Measured: 40 us for one row and plane, 150 us for 8 rows and 4 planes; a node takes 0.4 us. */
    return 100 + 2 * (long)(form->rows * form->planes * form->planes);
}
