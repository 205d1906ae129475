/* sheet_lines.h - the text of a sheet as sections and entries, each with its line.
 *
 * inih splits the lines; a reader of ours feeds it one cleaned `key = value` line at a time, so that
 * it can neither cut a line, glue an indented one to the one before, take a `;` for a comment nor
 * lose a line's number. Section headers, comments, quotes and the check for text are ours.
 */
#ifndef LOPSIDE_SHEET_SHEET_LINES_H
#define LOPSIDE_SHEET_SHEET_LINES_H

#include <stdbool.h>
#include <stddef.h>

#include "sheet/sheet_errors.h"

#define SHEET_LINE_MOST 4000          /* bytes of one line; a longer one is an error, never cut */
#define SHEET_BYTES_MOST (1 << 20)    /* bytes of one sheet */
#define SHEET_SECTIONS_MOST 1000
#define SHEET_ENTRIES_MOST 10000
#define SHEET_NO_SECTION ((size_t)-1)

struct sheet_key; /* see sheet_keys.h */

struct sheet_section {
    char *text;     /* owned: what stands between the brackets, blanks at the ends off */
    int kind;       /* enum sheet_kind, filled by sheet_keys_check; -1: not usable */
    const char *name; /* borrowed from text: "DE-V" of [sensor DE-V]; "" */
    int line;
    size_t entries; /* lines in it that are neither blank nor comment, right or wrong */
};

struct sheet_entry {
    char *text;      /* owned: the key as written */
    char *value;     /* owned: quotes taken off */
    size_t section;  /* index */
    int line;
    const struct sheet_key *key; /* filled by sheet_keys_check; NULL: not usable */
    const char *subject; /* borrowed from text: "wheel" of `weight wheel`; "" */
};

struct sheet_lines {
    struct sheet_section *sections; /* owned */
    size_t section_count;
    struct sheet_entry *entries;    /* owned, in the order of lines */
    size_t entry_count;
};

/* Splits `text` (length bytes, any content). A line that is wrong goes to `errors`, the rest is
 * still read; a file that is not text at all is one error and no lines. */
void sheet_lines_split(struct sheet_lines *lines, char *text, size_t length,
                       struct sheet_errors *errors);
void sheet_lines_release(struct sheet_lines *lines);

#endif
