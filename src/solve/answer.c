#include "solve/answer.h"

#include <math.h>
#include <stdio.h>
#include <stdlib.h>
#include <string.h>

#include "base/angle.h"
#include "sheet/units.h"
#include "solve/chebyshev.h"
#include "solve/correct.h"
#include "solve/menu.h"
#include "solve/parts.h"
#include "solve/ruling.h"
#include "solve/sits.h"

static int room(struct answer *a, size_t most)
{
    size_t p = a->planes, q = p + 1;
    a->row = calloc(most + 1, sizeof *a->row);
    a->posterior = calloc(most + 1, sizeof *a->posterior);
    a->scale = calloc(most + 1, sizeof *a->scale);
    a->se = calloc(most + 1, sizeof *a->se);
    a->mounted = calloc(q, sizeof *a->mounted);
    a->weights = calloc(q, sizeof *a->weights);
    a->full = calloc(q, sizeof *a->full);
    a->classical = calloc(q, sizeof *a->classical);
    a->ellipse = calloc(4 * p * p + 1, sizeof *a->ellipse);
    a->weak = calloc(q, sizeof *a->weak);
    a->forms = calloc(most * q * q + 1, sizeof *a->forms);
    a->certain = calloc(most * q * q + 1, sizeof *a->certain);
    a->placed_weights = calloc(q, sizeof *a->placed_weights);
    a->forecasts = calloc(most + 1, sizeof *a->forecasts);
    a->residuals = calloc(q, sizeof *a->residuals);
    return a->row && a->posterior && a->scale && a->se && a->mounted && a->weights && a->full &&
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

/* How many times a condition counts in the aim. */
static double importance(const struct answer *a, size_t condition)
{
    const struct job_aim *aim = &a->model->job->aim;
    for (size_t i = 0; i < aim->importance_count; i++)
        if (!strcmp(aim->importances[i].condition, a->model->conditions[condition]))
            return aim->importances[i].factor;
    return 1;
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
        a->scale[r] *= importance(a, row->condition);
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
    return answer_init_at(a, m, m->job->aim.mounted);
}

int answer_init_at(struct answer *a, const struct model *m, int base)
{
    memset(a, 0, sizeof *a);
    a->model = m;
    a->base = base;
    a->planes = m->job->plane_count;
    a->condition = INFINITY;
    int result = room(a, m->row_count);
    for (size_t p = 0; p < a->planes && result == ANSWER_OK && base >= 0; p++)
        a->mounted[p] = job_run_weight(m->job, (size_t)base, p);
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
    place_release(&a->unopposed);
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
    free(a->full);
    free(a->weights);
    free(a->mounted);
    free(a->se);
    free(a->scale);
    free(a->posterior);
    free(a->row);
    memset(a, 0, sizeof *a);
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

/* The noise of the placement's rule (place.h) about w. */
double answer_noise(const struct answer *a, const double complex *w)
{
    return fmax(a->floor, 0.1 * (objective(a, a->forms, w) - objective(a, a->certain, w)));
}

/* Minimises the rows' forms of `planes` unknowns as the aim says, from `w`. */
static int minimise(const struct answer *a, const double complex *forms, size_t planes,
                    double complex *w)
{
    size_t square = (planes + 1) * (planes + 1);
    double largest;
    if (a->model->job->aim.minimise == MINIMISE_WORST)
        return chebyshev_solve(forms, a->rows, planes, w, &largest);
    double complex *sum = calloc(square, sizeof *sum);
    if (!sum)
        return ANSWER_NO_MEMORY;
    for (size_t r = 0; r < a->rows; r++)
        for (size_t i = 0; i < square; i++)
            sum[i] += forms[r * square + i];
    int result = correct_quadratic(sum, planes, w);
    free(sum);
    return result;
}

/* The best static weight of two planes; it is all that is placed first, as long as it helps, where
 * the aim says so. */
static int correct_static(struct answer *a)
{
    double radius[2] = {a->model->job->planes[0].radius_m, a->model->job->planes[1].radius_m};
    double complex *reduced = calloc(4 * a->rows + 1, sizeof *reduced);
    if (!reduced)
        return ANSWER_NO_MEMORY;
    double complex couple, zero[2] = {0, 0};
    parts_split(a->full, radius, &a->static_alone, &couple); /* where to begin */
    parts_reduce(a->forms, a->rows, radius, reduced);
    int result = minimise(a, reduced, 1, &a->static_alone);
    free(reduced);
    if (result != ANSWER_OK)
        return result;
    double complex alone[2] = {a->static_alone / radius[0], a->static_alone / radius[1]};
    double nothing = objective(a, a->forms, zero), left = objective(a, a->forms, alone);
    a->left_alone = sqrt(left / nothing);
    a->left = sqrt(objective(a, a->forms, a->full) / nothing);
    a->static_only = a->model->job->aim.minimise == MINIMISE_STATIC_FIRST &&
                     nothing - left > answer_noise(a, alone);
    if (a->static_only)
        memcpy(a->weights, alone, sizeof alone);
    return ANSWER_OK;
}

/* With few degrees of freedom a region of two components follows F: F(2, dof) at 95 % is dof/2
 * (0.05^(-2/dof) - 1) in closed form. The ellipse is widened so that the normal's 5.9915 holds 95
 * %. */
static void widen_ellipse(struct answer *a)
{
    double dof = a->model->dof;
    for (size_t r = 0; r < a->rows; r++)
        dof = fmin(dof, a->posterior[r].dof);
    if (isinf(dof))
        return;
    double factor = dof * (pow(0.05, -2 / dof) - 1) / 5.9915;
    for (size_t i = 0; i < 4 * a->planes * a->planes; i++)
        a->ellipse[i] *= factor;
}

int answer_correct(struct answer *a)
{
    int result = correct_least_squares(a->posterior, a->scale, a->rows, a->planes, a->classical);
    if (result == CORRECT_OK)
        result = correct_covariance(a->posterior, a->scale, a->rows, a->planes, a->classical,
                                    a->ellipse);
    if (result != CORRECT_OK)
        return result;
    widen_ellipse(a);
    memcpy(a->full, a->classical, a->planes * sizeof *a->full);
    result = minimise(a, a->forms, a->planes, a->full);
    memcpy(a->weights, a->full, a->planes * sizeof *a->weights);
    if (result == ANSWER_OK && a->planes == 2)
        result = correct_static(a);
    return result;
}

/* ---- placement ---- */

static bool ideal_fits(const struct answer *a)
{
    for (size_t p = 0; p < a->planes; p++) {
        const struct job_plane *plane = &a->model->job->planes[p];
        double mass = cabs(a->weights[p]);
        double most = menu_most(plane), all = plane->most_in_all - sits_in_all(a->model->job, p);
        if (!isinf(most))
            most -= sits_at(a->model->job, p, angle_of(a->weights[p]));
        if (!plane->any_position || plane->stock || mass > most || mass > all)
            return false;
    }
    return true;
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
    double noise = answer_noise(a, a->weights);
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

static int search(const struct place_problem *problem, struct place_result *result, bool *done)
{
    int error = place_search(problem, result);
    *done = error == PLACE_OK;
    return error == PLACE_OK          ? ANSWER_OK
           : error == PLACE_NO_MEMORY ? ANSWER_NO_MEMORY
                                      : ANSWER_FAILED;
}

int answer_search(const struct answer *a, const struct menu_arc *arc, long nodes,
                  struct place_result *found, bool *done)
{
    const struct job *job = a->model->job;
    struct menu *menus = calloc(a->planes + 1, sizeof *menus);
    struct place_plane *planes = calloc(a->planes + 1, sizeof *planes);
    int result = menus && planes ? ANSWER_OK : ANSWER_NO_MEMORY;
    for (size_t p = 0; p < a->planes && result == ANSWER_OK; p++)
        result =
            menu_fill(job, p, arc && arc[p].half_deg < 180 ? &arc[p] : NULL, &menus[p], &planes[p]);
    if (result == ANSWER_OK) {
        struct place_problem problem = {.planes = a->planes,
                                        .plane = planes,
                                        .rows = a->rows,
                                        .forms = a->forms,
                                        .certain = a->certain,
                                        .worst = job->aim.minimise == MINIMISE_WORST,
                                        .floor = a->floor,
                                        .nodes = nodes};
        result = search(&problem, found, done);
    }
    for (size_t p = 0; p < a->planes && result == ANSWER_OK; p++) {
        menu_number(&menus[p], p, &found->best);
        menu_number(&menus[p], p, &found->next[0]);
        menu_number(&menus[p], p, &found->next[1]);
    }
    for (size_t p = 0; menus && p < a->planes; p++)
        menu_release(&menus[p]);
    free(planes);
    free(menus);
    return result;
}

/* What both planes can hold alike, as one plane of the first one's masses; partner[i]: the free
 * position of the second plane at the angle of position i. Pieces are alike where their unbalances
 * are, to a part in a thousand. */
static bool common_plane(const struct place_plane of[2], double ratio, struct menu *menu,
                         size_t *partner, struct place_plane *to)
{
    size_t positions = 0, stock = 0;
    for (size_t i = 0; i < of[0].positions; i++)
        for (size_t j = 0; j < of[1].positions; j++)
            if (fabs(angle_wrap_180(of[0].angles_deg[i] - of[1].angles_deg[j])) < 0.01) {
                partner[positions] = j;
                menu->held[positions] =
                    fmax(of[0].held[i], fmin(of[0].most, of[1].most / ratio) -
                                            (of[1].most - of[1].held[j]) / ratio);
                menu->angles[positions++] = of[0].angles_deg[i];
                break;
            }
    for (size_t i = 0; i < of[0].stock; i++)
        for (size_t j = 0; j < of[1].stock; j++)
            if (fabs(of[1].masses[j] / (of[0].masses[i] * ratio) - 1) < 1e-3) {
                menu->masses[stock] = of[0].masses[i];
                int first = of[0].counts[i], second = of[1].counts[j];
                menu->counts[stock++] =
                    first < 0 || (second >= 0 && second < first) ? second : first;
                break;
            }
    for (size_t i = 0; of[0].positions == 0 && i < 360; i++)
        menu->held[i] = fmax(of[0].held[i], of[1].held[i] / ratio);
    *to = of[0];
    to->held = menu->held;
    to->angles_deg = menu->angles;
    to->masses = menu->masses;
    to->counts = menu->counts;
    to->positions = positions;
    to->stock = stock;
    to->pieces = of[1].pieces < of[0].pieces ? of[1].pieces : of[0].pieces;
    to->most = fmin(of[0].most, of[1].most / ratio);
    to->most_in_all = fmin(of[0].most_in_all, of[1].most_in_all / ratio);
    return (of[0].positions > 0) == (of[1].positions > 0) &&
           (positions > 0 || of[0].positions == 0) && (of[0].stock > 0) == (of[1].stock > 0) &&
           (stock > 0 || of[0].stock == 0) && of[0].sign == of[1].sign && to->most_in_all > 0;
}

/* Position indices of the search's one plane become those of both planes. */
static int spread_out(struct place_choice *choice, const struct place_plane of[2],
                      const struct place_plane *common, const size_t *partner, double ratio)
{
    size_t n = choice->count;
    struct place_item *items = realloc(choice->items, (2 * n + 1) * sizeof *items);
    if (!items)
        return ANSWER_NO_MEMORY;
    choice->items = items;
    for (size_t i = 0; i < n; i++) {
        struct place_item *first = &items[i], *second = &items[n + i];
        int at = first->position;
        *second = *first;
        second->plane = 1;
        second->mass *= ratio;
        for (size_t k = 0; k < second->piece_count; k++)
            second->pieces[k] *= ratio;
        for (size_t j = 0; at >= 0 && j < of[0].positions; j++)
            if (of[0].angles_deg[j] == common->angles_deg[at])
                first->position = (int)j;
        if (at >= 0)
            second->position = (int)partner[at];
    }
    choice->count = 2 * n;
    return ANSWER_OK;
}

/* Equal unbalances at equal angles on both planes; nothing placed where that is not possible. */
static int place_static(struct answer *a)
{
    const struct job_plane *from = a->model->job->planes;
    double ratio = from[0].radius_m / from[1].radius_m, radius[2] = {1, 1 / ratio};
    struct menu menus[3] = {{0}};
    struct place_plane of[2], common;
    size_t *partner = calloc(MENU_ANGLES_MOST(&from[0]) + 1, sizeof *partner);
    double complex *forms = calloc(8 * a->rows + 1, sizeof *forms);
    int result =
        partner && forms && menu_init(&menus[2], &from[0]) == 0 ? ANSWER_OK : ANSWER_NO_MEMORY;
    for (size_t p = 0; p < 2 && result == ANSWER_OK; p++)
        result = menu_fill(a->model->job, p, NULL, &menus[p], &of[p]);
    if (result == ANSWER_OK && common_plane(of, ratio, &menus[2], partner, &common)) {
        parts_reduce(a->forms, a->rows, radius, forms);
        parts_reduce(a->certain, a->rows, radius, forms + 4 * a->rows);
        struct place_problem problem = {.planes = 1,
                                        .plane = &common,
                                        .rows = a->rows,
                                        .forms = forms,
                                        .certain = forms + 4 * a->rows,
                                        .floor = a->floor};
        result = search(&problem, &a->placement, &a->placed);
        struct place_choice *choices[3] = {&a->placement.best, &a->placement.next[0],
                                           &a->placement.next[1]};
        for (size_t i = 0; i < 3 && result == ANSWER_OK; i++)
            result = spread_out(choices[i], of, &common, partner, ratio);
        for (size_t i = 0; i < 6 && result == ANSWER_OK; i++)
            menu_number(&menus[i % 2], i % 2, choices[i / 2]);
    }
    for (size_t p = 0; p < 3; p++)
        menu_release(&menus[p]);
    free(forms);
    free(partner);
    return result;
}

/* Static first; the whole answer where no static weight can be fitted that helps. */
static int place_first(struct answer *a)
{
    int result = place_static(a);
    if (result != ANSWER_OK || answer_helps(a))
        return result;
    if (a->placed)
        place_release(&a->placement);
    a->placed = a->static_only = false;
    memcpy(a->weights, a->full, a->planes * sizeof *a->weights);
    return ideal_fits(a) ? place_ideal(a) : answer_search(a, NULL, 0, &a->placement, &a->placed);
}

int answer_place(struct answer *a)
{
    int result = ideal_fits(a)    ? place_ideal(a)
                 : a->static_only ? place_first(a)
                                  : answer_search(a, NULL, 0, &a->placement, &a->placed);
    for (size_t i = 0; result == ANSWER_OK && i < a->placement.best.count; i++) {
        const struct place_item *item = &a->placement.best.items[i];
        double sign = a->model->job->planes[item->plane].work == WORK_REMOVE ? -1 : 1;
        a->placed_weights[item->plane] += angle_vector(sign * item->mass, item->angle_deg);
    }
    return result;
}

bool answer_corrected_by(const struct answer *a, int run, bool *as_good)
{
    double complex *w = calloc(2 * a->planes + 1, sizeof *w);
    *as_good = false;
    if (!w || run < 0) {
        free(w);
        return false;
    }
    double nothing = objective(a, a->forms, w + a->planes);
    for (size_t p = 0; p < a->planes; p++)
        w[p] = job_run_weight(a->model->job, (size_t)run, p) - a->mounted[p];
    double now = objective(a, a->forms, w);
    double best = objective(a, a->forms, a->placed_weights);
    *as_good = now - best <= answer_noise(a, a->placed_weights);
    free(w);
    return now < nothing / 4; /* half the amplitude: our choice, a trial rarely does as well */
}

bool answer_helps(const struct answer *a)
{
    return a->placed && a->placement.best.count > 0;
}
