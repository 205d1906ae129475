/* test_place_brute.h - placements by plain enumeration, written apart from the search it judges. */
#ifndef LOPSIDE_TESTS_PLACE_BRUTE_H
#define LOPSIDE_TESTS_PLACE_BRUTE_H

#include <stdint.h>

#include "solve/place.h"

#define BRUTE_PLANES 3

struct brute {
    double best[PLACE_PIECES_MOST + 1]; /* for at most k pieces a plane */
    double three[PLACE_PIECES_MOST + 1][3]; /* the three least J among at most k pieces a plane */
    int most;
};

/* J of weights w[planes]: x^H F x summed, or the largest row. */
double brute_value(const struct place_problem *problem, const double complex *forms,
                   const double complex *w, size_t *worst_row);

/* All placements of a problem whose planes have positions and stock. */
void brute_search(const struct place_problem *problem, struct brute *result);

/* The weights of a choice, from its items' angles and masses only. */
void brute_weights(const struct place_problem *problem, const struct place_choice *choice,
                   double complex *w);

/* A repeatable generator (Knuth's MMIX multiplier and increment), uniform in [0, 1) and Gaussian. */
double random_uniform(uint64_t *state);
double random_normal(uint64_t *state);

/* Random forms: J_r = |z + A w|^2 certain, plus an uncertain part; forms and certain have room for rows x (P+1)^2.
 * responses' size is `response` per kg against vibration of size 1. */
void random_forms(uint64_t *state, size_t planes, size_t rows, double response, double unsure,
                  double complex *forms, double complex *certain);

#endif
