/* moved.h - tape, sensors and cables: was something moved between the runs? */
#ifndef LOPSIDE_VET_MOVED_H
#define LOPSIDE_VET_MOVED_H

#include "vet/facts.h"
#include "vet/findings.h"

/* Checks tape-moved, sensor-swapped, sensor-turned (suspects.h) on the usable readings with phase
 * of every condition, in the order of recording where all its runs tell `when`, else of the sheet.
 * They want runs to spare that would show it, whichever run it was moved before (suspects.h,
 * `hidden`); where some condition's would not, one finding without a figure says so in place of
 * those that are in order. The figure is how many times better the runs would fit. A pair of
 * sensors may have been exchanged where both measure the same quantity. Made before `repeat`, whose
 * refusals would hide what they look for. */
void moved_check(struct vet_runs *runs, const size_t *order, const struct job *job,
                 struct findings *findings);

#endif
