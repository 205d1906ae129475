/* place_setup.c - see place_setup.h. */
#include "solve/place_setup.h"

#include <math.h>
#include <stdlib.h>
#include <string.h>

#include "base/angle.h"

#define PART_SUMS 20000 /* sums in one tree; about 1.5 MB */
#define WHOLE_DEGREES 360
#define FAR 1e4 /* times the weight that alone makes `nothing`: no limit in practice (condition 1e4) */
#define NO_INFLUENCE 1e-24 /* of `nothing`, in J: below rounding of any vector */

static bool legal_plane(const struct place_plane *plane)
{
    bool ok = plane->pieces >= 1 && plane->pieces <= PLACE_PIECES_MOST && plane->most >= 0 &&
              plane->most_in_all >= 0 && (plane->sign == 1 || plane->sign == -1) &&
              (plane->positions == 0 || plane->angles_deg != NULL) &&
              (plane->stock == 0 || (plane->masses != NULL && plane->counts != NULL));
    for (size_t i = 0; ok && i < plane->positions; i++) {
        ok = isfinite(plane->angles_deg[i]);
    }
    for (size_t i = 0; ok && i < plane->stock; i++) {
        ok = plane->masses[i] > 0 && isfinite(plane->masses[i]) && plane->counts[i] >= -1;
    }
    size_t items = plane->stock * (plane->positions ? plane->positions : WHOLE_DEGREES);
    return ok && items < 1000000;
}

static bool legal_forms(const double complex *forms, size_t rows, size_t n)
{
    for (size_t r = 0; r < rows; r++) {
        for (size_t i = 0; i < n * n; i++) {
            double complex f = forms[r * n * n + i];
            if (!isfinite(creal(f)) || !isfinite(cimag(f)) ||
                (i % (n + 1) == 0 && creal(f) < 0)) {
                return false;
            }
        }
    }
    return true;
}

bool place_setup_legal(const struct place_problem *problem)
{
    if (problem == NULL || problem->rows == 0 || problem->forms == NULL ||
        problem->certain == NULL || (problem->planes > 0 && problem->plane == NULL) ||
        !(problem->floor >= 0) || isinf(problem->floor)) {
        return false;
    }
    for (size_t p = 0; p < problem->planes; p++) {
        if (!legal_plane(&problem->plane[p])) {
            return false;
        }
    }
    return legal_forms(problem->forms, problem->rows, problem->planes + 1) &&
           legal_forms(problem->certain, problem->rows, problem->planes + 1);
}

static enum place_kind kind_of(const struct place_plane *plane)
{
    return plane->stock > 0 ? PLACE_PIECES : plane->positions > 0 ? PLACE_POSITIONS : PLACE_ANYWHERE;
}

static double nothing_of(const struct place_problem *problem)
{
    size_t n = problem->planes + 1;
    double nothing = 0;
    for (size_t r = 0; r < problem->rows; r++) {
        double j = creal(problem->forms[r * n * n]);
        nothing = problem->worst ? fmax(nothing, j) : nothing + j;
    }
    return nothing;
}

/* The largest curvature of any row in plane p. */
static double curvature(const struct place_problem *problem, size_t p)
{
    size_t n = problem->planes + 1;
    double most = 0;
    for (size_t r = 0; r < problem->rows; r++) {
        most = fmax(most, creal(problem->forms[r * n * n + (p + 1) * (n + 1)]));
    }
    return most;
}

static double heaviest(const struct place_plane *plane)
{
    double mass = plane->stock > 0 ? 0 : fmin(plane->most, plane->most_in_all);
    for (size_t i = 0; i < plane->stock; i++) {
        mass = fmax(mass, plane->masses[i]);
    }
    return mass;
}

static bool matters(const struct place_problem *problem, size_t p)
{
    double mass = heaviest(&problem->plane[p]) * problem->plane[p].pieces;
    double j = curvature(problem, p);
    if (j == 0 || mass == 0) {
        return false;
    }
    return isinf(mass) || j * mass * mass > NO_INFLUENCE * nothing_of(problem);
}

