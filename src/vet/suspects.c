#include "vet/suspects.h"

#include <math.h>
#include <stdlib.h>

#include <lapacke.h>

#include "base/angle.h"

static const double NORMAL_999 = 3.0902, NORMAL_95 = 1.6449; /* points of the normal distribution */
static const double TURN_LEAST =
    5; /* deg: a mark put on anew hardly lands closer, common practice */
static const double TURN_SEEN = 30; /* deg: a smaller one does little harm; common practice */
static const double FAR = 4;        /* of chi-squared: twice as much in amplitude */
static const double AS_GOOD = 9.21; /* of chi-squared: the 99 % point with 2 degrees of freedom */
static const double RANK_LEAST = 1e-9; /* rounding of weights scaled to 1 */

static const double ROUNDING = 1e-6; /* of chi-squared */

/* Room for one regression, and the residuals of every sensor. */
struct bench {
    const struct suspects_set *set;
    double complex *matrix, *sides; /* rows x columns; rows x 2 */
    double complex *kept;           /* rows x columns: the matrix, which LAPACK destroys */
    lapack_int *pivots;
    double *scale;       /* per plane */
    double freedom, sum; /* of all sensors as they are */
};

double suspects_chi2(double freedom, double normal)
{
    double a = 2 / (9 * freedom);

    return freedom * pow(1 - a + normal * sqrt(a), 3);
}

/* Chance that chi-squared exceeds x, by the same approximation. */
static double beyond(double freedom, double x)
{
    double a = 2 / (9 * freedom);

    return 0.5 * erfc((cbrt(x / freedom) - (1 - a)) / sqrt(2 * a));
}

static bool in_group(size_t run, size_t first, bool onwards)
{
    return run == first || (onwards && run > first);
}

/* Fills the weighted matrix and the two right sides (outside, inside of the group) of a sensor
 * whose readings inside come from channel `from`; the number of rows. */
static size_t fill(struct bench *b, size_t sensor, size_t from, size_t first, bool onwards)
{
    const struct suspects_set *s = b->set;
    size_t columns = s->plane_count + 1, rows = 0;

    for (size_t r = 0; r < s->run_count; r++) {
        bool inside = in_group(r, first, onwards);
        size_t at = r * s->sensor_count + (inside ? from : sensor);
        double w = 1 / sqrt(s->variance[at] + s->repeatability[sensor]);
        if (isnan(creal(s->vectors[at])) || !isfinite(w)) /* infinite: all is exactly zero */
            continue;
        b->matrix[rows * columns] = w;
        for (size_t p = 0; p < s->plane_count; p++)
            b->matrix[rows * columns + p + 1] =
                b->scale[p] > 0 ? w * s->weights[r * s->plane_count + p] / b->scale[p] : 0;
        b->sides[rows * 2] = inside ? 0 : w * s->vectors[at];
        b->sides[rows * 2 + 1] = inside ? w * s->vectors[at] : 0;
        rows++;
    }
    return rows;
}

/* Residuals of both sides, in place; degrees of freedom; -1: no memory. What LAPACK cannot do,
 * since figures are beyond its range, leaves NaN. LAPACK wants room for the larger of rows and
 * columns. */
static double project(struct bench *b, size_t rows)
{
    size_t columns = b->set->plane_count + 1, room = rows > columns ? rows : columns;
    lapack_int rank = 0, failed;
    double complex *kept_sides = b->kept + rows * columns;

    for (size_t i = 0; i < rows * columns; i++)
        b->kept[i] = b->matrix[i];
    for (size_t i = 0; i < rows * 2; i++)
        kept_sides[i] = b->sides[i];
    for (size_t i = rows * 2; i < room * 2; i++)
        b->sides[i] = 0;
    for (size_t j = 0; j < columns; j++)
        b->pivots[j] = 0;
    failed = LAPACKE_zgelsy(LAPACK_ROW_MAJOR, (lapack_int)rows, (lapack_int)columns, 2, b->matrix,
                            (lapack_int)columns, b->sides, 2, b->pivots, RANK_LEAST, &rank);
    if (failed == LAPACK_WORK_MEMORY_ERROR || failed == LAPACK_TRANSPOSE_MEMORY_ERROR)
        return -1;
    for (size_t i = 0; failed && i < rows * 2; i++)
        b->sides[i] = NAN;
    if (failed)
        return 0;
    for (size_t i = 0; i < rows; i++) { /* solutions stand on top of the sides */
        for (size_t k = 0; k < 2; k++)
            for (size_t j = 0; j < columns; j++)
                kept_sides[i * 2 + k] -= b->kept[i * columns + j] * b->sides[j * 2 + k];
    }
    for (size_t i = 0; i < rows * 2; i++)
        b->sides[i] = kept_sides[i];
    return 2 * ((double)rows - (double)rank);
}

