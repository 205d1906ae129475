/* lines.h - counts the lines of a text as it passes, and remembers the last one. */
#ifndef LOPSIDE_READ_LINES_H
#define LOPSIDE_READ_LINES_H

#include <stdbool.h>
#include <stddef.h>

/* A line is empty when it holds nothing but blanks, tabs, semicolons, commas and carriage returns:
 * what spreadsheets leave behind the data. */
struct lines {
    long long count;       /* of lines that are not empty */
    long long last_offset; /* of the last such line, in bytes from the start */
    long long last_length; /* without its newline */
    long long start;       /* private: offset of the line at hand */
    long long offset;      /* private: bytes seen */
    bool filled;           /* private: the line at hand is not empty */
};

#define LINES_INIT                                                                                 \
    {                                                                                              \
        0                                                                                          \
    }

/* The next bytes of the text; it may be cut anywhere. */
void lines_feed(struct lines *lines, const char *bytes, size_t length);

/* No more bytes: a last line without a newline counts. */
void lines_finish(struct lines *lines);

#endif
