/* adopt.h - recordings on the command line become runs of a sheet.
 */
#ifndef LOPSIDE_READ_ADOPT_H
#define LOPSIDE_READ_ADOPT_H

#include <stddef.h>

#include "sheet/sheet.h"

/* Puts the `count` (above 0) recordings in the place of the sheet's runs: each is a run of
 * condition `service` without weights, named as names.h says, laid out as [recording], with the
 * sensors' own channels and scales. The paths are copied as they stand, and no run counts as
 * mounted. Returns 0; -1 when memory is out, and then the sheet is as it was. */
int adopt_recordings(struct sheet *sheet, char *const *paths, size_t count)
    __attribute__((warn_unused_result));

#endif
