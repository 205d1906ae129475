#include "solve/amplitude.h"

#include <lapacke.h>
#include <math.h>
#include <stdbool.h>
#include <string.h>

#include "base/angle.h"

#define FEWEST 4  /* runs: three unknowns and one to tell mirrored answers apart */
#define STEPS 60  /* of one descent */
#define ANGLES 24 /* starts around the circle */
#define SIZES 5   /* starts in the size of the response, a factor of two apart */
#define STARTS (ANGLES * SIZES)
#define ALIKE 5.99 /* in the sum of squares: as the header says */
#define APART 0.02 /* of the response: another answer */
#define PAIR 3     /* runs that leave two answers */
#define FLOOR 1e-9 /* as in regress.c: nobody reads nine digits */

struct task {
    size_t count;
    const double *amplitude;
    const double complex *w;
    const double *variance;
    double scale, reach; /* unknowns in units of scale and scale/reach */
};

/* Sum of squares at u = [T, re A, im A]; with `normal` and `gradient` also J'J and J'r. */
static double squares(const struct task *t, const double u[3], double normal[9], double gradient[3])
{
    double sum = 0;
    if (normal) {
        memset(normal, 0, 9 * sizeof *normal);
        memset(gradient, 0, 3 * sizeof *gradient);
    }
    for (size_t i = 0; i < t->count; i++) {
        double complex w = t->w[i] / t->reach;
        double complex z = u[0] + CMPLX(u[1], u[2]) * w;
        double size = cabs(z),
               sd = sqrt(fmax(t->variance[i] / (t->scale * t->scale), FLOOR * FLOOR));
        double r = (size - t->amplitude[i] / t->scale) / sd;
        sum += r * r;
        if (!normal || !(size > 0))
            continue;
        double complex unit = conj(z) / size;
        double j[3] = {creal(unit) / sd, creal(unit * w) / sd, creal(unit * w * I) / sd};
        for (int a = 0; a < 3; a++) {
            gradient[a] += j[a] * r;
            for (int b = 0; b < 3; b++)
                normal[3 * a + b] += j[a] * j[b];
        }
    }
    return sum;
}

static double descend(const struct task *t, double u[3])
{
    double damping = 1e-3, normal[9], step[3], sum = squares(t, u, NULL, NULL);
    for (int k = 0; k < STEPS && damping < 1e12; k++) {
        squares(t, u, normal, step);
        for (int a = 0; a < 3; a++)
            normal[4 * a] += damping * (normal[4 * a] + 1e-12);
        if (LAPACKE_dposv(LAPACK_ROW_MAJOR, 'U', 3, 1, normal, 3, step, 1) != 0) {
            damping *= 10;
            continue;
        }
        double next[3] = {u[0] - step[0], u[1] - step[1], u[2] - step[2]};
        double there = squares(t, next, NULL, NULL);
        if (there < sum) {
            memcpy(u, next, sizeof next);
            sum = there;
            damping /= 10;
        } else {
            damping *= 10;
        }
    }
    for (int a = 0; a < 3 && u[0] < 0; a++) /* T and A together may change sign */
        u[a] = a == 0 ? u[a] : -u[a];
    u[0] = fabs(u[0]);
    return sum;
}

static bool differ(const double a[3], const double b[3])
{
    return hypot(a[1] - b[1], a[2] - b[2]) > APART * hypot(b[1], b[2]);
}

/* Where all starts end, with their sums of squares, and the best of them. */
static double search(const struct task *t, double found[STARTS][4], double best[3])
{
    double least = INFINITY;
    for (int i = 0; i < STARTS; i++) {
        double complex a = angle_vector(pow(2, i / ANGLES - 2), 360.0 / ANGLES * (i % ANGLES));
        double *u = found[i];
        u[0] = 1;
        u[1] = creal(a);
        u[2] = cimag(a);
        u[3] = descend(t, u);
        if (u[3] < least) {
            least = u[3];
            memcpy(best, u, 3 * sizeof *best);
        }
    }
    return least;
}

/* The end of least sum of squares that is none of those `but`; NULL: there is none. */
static const double *rival(double (*found)[4], const double *const *but, size_t count)
{
    const double *next = NULL;
    for (int i = 0; i < STARTS; i++) {
        bool other = true;
        for (size_t k = 0; k < count; k++)
            other = other && differ(found[i], but[k]);
        if (other && (!next || found[i][3] < next[3]))
            next = found[i];
    }
    return next;
}

