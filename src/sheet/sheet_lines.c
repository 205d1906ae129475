#include "sheet/sheet_lines.h"

#include <ini.h>
#include <stdlib.h>
#include <string.h>

#include "sheet/sheet_utf8.h"

#define BLANKS " \t"

struct reader {
    struct sheet_lines *lines;
    struct sheet_errors *errors;
    char *at, *end; /* what is left of the text */
    int line;       /* number of the line last taken */
    char *value;    /* where the value of the line fed begins, for quotes */
    bool waiting;   /* a line was fed and its key has not come back */
    bool skipping;  /* in a section whose header is wrong: its keys are not looked at */
    bool opened;    /* a header was seen */
};

static bool is_blank(char c)
{
    return c == ' ' || c == '\t';
}

/* Cuts blanks off the end; returns the first that is none. */
static char *trim(char *text)
{
    size_t length = strlen(text);
    while (length > 0 && is_blank(text[length - 1]))
        text[--length] = '\0';
    return text + strspn(text, BLANKS);
}

/* The next line, its end cut off (LF or CRLF); NULL at the end. NUL bytes were refused before. */
static char *next_line(struct reader *reader)
{
    if (reader->at >= reader->end)
        return NULL;
    char *line = reader->at;
    char *end = memchr(line, '\n', (size_t)(reader->end - line));
    reader->at = end ? end + 1 : reader->end;
    if (!end)
        end = reader->end;
    *end = '\0';
    if (end > line && end[-1] == '\r')
        end[-1] = '\0';
    reader->line++;
    return line;
}

/* Where the value of a `key = value` line begins; NULL where there is no sign between them. */
static char *value_of(char *line)
{
    char *sign = strpbrk(line, "=:");
    return sign ? sign + 1 + strspn(sign + 1, BLANKS) : NULL;
}

/* Cuts the comment off: blank, #, blank (or the line's end), looked for from `at` on. */
static void cut_comment(char *line, char *at)
{
    for (; *at; at++)
        if (*at == '#' && at > line && is_blank(at[-1]) && (is_blank(at[1]) || !at[1])) {
            *at = '\0';
            return;
        }
}

/* Comments off, blanks off both ends; "" where nothing is left. A quoted value may hold ` # `. */
static char *clean(char *line)
{
    line += strspn(line, BLANKS);
    if (*line == '#')
        return line + strlen(line);
    char *from = line;
    char *value = *line == '[' ? NULL : value_of(line);
    if (value && *value == '"') {
        char *quote = strchr(value + 1, '"');
        if (quote)
            from = quote;
    }
    cut_comment(line, from);
    return trim(line);
}

static struct sheet_section *add_section(struct reader *reader, const char *text)
{
    struct sheet_lines *lines = reader->lines;
    size_t count = lines->section_count;
    if (count == SHEET_SECTIONS_MOST) {
        sheet_errors_add(reader->errors, reader->line, "more than %d sections",
                         SHEET_SECTIONS_MOST);
        reader->at = reader->end;
        return NULL;
    }
    struct sheet_section *sections = realloc(lines->sections, (count + 1) * sizeof *sections);
    if (!sections) {
        reader->errors->no_memory = true;
        return NULL;
    }
    lines->sections = sections;
    sections[count] = (struct sheet_section){strdup(text), -1, "", reader->line, 0};
    if (!sections[count].text) {
        reader->errors->no_memory = true;
        return NULL;
    }
    lines->section_count = count + 1;
    return &sections[count];
}

static void take_header(struct reader *reader, char *line)
{
    char *close = strchr(line, ']');
    reader->opened = true;
    reader->skipping = true;
    if (!close) {
        sheet_errors_add(reader->errors, reader->line, "section header without ']': '%.100s'",
                         line);
        return;
    }
    if (close[1]) {
        sheet_errors_add(reader->errors, reader->line, "text behind a section header: '%.100s'",
                         close + 1);
        return;
    }
    *close = '\0';
    if (add_section(reader, trim(line + 1)))
        reader->skipping = false;
}

static void miss_key(struct reader *reader)
{
    if (reader->waiting)
        sheet_errors_add(reader->errors, reader->line, "neither a section nor 'key = value'%s",
                         reader->value && *reader->value == ';' ? "; a comment begins with '#'"
                                                                : "");
    reader->waiting = false;
}

/* False where the line is not fit to be fed: the error is noted. */
static bool is_fit(struct reader *reader, const char *line)
{
    const char *fault = sheet_utf8_fault(line, strlen(line));
    if (fault) {
        sheet_errors_add(reader->errors, reader->line, "%s in the line", fault);
        return false;
    }
    if (strlen(line) > SHEET_LINE_MOST) {
        sheet_errors_add(reader->errors, reader->line, "line longer than %d bytes: '%.40s...'",
                         SHEET_LINE_MOST, line);
        return false;
    }
    return true;
}

/* A section is empty where it holds no line at all, right or wrong. */
static void count_line(struct reader *reader)
{
    if (reader->lines->section_count > 0 && !reader->skipping)
        reader->lines->sections[reader->lines->section_count - 1].entries++;
}

