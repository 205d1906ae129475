/* status.h - the exit codes of every stage, and the result of every call that can fail.
 *
 * The numbers are the program's exit codes and part of its contract. Kernels return their own
 * small codes (0 is success); stages turn those into one of these.
 */
#ifndef LOPSIDE_BASE_STATUS_H
#define LOPSIDE_BASE_STATUS_H

enum status {
    STATUS_DONE = 0,      /* nothing refused; cautions may be listed */
    STATUS_SYSTEM = 1,    /* write error, no memory, input ended early */
    STATUS_USAGE = 2,     /* misuse of the command, or a job sheet that is wrong */
    STATUS_RECORDING = 3, /* a recording is unreadable, cut short, or lacks what the sheet names */
    STATUS_REFUSED = 4,   /* readings not fit to balance on */
    STATUS_UNSOLVED = 5   /* no correction exists */
};

#endif
