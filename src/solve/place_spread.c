/* place_spread.c - see place_spread.h. */
#include "solve/place_spread.h"

#include <math.h>
#include <stdlib.h>
#include <string.h>

#include "solve/place_kept.h"
#include "solve/place_relax.h"

#define FINE 1e-9      /* of norm: as in place_kept.c */
#define CRUMB 1e-6     /* of a plane's mass: smaller parts are left out where that costs nothing */

enum { OPEN, IN, OUT };

static void clear_load(struct place_load *load)
{
    *load = (struct place_load){0};
    memset(load->item, 0xff, sizeof load->item);
}

/* The positions that may carry something now, and how much. */
static size_t usable(const struct place_site *site, size_t *index, double complex *e, double *cap)
{
    size_t in = 0, n = 0;
    for (size_t i = 0; i < site->positions; i++) {
        in += site->state[i] == IN;
    }
    bool closed = in >= (size_t)site->pieces;
    for (size_t i = 0; i < site->positions; i++) {
        if (site->state[i] == IN || (site->state[i] == OPEN && !closed)) {
            index[n] = i;
            cap[n] = site->caps[i];
            e[n++] = site->e[i];
        }
    }
    return n;
}

static int region_of(const struct place_site *site, struct place_region *region)
{
    if (site->kind == PLACE_ANYWHERE) {
        place_region_disc(region, site->region.radius);
        return 0;
    }
    size_t *index = malloc((site->positions + 1) * sizeof *index);
    double complex *e = malloc((site->positions + 1) * sizeof *e);
    double *cap = malloc((site->positions + 1) * sizeof *cap);
    int result = -1;
    *region = (struct place_region){0};
    if (index != NULL && e != NULL && cap != NULL) {
        size_t n = usable(site, index, e, cap);
        result = place_region_polygon(region, e, n, cap, site->total);
    }
    free(cap);
    free(e);
    free(index);
    return result;
}

/* Masses at positions for the weight w; m[positions] is written. */
static int masses_for(const struct place_site *site, double complex w, double *m, bool *possible)
{
    size_t *index = malloc((site->positions + 1) * sizeof *index);
    double complex *e = malloc((site->positions + 1) * sizeof *e);
    double *part = malloc((site->positions + 1) * sizeof *part);
    double *cap = malloc((site->positions + 1) * sizeof *cap);
    int result = -1;
    if (index != NULL && e != NULL && part != NULL && cap != NULL) {
        size_t n = usable(site, index, e, cap);
        *possible = place_region_split(e, n, cap, w, part);
        double sum = 0;
        memset(m, 0, site->positions * sizeof *m);
        for (size_t i = 0; i < n; i++) {
            m[index[i]] = part[i];
            sum += part[i];
        }
        for (size_t i = 0; i < site->positions; i++) {
            m[i] *= sum > site->total ? site->total / sum : 1;
        }
        result = 0;
    }
    free(cap);
    free(part);
    free(e);
    free(index);
    return result;
}

static void load_masses(const struct place_site *site, const double *m, double least,
                        struct place_load *load)
{
    size_t n = 0;
    clear_load(load);
    for (size_t i = 0; i < site->positions && n < PLACE_PIECES_MOST; i++) {
        if (m[i] > least) {
            load->item[n] = (uint32_t)i;
            load->mass[n++] = m[i];
            load->w += m[i] * site->e[i];
        }
    }
}

static size_t used(const double *m, size_t count, double least)
{
    size_t n = 0;
    for (size_t i = 0; i < count; i++) {
        n += m[i] > least;
    }
    return n;
}

static double total_of(const double *m, size_t count)
{
    double sum = 0;
    for (size_t i = 0; i < count; i++) {
        sum += m[i];
    }
    return sum;
}

/* A position to decide next: `open` that carries most; SIZE_MAX where none does. */
static size_t heaviest_open(const struct place_site *site, const double *m)
{
    size_t best = SIZE_MAX;
    for (size_t i = 0; i < site->positions; i++) {
        if (site->state[i] == OPEN && m[i] > 0 && (best == SIZE_MAX || m[i] > m[best])) {
            best = i;
        }
    }
    return best;
}

static int explore(struct place_hunt *hunt, size_t depth, const struct place_form *form);

/* One piece: it stands on one side of the relaxed weight's direction or on the other. */
static int take_sides(struct place_hunt *hunt, size_t depth, const struct place_form *form,
                      struct place_site *site, double complex w)
{
    unsigned char *before = malloc(site->positions);
    if (before == NULL) {
        return -1;
    }
    int result = 0;
    memcpy(before, site->state, site->positions);
    for (int side = 0; side < 2 && result == 0; side++) {
        for (size_t i = 0; i < site->positions; i++) {
            bool left = cimag(conj(w) * site->e[i]) >= 0;
            site->state[i] = before[i] == OPEN && left == (side == 0) ? OUT : before[i];
        }
        result = explore(hunt, depth, form);
    }
    memcpy(site->state, before, site->positions);
    free(before);
    return result;
}

