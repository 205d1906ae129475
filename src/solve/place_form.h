/* place_form.h - the rows of the objective as quadratic forms, with some planes already settled.
 *
 * Row r over n planes with weights w is  J_r(w) = constant + 2 Re(sum conj(w_q) linear_q) + w^H Q w.
 * All rows lie in one block, each a Hermitian (n+1) x (n+1) matrix, row-major, index 0 the constant.
 */
#ifndef LOPSIDE_SOLVE_PLACE_FORM_H
#define LOPSIDE_SOLVE_PLACE_FORM_H

#include <complex.h>
#include <stddef.h>

struct place_form {
    size_t planes, rows;
    double complex *f; /* rows x (planes+1) x (planes+1); owned */
};

int place_form_init(struct place_form *form, size_t planes, size_t rows)
    __attribute__((warn_unused_result)); /* zeros; 0, or -1 when memory is short */
void place_form_release(struct place_form *form);

/* One row of w[planes]. */
double place_form_row(const struct place_form *form, size_t row, const double complex *w);

/* The largest row of w[planes]; `which` (may be NULL) gets its index. */
double place_form_worst(const struct place_form *form, const double complex *w, size_t *which);

/* Settles plane 0 at `w`: `to` (initialised, one plane less) gets what is left for planes 1.... */
void place_form_settle(const struct place_form *form, double complex w, struct place_form *to);

/* The rows summed with weights lambda[rows]: `to` (initialised, one row). */
void place_form_blend(const struct place_form *form, const double *lambda, struct place_form *to);

/* Half the gradient of row 0 at w in plane q: linear_q + (Q w)_q. */
double complex place_form_slope(const struct place_form *form, const double complex *w, size_t q);

/* Curvature of row 0 in plane 0 once the other planes follow it freely: the Schur complement, never above
 * the true one by more than rounding; 0 where it cannot be told. Or -1 when memory is short. */
double place_form_stiffness(const struct place_form *form);

#endif
