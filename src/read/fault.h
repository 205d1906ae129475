/* fault.h - why a recording could not be read: an exit code and one line without the stage's name.
 */
#ifndef LOPSIDE_READ_FAULT_H
#define LOPSIDE_READ_FAULT_H

#include "base/status.h"

#define FAULT_ROOM 400 /* what a `finding` record takes */

struct fault {
    int status;            /* STATUS_DONE: nothing is wrong */
    char text[FAULT_ROOM]; /* cause first, then the name in quotes, then the place */
};

/* Notes a fault; the first one wins. Returns the status that is kept, never STATUS_DONE. A longer
 * text is cut. */
int fault_set(struct fault *fault, int status, const char *format, ...)
    __attribute__((format(printf, 3, 4)));

/* The same for a failed allocation. */
int fault_no_memory(struct fault *fault);

#endif
