/* buffer.h - a growable run of bytes. */
#ifndef LOPSIDE_BASE_BUFFER_H
#define LOPSIDE_BASE_BUFFER_H

#include <stddef.h>

struct buffer {
    char *bytes; /* owned; always NUL-terminated once anything was added */
    size_t length, room;
    int failed; /* set when an allocation failed; further adds do nothing */
};

#define BUFFER_INIT {0}

void buffer_add(struct buffer *b, const void *bytes, size_t length);
void buffer_text(struct buffer *b, const char *text);
void buffer_format(struct buffer *b, const char *format, ...) __attribute__((format(printf, 2, 3)));
void buffer_clear(struct buffer *b);   /* keeps the memory */
void buffer_release(struct buffer *b); /* frees it */

#endif