/* inih's reader: the next line that holds a key. Headers, comments and blank lines stay here. */
static char *feed(char *room, int size, void *stream)
{
    struct reader *reader = stream;
    miss_key(reader);
    for (char *line; (line = next_line(reader));) {
        if (!is_fit(reader, line)) {
            count_line(reader);
            continue;
        }
        line = clean(line);
        if (!*line)
            continue;
        if (*line == '[') {
            take_header(reader, line);
            continue;
        }
        if (reader->skipping)
            continue;
        count_line(reader);
        size_t length = strlen(line);
        if (length + 2 > (size_t)size) { /* cannot be: SHEET_LINE_MOST is less */
            sheet_errors_add(reader->errors, reader->line, "line too long: '%.40s...'", line);
            continue;
        }
        memcpy(room, line, length);
        memcpy(room + length, "\n", 2);
        reader->value = line;
        reader->waiting = true;
        return room;
    }
    return NULL;
}

/* Takes the quotes off in place; returns NULL or what is wrong. */
static const char *unquote(char *value)
{
    if (*value != '"')
        return NULL;
    char *close = strchr(value + 1, '"');
    if (!close)
        return "quote not closed";
    if (close[1])
        return "text behind the closing quote";
    *close = '\0';
    memmove(value, value + 1, (size_t)(close - value));
    return NULL;
}

static bool add_entry(struct reader *reader, const char *key, char *value)
{
    struct sheet_lines *lines = reader->lines;
    size_t count = lines->entry_count;
    struct sheet_entry *entries = realloc(lines->entries, (count + 1) * sizeof *entries);
    if (!entries)
        return false;
    lines->entries = entries;
    entries[count] = (struct sheet_entry){strdup(key),  strdup(value), lines->section_count - 1,
                                          reader->line, NULL,          ""};
    if (!entries[count].text || !entries[count].value) {
        free(entries[count].text);
        free(entries[count].value);
        return false;
    }
    lines->entry_count = count + 1;
    return true;
}

/* inih's handler. */
static int take(void *user, const char *section, const char *name, const char *value)
{
    struct reader *reader = user;
    (void)section; /* cut at 49 bytes: ours is kept */
    reader->waiting = false;
    if (!reader->opened) {
        sheet_errors_add(reader->errors, reader->line, "key before any section: '%.100s'", name);
        return 1;
    }
    if (reader->lines->entry_count == SHEET_ENTRIES_MOST) {
        sheet_errors_add(reader->errors, reader->line, "more than %d keys", SHEET_ENTRIES_MOST);
        reader->at = reader->end;
        return 1;
    }
    char *copy = strdup(value);
    if (!copy) {
        reader->errors->no_memory = true;
        return 1;
    }
    const char *fault = unquote(copy);
    if (!fault && !copy[strspn(copy, BLANKS)])
        fault = "no value";
    if (fault)
        sheet_errors_add(reader->errors, reader->line, "%s: '%.100s'", fault, name);
    else if (!add_entry(reader, name, copy))
        reader->errors->no_memory = true;
    free(copy);
    return 1;
}

/* Debian's inih takes these from variables; what is set here is its own caution switched off, since
 * the lines that it sees are clean already. */
static void set_inih(void)
{
    static char none[] = "";
    ini_use_stack = false;
    ini_max_line = SHEET_LINE_MOST + 8;
    ini_initial_alloc = SHEET_LINE_MOST + 8;
    ini_allow_realloc = false;
    ini_allow_multiline = false;
    ini_allow_inline_comments = false;
    ini_allow_no_value = false;
    ini_stop_on_first_error = false;
    ini_start_comment_prefixes = none;
}

/* Text has no NUL, and most of its lines are UTF-8. */
static bool is_text(const char *text, size_t length, struct sheet_errors *errors)
{
    int line = 1, bad = 0, first = 0;
    const char *nul = memchr(text, '\0', length);
    for (const char *at = text, *end = text + length; at < end; line++) {
        const char *stop = memchr(at, '\n', (size_t)(end - at));
        if (!stop)
            stop = end;
        size_t size = (size_t)(stop - at);
        if (size > 0 && at[size - 1] == '\r')
            size--;
        if (sheet_utf8_fault(at, size) && bad++ == 0)
            first = line;
        if (nul && nul >= at && nul < stop + 1) {
            sheet_errors_add(errors, line, "not a text file: a NUL byte");
            return false;
        }
        at = stop + 1;
    }
    if (2 * bad > line - 1) {
        sheet_errors_add(errors, first, "not a text file");
        return false;
    }
    return true;
}

void sheet_lines_split(struct sheet_lines *lines, char *text, size_t length,
                       struct sheet_errors *errors)
{
    struct reader reader = {.lines = lines, .errors = errors, .at = text, .end = text + length};
    if (length >= 3 && !memcmp(text, "\xef\xbb\xbf", 3))
        reader.at += 3;
    if (!is_text(reader.at, (size_t)(reader.end - reader.at), errors))
        return;
    set_inih();
    if (ini_parse_stream(feed, &reader, take, &reader) == -2)
        errors->no_memory = true;
}

void sheet_lines_release(struct sheet_lines *lines)
{
    for (size_t i = 0; i < lines->section_count; i++)
        free(lines->sections[i].text);
    free(lines->sections);
    for (size_t i = 0; i < lines->entry_count; i++) {
        free(lines->entries[i].text);
        free(lines->entries[i].value);
    }
    free(lines->entries);
    *lines = (struct sheet_lines){0};
}
