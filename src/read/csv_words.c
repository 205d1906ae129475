#include "read/csv_words.h"

#include <string.h>
#include <strings.h>

static bool is_letter(char c)
{
    return (c >= 'a' && c <= 'z') || (c >= 'A' && c <= 'Z') || (unsigned char)c >= 0x80;
}

static size_t word_length(const char *text)
{
    size_t length = 0;
    while (is_letter(text[length]))
        length++;
    return length;
}

static bool is_word(const char *text, size_t length, const char *word)
{
    return strlen(word) == length && strncasecmp(text, word, length) == 0;
}

struct unit {
    const char *name;
    double seconds;
};

static const struct unit units[] = {
    {"s", 1},       {"sec", 1},          {"secs", 1},         {"second", 1},
    {"seconds", 1}, {"sekunden", 1},     {"ms", 1e-3},        {"msec", 1e-3},
    {"us", 1e-6},   {"\xC2\xB5s", 1e-6}, {"\xCE\xBCs", 1e-6}, {"\xB5s", 1e-6},
    {"ns", 1e-9},   {"min", 60},         {"h", 3600},
};

static double find_unit(const char *text, size_t length)
{
    for (size_t i = 0; i < sizeof units / sizeof *units; i++)
        if (is_word(text, length, units[i].name))
            return units[i].seconds;
    return -1;
}

bool csv_words_is_time(const char *header)
{
    static const char *const words[] = {"time",  "timestamp", "zeit", "temps", "tiempo",
                                        "tempo", "tijd",      "tid",  NULL};
    const size_t length = word_length(header);
    if (length == 1 && header[0] == 't')
        return true;
    for (const char *const *word = words; *word; word++)
        if (is_word(header, length, *word))
            return true;
    return length > 1 && header[length] == '\0' && find_unit(header, length) > 0;
}

double csv_words_time_unit(const char *text)
{
    const size_t skipped = strspn(text, " [(/");
    const size_t length = strcspn(text + skipped, " )]");
    return length == 0 ? 0 : find_unit(text + skipped, length);
}

double csv_words_header_unit(const char *header)
{
    const char *bracket = strpbrk(header, "[(");
    if (bracket)
        return csv_words_time_unit(bracket);
    const size_t length = word_length(header);
    const char *rest = header + length;
    rest += strspn(rest, " _/,-");
    double unit = 0;
    if (*rest)
        unit = find_unit(rest, strlen(rest));
    else if (length > 1)
        unit = find_unit(header, length);
    return unit > 0 ? unit : 0;
}

bool csv_words_match(const char *header, const char *name, bool exact)
{
    const size_t length = strlen(name);
    if (strncmp(header, name, length) != 0)
        return false;
    if (exact)
        return header[length] == '\0';
    const char *rest = header + length + strspn(header + length, " ");
    return *rest == '[' || *rest == '(';
}

bool csv_words_is_not_finite(const char *text, size_t length)
{
    if (length > 0 && (*text == '-' || *text == '+')) {
        text++;
        length--;
    }
    return is_word(text, length, "nan") || is_word(text, length, "inf") ||
           is_word(text, length, "infinity");
}
