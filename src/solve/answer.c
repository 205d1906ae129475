#include "solve/answer.h"

#include <math.h>
#include <stdio.h>
#include <stdlib.h>
#include <string.h>

#include "base/angle.h"
#include "sheet/units.h"
#include "solve/chebyshev.h"
#include "solve/correct.h"
#include "solve/ruling.h"

static int room(struct answer *a, size_t most)
{
    size_t p = a->planes, q = p + 1;
    a->row = calloc(most + 1, sizeof *a->row);
    a->posterior = calloc(most + 1, sizeof *a->posterior);
    a->scale = calloc(most + 1, sizeof *a->scale);
    a->se = calloc(most + 1, sizeof *a->se);
    a->mounted = calloc(q, sizeof *a->mounted);
    a->weights = calloc(q, sizeof *a->weights);
    a->classical = calloc(q, sizeof *a->classical);
    a->ellipse = calloc(4 * p * p + 1, sizeof *a->ellipse);
    a->weak = calloc(q, sizeof *a->weak);
    a->forms = calloc(most * q * q + 1, sizeof *a->forms);
    a->certain = calloc(most * q * q + 1, sizeof *a->certain);
    a->placed_weights = calloc(q, sizeof *a->placed_weights);
    a->forecasts = calloc(most + 1, sizeof *a->forecasts);
    a->residuals = calloc(q, sizeof *a->residuals);
    return a->row && a->posterior && a->scale && a->se && a->mounted && a->weights &&
                   a->classical && a->ellipse && a->weak && a->forms && a->certain &&
                   a->placed_weights && a->forecasts && a->residuals
               ? ANSWER_OK
               : ANSWER_NO_MEMORY;
}

static int copy_posterior(const struct posterior *from, struct posterior *to)
{
    if (posterior_init(to, from->unknowns) != 0)
        return ANSWER_NO_MEMORY;
    size_t n = from->unknowns;
    to->rank = from->rank;
    to->dof = from->dof;
    memcpy(to->mean, from->mean, n * sizeof *to->mean);
    memcpy(to->cov, from->cov, 4 * n * n * sizeof *to->cov);
    memcpy(to->known, from->known, n * sizeof *to->known);
    return ANSWER_OK;
}

/* 1 where every row's sensor is shown in one quantity and that is known at its speed. */
static bool shared_quantity(const struct answer *a)
{
    const struct job *job = a->model->job;
    for (size_t r = 0; r < a->rows; r++) {
        const struct job_sensor *s = &job->sensors[a->row[r]->sensor];
        if (s->show.quantity != job->sensors[a->row[0]->sensor].show.quantity)
            return false;
        if (s->show.quantity != s->quantity && !(a->row[r]->speed_rpm > 0))
            return false;
    }
    return true;
}

static void set_scales(struct answer *a)
{
    bool targets = false, shared = shared_quantity(a);
    for (size_t r = 0; r < a->rows; r++)
        targets = targets || !isnan(a->row[r]->target);
    for (size_t r = 0; r < a->rows; r++) {
        const struct model_row *row = a->row[r];
        const struct job_sensor *s = &a->model->job->sensors[row->sensor];
        if (targets && row->target > 0)
            a->scale[r] = 1 / row->target;
        else if (targets || !shared)
            a->scale[r] = 1 / row->as_found;
        else if (s->quantity == s->show.quantity)
            a->scale[r] = 1;
        else
            a->scale[r] =
                cabs(units_convert(1, s->quantity, s->show.quantity, row->speed_rpm * PI / 30));
    }
}

/* Forms of every row, and the floor of the noise: (1 % of as found)^2, design section 6. */
static void set_forms(struct answer *a)
{
    size_t square = (a->planes + 1) * (a->planes + 1);
    bool worst = a->model->job->aim.minimise == MINIMISE_WORST;
    for (size_t r = 0; r < a->rows; r++) {
        double one = 0.01 * a->row[r]->as_found * a->scale[r];
        a->floor = worst ? fmax(a->floor, one * one) : a->floor + one * one;
        posterior_forms(&a->posterior[r], a->scale[r], a->forms + r * square,
                        a->certain + r * square);
    }
}

