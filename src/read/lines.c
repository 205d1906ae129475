#include "read/lines.h"

#include <string.h>

static bool is_filling(char c)
{
    return c == ' ' || c == '\t' || c == ';' || c == ',' || c == '\r';
}

static void end_line(struct lines *lines, long long end)
{
    if (!lines->filled)
        return;
    lines->count++;
    lines->last_offset = lines->start;
    lines->last_length = end - lines->start;
}

void lines_feed(struct lines *lines, const char *bytes, size_t length)
{
    const char *p = bytes, *end = bytes + length;
    while (p < end) {
        if (!lines->filled) {
            while (p < end && is_filling(*p))
                p++;
            if (p == end)
                break;
            lines->filled = *p != '\n';
        }
        const char *newline = memchr(p, '\n', (size_t)(end - p));
        if (!newline)
            break;
        long long at = lines->offset + (newline - bytes);
        end_line(lines, at);
        lines->start = at + 1;
        lines->filled = false;
        p = newline + 1;
    }
    lines->offset += (long long)length;
}

void lines_finish(struct lines *lines)
{
    end_line(lines, lines->offset);
    lines->filled = false;
}
