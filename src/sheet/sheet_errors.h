/* sheet_errors.h - the errors of a sheet, gathered in any order and told in the order of lines. */
#ifndef LOPSIDE_SHEET_SHEET_ERRORS_H
#define LOPSIDE_SHEET_SHEET_ERRORS_H

#include <stdbool.h>
#include <stddef.h>

#include "base/buffer.h"

/* No sheet has so many mistakes: what has is something else, and not worth more. */
#define SHEET_ERRORS_MOST 1000

struct sheet_error {
    int line;   /* 0: the sheet as a whole */
    char *text; /* owned: "cause: 'name'" */
};

struct sheet_errors {
    struct sheet_error *items; /* owned */
    size_t count, room;
    bool no_memory; /* an allocation failed anywhere while reading the sheet */
};

/* Adds one; the same text on the same line only once. In place of the
 * one at SHEET_ERRORS_MOST it says that there are too many; later ones are dropped. Where memory is out it sets no_memory. */
void sheet_errors_add(struct sheet_errors *errors, int line, const char *format, ...)
    __attribute__((format(printf, 3, 4)));

/* Appends "PATH:LINE: text\n" for each, by line and then as added; "PATH: text\n" for line 0. */
void sheet_errors_print(struct sheet_errors *errors, const char *path, struct buffer *out);

void sheet_errors_clear(struct sheet_errors *errors); /* forgets the errors, keeps no_memory */
void sheet_errors_release(struct sheet_errors *errors);

#endif