int answer_init(struct answer *a, const struct model *m)
{
    memset(a, 0, sizeof *a);
    a->model = m;
    a->planes = m->job->plane_count;
    a->condition = INFINITY;
    int result = room(a, m->row_count);
    for (size_t p = 0; p < a->planes && result == ANSWER_OK && m->job->aim.mounted >= 0; p++)
        a->mounted[p] = job_run_weight(m->job, (size_t)m->job->aim.mounted, p);
    for (size_t r = 0; r < m->row_count && result == ANSWER_OK; r++) {
        const struct model_row *row = &m->rows[r];
        if (!ruling_counts(row))
            continue;
        size_t n = a->rows++;
        a->row[n] = row;
        double variance = 0;
        for (size_t i = 0; i < row->count; i++)
            variance += (row->total[i][0] + row->total[i][2]) / (double)row->count;
        a->se[n] = fmax(sqrt(variance), 1e-9 * row->as_found);
        result = copy_posterior(&row->posterior, &a->posterior[n]);
        if (result == ANSWER_OK && posterior_rebase(&a->posterior[n], a->mounted) != 0)
            result = ANSWER_NO_MEMORY;
    }
    if (result == ANSWER_OK) {
        set_scales(a);
        set_forms(a);
        result = correct_condition(a->posterior, a->se, a->rows, a->planes, &a->condition, a->weak);
    }
    if (result != ANSWER_OK)
        answer_release(a);
    return result;
}

void answer_release(struct answer *a)
{
    for (size_t r = 0; a->posterior && r < a->rows; r++)
        posterior_release(&a->posterior[r]);
    if (a->placed)
        place_release(&a->placement);
    free(a->residuals);
    free(a->forecasts);
    free(a->placed_weights);
    free(a->certain);
    free(a->forms);
    free(a->weak);
    free(a->ellipse);
    free(a->classical);
    free(a->weights);
    free(a->mounted);
    free(a->se);
    free(a->scale);
    free(a->posterior);
    free(a->row);
    memset(a, 0, sizeof *a);
}

int answer_correct(struct answer *a)
{
    size_t square = (a->planes + 1) * (a->planes + 1);
    int result = correct_least_squares(a->posterior, a->scale, a->rows, a->planes, a->classical);
    if (result == CORRECT_OK)
        result = correct_covariance(a->posterior, a->scale, a->rows, a->planes, a->classical,
                                    a->ellipse);
    if (result != CORRECT_OK)
        return result;
    memcpy(a->weights, a->classical, a->planes * sizeof *a->weights);
    double largest;
    if (a->model->job->aim.minimise == MINIMISE_WORST)
        return chebyshev_solve(a->forms, a->rows, a->planes, a->weights, &largest);
    double complex *sum = calloc(square, sizeof *sum);
    if (!sum)
        return ANSWER_NO_MEMORY;
    for (size_t r = 0; r < a->rows; r++)
        for (size_t i = 0; i < square; i++)
            sum[i] += a->forms[r * square + i];
    result = correct_quadratic(sum, a->planes, a->weights);
    free(sum);
    return result;
}

/* ---- placement ---- */

static bool ideal_fits(const struct answer *a)
{
    for (size_t p = 0; p < a->planes; p++) {
        const struct job_plane *plane = &a->model->job->planes[p];
        double mass = cabs(a->weights[p]);
        if (!plane->any_position || plane->stock || mass > plane->most || mass > plane->most_in_all)
            return false;
    }
    return true;
}

/* Sum or largest of the rows' forms at w. */
static double objective(const struct answer *a, const double complex *forms,
                        const double complex *w)
{
    size_t square = (a->planes + 1) * (a->planes + 1);
    double sum = 0, most = 0;
    for (size_t r = 0; r < a->rows; r++) {
        double j = correct_value(forms + r * square, a->planes, w);
        sum += j;
        most = fmax(most, j);
    }
    return a->model->job->aim.minimise == MINIMISE_WORST ? most : sum;
}

/* The ideal weight itself as the placement, by the search's own rule for what is within the noise.
 */
