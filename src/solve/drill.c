#include "solve/drill.h"

#include <math.h>

#include "base/angle.h"

double drill_mass(double hole, double density, double depth)
{
    if (!(hole > 0) || !(density > 0) || !(depth > 0))
        return INFINITY;
    return density * PI / 4 * hole * hole * depth;
}

double drill_depth(double hole, double density, double mass)
{
    if (!(hole > 0) || !(density > 0))
        return NAN;
    return mass / (density * PI / 4 * hole * hole);
}