static int init_site(struct place_site *site, const struct place_problem *problem, size_t p)
{
    const struct place_plane *plane = &problem->plane[p];
    *site = (struct place_site){.kind = kind_of(plane), .plane = p, .positions = plane->positions};
    if (site->kind == PLACE_PIECES && site->positions == 0) {
        site->positions = WHOLE_DEGREES;
    }
    site->e = malloc((site->positions + 1) * sizeof *site->e);
    site->state = calloc(site->positions + 1, 1);
    site->caps = calloc(site->positions + 1, sizeof *site->caps);
    if (site->e == NULL || site->state == NULL || site->caps == NULL) {
        return -1;
    }
    for (size_t i = 0; i < site->positions; i++) {
        double deg = plane->positions > 0 ? plane->angles_deg[i] : (double)i;
        site->e[i] = plane->sign * angle_vector(1, deg);
    }
    site->stock = (struct place_stock){site->positions, plane->stock, site->e, plane->masses,
                                       plane->counts, plane->most, plane->most_in_all, plane->held};
    return 0;
}

/* The rows over the sites only, Hermitian to the last bit, summed unless the worst counts. */
static int init_form(struct place_hunt *hunt, const struct place_problem *problem)
{
    size_t n = problem->planes + 1, m = hunt->sites + 1;
    if (place_form_init(&hunt->form, hunt->sites, problem->worst ? problem->rows : 1) != 0) {
        return -1;
    }
    for (size_t r = 0; r < problem->rows; r++) {
        const double complex *f = problem->forms + r * n * n;
        double complex *t = hunt->form.f + (problem->worst ? r : 0) * m * m;
        for (size_t i = 0; i < m; i++) {
            size_t a = i ? hunt->site[i - 1].plane + 1 : 0;
            for (size_t j = 0; j < m; j++) {
                size_t b = j ? hunt->site[j - 1].plane + 1 : 0;
                t[i * m + j] += 0.5 * (f[a * n + b] + conj(f[b * n + a]));
            }
        }
    }
    return 0;
}

/* No weight of any use on site s is larger: where the rows' sum exceeds rows * nothing, the worst exceeds
 * nothing, and both 0 and the weight lie in that ellipsoid, whose half-width is sqrt(rows * nothing / stiffness). */
static int limit_site(struct place_hunt *hunt, const struct place_problem *problem, size_t s)
{
    struct place_site *site = &hunt->site[s];
    struct place_form sum = {0};
    size_t n = hunt->sites + 1;
    if (place_form_init(&sum, hunt->sites, 1) != 0) {
        return -1;
    }
    for (size_t r = 0; r < hunt->form.rows; r++) {
        for (size_t i = 0; i < n * n; i++) {
            /* Sites 0 and s change places. */
            size_t a = i / n, b = i % n;
            a = a == 1 ? s + 1 : a == s + 1 ? 1 : a;
            b = b == 1 ? s + 1 : b == s + 1 ? 1 : b;
            sum.f[i] += hunt->form.f[r * n * n + a * n + b];
        }
    }
    double stiffness = place_form_stiffness(&sum);
    double far = FAR * sqrt(hunt->norm / curvature(problem, site->plane));
    if (stiffness > 0) {
        far = fmin(far, 2 * sqrt((double)hunt->form.rows * hunt->norm / stiffness));
    }
    site->total = fmin(problem->plane[site->plane].most_in_all, PLACE_PIECES_MOST * far);
    site->cap = fmin(problem->plane[site->plane].most, site->total);
    for (size_t i = 0; i < site->positions; i++) {
        double held = site->stock.held != NULL ? site->stock.held[i] : 0;
        site->caps[i] = fmax(0, fmin(site->stock.most - held, site->total));
    }
    place_form_release(&sum);
    return stiffness < 0 ? -1 : 0;
}