/* What the two sides of a sensor come to: the sums of squares of both residuals, and their product.
 */
struct parts {
    double outside, inside, freedom;
    double size;            /* of the inside as it is read, not of its residual */
    double complex product; /* sum of conj(outside) * inside */
};

/* 0; -1: no memory. */
static int parts_of(struct bench *b, size_t sensor, size_t from, size_t first, bool onwards,
                    struct parts *parts)
{
    size_t rows = fill(b, sensor, from, first, onwards);

    *parts = (struct parts){0};
    if (rows == 0)
        return 0;
    for (size_t i = 0; i < rows; i++)
        parts->size += creal(b->sides[i * 2 + 1] * conj(b->sides[i * 2 + 1]));
    parts->freedom = project(b, rows);
    if (parts->freedom < 0)
        return -1;
    for (size_t i = 0; i < rows; i++) {
        double complex u = b->sides[i * 2], v = b->sides[i * 2 + 1];
        parts->outside += creal(u * conj(u));
        parts->inside += creal(v * conj(v));
        parts->product += conj(u) * v;
    }
    return 0;
}

/* The misfit of a sensor when the inside is multiplied by `factor` (of size 1). */
static double misfit(const struct parts *p, double complex factor)
{
    return fmax(p->outside + p->inside + 2 * creal(factor * p->product), 0);
}

/* A candidate against the best so far. `sum`: the misfit if it were so; `used`: parameters it took.
 */
struct search {
    double sum, used;
    bool hidden;
    struct suspect best;
};

static void offer(struct search *search, double sum, double used, struct suspect candidate)
{
    bool first = isnan(search->sum);

    if (first || sum <= search->sum + ROUNDING) { /* of two alike the later */
        bool as_good = !first && search->sum - sum < AS_GOOD;
        candidate.ambiguous = as_good;
        candidate.other = as_good ? search->best.run : candidate.run;
        candidate.other_deg = search->best.angle_deg;
        candidate.other_onwards = search->best.onwards;
        search->best = candidate;
        search->sum = sum;
        search->used = used;
    } else if (sum - search->sum < AS_GOOD && !search->best.ambiguous) {
        search->best.ambiguous = true;
        search->best.other = candidate.run;
        search->best.other_deg = candidate.angle_deg;
        search->best.other_onwards = candidate.onwards;
    }
}

/* True where a turn of the tape would change the readings by far more than their uncertainties and
 * still leave no misfit that shows. */
static bool hides(const struct bench *b, const struct parts *all)
{
    double turned = cabs(angle_vector(1, TURN_SEEN) - 1), limit;

    if (!(b->freedom > 0))
        return true;
    limit = suspects_chi2(b->freedom, NORMAL_999);
    return turned * turned * all->inside <= limit && turned * turned * all->size > FAR * limit;
}

static int try_tape(struct bench *b, size_t first, bool onwards, struct search *search)
{
    struct parts all = {0}, p;
    double turned;

    for (size_t i = 0; i < b->set->sensor_count; i++) {
        if (parts_of(b, i, i, first, onwards, &p))
            return -1;
        all.outside += p.outside;
        all.inside += p.inside;
        all.size += p.size;
        all.product += p.product;
    }
    if (onwards && hides(b, &all))
        search->hidden = true;
    /* exp(-j*turned) * product is to be as negative as can be */
    turned = carg(-all.product);
    if (cabs(all.product) > 0)
        offer(search, misfit(&all, cexp(-I * turned)), 1,
              (struct suspect){.run = first, .onwards = onwards, .angle_deg = turned * 180 / PI});
    return 0;
}

static int try_turns(struct bench *b, size_t first, bool onwards, struct search *search)
{
    static const double turns[] = {90, 180, -90};

    for (size_t i = 0; i < b->set->sensor_count; i++) {
        struct parts p;
        double rest;
        if (parts_of(b, i, i, first, onwards, &p))
            return -1;
        rest = b->sum - misfit(&p, 1);
        for (int k = 0; p.freedom > 0 && k < 3; k++)
            offer(search, rest + misfit(&p, angle_vector(1, -turns[k])), 0,
                  (struct suspect){
                      .run = first, .onwards = onwards, .sensor = i, .angle_deg = turns[k]});
    }
    return 0;
}

