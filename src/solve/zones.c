#include "solve/zones.h"

#include <math.h>

void zones_limits(int group, bool flexible, bool displacement, double limits[3])
{
    static const double velocity[2][2][3] = {{{2.3, 4.5, 7.1}, {3.5, 7.1, 11.0}}, /* mm/s rms */
                                             {{1.4, 2.8, 4.5}, {2.3, 4.5, 7.1}}};
    static const double length[2][2][3] = {{{29, 57, 90}, {45, 90, 140}}, /* um rms */
                                           {{22, 45, 71}, {37, 71, 113}}};
    for (int i = 0; i < 3; i++)
        limits[i] = displacement ? 1e-6 * length[group - 1][flexible][i]
                                 : 1e-3 * velocity[group - 1][flexible][i];
}

char zones_of(double rms, const double limits[3])
{
    if (isnan(rms))
        return '?';
    return rms <= limits[0] ? 'A' : rms <= limits[1] ? 'B' : rms <= limits[2] ? 'C' : 'D';
}
