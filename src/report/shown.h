/* shown.h - numbers of the stream in the units of people, with their 95 % half widths. */
#ifndef LOPSIDE_REPORT_SHOWN_H
#define LOPSIDE_REPORT_SHOWN_H

#include <complex.h>
#include <stdbool.h>

#include "report/digits.h"
#include "stream/job.h"

struct shown {
    double amplitude; /* in the show unit and detection */
    double half;      /* 95 % half width of it; NaN: not known */
    double lag_deg;   /* of the shown quantity; NaN: no phase */
    double lag_half;  /* 95 % half width, deg; NaN: not known */
    bool lag_open;    /* the half width is 90 deg or more: the lag says nothing */
};

/* Student's t for a two-sided 95 % range with `freedom` degrees of freedom (need not be whole).
 * Cornish-Fisher expansion (Abramowitz & Stegun 26.7.5) from 4 on, to 0.002; between the tabulated
 * values for 1 to 4 linear in 1/freedom. Below 1 as for 1; NaN or infinite: the normal 1.96. */
double shown_t95(double freedom);

/* The 1x vector `z` (SI peak, lag) of quantity `from` at `rpm` as `show` shows it. cov: [var re,
 * cov, var im] of z, NULL: not known; all zero counts as not known. `freedom`: see shown_t95. The
 * half widths are those along and across the vector, linearised. Where `from` is not the shown
 * quantity and rpm is not above zero: NaN. */
struct shown shown_vector(double complex z, const double cov[3], enum quantity from, double rpm,
                          const struct show *show, double freedom);

/* An amplitude (SI peak) alone; lag NaN. `half` SI peak, NaN: not known. */
struct shown shown_amplitude(double peak, double half, enum quantity from, double rpm,
                             const struct show *show);

/* Mass in the job's unit system: kg to g or oz, "g" or "oz". */
double shown_mass(const struct job *job, double kg);
const char *shown_mass_unit(const struct job *job);

/* Unbalance: kg m to g mm or oz in. */
double shown_unbalance(const struct job *job, double kgm);
const char *shown_unbalance_unit(const struct job *job);

/* A speed in rpm: whole, or tenths below 100 rpm. Returns text (DIGITS_ROOM bytes). */
char *shown_speed(char *text, double rpm);

/* A force, three significant digits, "592 N" or "592 N (133 lbf)"; text of 2*DIGITS_ROOM bytes. */
char *shown_force(const struct job *job, char *text, double newton);

#endif
