/* names.h - names of runs from the paths of their recordings. */
#ifndef LOPSIDE_READ_NAMES_H
#define LOPSIDE_READ_NAMES_H

#include <stddef.h>

#define NAMES_ROOM 41 /* names are up to 40 bytes */

/* One name a path, all different: the file's stem; where stems are equal, with as many parts of the
 * path before it as tell them apart; where paths differ only in their ending, with the ending.
 * Longer than 40 bytes: head and tail with `~` between. What no name may hold (control characters,
 * `: = ; # ]`, bytes that are not UTF-8, blanks at the ends) becomes `_`. Equal names that are left
 * get ~2, ~3, ... 0, or -1 when memory is out. */
int names_from_paths(char *const *paths, size_t count, char (*names)[NAMES_ROOM])
    __attribute__((warn_unused_result));

/* Replaces bytes of `text` that are not UTF-8 by '?', in place. */
void names_make_utf8(char *text);

#endif
