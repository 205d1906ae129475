/* angle.h - angles in degrees and complex vectors. Lag is the argument of a 1x vector. */
#ifndef LOPSIDE_BASE_ANGLE_H
#define LOPSIDE_BASE_ANGLE_H

#include <complex.h>

#define PI 3.14159265358979323846

double angle_wrap_360(double deg);  /* to [0, 360); NaN stays NaN */
double angle_wrap_180(double deg);  /* to (-180, 180] */
double angle_of(double complex z);  /* argument in [0, 360) deg; 0 for z = 0 */
double complex angle_vector(double amplitude, double deg); /* amplitude * exp(j*deg) */

#endif
