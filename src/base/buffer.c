#include "base/buffer.h"

#include <stdarg.h>
#include <stdint.h>
#include <stdio.h>
#include <stdlib.h>
#include <string.h>

/* Makes room for `more` bytes and a NUL. */
static int reserve(struct buffer *b, size_t more)
{
    if (b->failed || more > SIZE_MAX / 4 - b->length) {
        b->failed = 1;
        return -1;
    }
    size_t need = b->length + more + 1;
    if (need <= b->room)
        return 0;
    size_t room = b->room ? b->room : 128;
    while (room < need)
        room *= 2;
    char *bytes = realloc(b->bytes, room);
    if (!bytes) {
        b->failed = 1;
        return -1;
    }
    b->bytes = bytes;
    b->room = room;
    return 0;
}

void buffer_add(struct buffer *b, const void *bytes, size_t length)
{
    if (reserve(b, length) < 0)
        return;
    if (length)
        memcpy(b->bytes + b->length, bytes, length);
    b->length += length;
    b->bytes[b->length] = '\0';
}

void buffer_text(struct buffer *b, const char *text)
{
    buffer_add(b, text, strlen(text));
}

void buffer_format(struct buffer *b, const char *format, ...)
{
    va_list arguments, again;
    va_start(arguments, format);
    va_copy(again, arguments);
    int length = vsnprintf(NULL, 0, format, arguments);
    va_end(arguments);
    if (length >= 0 && reserve(b, (size_t)length) == 0) {
        vsnprintf(b->bytes + b->length, (size_t)length + 1, format, again);
        b->length += (size_t)length;
    }
    va_end(again);
}

void buffer_clear(struct buffer *b)
{
    b->length = 0;
    b->failed = 0;
    if (b->bytes)
        b->bytes[0] = '\0';
}

void buffer_release(struct buffer *b)
{
    free(b->bytes);
    *b = (struct buffer)BUFFER_INIT;
}
