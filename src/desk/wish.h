/* wish.h - the sheet's words for a run as what is asked of a recording. */
#ifndef LOPSIDE_DESK_WISH_H
#define LOPSIDE_DESK_WISH_H

#include "read/recording.h"
#include "sheet/sheet.h"

struct wish {
    struct recording_wish recording;  /* without digests */
    struct recording_column *columns; /* owned: the sensors that are on, then the tacho */
    int *sensors;                     /* owned, one a column: the sensor's index, -1: the tacho */
    int tacho;                        /* the tacho's column; -1: none */
    char **paths;                     /* owned: openable from here */
};

/* The files of run `run`; or, with `path`, that recording alone, laid out as [recording] says.
 * Borrows from the sheet. 0, or -1 when memory is out. */
int wish_init(struct wish *wish, const struct sheet *sheet, size_t run, const char *path)
    __attribute__((warn_unused_result));

/* The plane for whose weights no run gives any, where a trial is needed: there are several runs, and no
 * stored response that could stand in for it; NULL: all is well. Borrowed. */
const char *wish_lacks_weight(const struct job *job);
void wish_release(struct wish *wish); /* also after a failed wish_init */

#endif
