/* sheet_desk.h - what the sheet's tests share: a good sheet, and reading text as a sheet. */
#ifndef LOPSIDE_TESTS_UNIT_SHEET_DESK_H
#define LOPSIDE_TESTS_UNIT_SHEET_DESK_H

#include <stdbool.h>
#include <stddef.h>

#include "sheet/sheet.h"

/* Every section and key that a sheet may hold, with values that are right. */
extern const char SHEET_DESK_FULL[];

/* The least that a sheet with recordings needs, without [aim] and [limits]. */
extern const char SHEET_DESK_LEAST[];

/* Writes the text as "fan.ini" into a new folder, reads it, removes both. */
int sheet_desk_read(struct sheet *sheet, const char *text, size_t length, bool audit,
                    struct buffer *errors);

/* The text is refused with exactly these lines, folders taken off: "fan.ini:3: cause ...\n". */
void sheet_desk_expect(const char *text, bool audit, const char *wanted);
void sheet_desk_expect_bytes(const char *text, size_t length, bool audit, const char *wanted);

/* New: `text` with its first `old` replaced by `new`; fails the test where there is none. */
char *sheet_desk_swap(const char *text, const char *old, const char *new);

/* Number of the first line that begins with `start`; fails the test where there is none. */
int sheet_desk_line(const char *text, const char *start);

#endif
