#include "sheet/sheet_errors.h"

#include <stdarg.h>
#include <stdio.h>
#include <stdlib.h>
#include <string.h>

static bool is_known(const struct sheet_errors *errors, int line, const char *text)
{
    for (size_t i = 0; i < errors->count; i++)
        if (errors->items[i].line == line && !strcmp(errors->items[i].text, text))
            return true;
    return false;
}

static bool make_room(struct sheet_errors *errors)
{
    if (errors->count < errors->room)
        return true;
    size_t room = errors->room ? 2 * errors->room : 16;
    struct sheet_error *items = realloc(errors->items, room * sizeof *items);
    if (!items)
        return false;
    errors->items = items;
    errors->room = room;
    return true;
}

void sheet_errors_add(struct sheet_errors *errors, int line, const char *format, ...)
{
    if (errors->count == SHEET_ERRORS_MOST)
        return;
    if (errors->count == SHEET_ERRORS_MOST - 1) {
        line = 0;
        format = "too many errors, of which these came first";
    }
    char text[600]; /* a cause and one quoted text of at most 4 x 100 bytes */
    va_list arguments;
    va_start(arguments, format);
    vsnprintf(text, sizeof text, format, arguments);
    va_end(arguments);
    if (is_known(errors, line, text))
        return;
    char *copy = strdup(text);
    if (!copy || !make_room(errors)) {
        free(copy);
        errors->no_memory = true;
        return;
    }
    errors->items[errors->count++] = (struct sheet_error){line, copy};
}

/* Stable: errors of one line stay in the order in which they were found. */
static void sort_by_line(struct sheet_errors *errors)
{
    for (size_t i = 1; i < errors->count; i++) {
        struct sheet_error moved = errors->items[i];
        size_t j = i;
        for (; j > 0 && errors->items[j - 1].line > moved.line; j--)
            errors->items[j] = errors->items[j - 1];
        errors->items[j] = moved;
    }
}

void sheet_errors_print(struct sheet_errors *errors, const char *path, struct buffer *out)
{
    sort_by_line(errors);
    for (size_t i = 0; i < errors->count; i++) {
        if (errors->items[i].line > 0)
            buffer_format(out, "%s:%d: %s\n", path, errors->items[i].line, errors->items[i].text);
        else
            buffer_format(out, "%s: %s\n", path, errors->items[i].text);
    }
}

void sheet_errors_clear(struct sheet_errors *errors)
{
    for (size_t i = 0; i < errors->count; i++)
        free(errors->items[i].text);
    errors->count = 0;
}

void sheet_errors_release(struct sheet_errors *errors)
{
    sheet_errors_clear(errors);
    free(errors->items);
    errors->items = NULL;
    errors->room = 0;
}