static int init_kept(struct place_hunt *hunt)
{
    size_t bytes = (hunt->sites + 1) * sizeof(struct place_load);
    hunt->load = malloc(bytes);
    bool short_of = hunt->load == NULL;
    for (size_t i = 0; i < PLACE_KEPT; i++) {
        hunt->kept[i].load = malloc(bytes);
        short_of = short_of || hunt->kept[i].load == NULL;
    }
    if (short_of) {
        return -1;
    }
    for (size_t i = 0; i < PLACE_KEPT; i++) {
        for (size_t s = 0; s <= hunt->sites; s++) {
            hunt->kept[i].load[s] = (struct place_load){0};
            memset(hunt->kept[i].load[s].item, 0xff, sizeof hunt->load->item);
        }
    }
    hunt->kept[0].value = hunt->norm;
    hunt->count = 1;
    return 0;
}

int place_setup_init(struct place_hunt *hunt, const struct place_problem *problem)
{
    *hunt = (struct place_hunt){.norm = nothing_of(problem)};
    hunt->site = calloc(problem->planes + 1, sizeof *hunt->site);
    if (hunt->site == NULL) {
        return -1;
    }
    for (int kind = PLACE_PIECES; kind <= PLACE_ANYWHERE; kind++) {
        for (size_t p = 0; hunt->norm > 0 && p < problem->planes; p++) {
            if ((int)kind_of(&problem->plane[p]) != kind || !matters(problem, p)) {
                continue;
            }
            hunt->fine = hunt->fine || kind != PLACE_PIECES || problem->plane[p].positions == 0;
            if (init_site(&hunt->site[hunt->sites++], problem, p) != 0) {
                return -1;
            }
        }
    }
    if (init_form(hunt, problem) != 0 || init_kept(hunt) != 0) {
        return -1;
    }
    for (size_t s = 0; s < hunt->sites; s++) {
        if (limit_site(hunt, problem, s) != 0) {
            return -1;
        }
    }
    return 0;
}

/* The pieces are shared out over trees of equal or nearly equal depth. */
static int grow_parts(struct place_site *site)
{
    size_t items = site->positions * site->stock.stock, pieces = (size_t)site->pieces;
    size_t deepest = 1;
    while (deepest < pieces && place_sums_size(items, deepest + 1) <= PART_SUMS) {
        deepest++;
    }
    site->part_count = (pieces + deepest - 1) / deepest;
    size_t large = pieces / site->part_count, over = pieces % site->part_count;
    for (size_t i = 0; i < 2; i++) {
        place_sums_release(&site->parts[i]);
    }
    for (size_t p = 0; p < site->part_count; p++) {
        site->part[p] = p < over ? 1 : 0;
    }
    if (over > 0 && place_sums_init(&site->parts[1], &site->stock, large + 1) != 0) {
        return -1;
    }
    return place_sums_init(&site->parts[0], &site->stock, large);
}

int place_setup_pieces(struct place_hunt *hunt, const struct place_problem *problem, int most)
{
    for (size_t s = 0; s < hunt->sites; s++) {
        struct place_site *site = &hunt->site[s];
        const struct place_plane *plane = &problem->plane[site->plane];
        site->pieces = most < plane->pieces ? most : plane->pieces;
        double total = site->total;
        if (site->kind == PLACE_PIECES) {
            total = fmin(total, site->pieces * heaviest(plane));
            if (grow_parts(site) != 0) {
                return -1;
            }
        } else {
            total = fmin(total, site->pieces * site->cap);
        }
        place_region_release(&site->region);
        if (site->kind == PLACE_ANYWHERE || plane->positions == 0) {
            double one = site->kind == PLACE_ANYWHERE ? site->cap : total;
            place_region_disc(&site->region, one);
        } else if (place_region_polygon(&site->region, site->e, site->positions, site->caps,
                                        total) != 0) {
            return -1;
        }
    }
    return 0;
}

void place_setup_release(struct place_hunt *hunt)
{
    for (size_t i = 0; i < PLACE_KEPT; i++) {
        free(hunt->kept[i].load);
    }
    free(hunt->load);
    place_form_release(&hunt->form);
    for (size_t s = 0; hunt->site != NULL && s < hunt->sites; s++) {
        struct place_site *site = &hunt->site[s];
        place_sums_release(&site->parts[0]);
        place_sums_release(&site->parts[1]);
        place_region_release(&site->region);
        free(site->caps);
        free(site->state);
        free(site->e);
    }
    free(hunt->site);
    *hunt = (struct place_hunt){0};
}
