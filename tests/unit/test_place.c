/* test_place.c - the placement search against enumeration, closed forms and its own promises. */
#include <math.h>
#include <setjmp.h>
#include <stdarg.h>
#include <stdlib.h>
#include <string.h>

#include <cmocka.h>

#include "test_place_brute.h"

#define DEGREE (3.14159265358979323846 / 180)
#define MOST_FORMS (12 * 16)

/* A random small problem and the arrays it borrows. */
struct sample {
    struct place_problem problem;
    struct place_plane plane[3];
    double angles[3][12], masses[3][4];
    int counts[3][4];
    double complex forms[MOST_FORMS], certain[MOST_FORMS];
};

static size_t pick(uint64_t *state, size_t low, size_t high)
{
    return low + (size_t)(random_uniform(state) * (double)(high - low + 1));
}

/* Evenly spaced positions with some taken, or uneven ones; limits and bounded counts half of the time. */
static void random_plane(uint64_t *state, struct sample *s, size_t p, size_t positions_most,
                         int pieces_most)
{
    struct place_plane *plane = &s->plane[p];
    bool even = random_uniform(state) < 0.5;
    size_t slots = pick(state, 1, positions_most), n = 0;
    for (size_t i = 0; i < slots; i++) {
        double angle = even ? 360.0 * (double)i / (double)slots : 360 * random_uniform(state);
        if (n == 0 || random_uniform(state) < 0.8) {
            s->angles[p][n++] = angle;
        }
    }
    size_t stock = pick(state, 1, 3);
    double heaviest = 0;
    for (size_t i = 0; i < stock; i++) {
        s->masses[p][i] = even ? 0.01 * (double)(i + 1) : 0.005 + 0.03 * random_uniform(state);
        s->counts[p][i] = random_uniform(state) < 0.5 ? -1 : (int)pick(state, 0, 2);
        heaviest = fmax(heaviest, s->masses[p][i]);
    }
    *plane = (struct place_plane){
        .angles_deg = s->angles[p],
        .positions = n,
        .masses = s->masses[p],
        .counts = s->counts[p],
        .stock = stock,
        .pieces = (int)pick(state, 1, (size_t)pieces_most),
        .most = random_uniform(state) < 0.5 ? INFINITY : heaviest * (1 + random_uniform(state)),
        .most_in_all = random_uniform(state) < 0.6 ? INFINITY
                                                   : heaviest * (1 + 2 * random_uniform(state)),
        .sign = random_uniform(state) < 0.3 ? -1 : 1,
    };
}

static void random_sample(uint64_t *state, struct sample *s)
{
    static const size_t positions[] = {0, 12, 8, 4};
    static const int pieces[] = {0, 4, 3, 2};
    size_t planes = pick(state, 1, 3), rows = pick(state, 1, 5);
    for (size_t p = 0; p < planes; p++) {
        random_plane(state, s, p, positions[planes], pieces[planes]);
    }
    random_forms(state, planes, rows, 10 + 60 * random_uniform(state),
                 random_uniform(state) < 0.3 ? 0 : 0.1, s->forms, s->certain);
    s->problem = (struct place_problem){.planes = planes,
                                        .plane = s->plane,
                                        .rows = rows,
                                        .forms = s->forms,
                                        .certain = s->certain,
                                        .worst = random_uniform(state) < 0.4,
                                        .floor = 1e-4 * (double)rows};
}

static int pieces_of(const struct place_choice *choice, const struct place_problem *problem)
{
    int largest = 0;
    for (size_t p = 0; p < problem->planes; p++) {
        int here = 0;
        for (size_t i = 0; i < choice->count; i++) {
            here += choice->items[i].plane == p ? (int)choice->items[i].piece_count : 0;
        }
        largest = here > largest ? here : largest;
    }
    return largest;
}

