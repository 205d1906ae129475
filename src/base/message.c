#include "base/message.h"

#include <stdarg.h>
#include <stdio.h>
#include <string.h>
#include <unistd.h>

#include "base/status.h"

#define MESSAGE_MOST 4096 /* one line, one write */

static const char *stage_name;

void message_stage(const char *name)
{
    stage_name = name;
}

/* Copies `text` into `line` with control characters as \xNN; returns the new length. */
static size_t append_clean(char *line, size_t length, const char *text)
{
    for (const unsigned char *p = (const unsigned char *)text; *p && length < MESSAGE_MOST - 8; p++) {
        /* C0 controls, DEL, and C1 controls as UTF-8 (0xC2 0x80..0x9F) would reach the terminal */
        int c1 = p[0] == 0xC2 && p[1] >= 0x80 && p[1] <= 0x9F;
        if (*p < 0x20 || *p == 0x7F)
            length += (size_t)snprintf(line + length, 5, "\\x%02X", *p);
        else if (c1)
            length += (size_t)snprintf(line + length, 5, "\\x%02X", *++p);
        else
            line[length++] = (char)*p;
    }
    return length;
}

void message(const char *format, ...)
{
    char text[MESSAGE_MOST];
    char line[MESSAGE_MOST];
    size_t length = 0;
    va_list arguments;

    va_start(arguments, format);
    vsnprintf(text, sizeof text, format, arguments);
    va_end(arguments);

    length = append_clean(line, length, "lopside");
    if (stage_name) {
        line[length++] = ' ';
        length = append_clean(line, length, stage_name);
    }
    length = append_clean(line, length, ": ");
    length = append_clean(line, length, text);
    line[length++] = '\n';
    if (write(STDERR_FILENO, line, length) < 0)
        return; /* nowhere left to say it */
}

int message_no_memory(void)
{
    message("no memory left");
    return STATUS_SYSTEM;
}
