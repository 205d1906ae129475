/* nearest.h - of the names that there are, the one that was perhaps meant by a wrong one. */
#ifndef LOPSIDE_BASE_NEAREST_H
#define LOPSIDE_BASE_NEAREST_H

#include <stddef.h>

#define NEAREST_ROOM 160 /* bytes that hold a hint */

/* " (did you mean 'X'?)" for the name that is at most two letters from `wrong` (one, where that is shorter
 * than four), case aside, into room of NEAREST_ROOM bytes; "" where none is or it does not fit. Of equally near
 * ones the first counts. Returns `room`. `count` may be 0. */
const char *nearest_hint(const char *wrong, const char *const *names, size_t count, char *room);

/* The same for a path to a file that is not there, of the files in its folder; X is the file's name without the
 * folder. A file of the same name with another ending is near, too; hidden files are not. "" where the
 * folder cannot be read. */
const char *nearest_file(const char *path, char *room);

#endif