/* What stands there keeps every limit, and its J is what the result says. */
static void check_choice(const struct place_problem *problem, const struct place_choice *choice)
{
    double complex w[3];
    brute_weights(problem, choice, w);
    double j = brute_value(problem, problem->forms, w, NULL);
    double nothing = brute_value(problem, problem->forms, (double complex[3]){0}, NULL);
    assert_true(fabs(j - choice->objective) <= 1e-9 * nothing);
    assert_int_equal(choice->pieces, pieces_of(choice, problem));
    double all[3] = {0};
    for (size_t i = 0; i < choice->count; i++) {
        const struct place_item *item = &choice->items[i];
        const struct place_plane *plane = &problem->plane[item->plane];
        double mass = 0;
        for (size_t l = 0; l < item->piece_count; l++) {
            mass += item->pieces[l];
        }
        assert_true(fabs(mass - item->mass) <= 1e-12 * mass);
        assert_true(item->mass > 0 && item->mass <= plane->most * (1 + 1e-9));
        all[item->plane] += mass;
        assert_true(all[item->plane] <= plane->most_in_all * (1 + 1e-9));
        if (plane->positions > 0) {
            assert_true(item->angle_deg == plane->angles_deg[item->position]);
        }
        if (i > 0) {
            const struct place_item *before = &choice->items[i - 1];
            assert_true(before->plane < item->plane ||
                        (before->plane == item->plane && before->position < item->position));
        }
    }
    for (size_t p = 0; p < problem->planes; p++) {
        assert_true(pieces_of(choice, problem) <= 16);
    }
}

/* The rule of place.h, from the enumeration's figures. */
static int chosen_k(const struct place_problem *problem, const struct brute *brute, double noise)
{
    int k = 0;
    while (brute->best[k] - brute->best[brute->most] > fmax(0.1 * noise, problem->floor)) {
        k++;
    }
    return k;
}

static double unsure_part(const struct place_problem *problem, const double complex *w)
{
    size_t row = 0;
    double j = brute_value(problem, problem->forms, w, &row);
    if (!problem->worst) {
        return j - brute_value(problem, problem->certain, w, NULL);
    }
    struct place_problem one = *problem;
    size_t size = (problem->planes + 1) * (problem->planes + 1);
    one.rows = 1;
    return j - brute_value(&one, problem->certain + row * size, w, NULL);
}

static void equals_enumeration(void **unused)
{
    (void)unused;
    uint64_t state = 20250314;
    for (int trial = 0; trial < 500; trial++) {
        struct sample s;
        struct brute brute;
        struct place_result result, of_all;
        random_sample(&state, &s);
        brute_search(&s.problem, &brute);
        double tight = 1e-9 * brute.best[0];
        /* With no noise allowed the best of all is chosen, which shows its weights. */
        struct place_problem exact = s.problem;
        exact.certain = exact.forms;
        exact.floor = 0;
        assert_int_equal(place_search(&exact, &of_all), PLACE_OK);
        assert_true(fabs(of_all.best.objective - brute.best[brute.most]) <= tight);
        double complex w[3];
        brute_weights(&s.problem, &of_all.best, w);
        int k = chosen_k(&s.problem, &brute, unsure_part(&s.problem, w));
        place_release(&of_all);

        assert_int_equal(place_search(&s.problem, &result), PLACE_OK);
        assert_true(result.gap == 0);
        assert_true(fabs(result.of_all - brute.best[brute.most]) <= tight);
        assert_true(fabs(result.nothing - brute.best[0]) <= tight);
        assert_true(fabs(result.best.objective - brute.best[k]) <= tight);
        assert_true(result.best.pieces <= k);
        check_choice(&s.problem, &result.best);
        for (int i = 0; i < 2; i++) {
            if (isfinite(brute.three[k][i + 1])) {
                assert_true(fabs(result.next[i].objective - brute.three[k][i + 1]) <= tight);
                check_choice(&s.problem, &result.next[i]);
            } else {
                assert_true(isnan(result.next[i].objective));
                assert_int_equal(result.next[i].count, 0);
            }
        }
        place_release(&result);
    }
}

int main(void)
{
    const struct CMUnitTest tests[] = {
        cmocka_unit_test(equals_enumeration),
    };
    return cmocka_run_group_tests(tests, NULL, NULL);
}