/* Covariance of [T, A] at the best, the imaginary part of T being zero by definition. */
static int fill(const struct task *t, const double u[3], struct posterior *p)
{
    static const size_t place[3] = {0, 2, 3};
    double normal[9], unused[3], units[3] = {t->scale, t->scale / t->reach, t->scale / t->reach};
    squares(t, u, normal, unused);
    if (LAPACKE_dpotrf(LAPACK_ROW_MAJOR, 'U', 3, normal, 3) != 0 ||
        LAPACKE_dpotri(LAPACK_ROW_MAJOR, 'U', 3, normal, 3) != 0)
        return AMPLITUDE_AMBIGUOUS;
    if (posterior_init(p, 2) != 0)
        return AMPLITUDE_NO_MEMORY;
    p->rank = 2;
    p->known[0] = p->known[1] = true;
    p->mean[0] = u[0] * units[0];
    p->mean[1] = CMPLX(u[1], u[2]) * units[1];
    for (size_t a = 0; a < 3; a++)
        for (size_t b = a; b < 3; b++)
            p->cov[place[a] * 4 + place[b]] = p->cov[place[b] * 4 + place[a]] =
                normal[3 * a + b] * units[a] * units[b];
    return AMPLITUDE_OK;
}

static void judge(const struct task *t, const double u[3], double least, double *misfit,
                  size_t *which)
{
    double most = -1, stated = 0;
    for (size_t i = 0; i < t->count; i++) {
        double r =
            fabs(cabs(u[0] + CMPLX(u[1], u[2]) * t->w[i] / t->reach) - t->amplitude[i] / t->scale);
        stated = fmax(stated, t->variance[i]);
        if (r > most) {
            most = r;
            *which = i;
        }
    }
    if (stated > 0)
        *misfit = sqrt(least / (double)(t->count - 3));
}

/* What there is to fit; false: a number is not finite, or nothing was read as found. */
static bool task_of(size_t count, const double *amplitude, const double complex *w,
                    const double *variance, double scale, struct task *t)
{
    double sum = scale;
    *t = (struct task){count, amplitude, w, variance, scale, 0};
    for (size_t i = 0; i < count; i++) {
        t->reach = fmax(t->reach, cabs(w[i]));
        sum += amplitude[i] + variance[i] + cabs(w[i]);
    }
    return isfinite(sum) && scale > 0;
}

int amplitude_pair(size_t count, const double *amplitude, const double complex *w,
                   const double *variance, double scale, double complex either[2])
{
    struct task t;
    double found[STARTS][4], best[3];
    either[0] = either[1] = NAN;
    if (!task_of(count, amplitude, w, variance, scale, &t))
        return AMPLITUDE_NAN;
    if (count < PAIR || !(t.reach > 0))
        return AMPLITUDE_AMBIGUOUS;
    double least = search(&t, found, best);
    const double *answers[2] = {best, NULL};
    answers[1] = rival(found, answers, 1);
    if (!answers[1] || !(answers[1][3] - least < ALIKE))
        return AMPLITUDE_AMBIGUOUS;
    const double *third = rival(found, answers, 2);
    if (third && third[3] - least < ALIKE)
        return AMPLITUDE_AMBIGUOUS;
    for (int i = 0; i < 2; i++)
        either[i] = -answers[i][0] / CMPLX(answers[i][1], answers[i][2]) * t.reach;
    return AMPLITUDE_OK;
}

int amplitude_fit(size_t count, const double *amplitude, const double complex *w,
                  const double *variance, double scale, struct posterior *p, double *misfit,
                  size_t *which)
{
    struct task t;
    double found[STARTS][4], best[3];
    memset(p, 0, sizeof *p);
    *misfit = NAN;
    *which = 0;
    if (!task_of(count, amplitude, w, variance, scale, &t))
        return AMPLITUDE_NAN;
    if (count < FEWEST || !(t.reach > 0))
        return AMPLITUDE_AMBIGUOUS;
    double least = search(&t, found, best);
    const double *answer = best, *other = rival(found, &answer, 1);
    if (other && other[3] - least < ALIKE)
        return AMPLITUDE_AMBIGUOUS;
    judge(&t, best, least, misfit, which);
    return fill(&t, best, p);
}
