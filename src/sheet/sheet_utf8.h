/* sheet_utf8.h - is it text? */
#ifndef LOPSIDE_SHEET_SHEET_UTF8_H
#define LOPSIDE_SHEET_SHEET_UTF8_H

#include <stddef.h>

/* What keeps `bytes` from being a line of UTF-8 text without control characters (a tab is none), as
 * static text; NULL: nothing. Overlong forms, surrogates and code points above U+10FFFF are not
 * UTF-8 (RFC 3629, section 4). */
const char *sheet_utf8_fault(const char *bytes, size_t length);

/* Length of the character at `bytes`, 1 to 4, or 0 if it is not UTF-8 (RFC 3629, section 4). */
size_t sheet_utf8_length(const char *bytes, size_t length);

#endif
