/* optical.h - what a fixed optical tacho gives while a tape turns past it.
 *
 * The pulse's half height is exactly where the tape's edge passes the middle of the tacho's spot.
 * Everything that spoils pulses in the field can be switched on.
 */
#ifndef LOPSIDE_SIM_OPTICAL_H
#define LOPSIDE_SIM_OPTICAL_H

#include <stdint.h>

#include "rotor.h"

struct optical {
    double low_v, high_v;     /* level beside and on the tape; high below low: an inverted pulse */
    double edge_s;            /* time that an edge takes, > 0 */
    double ac_s;              /* time constant of AC coupling; 0: none */
    double noise_v;           /* standard deviation */
    double missing, extra;    /* chance per turn of a lost and of a false pulse, [0, 1] */
    long gap_from, gap_turns; /* pulses of these turns are lost; gap_turns 0: none */
    double scratch_deg, scratch_width_deg, scratch_height; /* on the body; height 0: none */
    int teeth;                                             /* ripple of a toothed wheel; 0: none */
    double ripple;                                         /* its height, of the pulse's */
    double grow_rpm; /* > 0: pulses are as high as speed/grow_rpm */
};

/* n samples at rate_hz into volts[i * stride]. */
void optical_run(const struct optical *optical, const struct rotor *rotor, uint64_t seed,
                 double rate_hz, size_t n, double *volts, size_t stride);

#endif