static int place_ideal(struct answer *a)
{
    double complex *zero = calloc(a->planes + 1, sizeof *zero);
    struct place_choice *best = &a->placement.best;
    best->items = calloc(a->planes + 1, sizeof *best->items);
    a->placed = true;
    if (!zero || !best->items) {
        free(zero);
        return ANSWER_NO_MEMORY;
    }
    double nothing = objective(a, a->forms, zero), least = objective(a, a->forms, a->weights);
    double noise = fmax(a->floor, 0.1 * (least - objective(a, a->certain, a->weights)));
    free(zero);
    a->placement.nothing = nothing;
    a->placement.of_all = a->placement.bound = least;
    a->placement.next[0].objective = a->placement.next[1].objective = NAN;
    best->objective = nothing;
    if (nothing - least <= noise)
        return ANSWER_OK;
    best->objective = least;
    for (size_t p = 0; p < a->planes; p++) {
        bool remove = a->model->job->planes[p].work == WORK_REMOVE;
        double mass = cabs(a->weights[p]);
        if (!(mass > 0))
            continue;
        best->items[best->count++] =
            (struct place_item){.plane = p,
                                .position = -1,
                                .angle_deg = angle_of(remove ? -a->weights[p] : a->weights[p]),
                                .mass = mass,
                                .pieces = {mass},
                                .piece_count = 1};
        best->pieces = 1;
    }
    return ANSWER_OK;
}

struct menu { /* one plane's lists for the search */
    double *angles, *masses;
    int *counts;
};

static int fill_plane(const struct job_plane *from, struct menu *menu, struct place_plane *to)
{
    menu->angles = calloc(from->position_count + 1, sizeof *menu->angles);
    menu->masses = calloc(from->stock_count + 1, sizeof *menu->masses);
    menu->counts = calloc(from->stock_count + 1, sizeof *menu->counts);
    if (!menu->angles || !menu->masses || !menu->counts)
        return ANSWER_NO_MEMORY;
    size_t free_positions = 0;
    for (size_t i = 0; !from->any_position && i < from->position_count; i++)
        if (!from->positions[i].taken)
            menu->angles[free_positions++] = from->positions[i].angle_deg;
    for (size_t i = 0; i < from->stock_count; i++) {
        menu->masses[i] = from->stock[i].mass;
        menu->counts[i] = from->stock[i].count;
    }
    int pieces = from->pieces > 0 ? from->pieces : 4; /* the sheet's default */
    *to = (struct place_plane){
        menu->angles, free_positions,    menu->masses,
        menu->counts, from->stock_count, pieces > PLACE_PIECES_MOST ? PLACE_PIECES_MOST : pieces,
        from->most,   from->most_in_all, from->work == WORK_REMOVE ? -1 : 1};
    if (!from->any_position && free_positions == 0) { /* all taken: nothing may be put here */
        to->angles_deg = menu->angles;
        to->positions = 1;
        to->most = to->most_in_all = 0;
    }
    return ANSWER_OK;
}

static int place_by_search(struct answer *a)
{
    const struct job *job = a->model->job;
    struct menu *menus = calloc(a->planes + 1, sizeof *menus);
    struct place_plane *planes = calloc(a->planes + 1, sizeof *planes);
    int result = menus && planes ? ANSWER_OK : ANSWER_NO_MEMORY;
    for (size_t p = 0; p < a->planes && result == ANSWER_OK; p++)
        result = fill_plane(&job->planes[p], &menus[p], &planes[p]);
    if (result == ANSWER_OK) {
        struct place_problem problem = {a->planes, planes,     a->rows,
                                        a->forms,  a->certain, job->aim.minimise == MINIMISE_WORST,
                                        a->floor,  0};
        int error = place_search(&problem, &a->placement);
        a->placed = error == PLACE_OK;
        result = error == PLACE_OK          ? ANSWER_OK
                 : error == PLACE_NO_MEMORY ? ANSWER_NO_MEMORY
                                            : ANSWER_FAILED;
    }
    for (size_t p = 0; menus && p < a->planes; p++) {
        free(menus[p].angles);
        free(menus[p].masses);
        free(menus[p].counts);
    }
    free(planes);
    free(menus);
    return result;
}

int answer_place(struct answer *a)
{
    int result = ideal_fits(a) ? place_ideal(a) : place_by_search(a);
    for (size_t i = 0; result == ANSWER_OK && i < a->placement.best.count; i++) {
        const struct place_item *item = &a->placement.best.items[i];
        double sign = a->model->job->planes[item->plane].work == WORK_REMOVE ? -1 : 1;
        a->placed_weights[item->plane] += angle_vector(sign * item->mass, item->angle_deg);
    }
    return result;
}

bool answer_helps(const struct answer *a)
{
    return a->placed && a->placement.best.count > 0;
}
