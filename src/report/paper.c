#include "report/paper.h"

#include <stdarg.h>
#include <stdbool.h>
#include <stdio.h>
#include <string.h>

/* Length of the UTF-8 sequence at s and its code point; 0 where it is not valid UTF-8 (RFC 3629).
 */
static size_t decode(const unsigned char *s, unsigned *point)
{
    static const unsigned least[] = {0, 0, 0x80, 0x800, 0x10000};
    size_t length = s[0] < 0x80       ? 1
                    : s[0] >> 5 == 6  ? 2
                    : s[0] >> 4 == 14 ? 3
                    : s[0] >> 3 == 30 ? 4
                                      : 0;
    if (length == 0)
        return 0;
    unsigned value = length == 1 ? s[0] : s[0] & (0x7fu >> length);
    for (size_t i = 1; i < length; i++) {
        if ((s[i] & 0xc0) != 0x80)
            return 0;
        value = value << 6 | (s[i] & 0x3fu);
    }
    if (length > 1 && (value < least[length] || value > 0x10ffff || (value >> 11) == 0x1b))
        return 0;
    *point = value;
    return length;
}

static bool is_control(unsigned point)
{
    return point < 0x20 || (point >= 0x7f && point < 0xa0);
}

/* Marks and overrides of direction, line and paragraph separators, the byte order mark (Unicode,
 * UAX 9). */
static bool is_invisible(unsigned point)
{
    return point == 0x061c || (point >= 0x200b && point <= 0x200f) ||
           (point >= 0x2028 && point <= 0x202e) || (point >= 0x2060 && point <= 0x206f) ||
           point == 0xfeff;
}

void paper_clean(struct buffer *out, const char *text)
{
    const unsigned char *s = (const unsigned char *)text;
    while (*s) {
        unsigned point = 0;
        size_t length = decode(s, &point);
        if (length == 0)
            buffer_format(out, "\\x%02x", *s);
        else if (is_control(point))
            buffer_format(out, "\\x%02x", point);
        else if (is_invisible(point))
            buffer_format(out, "\\u%04x", point);
        else
            buffer_add(out, s, length);
        s += length ? length : 1;
    }
}

size_t paper_width(const char *clean)
{
    size_t points = 0;
    for (; *clean; clean++)
        points += ((unsigned char)*clean & 0xc0) != 0x80;
    return points;
}

size_t paper_bytes(const char *clean, size_t points)
{
    size_t i = 0;
    for (; clean[i]; i++) {
        if (((unsigned char)clean[i] & 0xc0) != 0x80 && points-- == 0)
            break;
    }
    return i;
}

static void indent(struct buffer *out, size_t columns)
{
    for (size_t i = 0; i < columns; i++)
        buffer_add(out, " ", 1);
}

/* Bytes that fit the line: up to the last blank inside, or broken inside a word longer than it. */
static size_t line_length(const char *text, size_t columns)
{
    size_t fits = paper_bytes(text, columns);
    if (text[fits] == '\0' || text[fits] == ' ')
        return fits;
    for (size_t i = fits; i > 0; i--) {
        if (text[i - 1] == ' ')
            return i - 1;
    }
    return fits;
}

void paper_wrap(struct buffer *out, size_t first, size_t rest, const char *text)
{
    struct buffer clean = BUFFER_INIT;
    paper_clean(&clean, text);
    if (clean.failed)
        out->failed = 1;
    const char *at = clean.failed || !clean.bytes ? "" : clean.bytes;
    size_t columns = first;
    while (*(at += strspn(at, " "))) {
        indent(out, columns);
        size_t length = line_length(at, PAPER_WIDTH - columns);
        size_t inked = length;
        while (inked > 0 && at[inked - 1] == ' ')
            inked--;
        buffer_add(out, at, inked);
        buffer_add(out, "\n", 1);
        at += length;
        columns = rest;
    }
    buffer_release(&clean);
}

void paper_say(struct buffer *out, size_t first, size_t rest, const char *format, ...)
{
    char text[4096]; /* longer than any field of a record; what is longer is cut */
    va_list list;
    va_start(list, format);
    vsnprintf(text, sizeof text, format, list);
    va_end(list);
    paper_wrap(out, first, rest, text);
}

void paper_take(struct buffer *out, size_t first, size_t rest, struct buffer *text)
{
    if (text->failed)
        out->failed = 1;
    else if (text->bytes)
        paper_wrap(out, first, rest, text->bytes);
    buffer_release(text);
}

void paper_heading(struct buffer *out, const char *heading)
{
    buffer_add(out, "\n", 1);
    paper_wrap(out, 0, 0, heading);
}
