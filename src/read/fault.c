#include "read/fault.h"

#include <stdarg.h>
#include <stdio.h>

/* A text that was cut within a UTF-8 character loses what is left of it. */
static void drop_half_character(char *text, size_t length)
{
    size_t at = length;
    while (at > 0 && ((unsigned char)text[at - 1] & 0xC0) == 0x80)
        at--;
    if (at > 0 && ((unsigned char)text[at - 1] & 0x80) != 0)
        text[at - 1] = '\0';
}

int fault_set(struct fault *fault, int status, const char *format, ...)
{
    if (fault->status != STATUS_DONE)
        return fault->status;
    fault->status = status;
    va_list arguments;
    va_start(arguments, format);
    int length = vsnprintf(fault->text, sizeof fault->text, format, arguments);
    va_end(arguments);
    if (length >= (int)sizeof fault->text)
        drop_half_character(fault->text, sizeof fault->text - 1);
    return status;
}

int fault_no_memory(struct fault *fault)
{
    return fault_set(fault, STATUS_SYSTEM, "out of memory");
}
