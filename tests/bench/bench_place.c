/* bench_place.c - the placement search on large problems: seconds, bound, gap.
 *
 * Rows are twice the planes, responses random; "near" means the ideal weights lie well within what the pieces reach, "far"
 * that they lie beyond. Usage: bench_place [CASE [NODES]]; without a case all are run.
 */
#include <math.h>
#include <stdint.h>
#include <stdio.h>
#include <stdlib.h>
#include <string.h>
#include <time.h>

#include "solve/place.h"

#define PLANES 5
#define ROWS (2 * PLANES)

struct bench {
    const char *name;
    size_t planes, positions, stock; /* positions 0: any angle; stock 0: any mass */
    int pieces;
    double reach; /* ideal weight over one heaviest piece, about */
    bool worst, uneven, single; /* single: one heaviest piece a position at most */
    int seeds;
};

static double uniform(uint64_t *state)
{
    *state = *state * 6364136223846793005u + 1442695040888963407u; /* Knuth's MMIX */
    return (double)(*state >> 11) * 0x1p-53;
}

static double complex gauss(uint64_t *state)
{
    double u = 1 - uniform(state);
    return sqrt(-log(u)) * cexp(2 * I * 3.14159265358979323846 * uniform(state));
}

static void fill(const struct bench *b, uint64_t *state, double complex *forms, double complex *certain)
{
    size_t n = b->planes + 1;
    double complex ideal[PLANES];
    for (size_t p = 0; p < b->planes; p++) {
        ideal[p] = b->reach * 0.05 * gauss(state);
    }
    for (size_t r = 0; r < 2 * b->planes; r++) {
        double complex v[PLANES + 1], u[PLANES + 1];
        v[0] = 0.1 * gauss(state);
        for (size_t p = 0; p < b->planes; p++) {
            v[p + 1] = 20 * gauss(state);
            u[p + 1] = 0.5 * gauss(state);
            v[0] -= v[p + 1] * ideal[p];
        }
        u[0] = 0.02 * gauss(state);
        for (size_t i = 0; i < n * n; i++) {
            certain[r * n * n + i] = conj(v[i / n]) * v[i % n];
            forms[r * n * n + i] = certain[r * n * n + i] + conj(u[i / n]) * u[i % n];
        }
    }
}

static void run(const struct bench *b, long nodes)
{
    static const double masses[] = {0.005, 0.010, 0.015, 0.020, 0.030, 0.050};
    static const double odd[] = {0.0047, 0.0093, 0.0151, 0.0212, 0.0307, 0.0498};
    static const int counts[] = {-1, -1, -1, -1, -1, -1};
    static double complex forms[ROWS * (PLANES + 1) * (PLANES + 1)];
    static double complex certain[ROWS * (PLANES + 1) * (PLANES + 1)];
    double slowest = 0, all = 0, widest = 0;
    for (int seed = 1; seed <= b->seeds; seed++) {
        uint64_t state = (uint64_t)seed * 7919;
        double angles[PLANES][48];
        struct place_plane plane[PLANES];
        fill(b, &state, forms, certain);
        for (size_t p = 0; p < b->planes; p++) {
            for (size_t i = 0; i < b->positions; i++) {
                angles[p][i] = b->uneven ? 360 * uniform(&state) : 360.0 * (double)i / (double)b->positions;
            }
            plane[p] = (struct place_plane){.angles_deg = angles[p], .positions = b->positions,
                .masses = b->uneven ? odd : masses, .counts = counts, .stock = b->stock,
                .pieces = b->pieces, .most = b->single ? 0.05 : INFINITY, .most_in_all = INFINITY, .sign = 1};
        }
        struct place_problem problem = {.planes = b->planes, .plane = plane, .rows = 2 * b->planes,
            .forms = forms, .certain = certain, .worst = b->worst, .floor = 1e-4, .nodes = nodes};
        struct place_result result;
        struct timespec from, to;
        clock_gettime(CLOCK_MONOTONIC, &from);
        int code = place_search(&problem, &result);
        clock_gettime(CLOCK_MONOTONIC, &to);
        double s = (double)(to.tv_sec - from.tv_sec) + 1e-9 * (double)(to.tv_nsec - from.tv_nsec);
        slowest = fmax(slowest, s);
        all += s;
        if (code != PLACE_OK) {
            printf("%s: error %d\n", b->name, code);
            return;
        }
        widest = fmax(widest, result.gap / result.nothing);
        printf("  %-28s seed %d: %6.2f s, J of nothing %.4g, chosen %.5g (%d pieces), of all %.5g, gap %.2g\n",
               b->name, seed, s, result.nothing, result.best.objective, result.best.pieces,
               result.of_all, result.gap);
        place_release(&result);
    }
    printf("%-30s mean %.2f s, slowest %.2f s, widest gap %.2g of nothing\n", b->name, all / b->seeds,
           slowest, widest);
}

int main(int argc, char **argv)
{
    setvbuf(stdout, NULL, _IOLBF, 0);
    static const struct bench cases[] = {
        {"2x24x6x4 near", 2, 24, 6, 4, 1.5, false, false, false, 4},
        {"2x24x6x4 near uneven", 2, 24, 6, 4, 1.5, false, true, false, 4},
        {"2x24x6x4 far", 2, 24, 6, 4, 6, false, false, false, 4},
        {"2x24x6x4 single", 2, 24, 6, 4, 1.5, false, false, true, 4},
        {"2x24x6x4 worst", 2, 24, 6, 4, 1.5, true, false, false, 4},
        {"4x24x6x4 near", 4, 24, 6, 4, 1.5, false, false, false, 2},
        {"4x24x6x4 worst", 4, 24, 6, 4, 1.5, true, false, false, 2},
        {"5x12x3x4 near", 5, 12, 3, 4, 1.5, false, false, false, 2},
        {"any angle 2x6x4", 2, 0, 6, 4, 1.5, false, false, false, 2},
        {"any mass 2x24x4", 2, 24, 0, 4, 1.5, false, false, false, 2},
        {"any mass 4x24x4 single", 4, 24, 0, 4, 2.5, false, false, true, 2},
        {"any mass 4x24x4 worst", 4, 24, 0, 4, 1.5, true, false, false, 2},
        {"any mass any angle 5 worst", 5, 0, 0, 4, 1.5, true, false, false, 2},
    };
    for (size_t i = 0; i < sizeof cases / sizeof *cases; i++) {
        if (argc < 2 || strcmp(argv[1], cases[i].name) == 0) {
            run(&cases[i], argc > 2 ? atol(argv[2]) : 0);
        }
    }
    return 0;
}