static int decide(struct place_hunt *hunt, size_t depth, const struct place_form *form,
                  struct place_site *site, size_t position)
{
    int result = 0;
    for (int way = IN; way <= OUT && result == 0; way++) {
        site->state[position] = (unsigned char)way;
        result = explore(hunt, depth, form);
    }
    site->state[position] = OPEN;
    return result;
}

struct branch {
    struct place_site *site; /* NULL: nothing left to decide */
    size_t position;
    bool sides;       /* by side of `w` rather than by position */
    double complex w;
};

/* Offers the relaxed weights w[], as masses; tells where to split next. */
static int use_relaxed(struct place_hunt *hunt, size_t depth, const struct place_form *form,
                       double complex *w, struct branch *branch, double *value)
{
    bool fits = true;
    struct branch crowded = {0}, open = {0};
    for (size_t q = 0; q < form->planes; q++) {
        struct place_site *site = &hunt->site[depth + q];
        struct place_load *load = &hunt->load[depth + q];
        clear_load(load);
        if (site->kind == PLACE_ANYWHERE) {
            if (cabs(w[q]) > 1e-12 * site->region.radius) {
                load->item[0] = 0;
                load->mass[0] = cabs(w[q]);
                load->w = w[q];
            }
            continue;
        }
        double *m = malloc((site->positions + 1) * sizeof *m);
        bool possible = false;
        if (m == NULL || masses_for(site, w[q], m, &possible) != 0) {
            free(m);
            return -1;
        }
        double least = CRUMB * total_of(m, site->positions);
        size_t at = heaviest_open(site, m);
        if (!possible || used(m, site->positions, least) > (size_t)site->pieces) {
            fits = false;
            if (at != SIZE_MAX) {
                crowded = (struct branch){site, at, possible && site->pieces == 1, w[q]};
            }
        } else {
            load_masses(site, m, least, load);
        }
        if (at != SIZE_MAX && m[at] > least) {
            open = (struct branch){site, at, false, w[q]};
        }
        free(m);
    }
    if (fits) {
        for (size_t q = 0; q < form->planes; q++) {
            w[q] = hunt->load[depth + q].w;
        }
        *value = place_form_worst(form, w, NULL);
        place_kept_offer(hunt, *value);
    }
    *branch = crowded.site != NULL ? crowded : open;
    return 0;
}

static int explore(struct place_hunt *hunt, size_t depth, const struct place_form *form)
{
    size_t n = form->planes, ready = 0;
    struct place_region *region = calloc(n, sizeof *region);
    double complex *w = malloc(n * sizeof *w);
    double *lambda = malloc(form->rows * sizeof *lambda);
    struct branch branch = {0};
    double bound = -INFINITY;
    int result = region == NULL || w == NULL || lambda == NULL ? -1 : 0;
    while (result == 0 && ready < n) {
        result = region_of(&hunt->site[depth + ready], &region[ready]);
        ready++;
    }
    hunt->nodes -= 3 * place_relax_nodes(form); /* with the polygons */
    double cutoff = place_kept_cutoff(hunt);
    if (result == 0) {
        result = place_relax(form, region, hunt->norm, 0, cutoff, w, lambda, &bound);
    }
    if (result == 0 && bound < cutoff) {
        double value = INFINITY;
        result = use_relaxed(hunt, depth, form, w, &branch, &value);
        if (branch.site == NULL && value - bound > FINE * hunt->norm) {
            hunt->lost = fmin(hunt->lost, bound); /* a relaxation that did not converge proves only this */
        }
    }
    for (size_t q = 0; q < ready; q++) {
        place_region_release(&region[q]);
    }
    free(lambda);
    free(w);
    free(region);
    if (result != 0 || branch.site == NULL || bound >= place_kept_cutoff(hunt)) {
        return result;
    }
    if (hunt->nodes <= 0) {
        hunt->lost = fmin(hunt->lost, bound);
        return 0;
    }
    double lost = hunt->lost;
    hunt->lost = INFINITY;
    result = branch.sides ? take_sides(hunt, depth, form, branch.site, branch.w)
                          : decide(hunt, depth, form, branch.site, branch.position);
    hunt->lost = fmin(lost, fmax(hunt->lost, bound));
    return result;
}

int place_spread(struct place_hunt *hunt, size_t depth, const struct place_form *form)
{
    for (size_t q = 0; q < form->planes; q++) {
        struct place_site *site = &hunt->site[depth + q];
        if (site->kind == PLACE_POSITIONS) {
            for (size_t i = 0; i < site->positions; i++) {
                site->state[i] = site->caps[i] > 0 ? OPEN : OUT;
            }
        }
    }
    return explore(hunt, depth, form);
}
