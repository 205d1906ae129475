/* test_place_brute.c - see test_place_brute.h. */
#include "test_place_brute.h"

#include <math.h>
#include <string.h>

#define DEGREE (3.14159265358979323846 / 180)

double brute_value(const struct place_problem *problem, const double complex *forms,
                   const double complex *w, size_t *worst_row)
{
    size_t n = problem->planes + 1;
    double sum = 0, worst = -INFINITY;
    for (size_t r = 0; r < problem->rows; r++) {
        double complex j = 0;
        for (size_t a = 0; a < n; a++) {
            for (size_t b = 0; b < n; b++) {
                j += conj(a ? w[a - 1] : 1) * forms[r * n * n + a * n + b] * (b ? w[b - 1] : 1);
            }
        }
        sum += creal(j);
        if (creal(j) > worst) {
            worst = creal(j);
            if (worst_row != NULL) {
                *worst_row = r;
            }
        }
    }
    return problem->worst ? worst : sum;
}

struct walk {
    const struct place_problem *problem;
    struct brute *result;
    double complex w[BRUTE_PLANES];
    int counts[BRUTE_PLANES];
    double at[BRUTE_PLANES][32];
    int used[BRUTE_PLANES][8];
    double all[BRUTE_PLANES];
};

static void take_in(struct walk *walk)
{
    int largest = 0;
    for (size_t p = 0; p < walk->problem->planes; p++) {
        largest = walk->counts[p] > largest ? walk->counts[p] : largest;
    }
    double j = brute_value(walk->problem, walk->problem->forms, walk->w, NULL);
    for (int k = largest; k <= walk->result->most; k++) {
        double *three = walk->result->three[k];
        double value = j;
        for (int i = 0; i < 3; i++) {
            if (value < three[i]) {
                double old = three[i];
                three[i] = value;
                value = old;
            }
        }
        walk->result->best[k] = three[0];
    }
}

/* Next piece on this plane at or after (position, piece), or on to the next plane. */
static void walk_on(struct walk *walk, size_t plane, size_t position, size_t piece)
{
    if (plane == walk->problem->planes) {
        take_in(walk);
        return;
    }
    const struct place_plane *here = &walk->problem->plane[plane];
    walk_on(walk, plane + 1, 0, 0);
    if (walk->counts[plane] == here->pieces) {
        return;
    }
    for (size_t i = position * here->stock + piece; i < here->positions * here->stock; i++) {
        size_t at = i / here->stock, kind = i % here->stock;
        double mass = here->masses[kind];
        if ((here->counts[kind] >= 0 && walk->used[plane][kind] >= here->counts[kind]) ||
            walk->at[plane][at] + mass > here->most * (1 + 1e-9) ||
            walk->all[plane] + mass > here->most_in_all * (1 + 1e-9)) {
            continue;
        }
        double complex step = here->sign * mass * cexp(I * here->angles_deg[at] * DEGREE);
        walk->counts[plane]++;
        walk->used[plane][kind]++;
        walk->at[plane][at] += mass;
        walk->all[plane] += mass;
        walk->w[plane] += step;
        walk_on(walk, plane, at, kind);
        walk->w[plane] -= step;
        walk->all[plane] -= mass;
        walk->at[plane][at] -= mass;
        walk->used[plane][kind]--;
        walk->counts[plane]--;
    }
}

void brute_search(const struct place_problem *problem, struct brute *result)
{
    struct walk walk = {.problem = problem, .result = result};
    result->most = 0;
    for (size_t p = 0; p < problem->planes; p++) {
        int pieces = problem->plane[p].pieces;
        result->most = pieces > result->most ? pieces : result->most;
    }
    for (int k = 0; k <= result->most; k++) {
        result->best[k] = INFINITY;
        for (int i = 0; i < 3; i++) {
            result->three[k][i] = INFINITY;
        }
    }
    walk_on(&walk, 0, 0, 0);
}

void brute_weights(const struct place_problem *problem, const struct place_choice *choice,
                   double complex *w)
{
    memset(w, 0, problem->planes * sizeof *w);
    for (size_t i = 0; i < choice->count; i++) {
        const struct place_item *item = &choice->items[i];
        w[item->plane] += problem->plane[item->plane].sign * item->mass *
                          cexp(I * item->angle_deg * DEGREE);
    }
}

double random_uniform(uint64_t *state)
{
    *state = *state * 6364136223846793005u + 1442695040888963407u;
    return (double)(*state >> 11) * 0x1p-53;
}

double random_normal(uint64_t *state)
{
    double u = 1 - random_uniform(state), v = random_uniform(state);
    return sqrt(-2 * log(u)) * cos(360 * DEGREE * v);
}

void random_forms(uint64_t *state, size_t planes, size_t rows, double response, double unsure,
                  double complex *forms, double complex *certain)
{
    size_t n = planes + 1;
    for (size_t r = 0; r < rows; r++) {
        double complex v[BRUTE_PLANES + 2], u[BRUTE_PLANES + 2];
        for (size_t i = 0; i < n; i++) {
            double size = i ? response : 1;
            v[i] = size * (random_normal(state) + I * random_normal(state));
            u[i] = size * unsure * (random_normal(state) + I * random_normal(state));
        }
        for (size_t a = 0; a < n; a++) {
            for (size_t b = 0; b < n; b++) {
                size_t at = r * n * n + a * n + b;
                certain[at] = conj(v[a]) * v[b];
                forms[at] = certain[at] + conj(u[a]) * u[b];
                if (a == b && a > 0) {
                    forms[at] += response * response * unsure * unsure;
                }
            }
        }
    }
}