static int try_swaps(struct bench *b, size_t first, bool onwards, struct search *search)
{
    const struct suspects_set *s = b->set;

    for (size_t i = 0; i < s->sensor_count; i++) {
        for (size_t j = i + 1; j < s->sensor_count; j++) {
            struct parts is[2], were[2];
            double sum = b->sum, freedom = b->freedom;
            if (!s->alike[i * s->sensor_count + j])
                continue;
            if (parts_of(b, i, i, first, onwards, &is[0]) ||
                parts_of(b, j, j, first, onwards, &is[1]) ||
                parts_of(b, i, j, first, onwards, &were[0]) ||
                parts_of(b, j, i, first, onwards, &were[1]))
                return -1;
            for (int k = 0; k < 2; k++) {
                sum += misfit(&were[k], 1) - misfit(&is[k], 1);
                freedom += were[k].freedom - is[k].freedom;
            }
            if (is[0].freedom + is[1].freedom > 0 && freedom == b->freedom)
                offer(search, fmax(sum, 0), 0,
                      (struct suspect){.run = first, .onwards = onwards, .sensor = i, .with = j});
        }
    }
    return 0;
}

static int search_all(struct bench *b, enum suspects_kind kind, struct search *search)
{
    int failed = 0;

    /* The first run is the one that all others are held against: moved in it alone is moved in all
     * others, the other way. */
    for (size_t r = 1; !failed && r < b->set->run_count; r++) {
        for (int onwards = 1; !failed && onwards >= 0; onwards--) {
            if (!onwards && r + 1 == b->set->run_count)
                continue; /* the same as onwards */
            failed = kind == SUSPECTS_TAPE   ? try_tape(b, r, onwards, search)
                     : kind == SUSPECTS_SWAP ? try_swaps(b, r, onwards, search)
                                             : try_turns(b, r, onwards, search);
        }
    }
    return failed;
}

/* As the runs are. 0; -1: no memory. */
static int as_they_are(struct bench *b)
{
    for (size_t i = 0; i < b->set->sensor_count; i++) {
        struct parts p;
        if (parts_of(b, i, i, b->set->run_count, false, &p))
            return -1;
        b->freedom += p.freedom;
        b->sum += misfit(&p, 1);
    }
    return 0;
}

static void judge(const struct bench *b, enum suspects_kind kind, const struct search *search,
                  struct suspect *suspect)
{
    double freedom = b->freedom - search->used, then;

    *suspect = (struct suspect){.better = 1, .hidden = search->hidden};
    suspect->spare = b->freedom > 0 && !isnan(search->sum) && freedom > 0;
    if (!suspect->spare)
        return;
    *suspect = search->best;
    suspect->hidden = search->hidden;
    suspect->spare = true;
    suspect->misfit = sqrt(b->sum / b->freedom);
    suspect->chance = beyond(b->freedom, b->sum);
    then = fmax(sqrt(search->sum / freedom), 1); /* no better than the uncertainties */
    suspect->better = fmax(suspect->misfit / then, 1);
    suspect->likely = b->sum > suspects_chi2(b->freedom, NORMAL_999) &&
                      search->sum < suspects_chi2(freedom, NORMAL_95) &&
                      (kind != SUSPECTS_TAPE || fabs(suspect->angle_deg) >= TURN_LEAST);
}

static bool bench_init(struct bench *b, const struct suspects_set *set)
{
    size_t columns = set->plane_count + 1;
    size_t room = set->run_count + columns;

    *b = (struct bench){.set = set};
    b->matrix = malloc(room * columns * sizeof *b->matrix);
    b->sides = malloc(room * 2 * sizeof *b->sides);
    b->kept = malloc(room * (columns + 2) * sizeof *b->kept);
    b->pivots = malloc(columns * sizeof *b->pivots);
    b->scale = calloc(columns, sizeof *b->scale);
    if (!b->matrix || !b->sides || !b->kept || !b->pivots || !b->scale)
        return false;
    for (size_t r = 0; r < set->run_count; r++)
        for (size_t p = 0; p < set->plane_count; p++)
            b->scale[p] = fmax(b->scale[p], cabs(set->weights[r * set->plane_count + p]));
    return true;
}

static void bench_release(struct bench *b)
{
    free(b->scale);
    free(b->pivots);
    free(b->kept);
    free(b->sides);
    free(b->matrix);
}

int suspects_find(const struct suspects_set *set, enum suspects_kind kind, struct suspect *suspect)
{
    struct bench b;
    struct search search = {.sum = NAN};
    int failed = !bench_init(&b, set) || as_they_are(&b) || search_all(&b, kind, &search);

    if (!failed)
        judge(&b, kind, &search, suspect);
    bench_release(&b);
    return failed ? -1 : 0;
}
