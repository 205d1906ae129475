/* answer.h - from fitted rows to weights, placement and forecast. */
#ifndef LOPSIDE_SOLVE_ANSWER_H
#define LOPSIDE_SOLVE_ANSWER_H

#include <complex.h>
#include <stdbool.h>
#include <stddef.h>

#include "solve/menu.h"
#include "solve/model.h"
#include "solve/place.h"

struct answer_zone { /* of ISO 20816-3; rms, SI */
    bool given;
    enum quantity quantity;
    double before, after, limits[3];
    bool overall; /* false: of 1x alone */
};

struct answer_forecast {
    const struct model_row *row; /* borrowed */
    double complex before, after;
    double variance; /* complex, of the next reading about `after` */
    double range[2]; /* 95 % of the next reading, SI peak */
    double chance;   /* NaN without a target */
    struct answer_zone zone;
};

struct answer_residual { /* kg m; NaN: not known */
    double before, after, after_95, permissible;
};

struct answer {
    const struct model *model;    /* borrowed */
    int base;                     /* run whose weights stay on; -1: all is relative to as found */
    size_t planes, rows;          /* rows: in the aim and good */
    const struct model_row **row; /* owned array of borrowed rows */
    struct posterior *posterior;  /* owned: rows, relative to what is mounted */
    double *scale;                /* owned: 1/SI, makes rows comparable */
    double *se;              /* owned: SI, root of the complex variance of a reading of the row */
    double complex *mounted; /* owned: planes, what stays on, kg */
    double complex *weights; /* owned: planes, the ideal weight to add, kg */
    double complex *full; /* owned: planes, the ideal weight without regard to what comes first */
    bool static_only;     /* `weights` are the static part alone; the couple comes later */
    double complex static_alone; /* kg m, two planes: the best of both planes alike */
    double left_alone, left;   /* root of expected squared vibration over that of now; two planes */
    double complex *classical; /* owned: planes, least squares */
    double *ellipse;           /* owned: (2 planes)^2 covariance of `classical`, widened where the
                                  scatter is of few degrees of freedom: chi-square's 95 % then holds */
    double condition;          /* number; INFINITY where there are fewer rows than planes */
    double complex *weak;      /* owned: planes, the pattern of weights seen least */
    double complex *forms;     /* owned: rows x (planes+1)^2 */
    double complex *certain;   /* owned: the same without what is not known */
    double floor;              /* of the noise, J units (place.h) */
    struct place_result placement; /* owned */
    bool placed;
    bool opposed; /* pieces of the placement work against each other, or partly do (lighter.h) */
    bool has_unopposed;                /* there is an answer where none do, or with less mass */
    struct place_result unopposed;     /* owned: that answer */
    double complex *placed_weights;    /* owned: planes */
    struct answer_forecast *forecasts; /* owned: one a good row of the model, aim or not */
    size_t forecast_count;
    struct answer_residual *residuals; /* owned: planes */
    bool has_residual;
    char basis[120]; /* of the permissible residual */
};

enum answer_error { ANSWER_OK = 0, ANSWER_NO_MEMORY = -1, ANSWER_FAILED = -2 };

/* Gathers the rows, rebases them to aim.mounted, scales them: each relative to its target where one
 * has a target, else in the shown quantity if all share it, else relative to as found. Judges the
 * condition number. */
int answer_init(struct answer *answer, const struct model *model)
    __attribute__((warn_unused_result));
/* The same relative to run `base` (-1: to as found) instead of aim.mounted. */
int answer_init_at(struct answer *answer, const struct model *model, int base)
    __attribute__((warn_unused_result));
void answer_release(struct answer *answer); /* safe on a zeroed struct */

/* The least-squares and the ideal weight. Needs a finite condition number. */
int answer_correct(struct answer *answer) __attribute__((warn_unused_result));

/* What to fit now: the ideal weight where every plane takes any mass at any angle, else the search.
 */
int answer_place(struct answer *answer) __attribute__((warn_unused_result));

/* The search over all that the sheet allows, on plane p within arc[p] where that is less than all
 * around; arc NULL: everywhere. nodes: as in place.h. *done: `found` is to be released. */
int answer_search(const struct answer *answer, const struct menu_arc *arc, long nodes,
                  struct place_result *found, bool *done) __attribute__((warn_unused_result));

/* The noise of the placement's rule (place.h) about the weights w (planes). */
double answer_noise(const struct answer *answer, const double complex *w);

/* Run `run` carries weights that were meant to correct: they leave less than half of the as-found
 * vibration (aim.mounted unset: everything could come off). *as_good: what is placed beats them by
 * no more than the noise. False: no memory, or no such run. */
bool answer_corrected_by(const struct answer *answer, int run, bool *as_good);

/* True where something placed lowers the expected vibration beyond the noise. */
bool answer_helps(const struct answer *answer);

#endif
