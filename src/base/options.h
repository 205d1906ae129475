/* options.h - one table drives parsing, --help and the range messages, so they cannot drift.
 *
 * Long options only (--name VALUE or --name=VALUE) plus an optional single letter; `--` ends
 * options; a lone `-` is an operand. All option errors of a call are printed before it returns.
 */
#ifndef LOPSIDE_BASE_OPTIONS_H
#define LOPSIDE_BASE_OPTIONS_H

#include <stdbool.h>
#include <stddef.h>

enum option_type {
    OPTION_FLAG,   /* value: bool * */
    OPTION_TEXT,   /* value: const char ** (borrowed from argv) */
    OPTION_LIST,   /* value: struct option_list *, repeatable */
    OPTION_CHOICE, /* value: int *, index into choices */
    OPTION_NUMBER  /* value: double * */
};

struct option_list {
    const char **items; /* borrowed strings in a new array; free with option_list_release */
    size_t count;
};

struct option {
    const char *name;            /* without dashes */
    char letter;                 /* 0: none */
    enum option_type type;
    const char *unit;            /* the placeholder in --help: FILE, NAME, rpm ... NULL for flags */
    const char *fallback;        /* shown default, NULL: none shown */
    double min, max;             /* OPTION_NUMBER: legal range */
    const char *const *choices;  /* OPTION_CHOICE: NULL-terminated */
    const char *help;            /* one line */
    void *value;                 /* where the value goes, holding the default on entry */
};

struct usage {
    const char *stage;           /* "track"; NULL for the program itself */
    const char *operands;        /* "SHEET [RECORDING...]" or "" */
    const char *summary;         /* one line */
    const struct option *options; /* ends with name == NULL */
    size_t least, most;          /* number of operands; most 0 with least 0: none allowed */
    const char *details;         /* further text for --help, or NULL */
};

enum options_result { OPTIONS_GO, OPTIONS_STOP, OPTIONS_MISUSE };

/* Parses argv[1..]; `operands` receives the rest (borrowed pointers in a new array, to be freed with
 * option_list_release). Returns OPTIONS_GO; OPTIONS_STOP after --help or --version were printed
 * to standard output (exit 0); OPTIONS_MISUSE after every error was printed (exit 2). */
int options_parse(const struct usage *usage, int argc, char **argv, struct option_list *operands)
    __attribute__((warn_unused_result));

/* Prints the help of a stage to standard output. */
void options_help(const struct usage *usage);

void option_list_release(struct option_list *list);

#endif
