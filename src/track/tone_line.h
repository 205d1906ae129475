/* tone_line.h - lines of a spectrum without a tacho: which one is the shaft's, and where it is now.
 */
#ifndef LOPSIDE_TRACK_TONE_LINE_H
#define LOPSIDE_TRACK_TONE_LINE_H

#include <stdbool.h>
#include <stddef.h>

#define TONE_LINE_RIVAL                                                                            \
    0.5 /* amplitude that makes another line a rival: common sense, no source                      \
         */

struct tone_line {
    double hz;
    double rival_hz, rival; /* strongest line that makes it doubtful, amplitude as a share of the
                             * line's; 0: none */
};

/* The shaft's line in `sensors` planes of `n` samples, planes `room` apart, at rate_hz. Spectra are
 * taken as velocities (`derivatives` per sensor), each by its own total, and summed.
 * service_hz known: the strongest line within 10 % of it; rivals are all lines from a third to five
 * times it that are half as large or more. NaN: the strongest line of all; lines at its half or
 * third of a tenth its size are rivals, too. Returns 0 and *found; -1 when memory is out. *found is
 * false where no line stands out from the noise about it, where n < 64, or where a sample is not
 * finite. */
int tone_line_search(struct tone_line *line, bool *found, const float *data, size_t sensors,
                     size_t room, size_t n, const int *derivatives, double rate_hz,
                     double service_hz) __attribute__((warn_unused_result));

/* The amplitude (peak) at `hz` of n samples, their mean taken off, through a Hann window. */
double tone_line_amplitude(const float *x, size_t n, double hz, double rate_hz);

/* Where near `hz` (within `reach` Hz) the sensors together are largest. */
double tone_line_follow(const float *data, size_t sensors, size_t room, size_t n, double hz,
                        double reach, double rate_hz);

#endif
